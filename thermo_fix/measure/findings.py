"""Turn the regions of an image into measured findings."""

import math
from collections.abc import Mapping, Sequence
from dataclasses import replace

import cv2
import numpy as np

from thermo_fix import cautions
from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.measure import building, electrical
from thermo_fix.measure.quantities import Site, quantities_of
from thermo_fix.measure.spot import (
    Spot,
    spot_at_extreme,
    spot_of_median,
    temperature_of,
    variable_name,
)
from thermo_fix.measure.trade import Measured
from thermo_fix.measure.words import camera_words, input_words, place_words, where_words
from thermo_fix.radiometry.blackbody import BAND_RANGE_K
from thermo_fix.radiometry.path import seen_map
from thermo_fix.radiometry.surface import (
    MEASURABLE_FOOTPRINTS,
    STEEP_VIEW_DEG,
    pixel_footprint_m2,
)
from thermo_fix.records import (
    Assessment,
    BudgetLine,
    Camera,
    CorrectedFrame,
    Finding,
    MaskArray,
    MeasuredRegion,
    Purpose,
    Region,
    VariableWords,
)
from thermo_fix.thermal.load import LEAST_LOAD
from thermo_fix.uncertainty.equation import MODEL
from thermo_fix.uncertainty.estimate import Estimate

_LOW_EMISSIVITY = 0.6
_NEAR_REFLECTED_K = 2.0


_TRADES = {"electrical": electrical, "building": building}


def measure_regions(
    corrected: CorrectedFrame,
    regions: Sequence[Region],
    camera: Camera,
    prefix: str,
    purpose: Purpose,
) -> tuple[MeasuredRegion, ...]:
    """Measure the regions of one image.

    Parameters
    ----------
    corrected
        The image.
    regions
        From the find stage.
    camera
        For the footprint.
    prefix
        Of the findings' ids: ``7`` makes ``7.1``, ``7.2``.
    purpose
        Which trade adds its assessments.

    Returns
    -------
    tuple of MeasuredRegion
        In the order of the regions.

    """
    return tuple(
        _measure(corrected, region, camera, f"{prefix}.{number}", purpose)
        for number, region in enumerate(regions, 1)
    )


def assess_image(
    corrected: CorrectedFrame, regions: Sequence[MeasuredRegion], purpose: Purpose
) -> tuple[Assessment, ...]:
    """Return what the trade says of an image as a whole, or of groups of its zones."""
    said: tuple[Assessment, ...] = _TRADES[purpose].image_assessments(corrected, regions)
    return said


def _measure(
    corrected: CorrectedFrame, region: Region, camera: Camera, identity: str, purpose: Purpose
) -> MeasuredRegion:
    job = corrected.job
    equation = corrected.equations[region.label]
    inputs = corrected.inputs[region.label]
    where = where_words(corrected, region.label)
    spot = spot_at_extreme(
        corrected,
        f"finding {identity}",
        region.label,
        region.extreme_px,
        region.defective_px,
    )
    extreme = temperature_of(spot, equation)
    words = _words(corrected, spot, where)
    reference_spot = _reference_spot(corrected, region, identity)
    reference: Estimate | None = None
    difference: Estimate | None = None
    if reference_spot is not None:
        reference = temperature_of(reference_spot, corrected.equations[reference_spot.label])
        difference = extreme.minus(reference)
        words = {
            **_words(corrected, reference_spot, where_words(corrected, reference_spot.label)),
            **words,
        }
    words = _with_model_gap(words, extreme)
    site = Site(inputs, where)
    quantities, missing, site_words = quantities_of(
        extreme,
        difference,
        like=region.reference_kind == "like component",
        site=site,
    )
    words |= {name: words.get(name, each) for name, each in site_words.items()}
    rows = slice(region.bbox_px[1], region.bbox_px[3])
    columns = slice(region.bbox_px[0], region.bbox_px[2])
    surface = corrected.surface_k[rows, columns][region.mask]
    area_px = int(np.count_nonzero(region.mask))
    area_m2, u_area_m2 = _area(corrected, region.label, camera, area_px)
    alternative = extreme.contributions.get(MODEL)
    finding = Finding(
        id=identity,
        image=job.file,
        zone=job.zones[region.label - 1].name if region.label else None,
        sense=region.sense,
        bbox_px=region.bbox_px,
        area_px=area_px,
        area_m2=area_m2,
        u_area_m2=u_area_m2,
        extreme_c=extreme.value,
        extreme_px=region.extreme_px,
        mean_c=float(np.nanmean(surface, dtype=np.float64)) - ZERO_CELSIUS_K,
        reference_kind=region.reference_kind,
        reference_name=_reference_name(corrected, region),
        reference_c=None if reference is None else reference.value,
        delta_k=None if difference is None else difference.value,
        u_extreme_k=_finite(extreme.u),
        u_delta_k=None if difference is None else _finite(difference.u),
        contours=_contours(region),
        budget=_budget(extreme, words),
        delta_budget=() if difference is None else _budget(difference, words),
        apparent_c=_apparent_c(corrected, spot),
        model_difference_k=None if alternative is None else _finite(alternative * math.sqrt(3.0)),
        method="first order" if extreme.is_linear else "Monte Carlo",
        interval_c=None if math.isnan(extreme.u) else extreme.interval(),
    )
    extras = _TRADES[purpose].finding_extras(
        Measured(
            corrected=corrected,
            region=region,
            finding=finding,
            spot=spot,
            reference_spot=reference_spot,
            extreme=extreme,
            reference=reference,
            difference=difference,
            where=where,
            quantities=quantities,
            missing=missing,
        )
    )
    own = _cautions(corrected, region, finding, extreme, difference)
    return MeasuredRegion(
        replace(finding, cautions=(*own, *extras.cautions), assessments=extras.assessments),
        {**quantities, **extras.quantities},
        {**missing, **extras.missing},
        site.inside,
        {**extras.words, **words},
        extras.scenarios,
        extras.settings,
    )


def _reference_spot(corrected: CorrectedFrame, region: Region, identity: str) -> Spot | None:
    if not region.reference_px:
        return None
    if region.reference_kind == "like component" and region.reference_label is not None:
        # Named by its place, so that two findings that share a reference share its errors.
        zone = corrected.job.zones[region.reference_label - 1].name
        return spot_at_extreme(
            corrected,
            f"zone {zone} of {corrected.job.file}, {region.sense}",
            region.reference_label,
            region.reference_px[0],
            region.defective_px,
        )
    where = np.zeros(corrected.labels.shape, bool)
    columns, rows = np.array(region.reference_px).T
    where[rows, columns] = True
    return spot_of_median(corrected, f"surroundings of {identity}", region.label, where)


def _reference_name(corrected: CorrectedFrame, region: Region) -> str:
    if region.reference_kind == "surroundings" or region.reference_label is None:
        return "surroundings in the same zone" if region.label else "surroundings"
    zone = corrected.job.zones[region.reference_label - 1].name
    if len(region.reference_labels) > 1:
        return f"{zone}, median of {len(region.reference_labels)} like zones"
    which = "coolest" if region.sense == "hot" else "warmest"
    return f"{zone}, {which} like zone"


def _words(corrected: CorrectedFrame, spot: Spot, where: str) -> dict[str, VariableWords]:
    equation = corrected.equations[spot.label]
    inputs = corrected.inputs[spot.label]
    words = {
        variable_name(equation, key): input_words(key, inputs, where) for key in equation.variables
    }
    return {
        **words,
        **camera_words(equation, spot.reading_k),
        **place_words(spot.name, equation, spot.noise_gain),
    }


def _with_model_gap(words: dict[str, VariableWords], extreme: Estimate) -> dict[str, VariableWords]:
    if MODEL not in extreme.contributions:
        return words
    return {**words, MODEL: replace(words[MODEL], u=abs(extreme.contributions[MODEL]))}


def _budget(estimate: Estimate, words: Mapping[str, VariableWords]) -> tuple[BudgetLine, ...]:
    lines = []
    for name, part in estimate.contributions.items():
        if not math.isfinite(part):
            # Not known, and with it the uncertainty; a caution says so.
            continue
        each = words[name]
        sensitivity = part / each.u if each.u > 0.0 else 0.0
        lines.append(
            BudgetLine(each.words, name, each.value, each.u, each.unit, sensitivity, abs(part))
        )
    return tuple(sorted(lines, key=lambda line: (-line.contribution_k, line.name)))


def _area(
    corrected: CorrectedFrame, label: int, camera: Camera, area_px: int
) -> tuple[float | None, float | None]:
    values = corrected.inputs[label].values
    distance = values.get("distance_m")
    angle = values.get("view_angle_deg")
    if (
        camera.ifov_mrad is None
        or distance is None
        or distance.value <= 0.0
        or distance.origin == "assumed"
    ):
        return None, None
    tilt = 0.0 if angle is None else angle.value
    area = area_px * pixel_footprint_m2(camera.ifov_mrad, distance.value, tilt)
    # Area goes with the square of the distance; the tilt enters through 1/cos.
    by_distance = 2.0 * distance.u / distance.value
    by_tilt = 0.0 if angle is None else math.tan(math.radians(tilt)) * math.radians(angle.u)
    return area, area * math.hypot(by_distance, by_tilt)


def _apparent_c(corrected: CorrectedFrame, spot: Spot) -> float:
    equation = corrected.equations[spot.label]
    seen = seen_map(equation.recorded, equation.model)(equation.model.exitance(spot.reading_k))
    return float(equation.model.temperature(seen)) - ZERO_CELSIUS_K


def _contours(region: Region) -> tuple[tuple[tuple[float, float], ...], ...]:
    """Outline along the pixel edges' midpoints, closed, in image coordinates."""
    # Drawn at twice the size, so that the outline runs along pixel edges instead of centres.
    doubled = cv2.copyMakeBorder(region.mask.astype(np.uint8), 1, 1, 1, 1, cv2.BORDER_CONSTANT)
    doubled = cv2.resize(doubled, None, fx=4, fy=4, interpolation=cv2.INTER_NEAREST)
    found, _ = cv2.findContours(doubled, cv2.RETR_EXTERNAL, cv2.CHAIN_APPROX_SIMPLE)
    x0, y0 = region.bbox_px[:2]
    outlines = []
    for contour in found:
        points = [
            (
                round((float(x) + 0.5) / 4.0 - 1.0 + x0, 2),
                round((float(y) + 0.5) / 4.0 - 1.0 + y0, 2),
            )
            for x, y in contour.reshape(-1, 2)
        ]
        outlines.append((*points, points[0]))
    return tuple(outlines)


def _cautions(
    corrected: CorrectedFrame,
    region: Region,
    finding: Finding,
    extreme: Estimate,
    difference: Estimate | None,
) -> tuple[str, ...]:
    inputs = corrected.inputs[region.label]
    where = where_words(corrected, region.label)
    found: list[str] = []
    if region.cut_by_frame and not region.whole_zone:
        found.append(cautions.cut_by_frame())
    width, height = _least_extent(region.mask)
    # The optics widen a target by about a pixel, and the find stage outlines none narrower than 3:
    # what is outlined at 3 pixels is a smaller target.
    if min(width, height) <= MEASURABLE_FOOTPRINTS:
        found.append(cautions.too_small(width, height))
    emissivity = inputs.values["emissivity"]
    if inputs.emissivity_file is None and emissivity.value < _LOW_EMISSIVITY:
        found.append(cautions.low_emissivity(where, emissivity.value))
    angle = inputs.value("view_angle_deg")
    if angle is not None and angle > STEEP_VIEW_DEG:
        found.append(cautions.steep_view(where, angle))
    reflected = inputs.value("reflected_c")
    if (
        reflected is not None
        and inputs.reflected_file is None
        and emissivity.value < _LOW_EMISSIVITY
        and abs(finding.extreme_c - reflected) < _NEAR_REFLECTED_K
    ):
        found.append(cautions.near_reflected(finding.extreme_c - reflected))
    found += _extreme_cautions(corrected, region)
    if math.isnan(extreme.u):
        found.append(_no_uncertainty(extreme))
    elif not extreme.is_linear:
        lost = float(np.mean(~np.isfinite(extreme.draws)))
        if lost > 0.0:
            found.append(cautions.lost_draws(lost))
        found.append(cautions.not_linear())
    if region.label:
        zone = corrected.job.zones[region.label - 1]
        if zone.load_a is not None and zone.rated_a and zone.load_a / zone.rated_a < LEAST_LOAD:
            found.append(cautions.low_load(zone.load_a / zone.rated_a))
    if difference is not None:
        if math.isnan(difference.u):
            found.append(cautions.no_difference_uncertainty(difference.value))
        elif abs(difference.value) <= 2.0 * difference.u:
            found.append(cautions.inside_noise(difference.value, difference.u))
    return tuple(found)


def _extreme_cautions(corrected: CorrectedFrame, region: Region) -> list[str]:
    """Say whether the extreme rests on readings that are none."""
    found = []
    if region.defective_px:
        found.append(cautions.defective_extreme())
    ends = corrected.range_ends_k
    end_k = ends.greatest_k if region.sense == "hot" else ends.least_k
    x, y = region.extreme_px
    window = corrected.reading_k[max(0, y - 1) : y + 2, max(0, x - 1) : x + 2]
    if end_k is not None and np.any(window == np.float32(end_k)):
        found.append(cautions.saturated_extreme(region.sense))
    return found


def _no_uncertainty(extreme: Estimate) -> str:
    if math.isnan(extreme.contributions.get(MODEL, 0.0)):
        low, high = (edge - ZERO_CELSIUS_K for edge in BAND_RANGE_K)
        return cautions.beyond_band_tables(extreme.value, low, high)
    return cautions.no_uncertainty()


def _least_extent(mask: MaskArray) -> tuple[int, int]:
    """Return the width and height of the smallest rectangle, of any direction, around a region."""
    points = np.argwhere(mask)[:, ::-1].astype(np.float32)
    (_, _), (width, height), _ = cv2.minAreaRect(points)
    return round(width) + 1, round(height) + 1


def _finite(value: float) -> float | None:
    return value if math.isfinite(value) else None
