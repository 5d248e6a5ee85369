"""Images that are sound as files and odd as measurements: none is a fault of the program."""

from pathlib import Path

import numpy as np
import pytest
import tifffile
from hypothesis import HealthCheck, Phase, given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import array_shapes, arrays

from thermo_fix.survey import RunOptions, run_survey

ONE = RunOptions(jobs=1)
SHAPES = [(1, 1), (1, 2), (2, 1), (1, 300), (300, 1), (2, 2), (3, 3), (5, 7), (16, 200)]
NAN, INF = np.nan, np.inf
BIG = np.finfo(np.float32).max
SHEET = """\
[survey]
purpose = "{purpose}"
[camera]
pixel = "celsius"
band_um = [8.0, 14.0]
ifov_mrad = 1.3
[radiation]
model = "{model}"
[scene]
emissivity = 0.5
reflected_c = 60.0
air_c = 20.0
humidity = 0.9
distance_m = 300.0
indoor_c = 21.0
outdoor_c = 1.0
wind_m_s = 3.0
"""
ZONES = """\
[[image.zone]]
name = "{name} 1"
polygon = [[0, 0], [1, 0], [1, 1], [0, 1]]
like = "parts"
load_a = 5
rated_a = 100
[[image.zone]]
name = "{name} 2"
polygon = [[-5, -5], [900, -5], [900, 900], [-5, 900]]
like = "parts"
load_a = 99
rated_a = 100
"""


def odd_images() -> dict[str, np.ndarray]:
    rng = np.random.default_rng(8)
    images = {}
    for shape in SHAPES:
        level = 20.0 + rng.normal(0.0, 0.1, shape)
        images[f"level {shape[0]}x{shape[1]}"] = level
        images[f"constant {shape[0]}x{shape[1]}"] = np.full(shape, 20.0)
        hole = level.copy()
        hole.flat[0] = NAN
        images[f"hole {shape[0]}x{shape[1]}"] = hole
        spike = level.copy()
        spike.flat[-1] = BIG
        images[f"spike {shape[0]}x{shape[1]}"] = spike
    shape = (24, 32)
    level = 20.0 + rng.normal(0.0, 0.1, shape)
    board = np.indices(shape).sum(0) % 2 == 0
    one = np.full(shape, NAN)
    one[12, 16] = 20.0
    images |= {
        "one pixel": one,
        "board of NaN": np.where(board, NAN, level),
        "board of extremes": np.where(board, BIG, -270.0),
        "board of hot and cold": np.where(board, 80.0, -40.0),
        "largest": np.full(shape, BIG),
        "largest and infinite": np.where(board, BIG, INF),
        "minus infinity": np.where(board, -INF, level),
        "subnormal": np.full(shape, np.float32(1e-45)),
        "near zero kelvin": np.full(shape, -273.149),
        "half below zero kelvin": np.where(board, -300.0, level),
        "furnace": np.full(shape, 1499.0),
        "beyond the furnace": np.full(shape, 5000.0),
        "ramp": np.linspace(-80, 1600, 24 * 32).reshape(shape),
        "noise": rng.normal(20.0, 300.0, shape),
        "half hot": np.where(np.arange(32) < 16, 20.0, 90.0) + np.zeros(shape),
        "colder than the surroundings": np.full(shape, -60.0),
    }
    return {name: np.asarray(values, np.float32) for name, values in images.items()}


@pytest.mark.parametrize(
    ("purpose", "model"), [("building", "total"), ("electrical", "band"), ("building", "band")]
)
def test_an_odd_image_is_done_or_told_why_not(tmp_path: Path, purpose: str, model: str) -> None:
    text = SHEET.format(purpose=purpose, model=model)
    images = odd_images()
    for name, values in images.items():
        tifffile.imwrite(tmp_path / f"{name}.tif", values, photometric="minisblack")
        text += f'[[image]]\nfile = "{name}.tif"\n'
        if values.size % 2 == 0:
            text += ZONES.format(name=name)
    (tmp_path / "survey.toml").write_text(text, encoding="utf-8")
    result = run_survey(tmp_path, options=ONE)
    faults = [image.error for image in result.failed if "fault" in str(image.error)]
    assert faults == []
    assert len(result.failed) < len(images) / 3
    for image in result.images:
        for finding in image.findings:
            assert np.isfinite(finding.extreme_c)


EDGES = st.one_of(
    st.floats(width=32),
    st.floats(-60.0, 300.0, width=32),
    st.sampled_from([0.0, 20.0, NAN, INF, -INF, -273.15, 3.0e38, -3.0e38]).map(np.float32),
)


@settings(
    max_examples=25,
    phases=(Phase.explicit, Phase.reuse, Phase.generate),
    deadline=None,
    suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow],
)
@given(arrays(np.float32, array_shapes(min_dims=2, max_dims=2, max_side=12), elements=EDGES))
def test_any_numbers_in_an_image(tmp_path: Path, values: np.ndarray) -> None:
    (tmp_path / "survey.toml").write_text(SHEET.format(purpose="building", model="total"))
    tifffile.imwrite(tmp_path / "a.tif", values, photometric="minisblack")
    for image in run_survey(tmp_path, options=RunOptions(jobs=1, fresh=True)).failed:
        assert image.error is not None
        assert "fault" not in image.error
