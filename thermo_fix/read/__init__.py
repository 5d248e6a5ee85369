"""First stage: from the files of a folder to readings.

``list_images`` finds the images, ``read_frame`` turns one file into a ``Frame`` and
``reading_k`` gives its readings in kelvins. Every file is untrusted: whatever its bytes are, the
only exceptions are those of ``thermo_fix.errors``.

``content`` bytes of a regular file; ``directory`` the chain of TIFF directories; ``layout`` what
the first page declares, checked before anything is decoded; ``decode`` the pixel values;
``metadata`` the open tags; ``encoding`` how values turn into temperature.
"""

from thermo_fix.read.encoding import reading_k
from thermo_fix.read.folder import list_images
from thermo_fix.read.frame import read_frame
from thermo_fix.read.limits import DEFAULT_LIMITS, ReadLimits

__all__ = ["DEFAULT_LIMITS", "ReadLimits", "list_images", "read_frame", "reading_k"]
