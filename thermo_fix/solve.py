"""Find an input of the measurement from a reference in the images: the ``solve`` command's body.

Joins the sheet, an image and its zones with the procedures of ``radiometry.reference``. Like a
run, it corrects nothing that it was not told.
"""

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace
from functools import partial
from pathlib import Path

from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.correct import foil_reading, radiation_models, zone_reading
from thermo_fix.defaults import default_for, default_value
from thermo_fix.errors import DomainError, SheetError
from thermo_fix.radiometry.blackbody import RadiationModel, Real, TotalModel, band_model
from thermo_fix.radiometry.path import IDENTITY_PATH, OpticalPath, air_step
from thermo_fix.radiometry.reference import (
    LEAST_SEPARATION_K,
    PREFERRED_SEPARATION_K,
    emissivity_of,
    emitted_exitance,
    leaving_exitance,
    normal_emissivity,
    transmittance_of,
)
from thermo_fix.read.response import read_response
from thermo_fix.records import CorrectedFrame, ImageJob, ModelName, Survey
from thermo_fix.sheet.edit import put_key
from thermo_fix.sheet.problems import nearest
from thermo_fix.survey import open_survey
from thermo_fix.uncertainty.equation import (
    AIR_FORMULA,
    CALIBRATION,
    MODEL,
    NONUNIFORMITY,
    MeasurementEquation,
)
from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.numeric import estimate_of
from thermo_fix.uncertainty.variables import DRAWS, SEED, Variable, uniform_draws
from thermo_fix.work import correct_image

CONTACT_U_K = 1.0
"""Standard uncertainty of a contact reading where none is given, K (a hand-held probe on a solid
surface; common practice, no source)."""
SAME_U_K = 0.5
"""Standard uncertainty of the difference between patch and target, or between two views of one
steady target, K (judged: tape insulates a little, and a load is never quite steady)."""

_CONTACT = "contact thermometer"
_SAME = "difference between patch and target"
_STEADY = "change of the target between the two views"
_REST = "the rest"

_E1862 = "ASTM E1862, reflector method: mean of crumpled foil at emissivity 1, distance 0"
_E1933_PATCH = "ASTM E1933, non-contact: a reference patch of known emissivity"
_E1933_CONTACT = "ASTM E1933, contact thermometer"
_E1897 = "ASTM E1897, one target seen through the window and directly"


@dataclass(frozen=True, slots=True)
class Place:
    """Where in the sheet a value belongs."""

    file: str
    zone: str | None


@dataclass(frozen=True)
class Solved:
    """An input found from a reference."""

    name: str
    """In words: ``emissivity``."""
    of: str
    """Of what, in words."""
    key: str
    """Key of the sheet; with a dot for a nested one."""
    value: float
    u: float
    """Standard uncertainty (k = 1), same unit."""
    interval: tuple[float, float]
    """95 %."""
    unit: str
    """Empty for a fraction."""
    procedure: str
    inputs: tuple[str, ...]
    """What it was found from, one line each."""
    parts: Mapping[str, float]
    """Contributions to u by what they come from, largest first; not negative."""
    cautions: tuple[str, ...] = ()
    place: Place | None = None
    companions: Mapping[str, str] = field(default_factory=dict)
    """Other keys of the same inline table, as TOML text: those of a window."""

    @property
    def digits(self) -> int:
        """Decimals that show two figures of the standard uncertainty."""
        return 3 if self.u == 0.0 else min(6, max(1, 1 - math.floor(math.log10(self.u))))

    @property
    def quantity(self) -> str:
        """The value as the sheet takes it: ``{ value = 0.21, u = 0.02 }``."""
        least = 10.0**-self.digits
        value, u = max(self.value, least) if not self.unit else self.value, max(self.u, least)
        return f"{{ value = {value:.{self.digits}f}, u = {u:.{self.digits}f} }}"

    @property
    def sheet_line(self) -> str:
        """The line to paste into the sheet."""
        outer, _, inner = self.key.partition(".")
        if not inner:
            return f"{self.key} = {self.quantity}"
        inside = {inner: self.quantity, **self.companions}
        return f"{outer} = {{ {', '.join(f'{key} = {text}' for key, text in inside.items())} }}"


@dataclass(frozen=True)
class View:
    """One reading and the equation that holds for it."""

    name: str
    """Names the errors that it shares with no other."""
    reading_k: float
    equation: MeasurementEquation
    independent: Mapping[str, float] = field(default_factory=dict)
    """Standard uncertainties of the reading by variable name, K."""

    def variables(self, *, leave_out: tuple[str, ...] = ()) -> dict[str, Variable]:
        """Return all variables of the reading and of its path, by name."""
        equation = self.equation
        # Scaled to half-width or standard uncertainty 1, because the size goes with the reading
        # and the path, and the error is one and the same in every view.
        found = {CALIBRATION: Variable(CALIBRATION, 0.0, 1.0 / math.sqrt(3.0), "rectangular")}
        if equation.uses_air_formula:
            found[AIR_FORMULA] = Variable(AIR_FORMULA, 0.0, 1.0)
        found |= {name: Variable(name, 0.0, u) for name, u in self.independent.items()}
        for key, each in equation.variables.items():
            if key not in leave_out:
                found[each.name] = each
        return found

    def reading(self, values: Mapping[str, Real]) -> Real:
        """Reading with its errors, K."""
        half_width = self.equation.calibration_half_width_k(self.reading_k)
        total = self.reading_k + half_width * values[CALIBRATION]
        for name in self.independent:
            total = total + values[name]
        return total

    def path(self, values: Mapping[str, Real]) -> OpticalPath:
        """Path with its errors."""
        equation = self.equation
        by_key = {
            key: values[each.name]
            for key, each in equation.variables.items()
            if each.name in values
        }
        if equation.uses_air_formula:
            by_key["air_formula"] = equation.air_formula_u * values[AIR_FORMULA]
        # The emissivity of a target is sought: where the sheet has a plane of it, any will do.
        return equation.path(by_key, emissivity=1.0)

    def leaving(self, values: Mapping[str, Real], path: OpticalPath, model: RadiationModel) -> Real:
        """Exitance that leaves the surface, W m-2."""
        return leaving_exitance(self.reading(values), path, self.equation.recorded, model)


# ---------------------------------------------------------------- from a survey folder


def solve_reflected(folder: Path, file: str | None, zone: str | None) -> Solved:
    """Reflected apparent temperature from a zone of crumpled foil.

    Parameters
    ----------
    folder
        The survey.
    file
        Image; None for the only one.
    zone
        Foil zone; None for the only one of role ``foil``.

    Raises
    ------
    SheetError, FolderError, ImageError
        No such image or zone; the image cannot be used.

    """
    opened = _Opened(folder)
    job = opened.job(file)
    name = zone or _only_role(job, "foil")
    label = _label(job, name)
    corrected = opened.corrected(job)
    foil = foil_reading(
        corrected.reading_k,
        corrected.labels == label,
        name,
        job.file,
        opened.survey.camera,
        corrected.equations[0].model,
    )
    half = 1.96 * foil.u_k
    return Solved(
        name="reflected apparent temperature",
        of=f"{job.file}, from its foil zone {name!r}",
        key="reflected_c",
        value=foil.temperature_c,
        u=foil.u_k,
        interval=(foil.temperature_c - half, foil.temperature_c + half),
        unit="degC",
        procedure=_E1862,
        inputs=(f"{foil.pixels} inner pixels of zone {name!r}",),
        parts=_largest_first(foil.parts_k),
        place=Place(job.file, None),
    )


def solve_emissivity(
    folder: Path,
    file: str | None,
    zone: str | None,
    *,
    reference: str | None = None,
    contact_c: float | None = None,
    contact_u: float = CONTACT_U_K,
    same_u: float = SAME_U_K,
) -> Solved:
    """Emissivity of a zone from a patch beside it or from a contact reading.

    Parameters
    ----------
    folder
        The survey.
    file
        Image; None for the only one.
    zone
        Target; None for what lies outside all zones.
    reference
        Zone of known emissivity; None for the only one of role ``tape``, unless a contact reading
        is given.
    contact_c, contact_u
        Contact reading of the target, degC, and its standard uncertainty, K.
    same_u
        Standard uncertainty of the difference between patch and target, K.

    Raises
    ------
    DomainError
        Target too close to the reflected temperature, or an answer outside 0 to 1.
    SheetError, FolderError, ImageError
        No such image or zone; the image cannot be used.

    """
    if reference is not None and contact_c is not None:
        raise DomainError("give --reference or --contact-c, not both")
    opened = _Opened(folder)
    job = opened.job(file)
    label = 0 if zone is None else _label(job, zone)
    patch_label = None
    if contact_c is None:
        patch_label = _label(job, reference or _only_role(job, "tape"))
        if patch_label == label:
            raise DomainError(f"{job.file}: target and reference are the same zone")
    corrected = opened.corrected(job)
    target = _view(corrected, label)
    patch = None if patch_label is None else _view(corrected, patch_label)
    if patch is not None:
        _check_patch(patch, target, corrected, patch_label or 0)
    solved = _emissivity(target, patch, contact_c, contact_u, same_u)
    angle = corrected.inputs[label].value("view_angle_deg")
    if angle:
        solved = _at_normal(solved, angle)
    return replace(solved, of=target.name, place=Place(job.file, zone))


def solve_transmittance(
    folder: Path,
    through: tuple[str, str],
    direct: tuple[str, str],
    *,
    window_c: float | None = None,
    window_u: float | None = None,
    same_u: float = SAME_U_K,
) -> Solved:
    """Transmittance of a window from one target seen through it and directly.

    Parameters
    ----------
    folder
        The survey.
    through, direct
        Image and zone of each view.
    window_c, window_u
        Temperature of the window, degC, and its standard uncertainty; else as the sheet states,
        else that of the air.
    same_u
        Standard uncertainty of the target's change between the views, K.

    Raises
    ------
    DomainError
        Target too close to the window's temperature, or an answer outside 0 to 1.
    SheetError, FolderError, ImageError
        No such image or zone; an image cannot be used.

    """
    opened = _Opened(folder)
    views, jobs = [], []
    for file, zone in (through, direct):
        job = opened.job(file)
        label = _label(job, zone)
        views.append(_view(opened.corrected(job), label))
        jobs.append(job)
    if views[0].name == views[1].name:
        raise DomainError("--through and --direct name the same zone")
    stated = _label(jobs[0], through[1])
    known = jobs[0].zones[stated - 1].inputs.values.get("window.transmittance")
    own = known is not None and known.scope.startswith("zone ")
    seen, companions = _with_window(views[0], window_c, window_u)
    solved = _transmittance(seen, views[1], same_u)
    return replace(
        solved,
        of=f"the window before {views[0].name}",
        place=Place(jobs[0].file, through[1] if own else None),
        companions=companions,
    )


def write_to_sheet(folder: Path, solved: Solved, *, force: bool = False) -> str:
    """Put a solved input into the sheet, at its image or zone.

    Parameters
    ----------
    folder
        The survey.
    solved
        From this folder.
    force
        Overwrite a key that is there.

    Returns
    -------
    str
        Where it was written.

    Raises
    ------
    SheetError, FolderError
        See :func:`thermo_fix.sheet.edit.put_key`.

    """
    if solved.place is None:
        raise DomainError("a value from numbers alone belongs to no image; paste the line yourself")
    file, zone = solved.place.file, solved.place.zone
    outer, _, inner = solved.key.partition(".")
    if inner and force:
        try:
            return put_key(folder, file, zone, solved.key, solved.quantity, force=True)
        except SheetError:
            pass  # The image has no such table of its own yet: it gets one, whole.
    text = solved.sheet_line.partition(" = ")[2]
    return put_key(folder, file, zone, outer, text, force=force)


# ---------------------------------------------------------------- from numbers


@dataclass(frozen=True)
class Bench:
    """What holds for readings that are given as numbers."""

    model: ModelName = "total"
    band_um: tuple[float, float] = (8.0, 14.0)
    accuracy_k: float = 2.0
    accuracy_fraction: float = 0.02
    reflected: tuple[float, float] = (20.0, 2.0)
    """Reflected apparent temperature, degC, and its standard uncertainty."""

    def view(self, name: str, reading_c: float, emissivity: tuple[float, float]) -> View:
        """Return a reading of an apparent temperature at no distance."""
        band = band_model(self.band_um)
        equation = MeasurementEquation(
            model=band if self.model == "band" else TotalModel(),
            recorded=IDENTITY_PATH,
            variables={
                "emissivity": Variable(
                    f"emissivity of the {name}", *emissivity, lower=1e-3, upper=1
                ),
                "reflected_c": Variable("reflected temperature", *self.reflected),
                "air_c": Variable("air", 20.0, 0.0),
                "transmittance": Variable("air transmittance", 1.0, 0.0),
            },
            accuracy_k=self.accuracy_k,
            accuracy_fraction=self.accuracy_fraction,
            alternative=None if self.model == "band" else band,
        )
        u = default_value("camera.nonuniformity_k")
        return View(name, reading_c + ZERO_CELSIUS_K, equation, {f"{NONUNIFORMITY} of {name}": u})


def emissivity_from_numbers(
    bench: Bench,
    reading_c: float,
    *,
    contact_c: float | None = None,
    contact_u: float = CONTACT_U_K,
    reference_reading_c: float | None = None,
    reference_emissivity: tuple[float, float] = (0.95, 0.02),
    same_u: float = SAME_U_K,
) -> Solved:
    """Emissivity from apparent temperatures alone; see :func:`solve_emissivity`."""
    if (contact_c is None) == (reference_reading_c is None):
        raise DomainError("give one of --contact-c and --reference-reading-c")
    for each in (reading_c, contact_c, reference_reading_c, bench.reflected[0]):
        _check_temperature(each)
    target = bench.view("target", reading_c, (1.0, 0.0))
    patch = None
    if reference_reading_c is not None:
        if not 0.0 < reference_emissivity[0] <= 1.0:
            raise DomainError("--reference-emissivity must be above 0 and at most 1")
        patch = bench.view("reference patch", reference_reading_c, reference_emissivity)
    solved = _emissivity(target, patch, contact_c, contact_u, same_u)
    return replace(solved, of="the target")


def transmittance_from_numbers(
    bench: Bench,
    through_c: float,
    direct_c: float,
    window: tuple[float, float],
    *,
    reflectance: tuple[float, float] = (0.0, 0.0),
    same_u: float = SAME_U_K,
) -> Solved:
    """Transmittance from apparent temperatures alone; the window mirrors its own temperature.

    ``window`` and ``reflectance`` are values (degC; 1) with standard uncertainties.
    """
    for each in (through_c, direct_c, window[0]):
        _check_temperature(each)
    view = bench.view("view through the window", through_c, (1.0, 0.0))
    variables = {
        **view.equation.variables,
        "window.transmittance": Variable("window transmittance", 1.0, 0.0),
        "window.reflectance": Variable("window reflectance", *reflectance, lower=0.0, upper=1.0),
        "window.temperature_c": Variable("window temperature", *window),
        "window.reflected_c": Variable("window temperature", *window),
    }
    through = replace(view, equation=replace(view.equation, variables=variables))
    direct = bench.view("direct view", direct_c, (1.0, 0.0))
    return replace(_transmittance(through, direct, same_u), of="the window")


# ---------------------------------------------------------------- the two solutions


def _emissivity(
    target: View, patch: View | None, contact_c: float | None, contact_u: float, same_u: float
) -> Solved:
    _check_spread(contact_u)
    _check_spread(same_u)
    variables = target.variables(leave_out=("emissivity", "view_angle_deg"))
    if patch is not None:
        variables |= patch.variables()
        variables[_SAME] = Variable(_SAME, 0.0, same_u)
    else:
        variables[_CONTACT] = Variable(_CONTACT, contact_c or 0.0, contact_u)

    def surface(values: Mapping[str, Real], model: RadiationModel) -> Real:
        if patch is None:
            return values[_CONTACT] + ZERO_CELSIUS_K
        path = patch.path(values)
        emitted = emitted_exitance(
            patch.leaving(values, path, model), path.emissivity, model.exitance(path.reflected_k)
        )
        return model.temperature(emitted) + values[_SAME]

    def function(values: Mapping[str, Real], model: RadiationModel) -> Real:
        path = target.path(values)
        return emissivity_of(
            target.leaving(values, path, model),
            model.exitance(surface(values, model)),
            model.exitance(path.reflected_k),
        )

    best: dict[str, Real] = {name: each.value for name, each in variables.items()}
    surface_c = float(surface(best, target.equation.model)) - ZERO_CELSIUS_K
    reflected_c = float(target.path(best).reflected_k) - ZERO_CELSIUS_K
    cautions = _separation(
        surface_c, reflected_c, "target", "the reflected apparent temperature", "emissivity"
    )
    estimate = _estimate(function, variables, target.equation)
    value, u = estimate.value, estimate.u
    if not 0.0 < value <= 1.0:
        raise DomainError(
            f"the emissivity comes out at {value:.3f} (standard uncertainty {u:.3f}), which is "
            "not above 0 and at most 1: readings, surface temperature and reflected apparent "
            "temperature contradict each other; check them"
        )
    _check_known("emissivity", value, u)
    how = "contact reading" if patch is None else f"{patch.name}, corrected"
    return Solved(
        name="emissivity",
        of="",
        key="emissivity",
        value=value,
        u=u,
        interval=_limited(estimate),
        unit="",
        procedure=_E1933_CONTACT if patch is None else _E1933_PATCH,
        inputs=(
            f"surface temperature {surface_c:.2f} degC ({how})",
            f"reflected apparent temperature {reflected_c:.2f} degC",
        ),
        parts=_largest_first(estimate.contributions),
        cautions=cautions,
    )


def _transmittance(through: View, direct: View, same_u: float) -> Solved:
    _check_spread(same_u)
    variables = {
        **direct.variables(leave_out=("emissivity", "reflected_c", "view_angle_deg")),
        **through.variables(
            leave_out=("emissivity", "reflected_c", "view_angle_deg", "window.transmittance")
        ),
        _STEADY: Variable(_STEADY, 0.0, same_u),
    }

    def function(values: Mapping[str, Real], model: RadiationModel) -> Real:
        near, far = through.path(values), direct.path(values)
        window = near.window
        if window is None:
            raise DomainError("the view through the window has no window in its inputs")
        left = direct.leaving(values, replace(far, window=None), model)
        left = model.exitance(model.temperature(left) + values[_STEADY])
        arriving = air_step(near.transmittance, model.exitance(near.air_k))(left)
        seen = leaving_exitance(
            through.reading(values), IDENTITY_PATH, through.equation.recorded, model
        )
        return transmittance_of(
            seen,
            arriving,
            model.exitance(window.temperature_k),
            _raw(values, through, "window.reflectance"),
            model.exitance(window.reflected_k),
        )

    best: dict[str, Real] = {name: each.value for name, each in variables.items()}
    model = through.equation.model
    left = direct.leaving(best, replace(direct.path(best), window=None), model)
    target_c = float(model.temperature(left)) - ZERO_CELSIUS_K
    own_c = through.equation.variables["window.temperature_c"].value
    cautions = _separation(
        target_c, own_c, "target", "the temperature of the window", "transmittance"
    )
    estimate = _estimate(function, variables, through.equation)
    value, u = estimate.value, estimate.u
    reflectance = through.equation.variables["window.reflectance"].value
    if not 0.0 < value <= 1.0 or value + reflectance > 1.0:
        raise DomainError(
            f"the transmittance comes out at {value:.3f} (standard uncertainty {u:.3f}), which "
            f"with a reflectance of {reflectance:g} is not above 0 and at most 1: the two views, "
            "or the temperature of the window, contradict each other; check them"
        )
    _check_known("transmittance", value, u)
    return Solved(
        name="transmittance",
        of="",
        key="window.transmittance",
        value=value,
        u=u,
        interval=_limited(estimate),
        unit="",
        procedure=_E1897,
        inputs=(
            f"target {target_c:.2f} degC apparent, seen directly",
            f"window at {own_c:.2f} degC, reflectance {reflectance:g}",
        ),
        parts=_largest_first(estimate.contributions),
        cautions=cautions,
    )


def _raw(values: Mapping[str, Real], view: View, key: str) -> Real:
    return values[view.equation.variables[key].name]


def _estimate(
    function: Callable[[Mapping[str, Real], RadiationModel], Real],
    variables: Mapping[str, Variable],
    equation: MeasurementEquation,
) -> Estimate:
    """Propagate, and add the radiation model's difference as a rectangular variable."""
    estimate = estimate_of(partial(_call, function, equation.model), variables)
    if equation.alternative is None:
        return estimate
    best: dict[str, Real] = {name: each.value for name, each in variables.items()}
    gap = float(function(best, equation.alternative)) - estimate.value
    return Estimate(
        estimate.value,
        {**estimate.contributions, MODEL: gap / math.sqrt(3.0)},
        estimate.draws + gap * (2.0 * uniform_draws(MODEL, DRAWS, SEED) - 1.0),
    )


def _call(
    function: Callable[[Mapping[str, Real], RadiationModel], Real],
    model: RadiationModel,
    values: Mapping[str, Real],
) -> Real:
    return function(values, model)


def _separation(
    target_c: float, other_c: float, target: str, other: str, what: str
) -> tuple[str, ...]:
    apart = abs(target_c - other_c)
    if not apart >= LEAST_SEPARATION_K:
        raise DomainError(
            f"the {target} ({target_c:.1f} degC) lies within {LEAST_SEPARATION_K:g} K of {other} "
            f"({other_c:.1f} degC): its {what} cannot be told there; heat or cool the target "
            f"until they differ by {PREFERRED_SEPARATION_K:g} K"
        )
    if apart < PREFERRED_SEPARATION_K:
        return (
            f"The {target} lies only {apart:.1f} K from {other}; with "
            f"{PREFERRED_SEPARATION_K:g} K or more the {what} would be known better.",
        )
    return ()


def _check_known(what: str, value: float, u: float) -> None:
    if not u <= value:
        raise DomainError(
            f"the {what} comes out at {value:.3f} with a standard uncertainty of {u:.3f}, larger "
            "than itself: it is not known; make the difference in temperature larger"
        )


def _check_spread(u: float) -> None:
    if not (u >= 0.0 and math.isfinite(u)):
        raise DomainError(f"a standard uncertainty must be zero or more, not {u:g}")


def _check_temperature(value: float | None) -> None:
    if value is not None and not (math.isfinite(value) and value > -ZERO_CELSIUS_K):
        raise DomainError(f"{value:g} is no temperature in degC")


def _limited(estimate: Estimate) -> tuple[float, float]:
    low, high = estimate.interval()
    return max(low, 0.0), min(high, 1.0)


def _largest_first(parts: Mapping[str, float]) -> dict[str, float]:
    sizes = {name: abs(part) for name, part in parts.items()}
    return dict(sorted(sizes.items(), key=lambda item: (-item[1], item[0])))


def _at_normal(solved: Solved, angle_deg: float) -> Solved:
    """Refer an emissivity to the normal, which is what the sheet states."""
    normal = normal_emissivity(solved.value, angle_deg)
    if normal == solved.value:
        return solved
    scale = normal / solved.value
    low, high = solved.interval
    return replace(
        solved,
        value=normal,
        u=solved.u * scale,
        interval=(low * scale, min(high * scale, 1.0)),
        inputs=(
            *solved.inputs,
            f"referred to the normal; {solved.value:.3f} at {angle_deg:g} degrees",
        ),
        parts={name: part * scale for name, part in solved.parts.items()},
    )


# ---------------------------------------------------------------- sheet, images and zones


class _Opened:
    """A survey, whose images are corrected once each."""

    def __init__(self, folder: Path) -> None:
        self.survey: Survey = open_survey(folder)
        file = self.survey.camera.response_file
        self._response = None if file is None else read_response(file)
        radiation_models(self.survey.model, self.survey.camera, self._response)
        self._done: dict[str, CorrectedFrame] = {}

    def job(self, file: str | None) -> ImageJob:
        jobs = {job.file: job for job in self.survey.images}
        if file is None:
            if len(jobs) == 1:
                return next(iter(jobs.values()))
            raise SheetError(f"the survey has {len(jobs)} images; say which one with --image")
        if file not in jobs:
            near = nearest(file, tuple(jobs))
            raise SheetError(f'the survey has no image "{file}"; nearest: "{near}"')
        return jobs[file]

    def corrected(self, job: ImageJob) -> CorrectedFrame:
        if job.file not in self._done:
            self._done[job.file], _ = correct_image(job, self.survey, self._response)
        return self._done[job.file]


def _label(job: ImageJob, zone: str) -> int:
    names = [each.name for each in job.zones]
    if zone in names:
        return names.index(zone) + 1
    if not names:
        raise SheetError(f"{job.file}: has no zones; draw zone {zone!r} in survey.toml")
    raise SheetError(f'{job.file}: has no zone "{zone}"; nearest: "{nearest(zone, tuple(names))}"')


def _only_role(job: ImageJob, role: str) -> str:
    names = [zone.name for zone in job.zones if zone.role == role]
    if len(names) == 1:
        return names[0]
    option = "--zone" if role == "foil" else "--reference"
    found = "no zone" if not names else f"{len(names)} zones"
    raise SheetError(f'{job.file}: has {found} of role "{role}"; say which zone with {option}')


def _view(corrected: CorrectedFrame, label: int) -> View:
    job = corrected.job
    equation = corrected.equations[label]
    name = f"zone {job.zones[label - 1].name} of {job.file}" if label else f"{_REST} of {job.file}"
    if equation.reflected_is_plane:
        raise SheetError(
            f"{job.file}: its reflected_c stands in a file; state one value to solve with"
        )
    measured = zone_reading(
        corrected.reading_k, corrected.labels == label, equation.model, what=name
    )
    return View(
        name,
        measured.reading_k,
        equation,
        {
            f"spread in {name}": measured.u_spread_k,
            f"{NONUNIFORMITY} of {name}": equation.nonuniformity_k,
        },
    )


def _check_patch(patch: View, target: View, corrected: CorrectedFrame, label: int) -> None:
    zone = corrected.job.zones[label - 1]
    known = corrected.inputs[label].values["emissivity"]
    own = patch.equation.variables["emissivity"].name
    if patch.equation.emissivity_is_plane:
        raise SheetError(f"{patch.name}: state one emissivity for the reference patch")
    if known.origin == "assumed" or own == target.equation.variables["emissivity"].name:
        hint = ' such as { surface = "electrical tape, vinyl" }' if zone.role == "tape" else ""
        raise SheetError(
            f"{patch.name}: states no emissivity of its own, so it is no reference; add one{hint}"
        )


def _with_window(
    view: View, window_c: float | None, window_u: float | None
) -> tuple[View, dict[str, str]]:
    """Complete the window of a view, and return what the sheet needs to state of it."""
    variables = dict(view.equation.variables)
    air = variables["air_c"]
    companions = {}
    key = "window.temperature_c"
    if window_c is not None:
        _check_temperature(window_c)
        u = default_for(key).u_for(window_c) if window_u is None else window_u
        _check_spread(u)
        variables[key] = Variable("window temperature", window_c, u)
        companions["temperature_c"] = f"{{ value = {window_c:g}, u = {u:g} }}"
    elif key not in variables:
        variables[key] = Variable(
            "window temperature, as the air", air.value, default_for(key).u or 3.0
        )
    for key in ("window.reflectance", "window.reflected_c"):
        if key not in variables:
            entry = default_for(key)
            lower, upper = (0.0, 1.0) if key == "window.reflectance" else (-math.inf, math.inf)
            variables[key] = Variable(
                key, default_value(key), entry.u or 0.0, lower=lower, upper=upper
            )
    variables.setdefault("window.transmittance", Variable("window.transmittance", 1.0, 0.0))
    for key in ("window.reflectance", "window.temperature_c", "window.reflected_c"):
        short = key.partition(".")[2]
        each = variables[key]
        if (
            key in view.equation.variables
            and "default" not in each.name
            and short not in companions
        ):
            companions[short] = f"{{ value = {each.value:g}, u = {each.u:g} }}"
    return replace(view, equation=replace(view.equation, variables=variables)), companions
