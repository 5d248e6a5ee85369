"""What a trade concludes from a finding or an image, in words and rounded numbers."""

import re
from collections.abc import Sequence
from typing import Final

from thermo_fix.records import Assessment, Figure
from thermo_fix.report.catalogue import Words
from thermo_fix.report.formatting import COVERAGE, Measured, Units, known, unit_sign
from thermo_fix.report.view import AssessmentView, FigureRow

_ENOUGH: Final = 100
"""Characters of a statement from which a card goes on to something else."""

_SENTENCE_END: Final = re.compile(r"(?<=[.!?])\s+(?=[A-Z])")


def assessment_views(
    assessments: Sequence[Assessment], words: Words, units: Units
) -> tuple[AssessmentView, ...]:
    """Assessments in the order of the results."""
    return tuple(
        AssessmentView(
            title=each.title,
            statement=each.statement,
            short=_beginning(each.statement),
            figures=tuple(
                FigureRow(figure.label, _value(figure, words, units), figure.note)
                for figure in each.figures
            ),
            cautions=each.cautions,
            source=each.source,
        )
        for each in assessments
    )


def _beginning(statement: str) -> str:
    """Whole sentences, as many as say something: a first short one is not enough."""
    taken = ""
    for sentence in _SENTENCE_END.split(statement):
        taken = f"{taken} {sentence}".strip()
        if len(taken) >= _ENOUGH:
            break
    return taken


def _value(figure: Figure, words: Words, units: Units) -> str:
    if figure.value is None or not known(figure.value):
        return words("common.not_known")
    return _measured(figure, figure.value, units).text


def _measured(figure: Figure, value: float, units: Units) -> Measured:
    u = figure.u
    temperature = units.temperature(value, u) if units.is_celsius(figure.unit) else None
    if temperature is not None:
        return temperature
    difference = units.difference(value, u, sign=False) if figure.unit == "K" else None
    if difference is not None:
        return difference
    spread = None if u is None or not known(u) or u <= 0.0 else COVERAGE * u
    sign = unit_sign(figure.unit)
    if spread is None:
        return Measured(units.shortest(value, 4), sign, None, sign)
    return units.measured(value, spread, sign)
