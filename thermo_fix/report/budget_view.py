"""Uncertainty budgets in words and rounded numbers."""

from collections.abc import Sequence

from thermo_fix.records import BudgetLine, Finding
from thermo_fix.report.catalogue import Words
from thermo_fix.report.drawing import shares
from thermo_fix.report.formatting import Units, percent, unit_sign, with_unit
from thermo_fix.report.view import BudgetRow, BudgetView


def budget_views(finding: Finding, words: Words, units: Units) -> tuple[BudgetView, ...]:
    """Budgets of the extreme and of the difference, as far as there are any."""
    views = (
        _budget_view(words("budget.of_extreme"), finding.budget, finding.u_extreme_k, words, units),
        _budget_view(
            words("budget.of_difference"), finding.delta_budget, finding.u_delta_k, words, units
        ),
    )
    return tuple(view for view in views if view is not None)


def _budget_view(
    of: str, lines: Sequence[BudgetLine], stated_k: float | None, words: Words, units: Units
) -> BudgetView | None:
    if not lines:
        return None
    ordered = sorted(lines, key=lambda line: (-line.contribution_k, line.input))
    variance = sum(line.contribution_k**2 for line in ordered)
    bars = shares([line.contribution_k for line in ordered])
    blank = words("common.none")
    rows = []
    for line, bar in zip(ordered, bars, strict=True):
        value, u = units.input_and_u(line.value, line.u, line.unit)
        rows.append(
            BudgetRow(
                input=line.input,
                value=value or blank,
                u=u or blank,
                sensitivity=_sensitivity(line, words, units),
                contribution=units.standard_uncertainty(line.contribution_k) or blank,
                bar=bar,
                share=percent(line.contribution_k**2 / variance) if variance else blank,
            )
        )
    total = variance**0.5 if stated_k is None else stated_k
    return BudgetView(of, tuple(rows), units.standard_uncertainty(total) or blank)


def _sensitivity(line: BudgetLine, words: Words, units: Units) -> str:
    """Change of the temperature for one unit of an input, or for 0.01 of a bare number."""
    sign = units.difference_sign
    if line.unit == "K" or units.is_celsius(line.unit):
        effect, per = line.sensitivity, with_unit("1", sign)
    elif unit_sign(line.unit):
        effect = units.from_kelvin_difference(line.sensitivity)
        per = with_unit("1", unit_sign(line.unit))
    else:
        effect, per = units.from_kelvin_difference(line.sensitivity) / 100.0, units.number("0.01")
    return words("budget.per", effect=with_unit(units.shortest(effect, 2), sign), unit=per)
