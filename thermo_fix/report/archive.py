"""Pictures as named files, so that they can be kept between runs without pickling."""

import json
from collections.abc import Mapping
from dataclasses import fields

from thermo_fix.report.pictures import DataPlane, Pictures

INDEX = "pictures.json"


def pictures_to_files(pictures: Pictures) -> dict[str, bytes]:
    """Return the pictures of an image as files by name."""
    files: dict[str, bytes] = {}
    index: dict[str, object] = {}
    for each in fields(pictures):
        value = getattr(pictures, each.name)
        if isinstance(value, DataPlane):
            files[f"{each.name}.bin"] = value.png
            index[each.name] = {"offset": value.offset, "step": value.step}
        elif isinstance(value, bytes):
            files[f"{each.name}.bin"] = value
            index[each.name] = "file"
        else:
            index[each.name] = ["value", value]
    files[INDEX] = json.dumps(index, sort_keys=True).encode()
    return files


def pictures_from_files(files: Mapping[str, bytes]) -> Pictures:
    """Return the pictures of an image from their files.

    Raises
    ------
    KeyError, ValueError, TypeError
        The files are not those of :func:`pictures_to_files`.

    """
    index = json.loads(files[INDEX])
    values: dict[str, object] = {}
    for name, entry in index.items():
        if entry == "file":
            values[name] = files[f"{name}.bin"]
        elif isinstance(entry, dict):
            values[name] = DataPlane(files[f"{name}.bin"], entry["offset"], entry["step"])
        else:
            values[name] = entry[1]
    return Pictures(**values)  # type: ignore[arg-type]
