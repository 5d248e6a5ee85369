"""Coverage-guided fuzzing of the reader of images: ``python -m tests.fuzz.fuzz_tiff [options]``.

Needs ``pip install atheris``; options are those of libFuzzer, such as ``-max_total_time=300``.
Whatever the bytes, the reader gives a frame whose readings can be computed, or one line.
Inputs that break that are written to the working folder; they belong into ``tests/fuzz/found``.
"""

import os
import sys
import tempfile
from pathlib import Path
from typing import Any

import atheris

with atheris.instrument_imports(include=["tifffile", "thermo_fix.read"]):
    import tifffile

    from thermo_fix.read import ReadLimits, read_frame, reading_k
    from thermo_fix.read.moment import image_moment

from tests.hostile.bad_files import BAD_FILES
from thermo_fix.errors import ImageError
from thermo_fix.records import Camera

LIMITS = ReadLimits(max_file_bytes=10**6, max_pixels=10**6, max_pages=50)
FOLDER = Path(tempfile.mkdtemp())
FILE = FOLDER / "a.tif"


def one_input(data: bytes) -> None:
    FILE.write_bytes(data)
    image_moment(FILE, limits=LIMITS)
    try:
        frame = read_frame(FILE, Camera(pixel="celsius"), limits=LIMITS)
    except ImageError as error:
        line = str(error)
        if not (line.isprintable() and line.startswith("a.tif: ")):
            raise AssertionError(line) from error
        return
    assert reading_k(frame).shape == frame.shape
    assert all(note.isprintable() for note in frame.notes)


def seeds(folder: Path) -> None:
    import numpy as np

    for number, (content, _) in enumerate(BAD_FILES.values()):
        # Small ones are changed where it matters; long pixels would take all the changes.
        if len(content) < 2000:
            (folder / f"bad {number}").write_bytes(content)
    plane = np.linspace(10, 30, 12 * 9, dtype=np.float32).reshape(12, 9)
    options: list[dict[str, Any]] = [
        {"compression": "zlib", "predictor": True},
        {"compression": "lzw"},
        {"compression": "zstd"},
        {"compression": "packbits"},
        {"tile": (16, 16), "compression": "zlib"},
        {"bigtiff": True},
        {"byteorder": ">"},
        {"rowsperstrip": 3, "datetime": "2026:01:14 07:12:00"},
    ]
    for number, each in enumerate(options):
        tifffile.imwrite(folder / f"good {number}", plane, photometric="minisblack", **each)


def main() -> None:
    corpus = FOLDER / "corpus"
    corpus.mkdir()
    seeds(corpus)
    atheris.Setup([*sys.argv, "-rss_limit_mb=3000", "-timeout=20", str(corpus)], one_input)
    atheris.Fuzz()


if __name__ == "__main__":
    os.environ.setdefault("OMP_NUM_THREADS", "1")
    main()
