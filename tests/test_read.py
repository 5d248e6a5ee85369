"""Reading of image files: every variant of the format, every kind of bad file.

Expected pixel values are those handed to the TIFF library; the values of a file that was put
together by hand here, byte by byte after TIFF revision 6.0, are checked too, and OpenCV's TIFF
library is the second reader where one is needed.
"""

import hashlib
import logging
import os
import socket
import struct
import warnings
import zlib
from collections.abc import Callable
from datetime import datetime
from pathlib import Path
from typing import Any

import cv2
import numpy as np
import pytest
import tifffile
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.errors import (
    FolderError,
    ImageError,
    NotAMeasurement,
    UnclearEncoding,
    UnreadableImage,
)
from thermo_fix.read import DEFAULT_LIMITS, ReadLimits, list_images, read_frame, reading_k
from thermo_fix.records import Camera, Frame

ROWS, COLUMNS = 37, 53
CELSIUS = Camera(pixel="celsius")
CENTIKELVIN = Camera(pixel="linear", scale=0.01, offset=0.0)


def scene_c(rows: int = ROWS, columns: int = COLUMNS) -> NDArray[np.float64]:
    """A smooth scene of 5 to 35 degC with some noise, so that compression has work to do."""
    y, x = np.mgrid[0:rows, 0:columns]
    noise = np.random.default_rng(7).normal(0.0, 0.1, (rows, columns))
    return np.asarray(20.0 + 15.0 * np.sin(x / 9.0) * np.cos(y / 7.0) + noise)


def as_type(scene: NDArray[np.float64], sample_type: str) -> NDArray[Any]:
    if sample_type.startswith("float"):
        return scene.astype(sample_type)
    if sample_type == "int16":
        return np.round(scene * 100.0).astype(np.int16)
    return np.round((scene + ZERO_CELSIUS_K) * 100.0).astype(np.uint16)


def write(path: Path, values: NDArray[Any], **options: Any) -> Path:
    options = {"photometric": "minisblack", "metadata": None, **options}
    tifffile.imwrite(path, values, **options)
    return path


def build(
    entries: dict[int, tuple[int, int, int]],
    pixels: bytes = b"",
    *,
    order: str = "<",
    next_directory: int = 0,
) -> bytes:
    """Put a classic TIFF together by hand: header, pixels at byte 8, one directory.

    ``entries`` maps a tag to (type, count, value or offset).
    """
    mark = b"II" if order == "<" else b"MM"
    padding = b"\0" * (len(pixels) % 2)
    start = 8 + len(pixels) + len(padding)
    directory = struct.pack(f"{order}H", len(entries))
    for code, (kind, count, value) in sorted(entries.items()):
        directory += struct.pack(f"{order}HHI", code, kind, count)
        inline = kind == 3 and count == 1
        directory += (
            struct.pack(f"{order}HH", value, 0) if inline else struct.pack(f"{order}I", value)
        )
    directory += struct.pack(f"{order}I", next_directory)
    return mark + struct.pack(f"{order}HI", 42, start) + pixels + padding + directory


def plain_entries(rows: int = 2, columns: int = 3, **changed: int) -> dict[int, Any]:
    """Tags of one uncompressed float32 strip at byte 8 (TIFF revision 6.0, section 8)."""
    values = {
        "width": columns,
        "length": rows,
        "bits": 32,
        "compression": 1,
        "photometric": 1,
        "offset": 8,
        "samples": 1,
        "rows_per_strip": rows,
        "bytes": rows * columns * 4,
        "format": 3,
        **changed,
    }
    long, short = 4, 3
    return {
        256: (long, 1, values["width"]),
        257: (long, 1, values["length"]),
        258: (short, 1, values["bits"]),
        259: (short, 1, values["compression"]),
        262: (short, 1, values["photometric"]),
        273: (long, 1, values["offset"]),
        277: (short, 1, values["samples"]),
        278: (long, 1, values["rows_per_strip"]),
        279: (long, 1, values["bytes"]),
        339: (short, 1, values["format"]),
    }


PLAIN = np.array([[18.5, 19.0, 19.5], [20.0, 20.5, 21.0]], dtype=np.float32)


@pytest.fixture
def image(tmp_path: Path) -> Callable[[bytes], Path]:
    def put(content: bytes) -> Path:
        path = tmp_path / "IR_0001.tif"
        path.write_bytes(content)
        return path

    return put


def assert_as_written(frame: Frame, values: NDArray[Any]) -> None:
    assert frame.values.dtype == values.dtype.newbyteorder("=")
    assert frame.values.dtype.isnative
    assert frame.values.flags.c_contiguous
    assert not frame.values.flags.writeable
    assert np.array_equal(frame.values, values, equal_nan=True)


class TestVariants:
    @pytest.mark.parametrize("big", [False, True], ids=["classic", "BigTIFF"])
    @pytest.mark.parametrize("order", ["<", ">"], ids=["little", "big"])
    @pytest.mark.parametrize("tile", [None, (16, 32)], ids=["strips", "tiles"])
    @pytest.mark.parametrize(
        ("compression", "predictor"),
        [
            (None, False),
            ("zlib", False),
            ("zlib", True),
            ("lzw", False),
            ("lzw", True),
            ("zstd", False),
            ("zstd", True),
            ("packbits", False),
        ],
    )
    @pytest.mark.parametrize("sample_type", ["float32", "float64", "uint16", "int16"])
    def test_reads_what_was_written(
        self,
        tmp_path: Path,
        sample_type: str,
        compression: str | None,
        predictor: bool,
        tile: tuple[int, int] | None,
        order: str,
        big: bool,
    ) -> None:
        values = as_type(scene_c(), sample_type)
        path = write(
            tmp_path / "a.tif",
            values,
            compression=compression,
            predictor=predictor or None,
            tile=tile,
            rowsperstrip=None if tile else 5,
            byteorder=order,
            bigtiff=big,
        )
        signed = Camera(pixel="linear", scale=0.01, offset=ZERO_CELSIUS_K)
        camera = {"uint16": CENTIKELVIN, "int16": signed}.get(sample_type, CELSIUS)
        frame = read_frame(path, camera)
        assert_as_written(frame, values)
        assert frame.shape == (ROWS, COLUMNS)
        assert frame.notes == ()
        assert frame.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()

    def test_reads_a_file_put_together_by_hand(self, image: Callable[[bytes], Path]) -> None:
        for order in "<>":
            pixels = PLAIN.astype(f"{order}f4").tobytes()
            frame = read_frame(image(build(plain_entries(), pixels, order=order)), CELSIUS)
            assert_as_written(frame, PLAIN)

    @pytest.mark.parametrize("sample_type", ["float32", "float64", "uint16"])
    def test_agrees_with_a_second_reader(self, tmp_path: Path, sample_type: str) -> None:
        values = as_type(scene_c(), sample_type)
        path = write(tmp_path / "a.tif", values, compression="lzw", predictor=True)
        second = cv2.imread(str(path), cv2.IMREAD_UNCHANGED)
        assert second is not None
        counts = Camera(pixel="linear", scale=0.01, offset=0.0)
        camera = counts if sample_type == "uint16" else CELSIUS
        assert np.array_equal(read_frame(path, camera).values, second)

    @pytest.mark.parametrize("order", ["<", ">"])
    @pytest.mark.parametrize("bits", [32, 64])
    def test_horizontal_differencing_of_floats(
        self, image: Callable[[bytes], Path], bits: int, order: str
    ) -> None:
        # TIFF revision 6.0, section 14, on the bits as integers, as the common TIFF library does.
        values = scene_c().astype(f"f{bits // 8}")
        whole = values.view(f"u{bits // 8}")
        differences = np.diff(whole, axis=1, prepend=whole[:, :1] * 0)
        stream = zlib.compress(differences.astype(f"{order}u{bits // 8}").tobytes())
        entries = plain_entries(ROWS, COLUMNS, compression=8, bits=bits, bytes=len(stream))
        entries[317] = (3, 1, 2)
        path = image(build(entries, stream, order=order))
        assert_as_written(read_frame(path, CELSIUS), values)
        second = cv2.imread(str(path), cv2.IMREAD_UNCHANGED)
        assert second is not None
        assert np.array_equal(second, values)

    def test_one_pixel(self, tmp_path: Path) -> None:
        values = np.array([[21.5]], dtype=np.float32)
        assert_as_written(read_frame(write(tmp_path / "a.tif", values), CELSIUS), values)

    def test_leading_axis_of_one_is_dropped(self, tmp_path: Path) -> None:
        values = as_type(scene_c(), "float32")
        path = tmp_path / "a.tif"
        tifffile.imwrite(path, values[np.newaxis], photometric="minisblack")
        assert_as_written(read_frame(path, CELSIUS), values)

    def test_first_page_of_many(self, tmp_path: Path) -> None:
        pages = np.stack([as_type(scene_c(), "float32") + shift for shift in (0.0, 5.0, 9.0)])
        frame = read_frame(write(tmp_path / "a.tif", pages), CELSIUS)
        assert_as_written(frame, pages[0])
        assert frame.notes == ("The file holds 3 pages; only the first is used.",)

    def test_orientation_is_told(self, tmp_path: Path) -> None:
        values = as_type(scene_c(), "float32")
        path = write(tmp_path / "a.tif", values, extratags=[(274, 3, 1, 6, True)])
        frame = read_frame(path, CELSIUS)
        assert_as_written(frame, values)
        assert "orientation 6" in frame.notes[0]

    def test_missing_data_are_kept_as_nan(self, tmp_path: Path) -> None:
        values = as_type(scene_c(), "float32")
        values[3, 4:9] = np.nan
        frame = read_frame(write(tmp_path / "a.tif", values), CELSIUS)
        assert_as_written(frame, values)

    def test_infinite_values_are_nan_and_counted(self, tmp_path: Path) -> None:
        values = as_type(scene_c(), "float32")
        values[0, 0], values[1, 1] = np.inf, -np.inf
        frame = read_frame(write(tmp_path / "a.tif", values), CELSIUS)
        assert np.isnan(frame.values[[0, 1], [0, 1]].astype(float)).all()
        assert frame.notes == ("2 pixels with an infinite value are left out.",)

    def test_link_to_a_file_is_followed(self, tmp_path: Path) -> None:
        values = as_type(scene_c(), "float32")
        write(tmp_path / "a.tif", values)
        (tmp_path / "b.tif").symlink_to("a.tif")
        assert_as_written(read_frame(tmp_path / "b.tif", CELSIUS), values)


class TestDates:
    def read(self, tmp_path: Path, *tags: tuple[Any, ...]) -> Frame:
        values = as_type(scene_c(), "float32")
        return read_frame(write(tmp_path / "a.tif", values, extratags=list(tags)), CELSIUS)

    def test_date_of_change(self, tmp_path: Path) -> None:
        frame = self.read(tmp_path, (306, 2, 20, "2026:01:14 07:12:00", True))
        assert frame.taken == datetime(2026, 1, 14, 7, 12)
        assert frame.carried_tags == ((306, 2, 20, "2026:01:14 07:12:00"),)

    def test_original_date_comes_first(self, tmp_path: Path) -> None:
        frame = self.read(
            tmp_path,
            (306, 2, 20, "2026:01:15 09:00:00", True),
            (36867, 2, 20, "2026:01:14 07:12:00", True),
        )
        assert frame.taken == datetime(2026, 1, 14, 7, 12)

    def test_date_in_the_exif_directory(self, image: Callable[[bytes], Path]) -> None:
        # Exif 2.32 (CIPA DC-008): tag 34665 points to a directory that holds tag 36867.
        text = b"2026:01:14 07:12:00\0"
        pixels = PLAIN.tobytes()
        exif = struct.pack("<HHHII", 1, 36867, 2, 20, 8 + len(pixels)) + b"\0\0\0\0"
        entries = plain_entries()
        entries[34665] = (4, 1, 8 + len(pixels) + len(text))
        frame = read_frame(image(build(entries, pixels + text + exif)), CELSIUS)
        assert_as_written(frame, PLAIN)
        assert frame.taken == datetime(2026, 1, 14, 7, 12)

    @pytest.mark.parametrize(
        "text", ["2026:13:14 07:12:00", "2026:02:30 07:12:00", "yesterday", "0000:01:01 00:00:00"]
    )
    def test_wrong_date_is_a_note(self, tmp_path: Path, text: str) -> None:
        frame = self.read(tmp_path, (306, 2, len(text) + 1, text, True))
        assert frame.taken is None
        assert len(frame.notes) == 1
        assert text in frame.notes[0]
        assert frame.carried_tags == ()

    def test_unknown_date_is_no_note(self, tmp_path: Path) -> None:
        # Exif 2.32: "all characters but colons may be blank" where the date is unknown.
        frame = self.read(tmp_path, (306, 2, 20, "    :  :     :  :  ", True))
        assert frame.taken is None
        assert frame.notes == ()


GEOREFERENCE = [
    (33550, 12, 3, (0.5, 0.5, 0.0)),
    (33922, 12, 6, (0.0, 0.0, 0.0, 431000.25, 6213000.5, 0.0)),
    (34735, 3, 8, (1, 1, 0, 1, 1024, 0, 1, 1)),
    (34736, 12, 1, (6378137.0,)),
    (34737, 2, 8, " a|two|"),
]


class TestGeoreference:
    @pytest.mark.parametrize("order", ["<", ">"])
    def test_is_carried(self, tmp_path: Path, order: str) -> None:
        path = write(
            tmp_path / "a.tif",
            as_type(scene_c(), "float32"),
            byteorder=order,
            extratags=[(*tag, True) for tag in GEOREFERENCE],
        )
        frame = read_frame(path, CELSIUS)
        assert frame.carried_tags == tuple(GEOREFERENCE)
        assert frame.notes == ()

    def test_of_a_wrong_type_is_a_note(self, tmp_path: Path) -> None:
        path = write(
            tmp_path / "a.tif",
            as_type(scene_c(), "float32"),
            extratags=[(33550, 3, 3, (1, 1, 0), True)],
        )
        frame = read_frame(path, CELSIUS)
        assert frame.carried_tags == ()
        assert "33550" in frame.notes[0]


def items(**found: object) -> str:
    """Metadata document of GDAL's GeoTIFF driver (its documentation, tag 42112)."""
    lines = "".join(
        f'<Item name="{role.upper()}" sample="0" role="{role}">{value}</Item>'
        for role, value in found.items()
    )
    return f"<GDALMetadata>{lines}</GDALMetadata>"


def with_metadata(
    path: Path, values: NDArray[Any], document: str | None = None, nodata: str | None = None
) -> Path:
    tags: list[tuple[int, int, int, str | bytes, bool]] = []
    if document is not None:
        tags.append((42112, 2, 0, document.encode(), True))
    if nodata is not None:
        tags.append((42113, 2, 0, nodata, True))
    return write(path, values, extratags=tags)


class TestMetadata:
    def test_scale_offset_and_unit(self, tmp_path: Path) -> None:
        counts = np.round((scene_c() + 40.0) / 0.005).astype(np.uint16)
        document = items(scale=0.005, offset=-40, unittype="degC")
        frame = read_frame(with_metadata(tmp_path / "a.tif", counts, document), Camera())
        assert frame.encoding.unit == "linear"
        assert frame.encoding.origin == "inferred"
        assert frame.encoding.scale == 0.005
        assert frame.encoding.offset == pytest.approx(ZERO_CELSIUS_K - 40.0)
        assert "metadata" in frame.encoding.note
        assert np.abs(reading_k(frame) - ZERO_CELSIUS_K - scene_c()).max() < 0.0026

    @pytest.mark.parametrize(
        ("unit", "expected"),
        [("K", "kelvin"), ("kelvin", "kelvin"), ("degC", "celsius"), ("°C", "celsius")],
    )
    def test_unit_alone(self, tmp_path: Path, unit: str, expected: str) -> None:
        values = np.full((4, 5), 230.0, dtype=np.float32)  # unclear without the unit
        path = with_metadata(tmp_path / "a.tif", values, items(unittype=unit))
        encoding = read_frame(path, Camera()).encoding
        assert (encoding.unit, encoding.scale, encoding.offset) == (expected, 1.0, 0.0)

    def test_missing_unit_is_settled_by_the_values(self, tmp_path: Path) -> None:
        counts = np.round((scene_c() + ZERO_CELSIUS_K) / 0.005).astype(np.uint16)
        path = with_metadata(tmp_path / "a.tif", counts, items(scale=0.005))
        encoding = read_frame(path, Camera()).encoding
        assert (encoding.unit, encoding.scale, encoding.offset) == ("linear", 0.005, 0.0)
        assert "K only" in encoding.note

    def test_missing_unit_that_the_values_leave_open(self, tmp_path: Path) -> None:
        counts = np.full((4, 5), 2300, dtype=np.uint16)
        path = with_metadata(tmp_path / "a.tif", counts, items(scale=0.1))
        with pytest.raises(UnclearEncoding, match="no unit"):
            read_frame(path, Camera())

    def test_fills_in_for_linear_without_scale(self, tmp_path: Path) -> None:
        counts = np.full((4, 5), 14657, dtype=np.uint16)
        path = with_metadata(tmp_path / "a.tif", counts, items(scale=0.02, unittype="K"))
        encoding = read_frame(path, Camera(pixel="linear")).encoding
        assert (encoding.scale, encoding.origin) == (0.02, "inferred")

    def test_neutral_scale_says_nothing(self, tmp_path: Path) -> None:
        path = with_metadata(
            tmp_path / "a.tif", as_type(scene_c(), "uint16"), items(scale=1, offset=0)
        )
        assert read_frame(path, Camera()).encoding.scale == 0.01

    def test_other_samples_and_roles_are_ignored(self, tmp_path: Path) -> None:
        document = (
            '<GDALMetadata><Item name="SCALE" sample="1" role="scale">5</Item>'
            '<Item name="NOTE">of the 3rd floor</Item></GDALMetadata>'
        )
        path = with_metadata(tmp_path / "a.tif", as_type(scene_c(), "uint16"), document)
        assert read_frame(path, Camera()).encoding.scale == 0.01

    def test_sheet_wins_and_the_conflict_is_told(self, tmp_path: Path) -> None:
        path = with_metadata(
            tmp_path / "a.tif", as_type(scene_c(), "uint16"), items(scale=0.04, unittype="K")
        )
        frame = read_frame(path, CENTIKELVIN)
        assert (frame.encoding.scale, frame.encoding.origin) == (0.01, "given")
        assert any("scale 0.04" in note for note in frame.notes)

    @pytest.mark.parametrize("found", [{"scale": 0.01}, {"scale": 0.01, "unittype": "K"}])
    def test_agreement_with_the_sheet_is_no_note(
        self, tmp_path: Path, found: dict[str, object]
    ) -> None:
        path = with_metadata(tmp_path / "a.tif", as_type(scene_c(), "uint16"), items(**found))
        assert read_frame(path, CENTIKELVIN).notes == ()

    @pytest.mark.parametrize(
        "document",
        [
            '<!DOCTYPE d [<!ENTITY a "0.01">]><GDALMetadata><Item role="scale">&a;</Item>'
            "</GDALMetadata>",
            '<!DOCTYPE d SYSTEM "file:///etc/hostname"><GDALMetadata/>',
            "<GDALMetadata><Item",
            "no document at all",
            "",
            items(scale="ten"),
            items(scale="nan"),
            items(scale="1e999"),
            items(scale=0),
            items(unittype="furlong"),
        ],
    )
    def test_unusable_metadata(self, tmp_path: Path, document: str) -> None:
        path = with_metadata(tmp_path / "a.tif", as_type(scene_c(), "float32"), document)
        with pytest.raises(UnclearEncoding, match=r"camera\.pixel"):
            read_frame(path, Camera())
        frame = read_frame(path, CELSIUS)
        assert_as_written(frame, as_type(scene_c(), "float32"))
        assert any("not used" in note for note in frame.notes)

    def test_oversized_metadata_are_not_parsed(self, tmp_path: Path) -> None:
        document = items(scale=0.5, unittype="K") + " " * 2000
        path = with_metadata(tmp_path / "a.tif", as_type(scene_c(), "float32"), document)
        with pytest.raises(UnclearEncoding, match="larger"):
            read_frame(path, Camera(), limits=ReadLimits(max_metadata_bytes=1000))

    @pytest.mark.parametrize("sample_type", ["float32", "float64"])
    def test_missing_mark_of_floats(self, tmp_path: Path, sample_type: str) -> None:
        values = as_type(scene_c(), sample_type)
        values[2, 3] = -9999.1
        path = with_metadata(tmp_path / "a.tif", values, nodata="-9999.1")
        frame = read_frame(path, CELSIUS)
        expected = values.copy()
        expected[2, 3] = np.nan
        assert_as_written(frame, expected)
        assert frame.notes == ("1 pixel marked as missing (value '-9999.1') is left out.",)

    def test_missing_mark_of_counts(self, tmp_path: Path) -> None:
        counts = as_type(scene_c(), "uint16")
        counts[5, :7] = 0
        path = with_metadata(tmp_path / "a.tif", counts, nodata="0")
        for camera in (CENTIKELVIN, Camera()):
            frame = read_frame(path, camera)
            assert frame.values.dtype == np.float32
            assert np.isnan(frame.values[5, :7].astype(float)).all()
            assert np.array_equal(frame.values[6:], counts[6:])
            assert frame.encoding.scale == 0.01
            assert frame.notes[0].startswith("7 pixels marked as missing")

    @pytest.mark.parametrize("nodata", ["0", "-9999", "nan", "1e400"])
    def test_missing_mark_that_no_pixel_bears(self, tmp_path: Path, nodata: str) -> None:
        counts = as_type(scene_c(), "uint16")
        path = with_metadata(tmp_path / "a.tif", counts, nodata=nodata)
        frame = read_frame(path, CENTIKELVIN)
        assert_as_written(frame, counts)
        assert frame.notes == ()

    def test_missing_mark_that_is_no_number(self, tmp_path: Path) -> None:
        path = with_metadata(tmp_path / "a.tif", as_type(scene_c(), "uint16"), nodata="none")
        assert "'none'" in read_frame(path, CENTIKELVIN).notes[0]

    def test_nothing_left(self, tmp_path: Path) -> None:
        counts = np.zeros((4, 5), dtype=np.uint16)
        path = with_metadata(tmp_path / "a.tif", counts, nodata="0")
        with pytest.raises(UnreadableImage, match="no finite value"):
            read_frame(path, CENTIKELVIN)


class TestEncoding:
    """The bounds are this project's own choice (common practice, no source)."""

    def read(self, tmp_path: Path, values: NDArray[Any], camera: Camera) -> Frame:
        return read_frame(write(tmp_path / "a.tif", values), camera)

    @pytest.mark.parametrize(
        ("median", "unit"),
        [
            (-60.1, None),
            (-60.0, "celsius"),
            (21.0, "celsius"),
            (199.9, "celsius"),
            (200.0, None),
            (230.0, None),
            (250.0, None),
            (250.1, "kelvin"),
            (293.15, "kelvin"),
            (623.15, "kelvin"),
            (623.2, None),
            (29315.0, None),
        ],
    )
    def test_floats(self, tmp_path: Path, median: float, unit: str | None) -> None:
        values = np.full((5, 5), median)
        values[0, 0], values[4, 4] = median - 10.0, median + 900.0  # the median decides
        if unit is None:
            with pytest.raises(UnclearEncoding, match=r"camera\.pixel"):
                self.read(tmp_path, values, Camera())
            return
        frame = self.read(tmp_path, values, Camera())
        assert (frame.encoding.unit, frame.encoding.origin) == (unit, "inferred")
        assert f"{median:g}" in frame.encoding.note
        shift = ZERO_CELSIUS_K if unit == "celsius" else 0.0
        assert reading_k(frame)[2, 2] == np.float32(median + shift)

    @pytest.mark.parametrize(
        ("low_c", "high_c", "clear"),
        [(-60.0, 35.0, True), (-60.1, 35.0, False), (5.0, 350.0, True), (5.0, 350.1, False)],
    )
    def test_counts_at_the_bounds(
        self, tmp_path: Path, low_c: float, high_c: float, clear: bool
    ) -> None:
        kelvin = np.linspace(low_c, high_c, 100).reshape(10, 10) + ZERO_CELSIUS_K
        counts = np.round(kelvin * 100.0)
        order = np.sort(counts, axis=None)
        counts[counts <= order[9]] = order[0]  # the 5th percentile is the lowest value
        counts[counts >= order[90]] = order[99]
        values = counts.astype(np.uint16)
        if clear:
            encoding = self.read(tmp_path, values, Camera()).encoding
            assert (encoding.unit, encoding.scale, encoding.offset) == ("linear", 0.01, 0.0)
        else:
            with pytest.raises(UnclearEncoding, match="none of the usual"):
                self.read(tmp_path, values, Camera())

    @pytest.mark.parametrize("scale", [0.01, 0.04, 0.1])
    def test_counts_with_one_meaning(self, tmp_path: Path, scale: float) -> None:
        counts = np.round((scene_c() + ZERO_CELSIUS_K) / scale).astype(np.uint16)
        frame = self.read(tmp_path, counts, Camera())
        assert (frame.encoding.scale, frame.encoding.offset) == (scale, 0.0)
        assert frame.encoding.origin == "inferred"
        assert f"kelvin = {scale:g} x count" in frame.encoding.note
        assert np.abs(reading_k(frame) - ZERO_CELSIUS_K - scene_c()).max() <= scale / 2 + 1e-4

    def test_counts_with_two_meanings(self, tmp_path: Path) -> None:
        counts = np.full((4, 5), 5700, dtype=np.uint16)  # 228 K at 0.04, 570 K at 0.1
        with pytest.raises(UnclearEncoding, match=r"0\.04 x count.* or .*0\.1 x count"):
            self.read(tmp_path, counts, Camera())

    def test_signed_counts_below_zero_have_one_meaning(self, tmp_path: Path) -> None:
        counts = np.round(scene_c() * 100.0 - 3500.0).astype(np.int16)
        encoding = self.read(tmp_path, counts, Camera()).encoding
        assert (encoding.scale, encoding.offset) == (0.01, ZERO_CELSIUS_K)

    def test_signed_counts_above_zero_do_not(self, tmp_path: Path) -> None:
        counts = np.full((4, 5), 215, dtype=np.int16)  # 2.15 or 21.5 degC
        with pytest.raises(UnclearEncoding, match="may mean"):
            self.read(tmp_path, counts, Camera())

    def test_blank_counts(self, tmp_path: Path) -> None:
        with pytest.raises(UnclearEncoding, match="camera"):
            self.read(tmp_path, np.zeros((4, 5), dtype=np.uint16), Camera())

    def test_stated_is_used_as_it_is(self, tmp_path: Path) -> None:
        values = np.full((4, 5), 230.0, dtype=np.float32)
        for unit, kelvin in (("celsius", 503.15), ("kelvin", 230.0)):
            frame = self.read(tmp_path, values, Camera(pixel=unit))  # type: ignore[arg-type]
            assert (frame.encoding.unit, frame.encoding.origin) == (unit, "given")
            assert reading_k(frame)[0, 0] == np.float32(kelvin)
            assert frame.notes == ()

    def test_stated_scale_alone_means_linear(self, tmp_path: Path) -> None:
        counts = np.full((4, 5), 5700, dtype=np.uint16)
        frame = self.read(tmp_path, counts, Camera(scale=0.04, offset=60.0))
        assert frame.encoding.unit == "linear"
        assert frame.encoding.origin == "given"
        assert reading_k(frame)[0, 0] == np.float32(288.0)  # 0.04 x 5700 + 60

    def test_linear_floats_without_scale(self, tmp_path: Path) -> None:
        with pytest.raises(UnclearEncoding, match=r"camera\.scale"):
            self.read(tmp_path, as_type(scene_c(), "float32"), Camera(pixel="linear"))

    @pytest.mark.parametrize(
        ("median", "camera", "told"),
        [
            (20.0, Camera(pixel="kelvin"), True),  # -253 degC
            (293.0, CELSIUS, True),
            (250.0, CELSIUS, False),
            (250.1, CELSIUS, True),
            (-60.0, CELSIUS, False),
            (-60.1, CELSIUS, True),
        ],
    )
    def test_implausible_median_is_a_note(
        self, tmp_path: Path, median: float, camera: Camera, told: bool
    ) -> None:
        frame = self.read(tmp_path, np.full((4, 5), median), camera)
        assert any("implausible" in note for note in frame.notes) is told

    def test_impossible_throughout_is_refused(self, tmp_path: Path) -> None:
        values = np.full((4, 5), -10.0, dtype=np.float32)
        with pytest.raises(UnclearEncoding, match=r"absolute zero.*camera\.pixel"):
            self.read(tmp_path, values, Camera(pixel="kelvin"))

    def test_impossible_pixels_are_counted(self, tmp_path: Path) -> None:
        values = as_type(scene_c(), "float32")
        values[0, :3] = -300.0
        frame = self.read(tmp_path, values, CELSIUS)
        assert frame.notes == ("3 pixels at or below absolute zero are left out.",)
        kelvin = reading_k(frame)
        assert np.isnan(kelvin[0, :3]).all()
        assert np.count_nonzero(np.isnan(kelvin)) == 3

    def test_absolute_zero_itself_is_left_out(self, tmp_path: Path) -> None:
        values = np.array([[0.0, 1e-3, 300.0]])
        kelvin = reading_k(self.read(tmp_path, values, Camera(pixel="kelvin")))
        assert np.isnan(kelvin[0, 0])
        assert kelvin[0, 1] == np.float32(1e-3)

    def test_beyond_float32_is_left_out(self, tmp_path: Path) -> None:
        values = np.array([[20.0, 1e300, 21.0]])
        kelvin = reading_k(self.read(tmp_path, values, CELSIUS))
        assert kelvin.dtype == np.float32
        assert np.array_equal(np.isfinite(kelvin), [[True, False, True]])


class TestPictures:
    @pytest.mark.parametrize(
        ("values", "options"),
        [
            (np.zeros((8, 9, 3), np.uint8), {"photometric": "rgb"}),
            (np.zeros((8, 9, 3), np.uint16), {"photometric": "rgb"}),
            (np.zeros((8, 9, 3), np.float32), {"photometric": "rgb"}),
            (np.zeros((3, 8, 9), np.uint8), {"photometric": "rgb", "planarconfig": "separate"}),
            (np.zeros((8, 9, 4), np.uint8), {"photometric": "separated"}),
            (np.zeros((8, 9, 2), np.uint16), {"planarconfig": "contig"}),
            (np.zeros((8, 9), np.uint8), {}),
            (np.zeros((8, 9), np.int8), {}),
            (np.zeros((8, 9), bool), {}),
            (
                np.zeros((8, 9), np.uint8),
                {"photometric": "palette", "colormap": np.zeros((3, 256), np.uint16)},
            ),
            (
                np.zeros((8, 9), np.uint16),
                {"photometric": "palette", "colormap": np.zeros((3, 65536), np.uint16)},
            ),
            (np.zeros((16, 16, 3), np.uint8), {"photometric": "rgb", "compression": "jpeg"}),
            (np.zeros((16, 16, 3), np.uint8), {"photometric": "ycbcr", "compression": "jpeg"}),
            (np.zeros((16, 16), np.uint8), {"compression": "jpeg"}),
            (np.zeros((16, 16), np.uint16), {"compression": "jpeg2000"}),
            (np.zeros((8, 9), np.uint16), {"photometric": "cfa"}),
        ],
    )
    def test_is_refused(
        self, tmp_path: Path, values: NDArray[Any], options: dict[str, Any]
    ) -> None:
        path = write(tmp_path / "IR_0001.tif", values, **options)
        with pytest.raises(NotAMeasurement) as caught:
            read_frame(path, CELSIUS)
        message = str(caught.value)
        assert message.startswith("IR_0001.tif: a")
        assert "picture" in message
        assert "measurement" in message
        assert "export the radiometric data" in message
        assert "\n" not in message

    def test_in_front_of_other_pages(self, tmp_path: Path) -> None:
        path = tmp_path / "a.tif"
        write(path, np.zeros((8, 9, 3), np.uint8), photometric="rgb")
        write(path, as_type(scene_c(), "float32"), append=True)
        with pytest.raises(NotAMeasurement, match="page 1 of 2 is an RGB picture"):
            read_frame(path, CELSIUS)

    @pytest.mark.parametrize("sample_type", ["float16", "uint32", "int32", "uint64", "complex64"])
    def test_other_sample_types_are_named(self, tmp_path: Path, sample_type: str) -> None:
        path = write(tmp_path / "a.tif", np.ones((8, 9), sample_type))
        with pytest.raises(UnreadableImage, match=r"-bit .* not supported"):
            read_frame(path, CELSIUS)


def refusal(path: Path, limits: ReadLimits = DEFAULT_LIMITS) -> str:
    """Return the message of the refusal; it is one printable line that starts with the file."""
    with pytest.raises(UnreadableImage) as caught:
        read_frame(path, CELSIUS, limits=limits)
    message = str(caught.value)
    assert message.isprintable()
    assert len(message) < 300
    return message


class TestBadFiles:
    @pytest.mark.parametrize("big", [False, True], ids=["classic", "BigTIFF"])
    @pytest.mark.parametrize("compression", [None, "zlib", "lzw", "zstd"])
    def test_truncated(self, tmp_path: Path, compression: str | None, big: bool) -> None:
        values = as_type(scene_c(), "float32")
        path = write(
            tmp_path / "a.tif", values, compression=compression, rowsperstrip=8, bigtiff=big
        )
        whole = path.read_bytes()
        for place in range(20):
            path.write_bytes(whole[: len(whole) * place // 20])
            assert refusal(path).startswith("a.tif: ")
        path.write_bytes(whole[:-1])
        assert "truncated" in refusal(path)
        path.write_bytes(whole)
        assert_as_written(read_frame(path, CELSIUS), values)

    @pytest.mark.parametrize(
        "content",
        [
            b"",
            b"I",
            b"II*",
            b"II*\0",
            b"II*\0\x08\0\0",
            b"II*\0\x08\0\0\0",
            b"II*\0\0\0\0\0",
            b"II*\0\xff\xff\xff\xff",
            b"II*\0\x08\0\0\0\0\0\0\0\0\0",
            b"II+\0\x08\0\0\0" + b"\x10" + b"\0" * 7,
            b"II+\0\x04\0\0\0" + b"\x10" + b"\0" * 30,
            b"EP*\0\x08\0\0\0" + b"\0" * 40,
            b"\x89PNG\r\n\x1a\n" + b"\0" * 40,
            b"\xff\xd8\xff\xe0" + b"\0" * 40,
            b"<html>not found</html>",
            bytes(1000),
            bytes(range(256)) * 4,
        ],
    )
    def test_garbage(self, image: Callable[[bytes], Path], content: bytes) -> None:
        assert refusal(image(content)).startswith("IR_0001.tif: ")

    @pytest.mark.parametrize(
        ("changed", "reason"),
        [
            ({"offset": 0}, "holds no data"),
            ({"offset": 4_000_000_000}, "truncated"),
            ({"offset": 40}, "overlaps the tags"),
            ({"offset": 150}, "truncated"),
            ({"bytes": 0}, "holds no data"),
            ({"bytes": 23}, "too short"),
            ({"bytes": 4_000_000_000}, "truncated"),
            ({"width": 0}, "no width"),
            ({"length": 0}, "no height"),
            ({"width": 4_000_000_000, "length": 4_000_000_000}, "limit"),
            ({"width": 100_000_001, "length": 1}, "limit"),
            ({"length": 3, "rows_per_strip": 3}, "too short"),
            ({"length": 3}, "2 strips needed"),
            ({"rows_per_strip": 0}, "rows per strip"),
            ({"rows_per_strip": 1}, "2 strips needed"),
            ({"compression": 8}, "cannot be decoded"),
            ({"compression": 5}, "cannot be decoded"),
            ({"compression": 50000}, "cannot be decoded"),
            ({"compression": 12345}, r"compression (code 12345) is not supported"),
            ({"compression": 34887}, "not supported"),
            ({"format": 4}, "not supported"),
            ({"format": 77}, "not supported"),
            ({"bits": 0}, "no bits"),
            ({"bits": 24}, "not supported"),
            ({"bits": 33}, "not supported"),
        ],
    )
    def test_wrong_statements(
        self, image: Callable[[bytes], Path], changed: dict[str, int], reason: str
    ) -> None:
        assert reason in refusal(image(build(plain_entries(**changed), PLAIN.tobytes())))

    @pytest.mark.parametrize("code", [256, 257, 273, 279])
    def test_tag_that_is_needed_is_absent(self, image: Callable[[bytes], Path], code: int) -> None:
        entries = plain_entries()
        del entries[code]
        refusal(image(build(entries, PLAIN.tobytes())))

    @pytest.mark.parametrize("code", sorted(plain_entries()))
    @pytest.mark.parametrize("entry", [(0, 1, 1), (99, 1, 1), (12, 1, 4_000_000_000), (5, 1, 8)])
    def test_tag_of_a_wrong_type(
        self, image: Callable[[bytes], Path], code: int, entry: tuple[int, int, int]
    ) -> None:
        refusal(image(build({**plain_entries(), code: entry}, PLAIN.tobytes())))

    @pytest.mark.parametrize(
        ("compression", "predictor", "changed"),
        [(1, 3, {}), (1, 2, {}), (32773, 2, {}), (8, 99, {}), (8, 3, {"bits": 16, "format": 1})],
    )
    def test_predictor_that_does_not_go_with_the_rest(
        self,
        image: Callable[[bytes], Path],
        compression: int,
        predictor: int,
        changed: dict[str, int],
    ) -> None:
        entries = plain_entries(compression=compression, **changed)
        entries[317] = (3, 1, predictor)
        assert "predictor" in refusal(image(build(entries, PLAIN.tobytes())))

    def test_tiles_beyond_the_limit(self, image: Callable[[bytes], Path]) -> None:
        entries = plain_entries(compression=8)
        del entries[273], entries[278], entries[279]
        entries |= {322: (4, 1, 2**31), 323: (4, 1, 2**31), 324: (4, 1, 8), 325: (4, 1, 24)}
        assert "tiles" in refusal(image(build(entries, PLAIN.tobytes())))

    def test_small_stream_that_claims_much(self, tmp_path: Path) -> None:
        path = write(tmp_path / "a.tif", np.zeros((300, 400), np.float32), compression="zlib")
        assert "limit of 1000" in refusal(path, ReadLimits(max_pixels=1000))

    def test_pages_in_a_circle(self, image: Callable[[bytes], Path]) -> None:
        pixels = PLAIN.tobytes()
        start = 8 + len(pixels)
        assert "returns on itself" in refusal(
            image(build(plain_entries(), pixels, next_directory=start))
        )

    def test_pages_in_a_long_circle(self, tmp_path: Path) -> None:
        path = write(tmp_path / "a.tif", np.full((300, 4, 5), 20.0, np.float32))
        content = bytearray(path.read_bytes())
        with tifffile.TiffFile(path) as file:
            first, last = file.pages[0].offset, file.pages[299].offset
        entries = struct.unpack_from("<H", content, last)[0]
        struct.pack_into("<I", content, last + 2 + 12 * entries, first)
        path.write_bytes(content)
        assert "returns on itself" in refusal(path)

    def test_next_page_beyond_the_file(self, image: Callable[[bytes], Path]) -> None:
        content = build(plain_entries(), PLAIN.tobytes(), next_directory=1_000_000)
        assert "beyond the end" in refusal(image(content))

    def test_too_many_pages(self, tmp_path: Path) -> None:
        path = write(tmp_path / "a.tif", np.full((11, 4, 5), 20.0, np.float32))
        assert "limit of 10 pages" in refusal(path, ReadLimits(max_pages=10))
        assert read_frame(path, CELSIUS, limits=ReadLimits(max_pages=11)).shape == (4, 5)

    def test_file_beyond_the_limit(self, tmp_path: Path) -> None:
        path = write(tmp_path / "a.tif", as_type(scene_c(), "float32"))
        size = path.stat().st_size
        assert "larger than the limit" in refusal(path, ReadLimits(max_file_bytes=size - 1))
        assert read_frame(path, CELSIUS, limits=ReadLimits(max_file_bytes=size)).shape

    @pytest.mark.parametrize("value", [np.nan, np.inf, -np.inf])
    def test_no_finite_value(self, tmp_path: Path, value: float) -> None:
        path = write(tmp_path / "a.tif", np.full((4, 5), value, np.float32))
        assert "holds no finite value" in refusal(path)

    def test_folder(self, tmp_path: Path) -> None:
        (tmp_path / "a.tif").mkdir()
        assert refusal(tmp_path / "a.tif") == "a.tif: a folder, not an image file"

    def test_pipe_does_not_hang(self, tmp_path: Path) -> None:
        os.mkfifo(tmp_path / "a.tif")
        assert "a pipe" in refusal(tmp_path / "a.tif")
        (tmp_path / "b.tif").symlink_to("a.tif")
        assert "a pipe" in refusal(tmp_path / "b.tif")

    def test_socket(self, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
        monkeypatch.chdir(tmp_path)  # the path of a socket must be short
        with socket.socket(socket.AF_UNIX) as end:
            end.bind("a.tif")
            assert "a socket" in refusal(tmp_path / "a.tif")

    def test_links(self, tmp_path: Path) -> None:
        (tmp_path / "a.tif").symlink_to("gone.tif")
        assert "a link to a file that is not there" in refusal(tmp_path / "a.tif")
        (tmp_path / "b.tif").symlink_to("b.tif")
        refusal(tmp_path / "b.tif")

    def test_absent(self, tmp_path: Path) -> None:
        assert refusal(tmp_path / "a.tif") == "a.tif: no such file"
        refusal(tmp_path / "a\0.tif")

    def test_forbidden(self, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
        path = write(tmp_path / "a.tif", as_type(scene_c(), "float32"))

        def refuse(*_arguments: object) -> int:  # the superuser may read everything
            raise PermissionError(13, "Permission denied")

        monkeypatch.setattr(os, "open", refuse)
        assert refusal(path) == "a.tif: cannot be read (permission denied)"

    def test_name_with_a_line_break(self, tmp_path: Path) -> None:
        path = tmp_path / "a\n\x1b[31mb.tif"
        path.write_bytes(b"nothing")
        assert refusal(path).startswith("a\\n\\x1b[31mb.tif: ")

    def test_nothing_is_logged_or_warned(
        self,
        image: Callable[[bytes], Path],
        capfd: pytest.CaptureFixture[str],
        caplog: pytest.LogCaptureFixture,
    ) -> None:
        bad = {**plain_entries(), 305: (2, 9, 4_000_000_000), 282: (77, 1, 1), 330: (4, 1, 7)}
        with caplog.at_level(logging.DEBUG), warnings.catch_warnings(record=True) as caught:
            warnings.simplefilter("always")
            frame = read_frame(image(build(bad, PLAIN.tobytes())), CELSIUS)
        assert_as_written(frame, PLAIN)
        assert caplog.records == []
        assert caught == []
        assert capfd.readouterr() == ("", "")
        # Another user of the library in the same process still hears of it.
        with caplog.at_level(logging.DEBUG):
            logging.getLogger("tifffile").error("heard")
        assert [record.message for record in caplog.records] == ["heard"]


def assert_frame_or_image_error(path: Path) -> None:
    for camera in (Camera(), CELSIUS):
        outcome: Frame | ImageError
        try:
            outcome = read_frame(path, camera)
        except ImageError as error:
            outcome = error
        if isinstance(outcome, Frame):
            assert reading_k(outcome).shape == outcome.shape
        else:
            assert str(outcome).isprintable()


FUZZ = settings(
    max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)


class TestAnyBytes:
    @FUZZ
    @given(
        header=st.sampled_from(
            [b"II*\0\x08\0\0\0", b"MM\0*\0\0\0\x08", b"II+\0\x08\0\0\0\x10" + b"\0" * 7]
        ),
        entries=st.integers(1, 12),
        rest=st.binary(max_size=400),
    )
    def test_after_a_header(self, tmp_path: Path, header: bytes, entries: int, rest: bytes) -> None:
        order = "<" if header[:1] == b"I" else ">"
        number = struct.pack(f"{order}{'Q' if len(header) == 16 else 'H'}", entries)
        path = tmp_path / "a.tif"
        path.write_bytes(header + number + rest)
        assert_frame_or_image_error(path)
        path.write_bytes(header + rest)
        assert_frame_or_image_error(path)

    @FUZZ
    @given(
        codes=st.lists(
            st.one_of(
                st.sampled_from([256, 257, 258, 259, 262, 266, 273, 274, 277, 278, 279, 284]),
                st.sampled_from([306, 317, 322, 323, 324, 325, 330, 338, 339, 347, 32997]),
                st.sampled_from([33550, 33628, 33629, 34412, 34665, 34735, 36867, 42112, 42113]),
                st.integers(0, 65535),
            ),
            min_size=1,
            max_size=5,
        ),
        data=st.data(),
    )
    def test_with_tags_replaced(
        self, tmp_path: Path, codes: list[int], data: st.DataObject
    ) -> None:
        entries = plain_entries()
        for code in codes:
            kind = data.draw(st.integers(0, 18))
            count = data.draw(st.one_of(st.integers(0, 8), st.integers(0, 2**32 - 1)))
            value = data.draw(st.one_of(st.integers(0, 300), st.integers(0, 2**32 - 1)))
            short = kind == 3 and count == 1
            entries[code] = (kind, count, value % 65536 if short else value)
        path = tmp_path / "a.tif"
        path.write_bytes(build(entries, PLAIN.tobytes()))
        assert_frame_or_image_error(path)

    @FUZZ
    @given(
        compression=st.sampled_from([None, "zlib", "lzw", "zstd", "packbits"]),
        tiled=st.booleans(),
        wrong=st.lists(
            st.tuples(st.integers(0, 10_000), st.integers(0, 255)), min_size=1, max_size=6
        ),
    )
    def test_with_wrong_bytes(
        self,
        tmp_path: Path,
        compression: str | None,
        tiled: bool,
        wrong: list[tuple[int, int]],
    ) -> None:
        path = write(
            tmp_path / "a.tif",
            as_type(scene_c(20, 20), "float32"),
            compression=compression,
            tile=(16, 16) if tiled else None,
            extratags=[
                (42112, 2, 0, items(scale=1, unittype="degC"), True),
                (306, 2, 20, "2026:01:14 07:12:00", True),
            ],
        )
        content = bytearray(path.read_bytes())
        for place, value in wrong:
            content[place % len(content)] = value
        path.write_bytes(content)
        assert_frame_or_image_error(path)


class TestListImages:
    def test_natural_order_whatever_the_case(self, tmp_path: Path) -> None:
        names = [
            "IR_10.tif",
            "ir_9.TIF",
            "IR_2.tiff",
            "IR_1.TifF",
            "IR.tif",
            "a3b2.tif",
            "a3b10.tif",
        ]
        for name in [*names, ".hidden.tif", "._IR_1.tif", "VIS_1.jpg", "IR_1.tif.txt", "tif"]:
            (tmp_path / name).touch()
        (tmp_path / "results").mkdir()
        (tmp_path / "results" / "IR_1.tif").touch()
        assert [path.as_posix() for path in list_images(tmp_path)] == [
            "a3b2.tif",
            "a3b10.tif",
            "IR.tif",
            "IR_1.TifF",
            "IR_2.tiff",
            "ir_9.TIF",
            "IR_10.tif",
        ]

    def test_names_that_look_alike_keep_one_order(self, tmp_path: Path) -> None:
        for name in ("a01.tif", "a1.tif", "A1.tif", "a001.tif", "a1.TIF"):
            (tmp_path / name).touch()
        first = list_images(tmp_path)
        assert [str(path) for path in first] == [
            "A1.tif",
            "a001.tif",
            "a01.tif",
            "a1.TIF",
            "a1.tif",
        ]
        assert list_images(tmp_path) == first

    def test_any_bytes_in_a_name(self, tmp_path: Path) -> None:
        (tmp_path / os.fsdecode(b"\xff\xfe.tif")).touch()
        (name,) = list_images(tmp_path)
        message = refusal(tmp_path / name)
        assert message.encode("utf-8").startswith(b"\\udcff\\udcfe.tif: ")

    def test_what_is_no_file_is_not_lost(self, tmp_path: Path) -> None:
        (tmp_path / "a.tif").mkdir()
        assert list_images(tmp_path) == [Path("a.tif")]

    def test_empty_folder(self, tmp_path: Path) -> None:
        assert list_images(tmp_path) == []

    def test_no_folder(self, tmp_path: Path) -> None:
        with pytest.raises(FolderError, match="no such folder"):
            list_images(tmp_path / "gone")
        (tmp_path / "file").touch()
        with pytest.raises(FolderError, match="not a folder"):
            list_images(tmp_path / "file")
