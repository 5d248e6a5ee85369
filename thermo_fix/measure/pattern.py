"""Which of the patterns described in EN 13187 and ISO 6781 a building finding resembles.

A suggestion, never a diagnosis. Each pattern is a short list of marks taken from its description;
a mark is a descriptor of the shape put through a ramp from 0 (no) to 1 (yes). A pattern's score is
its weakest mark: a description fits only where all of it fits. The best pattern is named only where
its score is high enough and clearly above the next; else the answer is 'cannot tell'.
"""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from thermo_fix import cautions
from thermo_fix.measure.shape import Shape, describe
from thermo_fix.measure.trade import Measured
from thermo_fix.records import Assessment, Figure

LEAST_SCORE = 0.3
LEAST_MARGIN = 0.2
"""Scores and margin below which nothing is named; judged, not fitted to any survey."""

SOURCE = "EN 13187 and ISO 6781, descriptions of typical patterns (wording from memory)"

_MEANING = {
    "missing insulation": "missing or defective insulation (regular, well defined, even)",
    "air leakage": "air leakage (irregular or fading edge, strong variation, a streak or fan)",
    "moisture": "moisture (mottled, diffuse edge)",
    "thermal bridge": "a thermal bridge (narrow and straight, or where structural lines meet)",
}


@dataclass(frozen=True, slots=True)
class Pattern:
    """What a shape resembles."""

    name: str | None
    """Of the pattern; None where the marks do not separate."""
    scores: Mapping[str, float]
    """By pattern, 0 to 1."""


def pattern_of(shape: Shape) -> Pattern:
    """Say which pattern a shape resembles.

    Parameters
    ----------
    shape
        From :func:`thermo_fix.measure.shape.describe`.

    """
    narrow = _ramp(shape.elongation, 2.5, 5.0)
    meeting = 1.0 if shape.lines >= 2 else 0.0
    fading = _ramp(shape.trend, 0.06, 0.18)
    uneven = _ramp(shape.unevenness, 0.35, 0.8)
    diffuse = _ramp(shape.edge_width, 0.25, 0.42)
    spread = _ramp(shape.variation, 0.07, 0.2)
    straight = max(_ramp(shape.rectangularity, 0.7, 0.88), _ramp(shape.straight_share, 0.45, 0.75))
    outline = max(uneven, _ramp(shape.raggedness, 1.05, 1.25))
    scores = {
        "missing insulation": min(straight, 1 - diffuse, 1 - spread, 1 - narrow),
        "air leakage": min(outline, fading, spread),
        "moisture": min(
            diffuse,
            _ramp(shape.mottling, 0.008, 0.025),
            1 - _ramp(shape.trend, 0.1, 0.22),
            1 - _ramp(shape.unevenness, 0.5, 0.9),
            1 - narrow,
            1 - meeting,
        ),
        "thermal bridge": max(
            min(narrow, straight, 1 - uneven, 1 - fading),
            min(meeting, 1 - uneven, 1 - fading, spread),
        ),
    }
    first, second = sorted(scores, key=lambda name: -scores[name])[:2]
    clear = scores[first] >= LEAST_SCORE and scores[first] - scores[second] >= LEAST_MARGIN
    return Pattern(first if clear else None, scores)


def pattern_assessment(measured: Measured) -> Assessment | None:
    """Return what the shape of a finding suggests, with the descriptors as figures.

    Parameters
    ----------
    measured
        A finding of a building.

    Returns
    -------
    Assessment or None
        None where the region is too small, or too little is seen around it, to describe it.

    """
    corrected, region = measured.corrected, measured.region
    usable = (
        np.isfinite(corrected.surface_k) & (corrected.labels == region.label) & ~corrected.ignored
    )
    mask = np.zeros(corrected.labels.shape, bool)
    x0, y0, x1, y1 = region.bbox_px
    mask[y0:y1, x0:x1] = region.mask
    sign = 1.0 if region.sense == "hot" else -1.0
    shape = None if region.whole_zone else describe(corrected.surface_k, usable, mask, sign)
    if shape is None:
        return None
    pattern = pattern_of(shape)
    ranked = sorted(pattern.scores, key=lambda name: -pattern.scores[name])
    if pattern.name is None:
        statement = (
            "The shape does not tell the cause: its marks do not separate the patterns "
            f"({ranked[0]} {pattern.scores[ranked[0]]:.2f}, "
            f"{ranked[1]} {pattern.scores[ranked[1]]:.2f})."
        )
    else:
        statement = (
            f"The shape resembles {_MEANING[pattern.name]}, with a score of "
            f"{pattern.scores[pattern.name]:.2f}; next is {ranked[1]} with "
            f"{pattern.scores[ranked[1]]:.2f}. A suggestion from the shape alone, to be confirmed."
        )
    found = [cautions.shape_no_proof()]
    if region.cut_by_frame:
        found.append(cautions.shape_cut())
    return Assessment(
        kind="pattern",
        title="Likely pattern",
        statement=statement,
        figures=_figures(shape),
        cautions=tuple(found),
        source=SOURCE,
    )


def _figures(shape: Shape) -> tuple[Figure, ...]:
    def figure(label: str, value: float, note: str, unit: str = "") -> Figure:
        return Figure(label, round(value, 3), None, unit, note)

    return (
        figure("elongation", shape.elongation, "longer over shorter side"),
        figure("rectangularity", shape.rectangularity, "1 rectangle, 0.79 ellipse"),
        figure("straight share of the outline", shape.straight_share, "1 polygon of few sides"),
        figure("solidity", shape.solidity, "1 convex"),
        figure("raggedness", shape.raggedness, "outline over that of its hull"),
        figure("edge width over breadth", shape.edge_width, "small: well defined"),
        figure("edge width", shape.edge_width_px, "height over gradient", "px"),
        figure("unevenness of the edge", shape.unevenness, "large: sharp here, fading there"),
        figure("variation inside", shape.variation, "share of the height"),
        figure("trend along the axis", shape.trend, "share of the height; large: a streak or fan"),
        figure("place of the peak", shape.one_sided, "0 middle, 1 end of the axis"),
        figure("mottling", shape.mottling, "share of the height, about a smooth course"),
        figure("lines running out", float(shape.lines), "straight structures that meet here"),
    )


def _ramp(value: float, none: float, full: float) -> float:
    return min(1.0, max(0.0, (value - none) / (full - none)))
