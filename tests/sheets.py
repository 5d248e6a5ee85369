"""Sheets and functions that several tests of the survey sheet use."""

from pathlib import Path

import pytest
from hypothesis import strategies as st

from thermo_fix.errors import SheetError
from thermo_fix.records import Survey
from thermo_fix.sheet import SHEET_NAME, load_survey
from thermo_fix.sheet.lines import KeyPath

EXAMPLE = """\
[survey]
title = "Quayside mill, north elevation"
purpose = "building"          # building | electrical
date = 2026-01-14
surveyor = ""
temperature_unit = "celsius"  # of the report: celsius | fahrenheit

[camera]
pixel = "celsius"             # celsius | kelvin | linear
scale = 0.01                  # linear only: kelvin = scale * count + offset
offset = 0.0
band_um = [8.0, 14.0]
ifov_mrad = 1.3
noise_k = 0.05                # noise-equivalent temperature difference
accuracy_k = 2.0              # stated accuracy: the larger of these two
accuracy_fraction = 0.02      # of the reading in degC
recorded = { emissivity = 1.0, reflected_c = 20.0, air_c = 20.0, transmittance = 1.0 }

[radiation]
model = "total"               # total | band

[scene]
emissivity = { value = 0.93, u = 0.02 }
reflected_c = -4.0
air_c = 2.0
humidity = 0.75               # 0 to 1
distance_m = 8.0
view_angle_deg = 0.0
indoor_c = 20.5               # building: the air on the warm side
outdoor_c = 2.0
wind_m_s = 1.5
# transmittance = 0.98        # replaces the formula
# window = { transmittance = 0.86, reflectance = 0.04, temperature_c = 20, reflected_c = 20 }

[detect]
warm = true                   # hot findings
cold = true                   # cold findings
min_delta_k = 1.5
min_area_px = 9

[criteria]
use = ["iso13788-surface-factor"]   # names of criteria, built in or in a file of the survey's own

[[image]]
file = "IR_0007.tif"
asset = "north wall, bay 3"
photo = "VIS_0007.jpg"
taken = 2026-01-14T07:12:00
note = ""
emissivity = { surface = "brick, red" }

[[image.zone]]
name = "lug B"
polygon = [[120, 80], [140, 80], [140, 96], [120, 96]]   # x, y in pixels, corner-based
like = "lugs"
load_a = 62
rated_a = 100
ignore = false                # true: leave these pixels out
"""

IMAGE = '[[image]]\nfile = "a.tif"\n'
SQUARE = "polygon = [[0, 0], [4, 0], [4, 4], [0, 4]]\n"
ZONE = '[[image.zone]]\nname = "z"\n' + SQUARE


def load(folder: Path, text: str | bytes, *found: str, criteria: list[str] | None = None) -> Survey:
    data = text.encode() if isinstance(text, str) else text
    (folder / SHEET_NAME).write_bytes(data)
    return load_survey(folder, found_files=found, known_criteria=criteria)


def refused(folder: Path, text: str | bytes, criteria: list[str] | None = None) -> tuple[str, ...]:
    with pytest.raises(SheetError) as caught:
        load(folder, text, "a.tif", criteria=criteria)
    assert all("\n" not in line for line in caught.value.problems)
    return caught.value.problems


def paths_of(value: object, path: KeyPath = ()) -> set[KeyPath]:
    found = {path} if path else set()
    if isinstance(value, dict):
        for key, inner in value.items():
            found |= paths_of(inner, (*path, key))
    elif isinstance(value, list):
        for place, inner in enumerate(value):
            found |= paths_of(inner, (*path, place))
    return found


scalars = st.one_of(
    st.integers(-(2**40), 2**40),
    st.floats(allow_nan=False),
    st.booleans(),
    st.text(st.characters(exclude_categories=["Cs"]), max_size=12),
    st.dates(),
)
# The writer used here does not escape every key, so keys are kept to visible characters.
keys = st.text(st.characters(codec="utf-8", exclude_categories=["C", "Z"]), min_size=1, max_size=6)
values = st.recursive(
    scalars,
    lambda inner: st.one_of(st.lists(inner, max_size=4), st.dictionaries(keys, inner, max_size=4)),
    max_leaves=12,
)
