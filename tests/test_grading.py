"""Grades of findings: which criterion, on which quantity, with which chance, and what is missing.

Expected numbers that name no other source are arithmetic shown beside them.
"""

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray

from thermo_fix.criteria import built_in, load_criteria
from thermo_fix.grade import grade_finding
from thermo_fix.grade.grading import worse_probability
from thermo_fix.measure.quantities import Site, quantities_of
from thermo_fix.records import (
    GRADES,
    Finding,
    Grading,
    Input,
    MeasuredRegion,
    Origin,
    SceneInputs,
    Sense,
    VariableWords,
)
from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.variables import Variable

DRAWS = len(Variable("any", 0.0, 1.0).draw())


def exact(value: float) -> Estimate:
    return Estimate(value, {}, np.full(DRAWS, value))


def uncertain(value: float, **parts: float) -> Estimate:
    """A linear estimate; each part is a standard uncertainty in the unit of the value."""
    draws: NDArray[np.float64] = np.full(DRAWS, value)
    for name, part in parts.items():
        draws = draws + part * Variable(name, 0.0, 1.0).draw()
    return Estimate(value, parts, draws)


def finding(sense: Sense = "hot") -> Finding:
    return Finding(
        id="1.1",
        image="a.tif",
        zone="lug B",
        sense=sense,
        bbox_px=(0, 0, 4, 4),
        area_px=16,
        area_m2=None,
        u_area_m2=None,
        extreme_c=40.0,
        extreme_px=(1, 1),
        mean_c=39.0,
        reference_kind="like component",
        reference_name="lug A, coolest like zone",
        reference_c=30.0,
        delta_k=10.0,
        u_extreme_k=1.0,
        u_delta_k=0.2,
    )


def measured(
    quantities: Mapping[str, Estimate],
    *,
    missing: Mapping[str, tuple[str, ...]] | None = None,
    sense: Sense = "hot",
    inside: bool | None = True,
) -> MeasuredRegion:
    names = {name for each in quantities.values() for name in each.contributions}
    words = {
        name: VariableWords(f"words of {name}", f"measure {name}", None, 1.0, "K") for name in names
    }
    return MeasuredRegion(finding(sense), quantities, missing or {}, inside, words)


def graded(
    region: MeasuredRegion, names: Sequence[str], **settings: float
) -> tuple[Finding, tuple[Grading, ...]]:
    found = grade_finding(region, load_criteria(names), settings)
    return found, found.gradings


# ---- which class -------------------------------------------------------------------------------

SIMILAR = [
    # ANSI/NETA ATS/MTS table 100.18, similar components; between whole kelvins our own rule.
    (0.99, None, ""),
    (1.0, "watch", "1 to 3 K"),
    (3.0, "watch", "1 to 3 K"),
    (3.5, "watch", "1 to 3 K"),
    (4.0, "plan", "4 to 15 K"),
    (15.0, "plan", "4 to 15 K"),
    (15.01, "act", "more than 15 K"),
]
OVER_AIR = [
    # The same table, rise over the ambient air.
    (10.0, "watch", "1 to 10 K"),
    (10.5, "watch", "1 to 10 K"),
    (11.0, "plan", "11 to 20 K"),
    (20.0, "plan", "11 to 20 K"),
    (20.5, "plan", "11 to 20 K"),
    (21.0, "plan", "21 to 40 K"),
    (40.0, "plan", "21 to 40 K"),
    (40.01, "act", "more than 40 K"),
]


@pytest.mark.parametrize(("delta_k", "grade", "label"), SIMILAR)
def test_similar_components(delta_k: float, grade: str | None, label: str) -> None:
    found, (grading,) = graded(
        measured({"like_difference": exact(delta_k)}), ["neta-like-components"]
    )
    assert (found.grade, grading.class_label) == (grade, label)
    assert grading.value == delta_k
    assert grading.chances[grade or "none"] == 1.0
    assert grading.quantity == "difference to lug A, coolest like zone"


@pytest.mark.parametrize(("delta_k", "grade", "label"), OVER_AIR)
def test_rise_over_air(delta_k: float, grade: str, label: str) -> None:
    found, (grading,) = graded(measured({"rise_over_air": exact(delta_k)}), ["neta-rise-over-air"])
    assert (found.grade, grading.class_label) == (grade, label)
    assert grading.quantity == "rise over the air"


def test_a_rise_over_air_is_never_graded_as_a_difference_of_like_components() -> None:
    region = measured(
        {"rise_over_air": exact(18.0), "difference": exact(18.0)},
        missing={"like_difference": ("like",)},
    )
    found, (similar, ambient) = graded(region, ["neta-like-components", "neta-rise-over-air"])
    assert similar.grade is None
    assert similar.missing == ("like",)
    assert similar.value is None
    assert ambient.class_label == "11 to 20 K"
    # 18 K would be "act" on the other column.
    assert found.grade == "plan"


def test_a_hairs_breadth_is_not_rounded_away() -> None:
    # 3.9999999 prints as 4.0 and is not 4.
    _, (grading,) = graded(
        measured({"like_difference": exact(3.9999999)}), ["neta-like-components"]
    )
    assert grading.class_label == "1 to 3 K"
    _, (grading,) = graded(
        measured({"like_difference": exact(15.0000001)}), ["neta-like-components"]
    )
    assert grading.class_label == "more than 15 K"


def test_the_published_wording_is_quoted() -> None:
    _, (grading,) = graded(measured({"like_difference": exact(20.0)}), ["neta-like-components"])
    (worst,) = [each for each in built_in()["neta-like-components"].classes if each.grade == "act"]
    assert grading.class_text == worst.text
    assert grading.title == built_in()["neta-like-components"].title


def test_criteria_of_the_other_sense_are_left_out() -> None:
    found, gradings = graded(
        measured({"like_difference": exact(20.0)}, sense="cold"), ["neta-like-components"]
    )
    assert gradings == ()
    assert found.grade is None
    assert found.criterion is None


# ---- the worst heads the finding ---------------------------------------------------------------


def test_the_worst_grade_heads_the_finding() -> None:
    region = measured(
        {
            "like_difference": exact(3.0),
            "rise_over_air": exact(45.0),
            "difference": exact(3.0),
        }
    )
    found, gradings = graded(
        region, ["neta-like-components", "neta-rise-over-air", "house-difference"]
    )
    assert [each.grade for each in gradings] == ["watch", "act", "watch"]
    assert (found.grade, found.criterion) == ("act", "neta-rise-over-air")
    assert found.grade_probability == 1.0
    assert found.worse_probability == 0.0


def test_gradings_stand_in_the_order_of_the_sheet() -> None:
    region = measured({"like_difference": exact(3.0), "difference": exact(3.0)})
    names = ["house-difference", "neta-like-components"]
    assert [each.criterion for each in graded(region, names)[1]] == names


def test_chances_add_up_and_the_most_probable_is_named() -> None:
    # A normal distribution about 4.5 K with u = 1 K: below 1 K 0.0002, from 4 K on 0.6915
    # (standard normal table at 0.5 and 3.5).
    region = measured({"like_difference": uncertain(4.5, a=1.0)})
    found, (grading,) = graded(region, ["neta-like-components"])
    assert sum(grading.chances.values()) == pytest.approx(1.0)
    assert grading.grade == found.grade == "plan"
    assert grading.chances["plan"] == pytest.approx(0.6915, abs=0.01)
    assert grading.chances["watch"] == pytest.approx(0.3083, abs=0.01)
    assert grading.u == pytest.approx(1.0)
    assert found.grade_probability == grading.chances["plan"]
    assert found.worse_probability == pytest.approx(grading.chances["act"])


def test_the_class_may_differ_from_the_most_probable_grade_and_says_so() -> None:
    # Two of three draws lie below the value's class.
    draws = np.where(np.arange(DRAWS) % 3 == 0, 12.0, 2.0)
    region = measured({"like_difference": Estimate(5.0, {}, draws)})
    _, (grading,) = graded(region, ["neta-like-components"])
    assert grading.grade == "watch"
    assert grading.class_label == "1 to 3 K"
    assert "another class" in grading.note


def test_two_classes_of_one_grade_add_up() -> None:
    # Half of the draws in 11 to 20 K, half in 21 to 40 K: both are "plan".
    draws = np.where(np.arange(DRAWS) % 2 == 0, 15.0, 30.0)
    _, (grading,) = graded(
        measured({"rise_over_air": Estimate(22.0, {}, draws)}), ["neta-rise-over-air"]
    )
    assert grading.chances["plan"] == pytest.approx(1.0)
    assert grading.class_label == "21 to 40 K"


def test_draws_without_a_solution_are_left_out() -> None:
    draws = np.full(DRAWS, 5.0)
    draws[: DRAWS // 4] = np.nan
    _, (grading,) = graded(
        measured({"like_difference": Estimate(5.0, {}, draws)}), ["neta-like-components"]
    )
    assert grading.chances["plan"] == pytest.approx(1.0)


@pytest.mark.parametrize("lost", [0.51, 1.0])
def test_a_quantity_without_a_known_uncertainty_is_not_graded(lost: float) -> None:
    # Neither "act" by the value nor "no deficiency" by the few draws that are left.
    draws = np.full(DRAWS, 0.5)
    draws[: int(lost * DRAWS)] = np.nan
    region = measured({"like_difference": Estimate(30.0, {"a": 1.0}, draws)})
    found, (grading,) = graded(region, ["neta-like-components"])
    assert found.grade is None
    assert grading.grade is None
    assert grading.missing == ("a known uncertainty",)
    assert grading.chances == {}
    assert grading.value is None


def test_the_published_text_of_the_class_is_quoted() -> None:
    for delta_k, place in ((2.0, 0), (9.0, 1), (30.0, 2)):
        _, (grading,) = graded(
            measured({"like_difference": exact(delta_k)}), ["neta-like-components"]
        )
        (criterion,) = load_criteria(["neta-like-components"])
        assert grading.class_text == criterion.classes[place].text
        assert grading.class_label == criterion.classes[place].label


def test_a_scenario_is_graded_by_what_it_has_and_never_heads_the_finding() -> None:
    names = ["neta-like-components", "neta-rise-over-air"]
    region = replace(
        measured({"like_difference": exact(2.0), "rise_over_air": exact(5.0)}),
        scenarios={"full load": {"like_difference": exact(30.0)}},
    )
    found, gradings = graded(region, names)
    assert [(each.scenario, each.criterion, each.grade) for each in gradings] == [
        ("", "neta-like-components", "watch"),
        ("", "neta-rise-over-air", "watch"),
        ("full load", "neta-like-components", "act"),
    ]
    assert found.grade == "watch"


def test_a_dew_point_beyond_the_formula_is_named() -> None:
    # 0.02 % at 0 degC is a vapour pressure of 0.12 Pa; over ice that of -60 degC is 1.08 Pa
    # (ASHRAE Handbook Fundamentals 2017, ch. 1, table 3; from memory).
    region = of_site(exact(-5.0), given("indoor_c", 0.0), given("humidity", 2e-4))
    _, (grading,) = graded(region, ["dew-point"])
    assert grading.grade is None
    assert any("below -60 degC" in each for each in grading.missing)


@pytest.mark.parametrize(
    ("grade", "expected"), [(None, 1.0), ("note", 0.9), ("watch", 0.7), ("plan", 0.4), ("act", 0.0)]
)
def test_chance_of_a_worse_grade(grade: str | None, expected: float) -> None:
    chances = {"note": 0.1, "watch": 0.2, "plan": 0.3, "act": 0.4}
    chosen = next((each for each in GRADES if each == grade), None)
    assert worse_probability(chosen, chances) == pytest.approx(expected)


def test_the_input_that_would_settle_it_is_the_widest() -> None:
    region = measured({"like_difference": uncertain(4.2, small=0.1, wide=1.5)})
    found, (grading,) = graded(region, ["neta-like-components"])
    assert grading.settle == "measure wide"
    assert found.settle == "measure wide"


def test_nothing_to_settle_where_there_is_no_doubt() -> None:
    region = measured({"like_difference": uncertain(9.0, a=0.5)})
    assert graded(region, ["neta-like-components"])[1][0].settle == ""


# ---- what is missing is named, never guessed ---------------------------------------------------


def given(key: str, value: float, origin: Origin = "given", u: float = 0.0) -> Input:
    return Input(key, value, u, origin, "scene", "given")


def of_site(
    extreme: Estimate,
    *inputs: Input,
    difference: Estimate | None = None,
    like: bool = False,
    sense: Sense = "cold",
) -> MeasuredRegion:
    site = Site(SceneInputs({each.key: each for each in inputs}), "the wall")
    quantities, missing, words = quantities_of(extreme, difference, like=like, site=site)
    return MeasuredRegion(finding(sense), quantities, missing, site.inside, words)


INDOORS = (given("air_c", 20.0), given("indoor_c", 20.0), given("outdoor_c", -5.0))
BUILDING = ["iso13788-surface-factor", "dew-point", "surface-humidity"]


def test_missing_inputs_are_named_by_their_keys() -> None:
    _, (factor, dew, humidity) = graded(of_site(exact(12.0)), BUILDING)
    assert set(factor.missing) == {"air_c", "indoor_c", "outdoor_c"}
    assert {"indoor_c", "humidity"} <= set(dew.missing)
    assert {"indoor_c", "humidity"} <= set(humidity.missing)
    assert all(each.grade is None for each in (factor, dew, humidity))


@pytest.mark.parametrize("lacking", ["air_c", "indoor_c", "outdoor_c"])
def test_one_missing_input(lacking: str) -> None:
    region = of_site(exact(12.0), *(each for each in INDOORS if each.key != lacking))
    _, (grading,) = graded(region, ["iso13788-surface-factor"])
    assert grading.missing == (lacking,)
    assert grading.value is None


def test_an_assumed_default_counts_as_missing() -> None:
    region = of_site(exact(12.0), *INDOORS, given("humidity", 0.5, "assumed"))
    _, (factor, dew, _) = graded(region, BUILDING)
    assert factor.missing == ()
    assert dew.missing == ("humidity",)
    assumed_air = of_site(exact(40.0), given("air_c", 20.0, "assumed"), sense="hot")
    _, (rise,) = graded(assumed_air, ["neta-rise-over-air"])
    assert rise.missing == ("air_c",)
    assert rise.grade is None


def test_a_measured_input_is_not_missing() -> None:
    region = of_site(exact(40.0), given("air_c", 20.0, "measured"), sense="hot")
    _, (rise,) = graded(region, ["neta-rise-over-air"])
    assert rise.value == pytest.approx(20.0)


def test_the_absolute_limit_is_not_guessed() -> None:
    region = measured({"surface_c": exact(95.0)})
    found, (grading,) = graded(region, ["absolute-limit"])
    assert grading.missing == ("criteria.settings.absolute_limit_c",)
    assert found.grade is None
    found, (grading,) = graded(region, ["absolute-limit"], absolute_limit_c=90.0)
    assert (found.grade, grading.class_label) == ("act", "above the limit")
    found, (grading,) = graded(region, ["absolute-limit"], absolute_limit_c=100.0)
    assert (found.grade, grading.class_label) == ("watch", "near the limit")


def test_no_reference_no_difference() -> None:
    region = of_site(exact(40.0), difference=None, sense="hot")
    _, (grading,) = graded(region, ["house-difference"])
    assert grading.missing == ("a reference",)


def test_surroundings_are_no_like_component() -> None:
    region = of_site(exact(40.0), difference=exact(20.0), like=False, sense="hot")
    _, (similar, house) = graded(region, ["neta-like-components", "house-difference"])
    assert similar.missing == ("like",)
    assert house.grade == "plan"


# ---- building quantities -----------------------------------------------------------------------


def test_temperature_factor() -> None:
    # 12.6 degC between 20 and -5 degC: fRsi = 17.6/25 = 0.704 (ISO 13788:2012, 3.1; the boundary
    # set of DIN 4108-2).
    region = of_site(exact(12.6), *INDOORS)
    found, (grading,) = graded(region, ["iso13788-surface-factor"])
    assert grading.value == pytest.approx(0.704, abs=5e-4)
    # Below 0.75 (BRE IP 1/06, the default) and above 0.70 (DIN 4108-2).
    assert found.grade == "plan"
    found, (grading,) = graded(region, ["iso13788-surface-factor"], surface_factor_limit=0.70)
    assert found.grade is None
    assert grading.class_label == ""
    assert grading.chances["none"] == 1.0


def test_a_factor_needs_indoors_to_be_warmer() -> None:
    swapped = (given("air_c", 20.0), given("indoor_c", 20.0), given("outdoor_c", 20.0))
    _, (grading,) = graded(of_site(exact(12.6), *swapped), ["iso13788-surface-factor"])
    assert any("above outdoor_c" in each for each in grading.missing)


@pytest.mark.parametrize(
    ("air_c", "humidity", "critical_c", "tolerance_k"),
    [
        # Surface temperature at which the surface humidity is 80 % (ISO 13788:2012, 5.3).
        (20.0, 0.50, 12.6, 0.05),  # published: DIN 4108-2
        (20.0, 0.60, 15.438, 0.02),  # computed with psychrolib 2.5.0
        (21.0, 0.55, 15.044, 0.02),  # computed with psychrolib 2.5.0
        (20.0, 0.65, 16.691, 0.02),  # computed with psychrolib 2.5.0
    ],
)
def test_critical_surface_humidity(
    air_c: float, humidity: float, critical_c: float, tolerance_k: float
) -> None:
    site = (
        given("air_c", air_c),
        given("indoor_c", air_c),
        given("outdoor_c", -5.0),
        given("humidity", humidity),
    )

    def reached(surface_c: float) -> bool:
        return graded(of_site(exact(surface_c), *site), ["surface-humidity"])[0].grade == "plan"

    assert reached(critical_c - tolerance_k)
    assert not reached(critical_c + tolerance_k)


def test_dew_point() -> None:
    # Air of 20 degC and 50 %: dew point 9.3 degC (published with DIN 4108-2; psychrolib 2.5.0).
    site = (*INDOORS, given("humidity", 0.5))
    wet, (grading,) = graded(of_site(exact(9.2), *site), ["dew-point"])
    dry, _ = graded(of_site(exact(9.4), *site), ["dew-point"])
    assert wet.grade == "act"
    assert dry.grade is None
    assert grading.value == pytest.approx(9.2 - 9.3, abs=0.05)


def test_criteria_of_the_inside_do_not_apply_outside() -> None:
    outside = (given("air_c", -4.0), *INDOORS[1:], given("humidity", 0.8))
    region = of_site(exact(-5.0), *outside, difference=exact(-4.0))
    assert region.inside is False
    found, gradings = graded(region, [*BUILDING, "house-difference"])
    assert [each.criterion for each in gradings] == ["house-difference"]
    assert found.grade == "watch"


def test_a_side_that_was_not_told_is_not_guessed() -> None:
    region = of_site(exact(9.0), given("indoor_c", 20.0), given("humidity", 0.5))
    assert region.inside is None
    found, (_, dew, _) = graded(region, BUILDING)
    assert dew.grade is None
    assert set(dew.missing) == {"air_c", "outdoor_c"}
    assert found.grade is None


def test_air_as_near_to_indoors_as_to_outdoors_leaves_the_side_untold() -> None:
    between = (given("air_c", 7.5), *INDOORS[1:])
    _, (grading,) = graded(of_site(exact(9.0), *between), ["iso13788-surface-factor"])
    assert grading.missing == ("side",)


def test_uncertain_inputs_of_the_site_count() -> None:
    site = (
        given("air_c", 20.0),
        given("indoor_c", 20.0, u=1.0),
        given("outdoor_c", -5.0, u=2.0),
    )
    _, (grading,) = graded(of_site(exact(13.75), *site), ["iso13788-surface-factor"])
    # f = 18.75/25 = 0.75; df/dTi = -f/25, df/dTe = (f - 1)/25 (derivatives of the definition).
    assert grading.value == pytest.approx(0.75)
    assert grading.u == pytest.approx(np.hypot(0.75 / 25 * 1.0, 0.25 / 25 * 2.0), rel=0.05)
    assert grading.chances["plan"] == pytest.approx(0.5, abs=0.1)


def test_a_cold_difference_is_graded_by_its_size() -> None:
    region = of_site(exact(12.0), *INDOORS, difference=uncertain(-6.0, a=0.2))
    found, (grading,) = graded(region, ["house-difference"])
    assert grading.value == pytest.approx(6.0)
    assert found.grade == "plan"


# ---- settings and scenarios --------------------------------------------------------------------


def test_settings_of_the_finding_win() -> None:
    region = measured({"surface_c": exact(95.0)})
    own = MeasuredRegion(
        region.finding,
        region.quantities,
        region.missing,
        region.inside,
        region.variables,
        settings={"absolute_limit_c": 120.0},
    )
    found, _ = graded(own, ["absolute-limit"], absolute_limit_c=90.0)
    assert found.grade is None


def test_scenarios_are_graded_but_do_not_head_the_finding() -> None:
    region = measured({"like_difference": exact(3.0)})
    with_load = MeasuredRegion(
        region.finding,
        region.quantities,
        region.missing,
        region.inside,
        region.variables,
        scenarios={"full load": {"like_difference": exact(20.0)}},
    )
    found, gradings = graded(with_load, ["neta-like-components"])
    assert [(each.scenario, each.grade) for each in gradings] == [
        ("", "watch"),
        ("full load", "act"),
    ]
    assert found.grade == "watch"
