"""Gradings in words: one criterion applied to one finding."""

from collections.abc import Mapping
from typing import Final

from thermo_fix.records import GRADES, Finding, Grading
from thermo_fix.report.catalogue import Words
from thermo_fix.report.formatting import COVERAGE, Units, known, percent, unit_sign
from thermo_fix.report.view import Chance, GradeKey, GradingView

_NEGLIGIBLE_CHANCE: Final = 0.005


def grading_views(finding: Finding, words: Words, units: Units) -> tuple[GradingView, ...]:
    """Every criterion that was applied to a finding, in the order of the survey."""
    return tuple(_grading_view(grading, finding, words, units) for grading in finding.gradings)


def _grading_view(grading: Grading, finding: Finding, words: Words, units: Units) -> GradingView:
    grade: GradeKey = grading.grade or "ungraded"
    if grading.grade is None and not grading.missing:
        word = words("grading.no_deficiency")
    else:
        word = words.of("grade", grade)
    needs = None
    if grading.missing:
        listed = ", ".join(
            words("grading.input", name=words.of("input", key), key=key) for key in grading.missing
        )
        needs = words("grading.needs", list=listed)
    return GradingView(
        criterion=grading.criterion,
        title=grading.title,
        quantity=grading.quantity,
        value=_value(grading, units),
        grade=grade,
        grade_word=word,
        class_label=grading.class_label,
        class_text=grading.class_text,
        chances=_chances(grading.chances, words),
        needs=needs,
        settle=grading.settle,
        note=grading.note,
        scenario=grading.scenario,
        decides=(
            finding.grade is not None
            and not grading.scenario
            and grading.criterion == finding.criterion
            and grading.grade == finding.grade
        ),
    )


def _value(grading: Grading, units: Units) -> str | None:
    """The graded quantity in the criterion's own unit, and in degF as well if asked for."""
    if grading.value is None or not known(grading.value):
        return None
    u = None if grading.u is None else COVERAGE * grading.u
    celsius = units.is_celsius(grading.unit)
    sign = unit_sign(grading.unit)
    kelvin = grading.unit == "K"
    own = units.measured(
        grading.value,
        u,
        sign,
        uncertainty_unit="K" if celsius else sign,
        decimals=1 if celsius or kelvin else 3,
    )
    if not units.fahrenheit or not (celsius or kelvin):
        return own.text
    printed = (
        units.temperature(grading.value, grading.u)
        if celsius
        else units.difference(grading.value, grading.u, sign=False)
    )
    return own.text if printed is None else f"{printed.text} ({own.text})"


def _chances(chances: Mapping[str, float], words: Words) -> tuple[Chance, ...]:
    """Pieces of a bar, mildest first; chances below half a per cent are left out."""
    pieces: list[Chance] = []
    start = 0.0
    for key in ("none", *GRADES):
        chance = chances.get(key, 0.0)
        if chance < _NEGLIGIBLE_CHANCE:
            continue
        width = min(100.0 * chance, 100.0 - start)
        word = words("grading.none") if key == "none" else words.of("grade", key)
        pieces.append(Chance(key, word, start, width, percent(chance)))
        start += width
    return tuple(pieces)
