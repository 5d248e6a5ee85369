"""Find: hot and cold regions against the smooth background of their own zone."""

from thermo_fix.find.regions import find_regions

__all__ = ["find_regions"]
