"""What a trade concludes from a finding or an image, in words and rounded numbers."""

from collections.abc import Sequence

from thermo_fix.records import Assessment, Figure
from thermo_fix.report.catalogue import Words
from thermo_fix.report.formatting import COVERAGE, Measured, Units, known, unit_sign
from thermo_fix.report.view import AssessmentView, FigureRow



def assessment_views(
    assessments: Sequence[Assessment], words: Words, units: Units
) -> tuple[AssessmentView, ...]:
    """Assessments in the order of the results."""
    return tuple(
        AssessmentView(
            title=each.title,
            statement=each.statement,
            figures=tuple(
                FigureRow(figure.label, _value(figure, words, units), figure.note)
                for figure in each.figures
            ),
            cautions=each.cautions,
            source=each.source,
        )
        for each in assessments
    )


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
