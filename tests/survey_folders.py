"""Small survey folders for the tests of the run and of the command line."""

from pathlib import Path
from typing import Any

import numpy as np
import tifffile
from numpy.typing import NDArray

SHAPE = (60, 80)
SHEET = """\
[survey]
title = "Small survey"
purpose = "building"
[camera]
pixel = "celsius"
noise_k = 0.05
[scene]
emissivity = { value = 0.95, u = 0.02 }
reflected_c = 20.0
air_c = 20.0
humidity = 0.5
distance_m = 2.0
"""


def picture(level_c: float = 20.0, spot_k: float = 6.0, seed: int = 1) -> NDArray[np.float32]:
    """Readings in degC: a level with noise, and one warm spot of 12 x 10 pixels."""
    image = level_c + np.random.default_rng(seed).normal(0.0, 0.05, SHAPE)
    image[20:30, 30:42] += spot_k
    return image.astype(np.float32)


def write_image(path: Path, values: NDArray[Any] | None = None, **tags: Any) -> Path:
    path.parent.mkdir(parents=True, exist_ok=True)
    data = picture() if values is None else values
    photometric = "rgb" if data.ndim == 3 else "minisblack"
    tifffile.imwrite(path, data, photometric=photometric, metadata=None, **tags)
    return path


def write_folder(folder: Path, *names: str, sheet: str | None = SHEET) -> Path:
    """A folder with an image of each name, and a sheet unless it is None."""
    folder.mkdir(parents=True, exist_ok=True)
    for number, name in enumerate(names, start=1):
        write_image(folder / name, picture(seed=number))
    if sheet is not None:
        (folder / "survey.toml").write_text(sheet, encoding="utf-8")
    return folder


def files_below(folder: Path) -> dict[str, bytes]:
    return {
        path.relative_to(folder).as_posix(): path.read_bytes()
        for path in sorted(folder.rglob("*"))
        if path.is_file()
    }
