"""What the uncertainty plane costs, against the correction itself, in the same run.

``correct_frame`` gives the surface temperature and its uncertainty at every pixel. It is timed as
it is, and with everything that only the uncertainty needs taken out of it; the difference is the
price of the uncertainty. The plain formula, pixel by pixel, is timed beside them for comparison.
"""

from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

from tests.benchmarks.measure import cpu_seconds_of_many, report
from tests.uncertainty.in_memory import scene_inputs, with_emissivity
from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.correct import correct_frame, kernel, radiation_models
from thermo_fix.records import Camera, Encoding, Frame, ImageJob, ModelName, Zone
from thermo_fix.sheet.zones import label_zones
from thermo_fix.uncertainty.equation import MeasurementEquation

Kelvins = NDArray[np.float32]
Doubles = NDArray[np.float64]

SHAPE = (480, 640)
LIMIT = 2.0
REPEATS = 10
CAMERA = Camera(noise_k=0.05, accuracy_k=2.0, accuracy_fraction=0.02, nonuniformity_k=0.1)


@pytest.mark.parametrize("zone_count", [1, 8])
@pytest.mark.parametrize("model", ["total", "band"])
def test_uncertainty_costs_at_most_twice_the_correction(
    model: ModelName, zone_count: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    rng = np.random.default_rng(1)
    celsius = np.linspace(5.0, 65.0, SHAPE[1]) + rng.normal(0.0, 0.05, SHAPE)
    reading_k = (celsius + ZERO_CELSIUS_K).astype(np.float32)
    inputs = scene_inputs(
        emissivity=(0.93, 0.02),
        reflected_c=(15.0, 1.0),
        air_c=(18.0, 1.0),
        humidity=(0.5, 0.05),
        distance_m=(8.0, 0.4),
    )
    zones = tuple(
        Zone(
            f"zone {number}",
            ((80.0 * number, 40.0), (80.0 * number + 70.0, 40.0), (80.0 * number + 70.0, 440.0)),
            with_emissivity(inputs, 0.5 + 0.05 * number, 0.03, f"zone {number}"),
        )
        for number in range(zone_count)
    )
    path = Path("image.tif")
    job = ImageJob(path.name, path, inputs, zones)
    frame = Frame(path, reading_k, Encoding("kelvin", 1.0, 0.0, "given"), "0" * 64)
    labels = label_zones(zones, SHAPE)
    models = radiation_models(model, CAMERA)
    corrected = correct_frame(frame, reading_k, job, labels, CAMERA, models)
    equations = corrected.equations

    def formula() -> None:
        surface = np.empty_like(reading_k)
        for label, equation in enumerate(equations):
            here = labels == label
            surface[here] = equation.temperature_k(reading_k[here])

    def both() -> None:
        correct_frame(frame, reading_k, job, labels, CAMERA, models)

    plain = cpu_seconds_of_many(formula, REPEATS)
    whole = cpu_seconds_of_many(both, REPEATS)
    with monkeypatch.context() as patch:
        look_up = kernel._look_up

        def temperature_only(
            readings: Kelvins, nodes: Doubles, per_node: int, wanted: list[tuple[Doubles, Kelvins]]
        ) -> None:
            look_up(readings, nodes, per_node, wanted[:1])

        patch.setattr(MeasurementEquation, "u_k", lambda _, nodes: np.zeros_like(nodes))
        patch.setattr(kernel, "_look_up", temperature_only)
        alone = cpu_seconds_of_many(both, REPEATS)
    count = "1 zone" if zone_count == 1 else f"{zone_count} zones"
    size = f"{SHAPE[1]} x {SHAPE[0]}, {count}, {model}"
    detail = (
        f"correction {1e3 * alone:.1f} ms, both planes {1e3 * whole:.1f} ms, "
        f"plain formula {1e3 * plain:.1f} ms"
    )
    report(f"uncertainty plane over correction, {size}", (whole - alone) / alone, LIMIT, detail)
    assert whole - alone <= LIMIT * alone
    assert np.isfinite(corrected.uncertainty_k).all()
