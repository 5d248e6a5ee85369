"""The pixel values of the first page, decoded by tifffile and imagecodecs."""

import logging
import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from contextvars import ContextVar
from typing import Any

import numpy as np
from numpy.typing import NDArray
from tifffile import TiffPage

from thermo_fix.errors import ImageError, UnreadableImage
from thermo_fix.read.layout import Layout

_silent: ContextVar[bool] = ContextVar("thermo_fix_read_silent", default=False)


def _loud(_record: logging.LogRecord) -> bool:
    return not _silent.get()


# The TIFF library logs what it stumbles over; here that becomes one error or is of no account.
# The filter acts only in the context that sets the variable, so that another user of the library
# in the same process, or in another thread, loses nothing.
logging.getLogger("tifffile").addFilter(_loud)


@contextmanager
def untrusted() -> Iterator[None]:
    """Run library code on untrusted bytes: no log, no warning, no exception but ours."""
    token = _silent.set(True)
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            yield
    except ImageError:
        raise
    except MemoryError as error:
        raise UnreadableImage("too large for the memory of this computer") from error
    except Exception as error:
        # A wrong byte may surface as nearly anything in the library and its codecs: KeyError,
        # struct.error, zlib.error, ZeroDivisionError, AssertionError, the codecs' own.
        # Their words mean nothing to a user; they stay in the chain of causes.
        raise UnreadableImage(
            "damaged: its pixels cannot be decoded; copy it from the camera again"
        ) from error
    finally:
        _silent.reset(token)


def decode_values(page: TiffPage, layout: Layout) -> NDArray[Any]:
    """Return the pixel values, (rows, columns), C-contiguous, native byte order, writeable.

    Call inside ``untrusted``.
    """
    values = page.asarray(maxworkers=1)
    native = np.dtype(layout.sample_type)
    if values.shape != (layout.rows, layout.columns) or values.dtype.newbyteorder("=") != native:
        raise UnreadableImage("damaged: its pixels do not fit the size and type that it states")
    return np.require(values, dtype=native, requirements=["C", "W", "O"])
