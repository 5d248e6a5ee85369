"""Measure: what a region's temperature and differences are, with their uncertainty."""

from thermo_fix.measure.findings import assess_image, measure_regions
from thermo_fix.measure.image import measure_image

__all__ = ["assess_image", "measure_image", "measure_regions"]
