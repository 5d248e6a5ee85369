"""Correct: from readings to surface temperatures and their uncertainty, pixel by pixel."""

from thermo_fix.correct.frame import correct_frame
from thermo_fix.correct.inputs import radiation_models
from thermo_fix.correct.readout import planes_of
from thermo_fix.correct.reference_zone import foil_reading, zone_reading

__all__ = ["correct_frame", "foil_reading", "planes_of", "radiation_models", "zone_reading"]
