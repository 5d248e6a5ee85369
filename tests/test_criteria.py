"""Criteria: the class edges of what is published, and files of a survey's own.

The limits of the two NETA columns: ANSI/NETA ATS/MTS table 100.18, found in a public excerpt of the
2003 edition. The assignment of values between its printed whole kelvins is our own rule, printed
with the criterion.
"""

import copy
import tomllib
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import tomlkit
from hypothesis import given, settings
from hypothesis import strategies as st

from thermo_fix.criteria import DEFAULT_USE, Criterion, built_in, load_criteria, parse_criteria
from thermo_fix.errors import SheetError
from thermo_fix.records import GRADES

OWN = """\
[[criterion]]
id = "works-rule"
title = "Rule of the works"
source = "house rule"
quantity = "difference"
unit = "K"
senses = ["hot"]
gaps = "A class begins at its lower limit."
[criterion.settings]
first_k = { default = 3.0, meaning = "difference from which to watch, K" }
extra_k = { meaning = "what is added, K" }
[[criterion.class]]
at_least = "first_k"
label = "warm"
text = "Warm"
grade = "watch"
[[criterion.class]]
above = "first_k"
plus = "extra_k"
label = "hot"
text = "Hot"
grade = "act"
"""


def label(name: str, value: float, **given: float) -> str | None:
    criterion = built_in()[name]
    values, unset = criterion.values_of_settings(given)
    assert unset == ()
    index = int(criterion.classify(np.array([value]), values)[0])
    return None if index < 0 else criterion.classes[index].label


@pytest.mark.parametrize(
    ("delta_k", "expected"),
    [
        (-5.0, None),
        (0.0, None),
        (0.99, None),
        (1.0, "1 to 3 K"),
        (3.0, "1 to 3 K"),
        (3.5, "1 to 3 K"),
        (3.9999, "1 to 3 K"),
        (4.0, "4 to 15 K"),
        (15.0, "4 to 15 K"),
        (15.01, "more than 15 K"),
        (200.0, "more than 15 K"),
    ],
)
def test_neta_similar_components(delta_k: float, expected: str | None) -> None:
    assert label("neta-like-components", delta_k) == expected


@pytest.mark.parametrize(
    ("delta_k", "expected"),
    [
        (0.99, None),
        (1.0, "1 to 10 K"),
        (10.0, "1 to 10 K"),
        (10.5, "1 to 10 K"),
        (10.9999, "1 to 10 K"),
        (11.0, "11 to 20 K"),
        (20.0, "11 to 20 K"),
        (20.5, "11 to 20 K"),
        (20.9999, "11 to 20 K"),
        (21.0, "21 to 40 K"),
        (40.0, "21 to 40 K"),
        (40.01, "more than 40 K"),
    ],
)
def test_neta_rise_over_air(delta_k: float, expected: str | None) -> None:
    assert label("neta-rise-over-air", delta_k) == expected


def test_neta_grades_rise_with_the_class() -> None:
    assert [each.grade for each in built_in()["neta-like-components"].classes] == [
        "watch",
        "plan",
        "act",
    ]
    assert [each.grade for each in built_in()["neta-rise-over-air"].classes] == [
        "watch",
        "plan",
        "plan",
        "act",
    ]


def test_neta_columns_compare_different_quantities() -> None:
    # The over-ambient column has a class (21 to 40 K) that the other lacks.
    similar, ambient = built_in()["neta-like-components"], built_in()["neta-rise-over-air"]
    assert similar.quantity == "like_difference"
    assert ambient.quantity == "rise_over_air"
    assert len(similar.classes) == 3
    assert len(ambient.classes) == 4
    assert similar.senses == ambient.senses == ("hot",)


@pytest.mark.parametrize(
    ("limit", "source"),
    [
        (None, "the default, 0.75: BRE IP 1/06, United Kingdom dwellings"),
        (0.70, "DIN 4108-2"),
        (0.65, "Netherlands"),
    ],
)
def test_surface_factor_limits(limit: float | None, source: str) -> None:
    given = {} if limit is None else {"surface_factor_limit": limit}
    value = 0.75 if limit is None else limit
    assert label("iso13788-surface-factor", value, **given) is None, source
    assert label("iso13788-surface-factor", value - 1e-9, **given) == "below the limit", source
    assert label("iso13788-surface-factor", 1.0, **given) is None


@pytest.mark.parametrize(
    ("margin_k", "expected"),
    [(0.01, None), (0.0, "at or below the dew point"), (-3.0, "at or below the dew point")],
)
def test_dew_point(margin_k: float, expected: str | None) -> None:
    # ISO 13788:2012, 5.3: condensation at 100 % surface humidity.
    assert label("dew-point", margin_k) == expected


@pytest.mark.parametrize(("share", "reached"), [(0.7999, False), (0.80, True), (1.2, True)])
def test_surface_humidity(share: float, reached: bool) -> None:
    # 80 %: ISO 13788:2012, 5.3, critical surface humidity.
    assert (label("surface-humidity", share) is not None) is reached


@pytest.mark.parametrize(
    ("celsius", "given", "expected"),
    [
        (79.99, {}, None),
        (80.0, {}, None),  # exactly 10 K below the limit is not within
        (80.01, {}, "near the limit"),
        (90.0, {}, "near the limit"),
        (90.01, {}, "above the limit"),
        (85.0, {"absolute_margin_k": 5.0}, None),
        (85.01, {"absolute_margin_k": 5.0}, "near the limit"),
    ],
)
def test_absolute_limit(celsius: float, given: dict[str, float], expected: str | None) -> None:
    # The margin of 10 K: common practice, no source.
    assert label("absolute-limit", celsius, absolute_limit_c=90.0, **given) == expected


def test_absolute_limit_is_not_guessed() -> None:
    values, unset = built_in()["absolute-limit"].values_of_settings({})
    assert unset == ("absolute_limit_c",)
    assert values == {"absolute_margin_k": 10.0}


@pytest.mark.parametrize(
    ("delta_k", "expected"),
    [(0.0, "small"), (1.99, "small"), (2.0, "clear"), (4.99, "clear"), (5.0, "large")],
)
def test_house_rule(delta_k: float, expected: str) -> None:
    # Common practice, no source.
    assert label("house-difference", delta_k) == expected


def test_house_rule_with_limits_of_the_sheet() -> None:
    assert label("house-difference", 2.5, house_watch_k=3.0) == "small"
    assert label("house-difference", 3.0, house_watch_k=3.0) == "clear"


def test_missing_values_belong_to_no_class() -> None:
    for criterion in built_in().values():
        values, _ = criterion.values_of_settings({"absolute_limit_c": 90.0})
        classes = criterion.classify(np.array([np.nan, np.nan]), values)
        assert classes.tolist() == [-1, -1], criterion.id


def test_shape_is_kept() -> None:
    criterion = built_in()["neta-like-components"]
    assert criterion.classify(np.full((2, 3), 5.0), {}).tolist() == [[1, 1, 1], [1, 1, 1]]


def test_built_in_criteria_are_complete() -> None:
    for name, criterion in built_in().items():
        assert name == criterion.id
        assert criterion.title
        assert criterion.source
        assert criterion.gaps
        grades = [GRADES.index(each.grade) for each in criterion.classes]
        assert grades == sorted(grades), "from mildest to worst"
        assert len({each.label for each in criterion.classes}) == len(criterion.classes)
    for names in DEFAULT_USE.values():
        assert set(names) <= set(built_in())


# ---- a file of the survey's own ----------------------------------------------------------------


def written(folder: Path, text: str) -> Path:
    file = folder / "rules.toml"
    file.write_text(text, encoding="utf-8")
    return file


def test_a_file_of_the_surveys_own(tmp_path: Path) -> None:
    chosen = load_criteria(["works-rule", "dew-point"], written(tmp_path, OWN))
    assert [each.id for each in chosen] == ["works-rule", "dew-point"]
    rule = chosen[0]
    values, unset = rule.values_of_settings({})
    assert (values, unset) == ({"first_k": 3.0}, ("extra_k",))
    values, unset = rule.values_of_settings({"extra_k": 4.0, "first_k": 2.0, "unknown": 1.0})
    assert (values, unset) == ({"first_k": 2.0, "extra_k": 4.0}, ())
    assert rule.classify(np.array([1.9, 2.0, 6.0, 6.1]), values).tolist() == [-1, 0, 0, 1]


def test_its_criteria_win_over_built_in_ones(tmp_path: Path) -> None:
    file = written(tmp_path, OWN.replace("works-rule", "house-difference"))
    assert load_criteria(["house-difference"], file)[0].title == "Rule of the works"
    assert load_criteria(["house-difference"])[0].title != "Rule of the works"


def one_line(error: pytest.ExceptionInfo[SheetError]) -> str:
    (line,) = error.value.problems
    assert "\n" not in line
    return line


def test_an_unknown_name_names_the_nearest() -> None:
    with pytest.raises(SheetError) as error:
        load_criteria(["neta-like-component"])
    assert '"neta-like-component"' in one_line(error)
    assert 'nearest: "neta-like-components"' in one_line(error)


def test_a_file_that_is_not_there(tmp_path: Path) -> None:
    with pytest.raises(SheetError) as error:
        load_criteria(["dew-point"], tmp_path / "none.toml")
    assert one_line(error).startswith("none.toml: cannot be read")


def test_a_file_that_is_no_utf8(tmp_path: Path) -> None:
    file = tmp_path / "rules.toml"
    file.write_bytes(OWN.replace("Warm", "Wärme").encode("latin-1"))
    with pytest.raises(SheetError) as error:
        load_criteria(["works-rule"], file)
    assert "UTF-8" in one_line(error)


@pytest.mark.parametrize(
    ("old", "new", "says"),
    [
        ('id = "works-rule"', "id = ", "not valid TOML"),
        ('id = "works-rule"', "id = 4", "id must be a text"),
        ('id = "works-rule"', 'id = " "', "id must be a text"),
        ('title = "Rule of the works"\n', "", "title must be a text"),
        ('source = "house rule"\n', "", "source must be a text"),
        ('source = "house rule"', 'sauce = "house rule"', 'nearest known key: "source"'),
        ('"difference"', '"differnce"', "quantity = 'differnce' is not one of"),
        ('["hot"]', '["warm"]', 'senses must be a list of "hot" and "cold"'),
        ('["hot"]', "[]", "senses must be a list"),
        ('["hot"]', '"hot"', "senses must be a list"),
        ('["hot"]', "[[1]]", "senses must be a list"),
        ('unit = "K"', 'unit = "K"\nside = "outside"', "side = 'outside'"),
        ('at_least = "first_k"\n', "", "each class needs one of"),
        ('at_least = "first_k"', "at_least = 1.0\nbelow = 3.0", "each class needs one of"),
        ('at_least = "first_k"', "at_least = true", "must be a number or a setting"),
        ('at_least = "first_k"', "at_least = [1]", "must be a number or a setting"),
        ('at_least = "first_k"', "at_least = nan", "must be a number or a setting"),
        ('at_least = "first_k"', 'at_least = "second_k"', 'setting "second_k"'),
        ('plus = "extra_k"', 'plus = "-other_k"', 'setting "-other_k"'),
        ('plus = "extra_k"', "plus = 2.0", "plus"),
        ('grade = "act"', 'grade = "alarm"', "grade = 'alarm' is not one of note, watch"),
        ('text = "Hot"\n', "", "text must be a text"),
        ('label = "hot"', 'lable = "hot"', 'nearest known key: "label"'),
        ("default = 3.0", 'default = "3"', "default"),
        ("default = 3.0", "default = inf", "default"),
        ("default = 3.0", "defualt = 3.0", "defualt"),
        ('{ meaning = "what is added, K" }', "4.0", "extra_k"),
        ("[criterion.settings]", "[other]", "nothing else"),
        ("[[criterion]]", "[criterion]", "[[criterion]]"),
    ],
)
def test_a_bad_file_is_one_clear_line(tmp_path: Path, old: str, new: str, says: str) -> None:
    assert old in OWN
    with pytest.raises(SheetError) as error:
        load_criteria(["dew-point"], written(tmp_path, OWN.replace(old, new)))
    line = one_line(error)
    assert line.startswith("rules.toml: ")
    assert says in line


def test_an_id_that_stands_twice() -> None:
    with pytest.raises(SheetError) as error:
        parse_criteria(OWN + OWN, "rules.toml")
    assert 'the id "works-rule" stands twice' in one_line(error)


@pytest.mark.parametrize("text", ["", "criterion = []", "criterion = 3", "criterion = [3]"])
def test_a_file_without_criteria(text: str) -> None:
    with pytest.raises(SheetError) as error:
        parse_criteria(text, "rules.toml")
    assert one_line(error).startswith("rules.toml: ")


def places(value: Any, path: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    inner: list[tuple[Any, Any]] = []
    if isinstance(value, dict):
        inner = list(value.items())
    elif isinstance(value, list):
        inner = list(enumerate(value))
    return [path, *(place for key, each in inner for place in places(each, (*path, key)))][
        0 if path else 1 :
    ]


DOCUMENT = tomllib.loads(OWN)
odd = st.one_of(
    st.integers(-5, 5),
    st.booleans(),
    st.floats(allow_nan=True),
    st.sampled_from(["", "hot", "first_k", "inside", "-extra_k"]),
    st.lists(st.integers(0, 3), max_size=2),
    st.dictionaries(st.sampled_from(["a", "meaning", "grade"]), st.integers(0, 3), max_size=2),
)


@settings(max_examples=200, deadline=None)
@given(place=st.sampled_from(places(DOCUMENT)), value=odd)
def test_whatever_stands_there_is_read_or_refused_in_one_line(
    place: tuple[Any, ...], value: Any
) -> None:
    document = copy.deepcopy(DOCUMENT)
    inner: Any = document
    for key in place[:-1]:
        inner = inner[key]
    inner[place[-1]] = value
    try:
        parsed = parse_criteria(tomlkit.dumps(document), "rules.toml")
    except SheetError as error:
        (line,) = error.problems
        assert line.startswith("rules.toml: ")
        assert "\n" not in line
    else:
        usable(parsed[0])


def usable(criterion: Criterion) -> None:
    values, _ = criterion.values_of_settings({"first_k": 3.0, "extra_k": 1.0})
    assert criterion.classify(np.array([0.0, 5.0]), values).shape == (2,)
