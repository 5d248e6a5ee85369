"""What a pixel can be told: apparent temperature, emissivity, where its uncertainty comes from."""

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from thermo_fix.correct import correct_frame, planes_of, radiation_models
from thermo_fix.demo import demo_surveys
from thermo_fix.read import read_frame, reading_k
from thermo_fix.records import Camera, CorrectedFrame, PixelBudget, Recorded
from thermo_fix.report import encode_pictures
from thermo_fix.sheet import label_zones
from thermo_fix.survey import open_survey


def corrected(recorded: Recorded | None = None) -> CorrectedFrame:
    """The first electrical demo image, which has zones."""
    survey = open_survey(demo_surveys()["electrical"])
    job = survey.images[0]
    camera: Camera = (
        survey.camera if recorded is None else replace(survey.camera, recorded=recorded)
    )
    frame = read_frame(job.path, camera)
    return correct_frame(
        frame,
        reading_k(frame),
        job,
        label_zones(job.zones, frame.shape),
        camera,
        radiation_models(survey.model, camera, None),
    )


def between(budget: PixelBudget, reading_c: float) -> dict[str, float]:
    return {
        name: float(np.interp(reading_c, budget.reading_c, parts))
        for name, parts in budget.parts_k.items()
    }


def test_budget_of_a_pixel_gives_its_written_uncertainty() -> None:
    frame = corrected()
    planes = planes_of(frame)
    assert planes.labels is not None
    assert len(planes.budgets) == len(frame.job.zones) + 1
    for label, budget in enumerate(planes.budgets):
        rows, columns = np.nonzero(planes.labels == label)
        for place in range(0, len(rows), max(1, len(rows) // 7)):
            y, x = rows[place], columns[place]
            parts = between(budget, float(planes.recorded_c[y, x]))
            u = float(np.sqrt(sum(part**2 for part in parts.values())))
            assert u == pytest.approx(float(planes.uncertainty_k[y, x]), rel=0.01, abs=0.005)


def test_difference_from_budgets_is_that_of_the_draws() -> None:
    """Monte Carlo (JCGM 101) as the other opinion on the first-order difference."""
    frame = corrected()
    planes = planes_of(frame)
    assert planes.labels is not None
    places = [tuple(np.argwhere(planes.labels == label)[40]) for label in (1, 2)]
    parts, draws = [], []
    for number, (y, x) in enumerate(places):
        label = int(planes.labels[y, x])
        found = between(planes.budgets[label], float(planes.recorded_c[y, x]))
        own = planes.budgets[label].own
        parts.append({name if name not in own else (name, number): p for name, p in found.items()})
        equation = frame.equations[label]
        draws.append(
            equation.draw_k(
                float(frame.reading_k[y, x]),
                independent={
                    f"noise {number}": equation.noise_k,
                    f"non-uniformity {number}": equation.nonuniformity_k,
                },
            )
        )
    names = {*parts[0], *parts[1]}
    u = np.sqrt(sum((parts[0].get(n, 0.0) - parts[1].get(n, 0.0)) ** 2 for n in names))
    # 20,000 draws: a standard deviation is good to 0.5 %.
    assert u == pytest.approx(float(np.std(draws[0] - draws[1])), rel=0.03)


def test_apparent_temperature_is_left_out_where_it_is_the_reading() -> None:
    assert planes_of(corrected()).apparent_c is None


def test_apparent_temperature_undoes_the_recorded_settings() -> None:
    recorded = Recorded(emissivity=0.95, reflected_c=20.0, air_c=20.0, transmittance=1.0)
    frame = corrected(recorded)
    planes = planes_of(frame)
    assert planes.apparent_c is not None
    # By hand: M_seen = 0.95 M(reading) + 0.05 M(20 degC), in the model of the equation.
    model = frame.equations[0].model
    seen = 0.95 * model.exitance(float(frame.reading_k[139, 160])) + 0.05 * model.exitance(293.15)
    wanted = float(model.temperature(seen)) - 273.15
    assert float(planes.apparent_c[139, 160]) == pytest.approx(wanted, abs=2e-3)


def test_emissivity_of_a_zone_is_that_of_its_budget() -> None:
    frame = corrected()
    budgets = planes_of(frame).budgets
    for label, budget in enumerate(budgets):
        value = frame.inputs[label].values["emissivity"].value
        # Viewed squarely, the directional factor is 1.
        assert budget.emissivity == pytest.approx(value, abs=1e-3)
    assert [budget.name for budget in budgets[1:]] == [zone.name for zone in frame.job.zones]


def test_pictures_carry_what_the_planes_say(tmp_path: Path) -> None:
    frame = corrected()
    planes = planes_of(frame)
    from thermo_fix.measure import measure_image

    image = measure_image(frame, ())
    pictures = encode_pictures(planes, image)
    budgets = json.loads(pictures.budgets)
    assert [budget["name"] for budget in budgets] == [one.name for one in planes.budgets]
    assert pictures.labels_png is not None
    assert not pictures.by_pixel
    assert pictures.apparent_data is None
    assert sum(pictures.histogram) <= planes.corrected_c.size
    assert sum(pictures.histogram) >= 0.98 * np.isfinite(planes.corrected_c).sum()
