"""Correct: from readings to surface temperatures and their uncertainty, pixel by pixel."""

from thermo_fix.correct.frame import correct_frame
from thermo_fix.correct.inputs import radiation_models

__all__ = ["correct_frame", "radiation_models"]
