"""Grade a finding by criteria, as a probability (JCGM 106).

The draws of the quantity are classed one by one; the share in a class is its probability. The
most probable grade is printed, with the chance of a higher one and the input that would settle
it. Unrounded values are compared.
"""

import math
from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from thermo_fix.criteria import Criterion
from thermo_fix.records import (
    GRADES,
    Finding,
    Grade,
    Grading,
    MeasuredRegion,
    VariableWords,
)
from thermo_fix.uncertainty.equation import RECTANGULAR
from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.variables import SEED, Shape, standard_deviates

NO_GRADE = "none"
UNKNOWN = "a known uncertainty"
"""What a quantity lacks of which most draws have no solution."""
_DOUBT_WORTH_SETTLING = 0.02
_GAIN_WORTH_NAMING = 0.01
"""A smaller change of a chance lies within the scatter of the draws."""
_QUANTITY_WORDS = {
    "like_difference": "difference to the like component",
    "rise_over_air": "rise over the air",
    "difference": "difference to the reference",
    "surface_c": "surface temperature",
    "surface_factor": "temperature factor fRsi",
    "dew_point_margin": "surface temperature above the dew point",
    "surface_humidity": "relative humidity at the surface",
}


def grade_finding(
    measured: MeasuredRegion,
    criteria: Sequence[Criterion],
    settings: Mapping[str, float],
) -> Finding:
    """Apply every criterion that concerns a finding.

    Parameters
    ----------
    measured
        The finding and its quantities.
    criteria
        In the order of the sheet.
    settings
        Numbers of the sheet's [criteria.settings].

    Returns
    -------
    Finding
        With all gradings; its own grade is the worst of their most probable ones.

    """
    settings = {**settings, **measured.settings}
    concerned = [criterion for criterion in criteria if _concerns(criterion, measured)]
    gradings = tuple(
        _grading(measured, criterion, settings, measured.quantities) for criterion in concerned
    )
    others = tuple(
        replace(_grading(measured, criterion, settings, quantities), scenario=scenario)
        for scenario, quantities in measured.scenarios.items()
        for criterion in concerned
        # What a criterion lacks is said once, with the grading as measured.
        if criterion.quantity in quantities and not criterion.values_of_settings(settings)[1]
    )
    graded = [each for each in gradings if each.grade is not None]
    gradings += others
    if not graded:
        return replace(measured.finding, gradings=gradings)
    head = max(
        graded,
        key=lambda each: (
            GRADES.index(each.grade) if each.grade else -1,
            each.chances.get(each.grade or NO_GRADE, 0.0),
        ),
    )
    assert head.grade is not None  # of a graded one
    return replace(
        measured.finding,
        gradings=gradings,
        grade=head.grade,
        grade_probability=head.chances[head.grade],
        worse_probability=worse_probability(head.grade, head.chances),
        criterion=head.criterion,
        settle=head.settle,
    )


def worse_probability(grade: Grade | None, chances: Mapping[str, float]) -> float:
    """Chance of a grade above the given one (None: no deficiency)."""
    above = GRADES if grade is None else GRADES[GRADES.index(grade) + 1 :]
    return sum(chances.get(each, 0.0) for each in above)


def _concerns(criterion: Criterion, measured: MeasuredRegion) -> bool:
    if measured.finding.sense not in criterion.senses:
        return False
    return not (criterion.side == "inside" and measured.inside is False)


def _grading(
    measured: MeasuredRegion,
    criterion: Criterion,
    settings: Mapping[str, float],
    quantities: Mapping[str, Estimate],
) -> Grading:
    values, unset = criterion.values_of_settings(settings)
    estimate = quantities.get(criterion.quantity)
    lacking = [f"criteria.settings.{name}" for name in unset]
    if estimate is None:
        lacking += measured.missing.get(criterion.quantity, ())
    if criterion.side == "inside" and measured.inside is None:
        lacking += [key for key in measured.missing.get("side", ("side",)) if key not in lacking]
    if estimate is not None and math.isnan(estimate.u):
        # A grade is a probability, and there is none: neither "act" nor "no deficiency".
        lacking.append(UNKNOWN)
    words = _QUANTITY_WORDS[criterion.quantity]
    if criterion.quantity in ("difference", "like_difference"):
        words = f"difference to {measured.finding.reference_name}"
    if estimate is None or lacking:
        return Grading(
            criterion=criterion.id,
            title=criterion.title,
            quantity=words,
            value=None,
            u=None,
            unit=criterion.unit,
            grade=None,
            missing=tuple(lacking),
        )
    class_of_value = int(criterion.classify(np.array([estimate.value]), values)[0])
    chances = _chances(criterion, estimate.draws, values)
    grade = _most_probable(chances)
    # The class that is quoted is that of the value, unless another grade is more probable.
    shown = class_of_value
    if _grade_of(criterion, shown) != grade:
        shown = _class_with_grade(criterion, grade)
    note = ""
    if _grade_of(criterion, class_of_value) != grade:
        note = (
            "The best estimate lies in another class than the most probable grade, because the "
            "uncertainty is not symmetric about it."
        )
    u = estimate.u
    return Grading(
        criterion=criterion.id,
        title=criterion.title,
        quantity=words,
        value=estimate.value,
        u=u if np.isfinite(u) else None,
        unit=criterion.unit,
        grade=grade,
        class_label="" if shown < 0 else criterion.classes[shown].label,
        class_text="" if shown < 0 else criterion.classes[shown].text,
        chances=chances,
        settle=_settle(criterion, estimate, values, chances, measured.variables),
        note=note,
    )


def _chances(
    criterion: Criterion, draws: NDArray[np.float64], settings: Mapping[str, float]
) -> dict[str, float]:
    """Probability of each grade; draws without a solution, fewer than half, are left out."""
    finite = draws[np.isfinite(draws)]
    classes = criterion.classify(finite, settings)
    shares = np.bincount(classes + 1, minlength=len(criterion.classes) + 1) / len(finite)
    chances: dict[str, float] = {NO_GRADE: float(shares[0])}
    for each, share in zip(criterion.classes, shares[1:], strict=True):
        chances[each.grade] = chances.get(each.grade, 0.0) + float(share)
    return chances


def _most_probable(chances: Mapping[str, float]) -> Grade | None:
    """Return the most probable grade; of two equal ones the worse."""
    best: Grade | None = None
    chance = chances.get(NO_GRADE, 0.0)
    for grade in GRADES:
        if chances.get(grade, 0.0) >= chance and grade in chances:
            best, chance = grade, chances[grade]
    return best


def _grade_of(criterion: Criterion, index: int) -> Grade | None:
    return None if index < 0 else criterion.classes[index].grade


def _class_with_grade(criterion: Criterion, grade: Grade | None) -> int:
    for index, each in enumerate(criterion.classes):
        if each.grade == grade:
            return index
    return -1


def _settle(
    criterion: Criterion,
    estimate: Estimate,
    settings: Mapping[str, float],
    chances: Mapping[str, float],
    words: Mapping[str, VariableWords],
) -> str:
    """Name the one input whose uncertainty, if halved, lowers the doubt most.

    So near to a limit that halving tells nothing with the best estimate where it is, it is the
    input that moves the estimate most: knowing it better decides on which side it lies.
    """
    doubt = 1.0 - max(chances.values())
    if doubt < _DOUBT_WORTH_SETTLING:
        return ""
    best_name, best_doubt = "", doubt
    for name in estimate.contributions:
        # Standardised draws of the variable, from the same stream as the estimate's own.
        flat = name in RECTANGULAR or words[name].rectangular
        shape: Shape = "rectangular" if flat else "normal"
        deviates = standard_deviates(name, len(estimate.draws), SEED, shape)
        halved = _chances(criterion, estimate.halved(name, deviates), settings)
        left = 1.0 - max(halved.values())
        if left < best_doubt:
            best_name, best_doubt = name, left
    if doubt - best_doubt < _GAIN_WORTH_NAMING and estimate.contributions:
        parts = estimate.contributions
        best_name = max(parts, key=lambda name: abs(parts[name]))
    return words[best_name].remedy if best_name else ""
