"""Write both demo surveys and their truth: `python -m tests.simulator.make_demo`.

The same libraries give the same bytes at each run: every random number comes from a fixed seed and
the TIFFs carry no other time than the invented one of the image.
"""

import argparse
import json
from pathlib import Path
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from tests.simulator import demo_building, demo_electrical
from tests.simulator.demo_pictures import write_pictures
from tests.simulator.demo_scene import write_images
from tests.simulator.survey import write_tiff

REPOSITORY: Final = Path(__file__).parents[2]
DEMO_FOLDER: Final = REPOSITORY / "demo_images"
TRUTH_FILE: Final = REPOSITORY / "tests" / "data" / "demo_truth.json"

README: Final = """\
# Demo images

Two small surveys to try the program on: `thermo-fix run demo_images/building`, or
`thermo-fix demo`, which copies a survey first.

Everything here is invented. Marlhythe, its rope works on the river Sellow, Hatchel Lane and Tar
Kettle Row do not exist, and nothing was photographed: the images were computed by
`python -m tests.simulator.make_demo` from temperatures chosen for the purpose. Planck's law is
integrated over an 8-14 um detector, the air's transmittance comes from LOWTRAN7, and blur, noise
and a calibration offset are added. Because the truth is known, the tests compare the program's
results with it. The two `VIS_*.png` are drawings.

`building/`: a heating-season walk-through, eight images and a broken one. Outside: a bay without
insulation, a slab edge, a street front whose windows mirror a cold sky. Inside: a cold corner, a
damp patch, a leaking ceiling joint, a sound wall, and a wall with a piece of crumpled foil that
measures the reflected apparent temperature. `weather.csv` is the log of a mast; from it come the
outdoor temperature and the wind. The corner of `IR_0104.tif` passes as the morning was, and fails
on the cold and humid day of the sheet's `[design]`. `IR_0109.tif` is cut short on purpose.

`electrical/`: boards and a motor under load, seven images and a wrong one. A loose lug, cables that
are unequally warm because their currents differ, a fuse without current, terminals behind an
infrared window, a bare copper bar with a strip of tape, a terminal that is only just too warm, and
a sound board. `IR_0208.tif` is a colour picture, not temperatures, on purpose.

Each `survey.toml` is commented and can serve as a pattern for your own.
"""


def make_demo(demo_folder: Path = DEMO_FOLDER, truth_file: Path = TRUTH_FILE) -> None:
    """Write the demo folder and the truth file, over what is there."""
    building, electrical = demo_folder / "building", demo_folder / "electrical"
    for folder in (building, electrical, truth_file.parent):
        folder.mkdir(parents=True, exist_ok=True)
    truth: dict[str, list[dict[str, Any]]] = {
        "building": write_images(
            building,
            demo_building.images(),
            demo_building.CAMERA,
            demo_building.SEED,
            demo_building.PIXEL,
        ),
        "electrical": write_images(
            electrical,
            demo_electrical.images(),
            demo_electrical.CAMERA,
            demo_electrical.SEED,
            demo_electrical.PIXEL,
        ),
    }
    for entry in truth["electrical"]:
        entry["explained"] = demo_electrical.EXPLAINED.get(entry["file"], [])
    _write_truncated(building)
    truth["building"].append({"file": demo_building.BROKEN, "broken": "cut short"})
    _write_colour_picture(electrical / demo_electrical.BROKEN)
    truth["electrical"].append({"file": demo_electrical.BROKEN, "broken": "colour picture"})
    (building / "survey.toml").write_text(demo_building.SHEET, encoding="utf-8")
    (building / "weather.csv").write_text(demo_building.WEATHER, encoding="utf-8")
    (electrical / "survey.toml").write_text(demo_electrical.SHEET, encoding="utf-8")
    write_pictures(building)
    (demo_folder / "README.md").write_text(README, encoding="utf-8")
    truth_file.write_text(json.dumps(truth, indent=1) + "\n", encoding="utf-8")


def _write_truncated(folder: Path) -> None:
    """A TIFF of which only the first part reached the card."""
    image = demo_building.broken_image()
    write_images(folder, [image], demo_building.CAMERA, demo_building.SEED + 9, demo_building.PIXEL)
    path = folder / image.file
    whole = path.read_bytes()
    path.write_bytes(whole[: len(whole) * 2 // 5])


def _write_colour_picture(path: Path) -> None:
    """Three planes of colour where temperatures were expected."""
    rows, columns = np.indices((90, 120))
    planes = (2 * columns, rows + columns, 255 - 2 * rows)
    colours: NDArray[np.uint8] = np.stack(planes, axis=-1).clip(0, 255).astype(np.uint8)
    taken = demo_electrical.images()[-1].taken
    write_tiff(path, colours, compression="zlib", taken=taken, predictor=True)


def main() -> None:
    parser = argparse.ArgumentParser(
        prog="python -m tests.simulator.make_demo", description=__doc__
    )
    parser.add_argument("--folder", type=Path, default=DEMO_FOLDER)
    parser.add_argument("--truth", type=Path, default=TRUTH_FILE)
    given = parser.parse_args()
    make_demo(given.folder, given.truth)
    size = sum(path.stat().st_size for path in given.folder.rglob("*") if path.is_file())
    print(f"{given.folder}: {size / 1e6:.2f} MB")


if __name__ == "__main__":
    main()
