"""Grade: apply criteria to measured findings, with probabilities."""

from thermo_fix.grade.conditions import conditions
from thermo_fix.grade.grading import grade_finding

__all__ = ["conditions", "grade_finding"]
