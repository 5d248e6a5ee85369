"""The table of surfaces: complete, plausible, found by name, and the same as in the docs.

Run as a program it prints the table for ``docs/surfaces.md``.
"""

import math
import pickle
import tomllib
from dataclasses import FrozenInstanceError
from importlib.resources import files
from pathlib import Path
from typing import get_args

import pytest

from thermo_fix.surfaces import (
    Band,
    Obtained,
    Surface,
    UnknownSurface,
    find_surface,
    load_surfaces,
    search,
)

DOC = Path(__file__).parents[1] / "docs" / "surfaces.md"
SURFACES = load_surfaces()

# Published values that the table is held against. Some rows of the table are copied from the
# same source, where the check only proves the copying; where another author is named it is an
# independent one. "found" and "from memory" as in the data file.
EDE = (
    "Ede, An Introduction to Heat Transfer Principles and Calculations, total hemispherical; found"
)
KATZ = "Katz, Automotive Aerodynamics, Table 11.3; found"
THOME = "Thome, heat transfer course notes (EPFL, 2008); found"
COMPILATION = "unnamed process-engineering compilation, total normal; found"
HOTTEL = "Hottel, in McAdams, Heat Transmission, 3rd ed. 1954; from memory"
INCROPERA = "Incropera et al., Table A.11; from memory"
ASHRAE = "ASHRAE and building literature, sources disagree; from memory"
PRACTICE = "thermography practice, ASTM E1933; from memory"

PUBLISHED_RANGES = [
    ("brick, red", 0.85, 0.95, EDE),
    ("brick, white", 0.80, 0.90, EDE),
    ("glass, window", 0.90, 0.95, EDE),
    ("glass, window", 0.90, 0.95, INCROPERA),
    ("wood, unfinished", 0.80, 0.95, EDE),
    ("wood, planed", 0.80, 0.95, EDE),
    ("wood, planed", 0.82, 0.92, INCROPERA),
    ("paper, white", 0.90, 0.95, EDE),
    ("paper insulation", 0.90, 0.95, EDE),
    ("paint, white", 0.80, 0.95, EDE),
    ("paint, white", 0.89, 0.97, THOME),
    ("paint, black", 0.80, 0.95, EDE),
    ("paint, aluminium", 0.30, 0.70, EDE),
    ("paint, oil-based", 0.92, 0.96, THOME),
    ("lacquer, unspecified", 0.80, 0.95, THOME),
    ("aluminium, polished", 0.04, 0.06, EDE),
    ("aluminium, oxidised", 0.10, 0.20, EDE),
    ("aluminium, heavily oxidised", 0.20, 0.31, COMPILATION),
    ("copper, polished", 0.02, 0.05, EDE),
    ("copper, oxidised", 0.60, 0.70, EDE),
    ("copper, dull", 0.12, 0.15, THOME),
    ("brass, oxidised", 0.46, 0.56, THOME),
    ("steel, polished", 0.07, 0.10, THOME),
    ("steel, oxidised", 0.60, 0.80, EDE),
    ("steel, rough plate", 0.85, 0.95, EDE),
    ("stainless steel, heat-treated", 0.50, 0.70, THOME),
    ("cast iron, bright", 0.20, 0.25, EDE),
    ("cast iron, oxidised", 0.60, 0.70, EDE),
    ("soot", 0.95, 0.98, EDE),
    ("gypsum plasterboard", 0.90, 0.92, INCROPERA),
    ("concrete, rough", 0.88, 0.93, INCROPERA),
    ("asphalt", 0.85, 0.93, INCROPERA),
    ("steel, galvanised weathered", 0.28, 0.88, ASHRAE),
    ("electrical tape, vinyl", 0.93, 0.97, PRACTICE),
]

PUBLISHED_VALUES = [
    ("brick, red", 0.90, KATZ),
    ("brick, red", 0.93, HOTTEL),
    ("glass, window", 0.95, KATZ),
    ("wood, unfinished", 0.90, KATZ),
    ("wood, planed", 0.895, HOTTEL),
    ("paint, black", 0.90, THOME),
    ("concrete, rough", 0.91, KATZ),
    ("asphalt", 0.90, KATZ),
    ("marble", 0.90, KATZ),
    ("aluminium, commercial sheet", 0.09, COMPILATION),
    ("aluminium, anodised", 0.84, COMPILATION),
    ("aluminium, anodised", 0.82, INCROPERA),
    ("aluminium roofing", 0.216, COMPILATION),
    ("aluminium, rough polish", 0.18, COMPILATION),
    ("aluminium, polished", 0.04, INCROPERA),
    ("aluminium foil, bright", 0.07, INCROPERA),
    ("aluminium foil, crumpled", 0.07, INCROPERA),
    ("brass, polished", 0.04, THOME),
    ("brass, dull", 0.22, THOME),
    ("plaster", 0.91, HOTTEL),
    ("gypsum plasterboard", 0.903, HOTTEL),
    ("roofing felt", 0.91, HOTTEL),
    ("steel, galvanised", 0.228, HOTTEL),
    ("steel, galvanised", 0.276, HOTTEL),
    ("porcelain, glazed", 0.924, HOTTEL),
    ("rubber, hard", 0.945, HOTTEL),
    ("rubber, soft grey", 0.859, HOTTEL),
    ("stainless steel, cleaned", 0.22, INCROPERA),
    ("stainless steel, polished", 0.17, INCROPERA),
    ("stainless steel, lightly oxidised", 0.33, INCROPERA),
    ("copper, polished", 0.03, INCROPERA),
    ("copper, oxidised", 0.50, INCROPERA),
    ("copper, oxidised black", 0.78, HOTTEL),
    ("cast iron, bright", 0.21, HOTTEL),
    ("cast iron, rough oxidised", 0.95, HOTTEL),
    ("paint, black optical", 0.98, INCROPERA),
    ("paint, white", 0.90, INCROPERA),
    ("water", 0.96, INCROPERA),
]

EXPECTED_NAMES = """
    brick, red; plaster; concrete, rough; electrical tape, vinyl; paint, oil-based;
    copper, oxidised; copper, polished; plastic, black; glass, window; wood, planed;
    aluminium, anodised; aluminium, polished; aluminium foil, crumpled; steel, oxidised;
    steel, galvanised; roofing felt; gypsum plasterboard; render, cement; wallpaper; pvc, rigid;
    porcelain, glazed; rubber, hard; brass, oxidised; tinned copper; silver-plated contact;
    paint, aluminium; water; ice; snow; soil; asphalt; slate; tile, clay roof; limestone;
    sandstone; granite; mineral wool; carpet; linoleum; fibre cement; enamel, white;
    lacquer, black matt; epoxy, cast; phenolic moulding; paper insulation; human skin
"""


def doc_rows() -> list[str]:
    """Return the lines of the table as the page should show them."""
    rows = [
        "| name | also | emissivity | u | published range | band | at, °C | obtained | source |",
        "|---|---|---|---|---|---|---|---|---|",
    ]
    for s in SURFACES:
        span = "" if s.low is None else f"{s.low:g} to {s.high:g}"
        at = ""
        if s.temperature_c is not None:
            at = " to ".join(f"{t:g}" for t in dict.fromkeys(s.temperature_c))
        source = f"{s.source}. {s.note}" if s.note else s.source
        cells = (
            s.name,
            "; ".join(s.aliases),
            f"{s.emissivity:g}",
            f"{s.u:g} ({s.u_basis})",
            span,
            s.band,
            at,
            s.obtained,
            source,
        )
        rows.append("| " + " | ".join(cells) + " |")
    return rows


def named(surface: Surface) -> str:
    return surface.name


# ---------------------------------------------------------------- the data


def test_the_table_has_a_useful_size() -> None:
    assert 60 <= len(SURFACES) <= 200


def test_no_name_or_alias_is_used_twice() -> None:
    names = [name for surface in SURFACES for name in surface.names]
    assert len(names) == len(set(names))
    # Names that differ only by case, spacing or commas would shadow one another.
    bare = [" ".join(name.lower().replace(",", " ").split()) for name in names]
    assert len(bare) == len(set(bare))


@pytest.mark.parametrize("name", [" ".join(n.split()) for n in EXPECTED_NAMES.split(";")])
def test_the_common_surfaces_are_there(name: str) -> None:
    assert find_surface(name).name == name


@pytest.mark.parametrize("surface", SURFACES, ids=named)
def test_each_entry_is_complete(surface: Surface) -> None:
    for name in surface.names:
        assert name == name.lower().strip() != ""
    assert surface.group
    assert surface.source
    assert surface.band in get_args(Band)
    assert surface.obtained in get_args(Obtained)
    assert isinstance(surface.aliases, tuple)
    assert (surface.low is None) == (surface.high is None)


@pytest.mark.parametrize("surface", SURFACES, ids=named)
def test_each_value_is_plausible(surface: Surface) -> None:
    assert 0 < surface.emissivity < 1
    assert surface.u > 0
    if surface.low is not None and surface.high is not None:
        assert 0 < surface.low <= surface.emissivity <= surface.high < 1
    if surface.temperature_c is not None:
        start, end = surface.temperature_c
        assert -100 <= start <= end <= 1500


@pytest.mark.parametrize("surface", SURFACES, ids=named)
def test_two_standard_uncertainties_stay_physical(surface: Surface) -> None:
    assert surface.emissivity - 2 * surface.u > 0
    assert surface.emissivity + 2 * surface.u <= 1 + 1e-9
    if surface.u > 0.075:  # our own limit for "wide"
        assert surface.note, "a wide uncertainty needs a note"


@pytest.mark.parametrize("surface", SURFACES, ids=named)
def test_the_uncertainty_is_what_its_basis_says(surface: Surface) -> None:
    # Rectangular distribution: JCGM 100:2008, 4.3.7.
    spread = None
    if surface.low is not None and surface.high is not None:
        spread = (surface.high - surface.low) / 2 / math.sqrt(3)
    if surface.u_basis == "spread":
        assert spread is not None
        assert surface.u == pytest.approx(spread, abs=0.00051)
    else:
        assert surface.u_basis == "judged"
        # A judgement may widen a published range but never narrow it.
        assert spread is None or surface.u >= spread


def test_the_data_file_has_no_key_that_the_record_lacks() -> None:
    text = files("thermo_fix").joinpath("data", "surfaces.toml").read_text(encoding="utf-8")
    raw = tomllib.loads(text)
    assert set(raw) == {"surface"}
    assert [row["name"] for row in raw["surface"]] == [surface.name for surface in SURFACES]


# ---------------------------------------------------------------- against published values


@pytest.mark.parametrize(("name", "low", "high", "source"), PUBLISHED_RANGES)
def test_the_value_lies_in_the_published_range(
    name: str, low: float, high: float, source: str
) -> None:
    assert low <= find_surface(name).emissivity <= high, source


@pytest.mark.parametrize(("name", "published", "source"), PUBLISHED_VALUES)
def test_a_single_published_value_lies_within_two_standard_uncertainties(
    name: str, published: float, source: str
) -> None:
    surface = find_surface(name)
    assert abs(surface.emissivity - published) <= 2 * surface.u + 1e-9, source


def test_black_copper_oxide_is_not_the_misprint() -> None:
    # One public extract prints 0.04; textbooks give 0.76 to 0.78 (Hottel in McAdams 1954, from
    # memory).
    assert 0.76 <= find_surface("copper, oxidised black").emissivity <= 0.78
    assert find_surface("copper, oxidised").emissivity > 0.5


def test_bare_metal_is_low_and_oxide_is_higher() -> None:
    # Direction only: an oxide layer raises the emissivity of a metal (any handbook table).
    for metal in ("copper", "aluminium", "brass", "steel"):
        polished = find_surface(f"{metal}, polished")
        assert polished.emissivity < 0.2
        assert find_surface(f"{metal}, oxidised").emissivity > polished.emissivity


# ---------------------------------------------------------------- the functions


@pytest.mark.parametrize(
    "asked", ["brick, red", "Brick, Red", "  brick ,  red ", "brick,red", "brick red"]
)
def test_case_spacing_and_commas_do_not_matter(asked: str) -> None:
    assert find_surface(asked).name == "brick, red"


def test_every_name_and_alias_finds_its_surface() -> None:
    for surface in SURFACES:
        for name in surface.names:
            assert find_surface(name) is surface


def test_an_american_spelling_is_an_alias() -> None:
    assert find_surface("aluminum, anodized").name == "aluminium, anodised"
    assert find_surface("steel, galvanized").name == "steel, galvanised"


@pytest.mark.parametrize(
    ("asked", "expected"),
    [
        ("red brick", "brick, red"),
        ("brik, red", "brick, red"),
        ("oxidised copper", "copper, oxidised"),
        ("copper, oxidzed", "copper, oxidised"),
        ("vinyl tape", "electrical tape, vinyl"),
        ("window", "glass, window"),
        ("galv steel", "steel, galvanised"),
    ],
)
def test_a_near_miss_is_refused_and_the_nearest_name_comes_first(asked: str, expected: str) -> None:
    with pytest.raises(UnknownSurface) as caught:
        find_surface(asked)
    assert caught.value.nearest[0] == expected
    assert f'"{asked}"' in str(caught.value)
    assert f'"{expected}"' in str(caught.value)
    assert "\n" not in str(caught.value)


def test_at_most_three_names_are_suggested() -> None:
    with pytest.raises(UnknownSurface) as caught:
        find_surface("copper")
    assert len(caught.value.nearest) == 3
    assert all("copper" in name for name in caught.value.nearest)


@pytest.mark.parametrize("asked", ["zzz", "", "  ", "0.93"])
def test_nothing_is_suggested_where_nothing_is_near(asked: str) -> None:
    with pytest.raises(UnknownSurface, match="none in the table is near") as caught:
        find_surface(asked)
    assert caught.value.nearest == ()


def test_unknown_surface_is_a_lookup_error_and_survives_pickling() -> None:
    error = UnknownSurface("red brick", ("brick, red",))
    assert isinstance(error, LookupError)
    copy = pickle.loads(pickle.dumps(error))
    assert (copy.name, copy.nearest, str(copy)) == (error.name, error.nearest, str(error))


def test_search_needs_every_word_and_takes_parts_of_words() -> None:
    found = [surface.name for surface in search("Oxid copper")]
    assert found == ["copper, oxidised", "copper, oxidised black"]
    assert {surface.group for surface in search("masonry")} == {"masonry"}
    assert search("unobtainium") == ()
    assert search("") == SURFACES


def test_low_emissivity_starts_below_its_limit() -> None:
    # Limit 0.6: the product's own caution; common practice, no source.
    def at(emissivity: float) -> Surface:
        return Surface("x", "metal", emissivity, 0.01, "judged", "8-14 um", "test", "found")

    assert at(0.599).is_low_emissivity
    assert not at(0.6).is_low_emissivity
    assert find_surface("copper, polished").is_low_emissivity
    assert not find_surface("brick, red").is_low_emissivity


def test_the_table_is_loaded_once_and_cannot_be_changed() -> None:
    assert load_surfaces() is load_surfaces()
    with pytest.raises(FrozenInstanceError):
        SURFACES[0].emissivity = 0.5  # type: ignore[misc]


# ---------------------------------------------------------------- the page


def test_the_page_shows_the_table_as_it_is() -> None:
    shown = [line for line in DOC.read_text(encoding="utf-8").splitlines() if line[:1] == "|"]
    names = [line.split("|")[1].strip() for line in shown[2:]]
    assert names == [surface.name for surface in SURFACES]
    assert shown == doc_rows()


if __name__ == "__main__":
    print("\n".join(doc_rows()))
