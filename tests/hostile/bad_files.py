"""Files that are no image, or not a whole one, each with what has to be said of it.

Made when they are needed, byte by byte, after TIFF revision 6.0 (Adobe, 1992). None takes
more than some kilobytes of the disk, whatever it claims.
"""

import os
import socket
import struct
import zlib
from collections.abc import Callable
from pathlib import Path

import imagecodecs
import numpy as np

ROWS, COLUMNS = 60, 80
Entries = dict[int, tuple[int, int, int]]
"""(type, count, value or offset) by tag."""

SHORT, LONG, RATIONAL, FLOAT, DOUBLE, LONG8 = 3, 4, 5, 11, 12, 16


def readings(rows: int = ROWS, columns: int = COLUMNS) -> bytes:
    level = 20.0 + np.random.default_rng(1).normal(0.0, 0.05, (rows, columns))
    return level.astype("<f4").tobytes()


def tags(size: int, rows: int = ROWS, columns: int = COLUMNS, **changed: int) -> Entries:
    """Tags of one strip of float32 at byte 8."""
    values = {
        "compression": 1,
        "photometric": 1,
        "bits": 32,
        "samples": 1,
        "format": 3,
        "offset": 8,
        "strip_rows": rows,
    } | changed
    return {
        256: (LONG, 1, columns),
        257: (LONG, 1, rows),
        258: (SHORT, 1, values["bits"]),
        259: (SHORT, 1, values["compression"]),
        262: (SHORT, 1, values["photometric"]),
        273: (LONG, 1, values["offset"]),
        277: (SHORT, 1, values["samples"]),
        278: (LONG, 1, values["strip_rows"]),
        279: (LONG, 1, size),
        339: (SHORT, 1, values["format"]),
    }


def tiff(entries: Entries, pixels: bytes, *, following: int = 0) -> bytes:
    """Header, pixels at byte 8, one directory."""
    pixels += b"\0" * (len(pixels) % 2)
    directory = struct.pack("<H", len(entries))
    for code, (kind, count, value) in sorted(entries.items()):
        directory += struct.pack("<HHI", code, kind, count)
        inline = kind == SHORT and count == 1
        directory += struct.pack("<HH", value, 0) if inline else struct.pack("<I", value)
    start = 8 + len(pixels)
    return (
        struct.pack("<2sHI", b"II", 42, start) + pixels + directory + struct.pack("<I", following)
    )


def big_tiff(entries: Entries, pixels: bytes, *, stated: int | None = None) -> bytes:
    """The same as BigTIFF; ``stated`` is the number of tags that it claims."""
    directory = struct.pack("<Q", len(entries) if stated is None else stated)
    for code, (kind, count, value) in sorted(entries.items()):
        directory += struct.pack("<HHQ", code, kind, count)
        directory += struct.pack("<HHI", value, 0, 0) if kind == SHORT else struct.pack("<Q", value)
    head = struct.pack("<2sHHHQ", b"II", 43, 8, 0, 16 + len(pixels))
    return head + pixels + directory + struct.pack("<Q", 0)


def packed(code: int, content: bytes, **changed: int) -> bytes:
    """One compressed strip."""
    return tiff(tags(len(content), compression=code, **changed), content)


PLAIN = readings()


def changed(code: int, entry: tuple[int, int, int] | None, pixels: bytes = PLAIN) -> bytes:
    """A good file with one tag replaced or taken away."""
    entries = tags(len(pixels))
    if entry is None:
        del entries[code]
    else:
        entries[code] = entry
    return tiff(entries, pixels)


def tiled(wide: int, high: int, offset: int = 8, size: int = len(PLAIN)) -> bytes:
    entries = tags(len(PLAIN))
    del entries[273], entries[278], entries[279]
    entries |= {
        322: (LONG, 1, wide),
        323: (LONG, 1, high),
        324: (LONG, 1, offset),
        325: (LONG, 1, size),
    }
    return tiff(entries, PLAIN)


def counts(values: list[int], kind: str = "<u2") -> bytes:
    pixels = np.resize(np.array(values), ROWS * COLUMNS).astype(kind).tobytes()
    return tiff(tags(len(pixels), bits=16, format=1 if "u" in kind else 2), pixels)


def floats(value: float) -> bytes:
    pixels = np.full((ROWS, COLUMNS), value, "<f4").tobytes()
    return tiff(tags(len(pixels)), pixels)


def with_directory_at(offset: int) -> bytes:
    return struct.pack("<2sHI", b"II", 42, offset) + PLAIN


GOOD = tiff(tags(len(PLAIN)), PLAIN)
SELF = 8 + len(PLAIN)
"""Offset of the directory of ``GOOD``."""
DEFLATED = zlib.compress(PLAIN)

BAD_FILES: dict[str, tuple[bytes, str]] = {
    # What is no TIFF.
    "empty": (b"", "an empty file"),
    "one byte": (b"I", "not a TIFF file"),
    "text": (b"not an image, and not a short text either", "not a TIFF file"),
    "zeros": (b"\0" * 5000, "not a TIFF file"),
    "jpeg": (b"\xff\xd8\xff\xe0\x00\x10JFIF\0" + b"\0" * 100, "not a TIFF file"),
    "png": (b"\x89PNG\r\n\x1a\n" + b"\0" * 100, "not a TIFF file"),
    "zip": (b"PK\x03\x04" + b"\0" * 100, "not a TIFF file"),
    "web page": (b"<script>alert(1)</script>", "not a TIFF file"),
    "mixed byte order": (b"IM*\0" + b"\0" * 100, "not a TIFF file"),
    "version 44": (struct.pack("<2sHI", b"II", 44, 8) + PLAIN, "not a TIFF file"),
    # Headers and directories.
    "header only": (b"II*\0", "beyond the end of the file"),
    "no page": (with_directory_at(0), "without any page"),
    "directory at the header": (with_directory_at(1), "states 10825 tags"),
    "directory beyond": (with_directory_at(2**32 - 2), "beyond the end of the file"),
    "cut in the directory": (GOOD[: SELF + 20], "beyond the end of the file"),
    "cut before the directory": (GOOD[:SELF], "beyond the end of the file"),
    "cut at half": (GOOD[: len(GOOD) // 2], "beyond the end of the file"),
    "no tag": (tiff({}, PLAIN), "a page without any tag"),
    "page follows itself": (tiff(tags(len(PLAIN)), PLAIN, following=SELF), "returns on itself"),
    "next page beyond": (tiff(tags(len(PLAIN)), PLAIN, following=2**31), "beyond the end"),
    "thousands of tags": (
        tiff(tags(len(PLAIN)) | dict.fromkeys(range(1000, 6000), (SHORT, 1, 0)), PLAIN),
        "more than the limit of 4096",
    ),
    "BigTIFF header": (struct.pack("<2sHHHQ", b"II", 43, 4, 0, 16) + PLAIN, "BigTIFF header"),
    "BigTIFF cut": (b"II+\0\x08\0\0\0", "beyond the end of the file"),
    "BigTIFF of endless tags": (
        big_tiff(tags(len(PLAIN), offset=16), PLAIN, stated=2**63),
        "states 9223372036854775808 tags",
    ),
    # Sizes.
    "no width": (changed(256, (LONG, 1, 0)), "no width or no height"),
    "no height": (changed(257, (LONG, 1, 0)), "no width or no height"),
    "absent width": (changed(256, None), "no width or no height"),
    "absurd size": (
        tiff(tags(len(PLAIN), 2**31, 2**31), PLAIN),
        "2147483648 x 2147483648 pixels",
    ),
    "one very long row": (tiff(tags(len(PLAIN), 1, 2**32 - 1), PLAIN), "4294967295 x 1 pixels"),
    "a little beyond the limit": (tiff(tags(len(PLAIN), 10_001, 10_000), PLAIN), "100000000"),
    "twice the height": (tiff(tags(len(PLAIN), 2 * ROWS), PLAIN), "is too short"),
    "width as a text": (changed(256, (2, 1, 80)), "tag 256"),
    "width as a fraction": (changed(256, (RATIONAL, 1, 8)), "damaged"),
    "width as a float": (changed(256, (FLOAT, 1, 0x42A00000)), "tag 256"),
    "width of no type": (changed(256, (99, 1, 80)), "tag 256"),
    "depth of 3": (changed(32997, (LONG, 1, 3)), "not a plane"),
    # Strips and tiles.
    "no offset": (changed(273, None), "1 strip needed, but it lists 0 offsets"),
    "no strip size": (changed(279, None), "1 strip needed"),
    "offset 0": (changed(273, (LONG, 1, 0)), "holds no data"),
    "offset beyond": (changed(273, (LONG, 1, 2**31)), "truncated: strip 1 of 1"),
    "strip size 0": (changed(279, (LONG, 1, 0)), "holds no data"),
    "strip size beyond": (changed(279, (LONG, 1, 2**32 - 1)), "truncated: strip 1 of 1"),
    "strip in the tags": (changed(273, (LONG, 1, 40)), "overlaps the tags"),
    "millions of strips": (changed(273, (LONG, 50_000_000, 8)), "lists 50000000 numbers"),
    "millions of rows of strips": (changed(278, (LONG, 1, 1)), "60 strips needed"),
    "no rows in a strip": (changed(278, (LONG, 1, 0)), "no rows per strip"),
    "no tile size": (tiled(0, 16), "no tile size"),
    "huge tiles": (tiled(2**31, 2**31), "more than the limit allows"),
    "too few tiles": (tiled(16, 16), "tiles needed"),
    "tile beyond": (tiled(80, 64, 2**31), "truncated: tile 1 of 1"),
    # Compression.
    "cut deflate": (packed(8, DEFLATED[:-200]), "cannot be decoded"),
    "wrong deflate": (packed(8, b"\xff" * 300), "cannot be decoded"),
    "short deflate": (packed(8, zlib.compress(PLAIN[:-400])), "cannot be decoded"),
    "long deflate": (packed(8, zlib.compress(PLAIN * 2)), "cannot be decoded"),
    "deflate bomb": (packed(8, zlib.compress(b"\0" * 2**24, 9)), "cannot be decoded"),
    "short LZW": (packed(5, bytes(imagecodecs.lzw_encode(PLAIN[:-400]))), "cannot be decoded"),
    "wrong LZW": (packed(5, b"\x12\x34" * 200), "cannot be decoded"),
    "short PackBits": (packed(32773, b"\xff" * 20), "cannot be decoded"),
    "cut Zstandard": (
        packed(50000, bytes(imagecodecs.zstd_encode(PLAIN))[:-50]),
        "cannot be decoded",
    ),
    "Zstandard of another size": (
        packed(50000, bytes(imagecodecs.zstd_encode(PLAIN * 2))),
        "cannot be decoded",
    ),
    "unknown compression": (packed(65000, PLAIN), "compression (code 65000) is not supported"),
    "LZMA": (packed(34925, b"\xfd7zXZ\0" + PLAIN), "compression (code 34925) is not supported"),
    "JPEG inside": (packed(7, PLAIN, bits=8, format=1), "not a measurement"),
    "WebP inside": (packed(50001, PLAIN), "not a measurement"),
    "predictor of another kind": (
        tiff(tags(len(PLAIN)) | {317: (SHORT, 1, 3)}, PLAIN),
        "predictor (code 3)",
    ),
    # Pictures for the eye.
    "RGB": (tiff(tags(len(PLAIN), photometric=2), PLAIN), "an RGB picture"),
    "palette": (tiff(tags(len(PLAIN), photometric=3), PLAIN), "colour palette"),
    "three samples": (tiff(tags(len(PLAIN), samples=3), PLAIN), "3 samples per pixel"),
    "8 bits": (tiff(tags(len(PLAIN), bits=8, format=1), PLAIN), "8 bits per pixel"),
    "1 bit": (tiff(tags(len(PLAIN), bits=1, format=1), PLAIN), "black-and-white"),
    "no bits": (tiff(tags(len(PLAIN), bits=0), PLAIN), "no bits per pixel"),
    "complex numbers": (tiff(tags(len(PLAIN), bits=64, format=6), PLAIN), "not supported"),
    "32-bit integers": (tiff(tags(len(PLAIN), format=2), PLAIN), "32-bit signed integers"),
    "16-bit floats": (tiff(tags(len(PLAIN), bits=16), PLAIN), "16-bit floating-point"),
    # Values.
    "only NaN": (floats(float("nan")), "no finite value"),
    "only infinity": (floats(float("inf")), "no finite value"),
    "only minus infinity": (floats(float("-inf")), "no finite value"),
    "below absolute zero": (floats(-1e30), "absolute zero"),
}
"""File by name, and a part of the line that is due."""


def _pipe(path: Path) -> None:
    os.mkfifo(path)


def _socket(path: Path) -> None:
    # The path of a socket must be short, so it is bound from its own folder.
    here = Path.cwd()
    os.chdir(path.parent)
    try:
        with socket.socket(socket.AF_UNIX) as end:
            end.bind(path.name)
    finally:
        os.chdir(here)


def _folder(path: Path) -> None:
    path.mkdir()
    (path / "inside.tif").write_bytes(GOOD)


def _dead_link(path: Path) -> None:
    path.symlink_to("nowhere.tif")


def _link_to_itself(path: Path) -> None:
    path.symlink_to(path.name)


def _link_outside(path: Path) -> None:
    outside = path.parent.parent / "outside.tif"
    outside.write_bytes(GOOD)
    path.symlink_to(outside)


def _link_to_a_device(path: Path) -> None:
    path.symlink_to("/dev/zero")


def _sparse(path: Path) -> None:
    with path.open("wb") as stream:
        stream.write(GOOD)
        stream.truncate(2**40)


BAD_ENTRIES: dict[str, tuple[Callable[[Path], None], str]] = {
    "pipe": (_pipe, "a pipe, not an image file"),
    "socket": (_socket, "a socket, not an image file"),
    "folder": (_folder, "a folder, not an image file"),
    "dead link": (_dead_link, "a link to a file that is not there"),
    "link to itself": (_link_to_itself, "cannot be read"),
    "link outside": (_link_outside, "a link leads out of the survey folder"),
    "link to a device": (_link_to_a_device, "a link leads out of the survey folder"),
    "terabyte": (_sparse, "larger than the limit of 2048 MiB"),
}
"""The same for what is no ordinary file."""


def write_bad_files(folder: Path) -> dict[str, str]:
    """Write them all; return what is due by file name."""
    due = {}
    for name, (content, says) in BAD_FILES.items():
        (folder / f"{name}.tif").write_bytes(content)
        due[f"{name}.tif"] = says
    for name, (make, says) in BAD_ENTRIES.items():
        make(folder / f"{name}.tif")
        due[f"{name}.tif"] = says
    return due
