"""Correct: from readings to surface temperatures and their uncertainty, pixel by pixel."""

from thermo_fix.correct.frame import correct_frame
from thermo_fix.correct.inputs import radiation_models
from thermo_fix.correct.reference_zone import foil_temperature, zone_reading

__all__ = ["correct_frame", "foil_temperature", "radiation_models", "zone_reading"]
