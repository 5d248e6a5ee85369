"""Cost of the kernels in memory copies of one float32 plane, measured in the same run."""

import numpy as np
import pytest

from tests.benchmarks.measure import cpu_seconds_of_many, report
from thermo_fix.correct.inputs import radiation_models
from thermo_fix.correct.kernel import planes_of
from thermo_fix.radiometry.path import IDENTITY_PATH
from thermo_fix.records import Camera, ModelName
from thermo_fix.uncertainty.equation import MeasurementEquation
from thermo_fix.uncertainty.variables import Variable

SHAPES = [(480, 640), (1024, 1280)]


def equation(name: ModelName) -> MeasurementEquation:
    models = radiation_models(name, Camera())
    inputs = {
        "emissivity": (0.93, 0.02),
        "reflected_c": (20.0, 1.0),
        "air_c": (15.0, 1.0),
        "humidity": (0.5, 0.05),
        "distance_m": (10.0, 0.5),
    }
    return MeasurementEquation(
        model=models.model,
        recorded=IDENTITY_PATH,
        variables={key: Variable(key, *pair) for key, pair in inputs.items()},
        accuracy_k=2.0,
        accuracy_fraction=0.02,
        noise_k=0.05,
        nonuniformity_k=0.1,
        alternative=models.alternative,
    )


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("model", ["total", "band"])
def test_both_planes_in_memory_copies(shape: tuple[int, int], model: ModelName) -> None:
    rng = np.random.default_rng(1)
    # A scene of 60 K with noise: neighbouring pixels are near each other, as in any image.
    slope = np.linspace(280.0, 340.0, shape[1])
    readings = (slope + rng.normal(0.0, 0.05, shape)).astype(np.float32)
    target = np.empty_like(readings)
    here = equation(model)
    copy = cpu_seconds_of_many(lambda: np.copyto(target, readings), 200)
    fresh = cpu_seconds_of_many(lambda: readings.copy(), 50)
    both = cpu_seconds_of_many(lambda: planes_of(readings, here), 10)
    size = f"{shape[1]} x {shape[0]}, {model}"
    detail = f"both planes {both * 1e3:.2f} ms, copy {copy * 1e3:.3f} ms, into new memory "
    report(f"kernel, {size}", both / copy, None, f"{detail}{fresh * 1e3:.3f} ms")
    assert both > copy  # cannot be: the measurement would be wrong
