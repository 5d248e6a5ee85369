"""What the electrical trade adds to findings and images: load, wind, limits, phases."""

from collections.abc import Sequence

from thermo_fix.measure.trade import Extras, Measured
from thermo_fix.records import Assessment, CorrectedFrame, MeasuredRegion


def finding_extras(measured: Measured) -> Extras:
    """Return what the trade adds to one finding."""
    return Extras()


def image_assessments(
    corrected: CorrectedFrame, regions: Sequence[MeasuredRegion]
) -> tuple[Assessment, ...]:
    """Return what the trade says of an image as a whole, or of groups of its zones."""
    return ()
