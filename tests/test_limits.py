"""The table of limits against published values, and how a name is found."""

import pytest

from thermo_fix.limits import UnknownLimit, all_limits, find_limit, stated_limit

# IEC 60034-1, temperature-rise limits, resistance method, 40 degC coolant (found in a motor
# maker's manual that attributes the table so), K.
IEC_60034_1 = {"B": 80.0, "F": 105.0, "H": 125.0}
# NEMA MG 1 (found in two public extracts): rises in K, class maxima in degC.
NEMA_SF_1_0 = {"A": 60.0, "B": 80.0, "F": 105.0, "H": 125.0}
NEMA_SF_1_15 = {"A": 70.0, "B": 90.0, "F": 115.0}
NEMA_CLASS_MAXIMUM = {"A": 105.0, "B": 130.0, "F": 155.0, "H": 180.0}


@pytest.mark.parametrize(("letter", "rise_k"), [*IEC_60034_1.items(), *NEMA_SF_1_0.items()])
def test_winding_rises(letter: str, rise_k: float) -> None:
    limit = find_limit(f"winding rise, class {letter}")
    assert (limit.rise_k, limit.temperature_c) == (rise_k, None)
    assert limit.obtained == "found"


@pytest.mark.parametrize(("letter", "rise_k"), NEMA_SF_1_15.items())
def test_winding_rises_with_a_service_factor(letter: str, rise_k: float) -> None:
    assert find_limit(f"winding rise, class {letter}, service factor 1.15").rise_k == rise_k


@pytest.mark.parametrize(("letter", "temperature_c"), NEMA_CLASS_MAXIMUM.items())
def test_insulation_classes(letter: str, temperature_c: float) -> None:
    assert find_limit(f"insulation class {letter}").temperature_c == temperature_c


def test_a_rise_keeps_below_its_class() -> None:
    # 40 degC of coolant, the rise and an allowance for the hot spot make the class (NEMA MG 1).
    for letter in IEC_60034_1:
        rise = find_limit(f"winding rise, class {letter}")
        top = find_limit(f"insulation class {letter}")
        assert rise.rise_k is not None
        assert top.temperature_c is not None
        assert 5.0 <= top.temperature_c - 40.0 - rise.rise_k <= 15.0


def test_conductors_by_the_number_in_their_name() -> None:
    # NFPA 70, table 310.16, and 110.14(C), from memory; the name says the number.
    for group in ("conductor insulation", "termination"):
        for degrees in (60, 75, 90):
            limit = find_limit(f"{group} {degrees}")
            assert limit.temperature_c == degrees
            assert limit.obtained == "from memory"


def test_every_limit_is_complete() -> None:
    names: list[str] = []
    for name, limit in all_limits().items():
        assert (limit.temperature_c is None) != (limit.rise_k is None), name
        assert limit.source
        assert limit.of
        assert limit.obtained in ("found", "from memory")
        value = limit.temperature_c if limit.rise_k is None else limit.rise_k
        assert value is not None
        assert 20.0 <= value <= 250.0
        names += [each.casefold() for each in limit.names]
    assert len(names) == len(set(names))


@pytest.mark.parametrize(
    "written",
    ["Conductor  Insulation 90", "conductor insulation, 90", "cable insulation, XLPE 90"],
)
def test_case_spacing_commas_and_aliases(written: str) -> None:
    assert find_limit(written).name == "conductor insulation 90"


def test_an_unknown_name_gets_the_nearest() -> None:
    with pytest.raises(UnknownLimit, match=r'unknown limit "conductor iso.*"conductor in'):
        find_limit("conductor isolation 75")
    with pytest.raises(UnknownLimit, match="as a number in degC"):
        find_limit("zzzz")


def test_a_stated_number() -> None:
    limit = stated_limit(85.0)
    assert limit.temperature_c == 85.0
    assert limit.rise_k is None
