"""Written planes: exact, repeatable, and readable by anybody's TIFF reader.

The second reader is OpenCV, whose TIFF library shares no code with the one that writes.
"""

from pathlib import Path
from typing import Literal

import cv2
import numpy as np
import pytest
import tifffile
from numpy.typing import NDArray

from thermo_fix.errors import FolderError, UnreadableImage
from thermo_fix.read import read_frame
from thermo_fix.records import Camera
from thermo_fix.results.planes import read_plane, write_plane
from thermo_fix.version import __version__

CARRIED = (
    (306, 2, 20, "2026:01:14 07:12:00"),
    (33550, 12, 3, (0.5, 0.5, 0.0)),
    (33922, 12, 6, (0.0, 0.0, 0.0, 431000.25, 6213000.5, 0.0)),
    (34735, 3, 8, (1, 1, 0, 1, 1024, 0, 1, 1)),
    (34736, 12, 1, (6378137.0,)),
    (34737, 2, 8, " a|two|"),
)


def plane(rows: int = 480, columns: int = 640) -> NDArray[np.float32]:
    values = np.random.default_rng(3).normal(20.0, 5.0, (rows, columns)).astype(np.float32)
    values[2, 3:6] = np.nan
    return values


@pytest.mark.parametrize("shape", [(1, 1), (1, 7), (7, 1), (37, 53), (480, 640)])
def test_comes_back_exactly(tmp_path: Path, shape: tuple[int, int]) -> None:
    values = np.resize(plane(37, 53), shape)
    write_plane(tmp_path / "a.tif", values)
    back = read_plane(tmp_path / "a.tif")
    assert back.dtype == np.float32
    assert np.array_equal(back, values, equal_nan=True)


@pytest.mark.parametrize("shape", [(7, 5), (37, 53), (480, 640)])
def test_second_reader_agrees(tmp_path: Path, shape: tuple[int, int]) -> None:
    values = plane(*shape)
    write_plane(tmp_path / "a.tif", values, carried_tags=CARRIED, description="degC")
    second = cv2.imread(str(tmp_path / "a.tif"), cv2.IMREAD_UNCHANGED)
    assert second is not None
    assert second.dtype == np.float32
    assert np.array_equal(second, values, equal_nan=True)


def test_tags(tmp_path: Path) -> None:
    write_plane(tmp_path / "a.tif", plane(), carried_tags=CARRIED, description="20 °C or so")
    with tifffile.TiffFile(tmp_path / "a.tif") as file:
        assert len(file.pages) == 1
        assert file.byteorder == "<"
        tags = file.pages.first.tags
        # Codes: TIFF revision 6.0 and Adobe Photoshop TIFF technical notes 1 and 3.
        assert tags[259].value == 8
        assert tags[317].value == 3
        assert tags[262].value == 1
        assert tags[339].value == 3
        assert tags[305].value == f"thermo_fix {__version__}"
        assert tags[270].value == r"20 \xb0C or so"
        assert tags[306].value == "2026:01:14 07:12:00"
        assert sorted(tags.keys()) == list(tags.keys())


def test_without_a_source_date_there_is_none(tmp_path: Path) -> None:
    write_plane(tmp_path / "a.tif", plane(), description="")
    with tifffile.TiffFile(tmp_path / "a.tif") as file:
        tags = file.pages.first.tags
        assert 306 not in tags
        assert 270 not in tags


@pytest.mark.parametrize("order", ["<", ">"])
def test_tags_of_the_source_are_kept(tmp_path: Path, order: Literal["<", ">"]) -> None:
    tifffile.imwrite(
        tmp_path / "in.tif",
        plane(),
        photometric="minisblack",
        metadata=None,
        byteorder=order,
        extratags=[(*tag, True) for tag in CARRIED],
    )
    source = read_frame(tmp_path / "in.tif", Camera(pixel="celsius"))
    write_plane(tmp_path / "out.tif", plane(), carried_tags=source.carried_tags)
    result = read_frame(tmp_path / "out.tif", Camera(pixel="celsius"))
    assert source.carried_tags == CARRIED
    assert result.carried_tags == CARRIED
    assert result.taken == source.taken


def test_same_input_gives_the_same_bytes(tmp_path: Path) -> None:
    for name in ("a.tif", "b.tif"):
        write_plane(tmp_path / name, plane(), carried_tags=CARRIED, description="x")
    write_plane(tmp_path / "c.tif", plane(), carried_tags=reversed(CARRIED), description="x")
    first = (tmp_path / "a.tif").read_bytes()
    assert (tmp_path / "b.tif").read_bytes() == first
    assert (tmp_path / "c.tif").read_bytes() == first


def test_is_smaller_than_raw(tmp_path: Path) -> None:
    smooth = np.tile(np.linspace(10.0, 30.0, 640, dtype=np.float32), (480, 1))
    write_plane(tmp_path / "a.tif", smooth)
    assert (tmp_path / "a.tif").stat().st_size < smooth.nbytes / 4


def test_view_of_a_larger_array(tmp_path: Path) -> None:
    values = plane()[::2, ::3]
    write_plane(tmp_path / "a.tif", values)
    assert np.array_equal(read_plane(tmp_path / "a.tif"), values, equal_nan=True)


@pytest.mark.parametrize(
    "wrong",
    [
        np.zeros((4, 5)),
        np.zeros((4, 5, 3), np.float32),
        np.zeros(4, np.float32),
        np.zeros((0, 5), np.float32),
    ],
)
def test_what_is_no_plane(tmp_path: Path, wrong: NDArray[np.float32]) -> None:
    with pytest.raises(ValueError, match="rows, columns"):
        write_plane(tmp_path / "a.tif", wrong)
    assert list(tmp_path.iterdir()) == []


def test_replaces_an_earlier_file_and_leaves_nothing_behind(tmp_path: Path) -> None:
    write_plane(tmp_path / "a.tif", plane())
    write_plane(tmp_path / "a.tif", plane() + 1)
    assert np.array_equal(read_plane(tmp_path / "a.tif"), plane() + 1, equal_nan=True)
    assert [path.name for path in tmp_path.iterdir()] == ["a.tif"]


def test_not_writable(tmp_path: Path) -> None:
    with pytest.raises(FolderError, match="cannot be written"):
        write_plane(tmp_path / "gone" / "a.tif", plane())
    (tmp_path / "a.tif").mkdir()
    with pytest.raises(FolderError, match="cannot be written"):
        write_plane(tmp_path / "a.tif", plane())
    assert [path.name for path in tmp_path.iterdir()] == ["a.tif"]


def test_unreadable(tmp_path: Path) -> None:
    path = tmp_path / "a.tif"
    with pytest.raises(UnreadableImage, match=r"a\.tif"):
        read_plane(path)
    write_plane(path, plane())
    path.write_bytes(path.read_bytes()[:-1000])
    with pytest.raises(UnreadableImage, match=r"a\.tif"):
        read_plane(path)
    tifffile.imwrite(path, np.zeros((4, 5), np.uint16), photometric="minisblack")
    with pytest.raises(UnreadableImage, match="float32"):
        read_plane(path)
