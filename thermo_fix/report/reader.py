"""What the script of the page is given: words, colours, and the numbers of each image.

Everything travels as JSON in blocks that a browser does not run. The script is
``static/report.js``; the page says all that matters without it.
"""

import base64
import json
from functools import lru_cache

from markupsafe import Markup

from thermo_fix.report.catalogue import Words
from thermo_fix.report.cleaning import clean_text
from thermo_fix.report.formatting import (
    COVERAGE,
    FAHRENHEIT_PER_KELVIN,
    FAHRENHEIT_ZERO_OFFSET,
    Units,
)
from thermo_fix.report.pictures import COLOUR_MAPS, DataPlane, Pictures, palette_bytes


def page_data(words: Words, units: Units) -> Markup:
    """What all images of a page share."""
    return _block(
        {
            "words": words.family("reader"),
            "decimal": units.decimal_mark,
            "sign": units.sign,
            "difference": units.difference_sign,
            "factor": FAHRENHEIT_PER_KELVIN if units.fahrenheit else 1.0,
            "zero": FAHRENHEIT_ZERO_OFFSET if units.fahrenheit else 0.0,
            "coverage": COVERAGE,
            "maps": _maps(),
        }
    )


def image_data(pictures: Pictures, pixel_m: float | None) -> Markup:
    """The numbers of one image."""
    planes = {
        "corrected": pictures.data,
        "recorded": pictures.recorded_data,
        "apparent": pictures.apparent_data,
        "emissivity": pictures.emissivity_data,
        "uncertainty": pictures.uncertainty_data if pictures.by_pixel else None,
    }
    return _block(
        {
            "width": pictures.width,
            "height": pictures.height,
            "low": pictures.low_c,
            "high": pictures.high_c,
            "map": pictures.colour_map,
            "pixel": pixel_m,
            "planes": {name: _plane(plane) for name, plane in planes.items() if plane},
            "labels": None if pictures.labels_png is None else _text(pictures.labels_png),
            "budgets": [
                {**budget, "name": clean_text(budget["name"])}
                for budget in json.loads(pictures.budgets)
            ],
        }
    )


def _plane(plane: DataPlane) -> dict[str, object]:
    return {"offset": plane.offset, "step": plane.step, "png": _text(plane.png)}


def _text(content: bytes) -> str:
    return base64.b64encode(content).decode()


@lru_cache(maxsize=1)
def _maps() -> dict[str, str]:
    return {name: _text(palette_bytes(name)) for name in COLOUR_MAPS}


def _block(content: object) -> Markup:
    """JSON that cannot end the block it stands in."""
    text = json.dumps(content, separators=(",", ":"), allow_nan=False)
    return Markup(text.replace("<", "\\u003c"))
