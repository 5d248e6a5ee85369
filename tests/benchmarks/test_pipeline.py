"""Cost of the whole pipeline against its floor and against a plain script, in the same run.

The floor is what cannot be avoided: decode the inputs and encode the outputs (both planes and
all pictures) with the same libraries and settings.
"""

import tomllib
from pathlib import Path

import numpy as np
import pytest

from tests.benchmarks import plain
from tests.benchmarks.measure import cpu_seconds, report
from tests.simulator.survey import write_survey
from thermo_fix.read import read_frame, reading_k
from thermo_fix.records import ImageResult, Planes
from thermo_fix.report import encode_pictures
from thermo_fix.results import write_plane
from thermo_fix.survey import RunOptions, open_survey, run_survey

ONE_PROCESS = RunOptions(jobs=1, fresh=True)


@pytest.mark.parametrize("shape", [(120, 160), (480, 640)])
def test_pipeline_against_floor_and_plain_script(shape: tuple[int, int], tmp_path: Path) -> None:
    folder = tmp_path / "survey"
    write_survey(folder, "hard-outside", 5, images=6, shape=shape)
    survey = open_survey(folder)
    sheet = tomllib.loads((folder / "survey.toml").read_text())

    def floor() -> None:
        for job in survey.images:
            readings = reading_k(read_frame(job.path, survey.camera))
            celsius = readings - np.float32(273.0)
            planes = Planes(celsius, celsius, celsius * np.float32(0.01))
            write_plane(tmp_path / "a.tif", planes.corrected_c)
            write_plane(tmp_path / "b.tif", planes.uncertainty_k)
            encode_pictures(planes, ImageResult(file=job.file, status="done"))

    least = cpu_seconds(floor, 5)
    whole = cpu_seconds(lambda: run_survey(folder, tmp_path / "ours", options=ONE_PROCESS), 5)
    peer = cpu_seconds(lambda: plain.run(folder, tmp_path / "plain", sheet), 3)
    size = f"{shape[1]} x {shape[0]}"
    each = f"{whole / 6 * 1e3:.0f} ms an image, floor {least / 6 * 1e3:.0f} ms"
    report(f"pipeline over its floor, {size}", whole / least, None, each)
    report(f"plain script over pipeline, {size}", peer / whole, None, f"{peer / 6 * 1e3:.0f} ms")
    assert whole > least
