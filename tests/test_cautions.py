"""The catalogue of cautions: each entry is set off by a small survey and reaches all results.

What set an entry off is known because its function is listened to during the run.
"""

import html
import json
import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from tests.survey_folders import SHAPE, picture, write_image
from thermo_fix import cautions, run_survey
from thermo_fix.cautions import CATALOGUE, Caution
from thermo_fix.cli import main
from thermo_fix.records import SurveyResult
from thermo_fix.survey import RunOptions

DOCS = Path(__file__).parent.parent / "docs" / "cautions.md"
OPTIONS = RunOptions(jobs=1, planes=False, pictures=False)
Image = NDArray[np.float32]

TOLD = """\
[camera]
pixel = "celsius"
noise_k = 0.05
recorded = { emissivity = 1.0, reflected_c = 20.0, air_c = 20.0, transmittance = 1.0 }
[scene]
emissivity = 0.9
reflected_c = 20.0
air_c = 20.0
humidity = 0.5
distance_m = 2.0
view_angle_deg = 0.0
"""
"""A sheet that leaves nothing to assume."""


@dataclass(frozen=True)
class Case:
    sheet: str | None
    images: Mapping[str, Image]
    sets_off: tuple[str, ...] = field(default=())


def spot(
    by_k: float, place: tuple[slice, slice] = np.s_[20:30, 30:42], level: float = 20.0
) -> Image:
    image = picture(level, 0.0)
    image[place] += by_k
    return image


def peak(height_k: float = 6.0) -> Image:
    """A spot with a round top at (x, y) = (36, 25)."""
    rows, columns = np.mgrid[: SHAPE[0], : SHAPE[1]]
    distance = (rows - 25.0) ** 2 + (columns - 36.0) ** 2
    image = picture(20.0, 0.0)
    image += height_k * np.exp(-distance / 32.0)
    return image


def with_defect(image: Image) -> Image:
    image[25, 36] += 5.0
    return image


def with_blank(image: Image) -> Image:
    image[:3, :4] = np.nan
    return image


def changed(sheet: str, **keys: str) -> str:
    """The sheet with other values in the lines of the keys."""
    for key, value in keys.items():
        sheet, count = re.subn(rf"^{key} = .*$", f"{key} = {value}", sheet, flags=re.MULTILINE)
        assert count == 1, key
    return sheet


def zone(name: str, x: int, more: str) -> str:
    corners = [[x, 10], [x + 16, 10], [x + 16, 50], [x, 50]]
    return f'[[image.zone]]\nname = "{name}"\npolygon = {corners}\n{more}\n'


def lugs(*warm_k: float) -> Image:
    image = picture(20.0, 0.0)
    for place, by_k in enumerate(warm_k):
        x = 8 + 24 * place
        image[25:35, x + 3 : x + 13] += by_k
    return image


ELECTRICAL = '[survey]\npurpose = "electrical"\n' + TOLD + '[[image]]\nfile = "a.tif"\n'
WALL = 'side = "{side}"\nindoor_c = {indoor}\noutdoor_c = {outdoor}\nwind_m_s = {wind}\n'


def wall(side: str, indoor: float, outdoor: float, wind: float = 1.0) -> str:
    told = WALL.format(side=side, indoor=indoor, outdoor=outdoor, wind=wind)
    return '[survey]\npurpose = "building"\n' + TOLD + told


CASES = {
    "nothing told": Case(None, {"a.tif": spot(6.0)}, ("assumed-inputs", "inferred-encoding")),
    "shiny": Case(
        changed(TOLD, emissivity="{ value = 0.5, u = 0.02 }", reflected_c="29.0"),
        {"a.tif": spot(9.0)},
        ("low-emissivity", "near-reflected"),
    ),
    "near black": Case(
        changed(TOLD, emissivity="{ value = 0.98, u = 0.02 }"), {"a.tif": spot(6.0)}, ("bounded",)
    ),
    "seen from the side": Case(
        changed(TOLD, view_angle_deg="70.0"), {"a.tif": spot(6.0)}, ("steep-view",)
    ),
    "far": Case(changed(TOLD, distance_m="400.0"), {"a.tif": spot(6.0)}, ("stretched-air",)),
    "blank": Case(
        changed(TOLD, emissivity="{ value = 0.1, u = 0.02 }"),
        {"a.tif": with_blank(spot(-25.0))},
        ("no-reading", "unsolved"),
    ),
    "very hot": Case(
        changed(TOLD, emissivity="{ value = 0.5, u = 0.02 }"),
        {"a.tif": spot(1500.0)},
        ("unknown-uncertainty", "beyond-band-tables", "no-difference-uncertainty"),
    ),
    "mid-wave": Case(
        TOLD.replace("[scene]", "band_um = [3.0, 5.0]\n[scene]"),
        {"a.tif": spot(6.0)},
        ("not-long-wave",),
    ),
    "under the sky": Case(
        changed(TOLD, reflected_c="{ sky = { cloud = 0.2, tilt_deg = 90, ground_c = 5.0 } }"),
        {"a.tif": spot(6.0)},
        ("computed-reflected",),
    ),
    "over the range": Case(
        TOLD,
        {"a.tif": np.minimum(spot(6.0), np.float32(24.0))},
        ("saturated", "saturated-extreme"),
    ),
    "defective": Case(
        TOLD, {"a.tif": with_defect(peak())}, ("defective-pixels", "defective-extreme")
    ),
    "small and at the edge": Case(
        TOLD,
        {"a.tif": spot(6.0, np.s_[0:12, 30:42]), "b.tif": spot(9.0, np.s_[30:33, 40:43])},
        ("cut-by-frame", "too-small", "shape-no-proof", "shape-cut"),
    ),
    "hardly known": Case(
        changed(TOLD, emissivity="{ value = 0.2, u = 0.05 }", reflected_c="{ value = 20, u = 6 }"),
        {"a.tif": spot(-4.0)},
        ("lost-draws", "not-linear"),
    ),
    # Of the draws of a transmittance near 1 most are smaller, and the warm air then accounts for
    # more than was seen.
    "not known": Case(
        changed(
            TOLD,
            emissivity="{ value = 0.05, u = 0.02 }",
            reflected_c="{ value = 20, u = 9 }",
            air_c="40.0",
            distance_m="2.0\ntransmittance = { value = 0.999, u = 0.1 }",
        )
        + '[radiation]\nmodel = "band"\n',
        {"a.tif": spot(-2.0)},
        ("no-uncertainty",),
    ),
    "uneven": Case(
        TOLD.replace("[scene]", "nonuniformity_k = 2.0\n[scene]"),
        {"a.tif": spot(2.5)},
        ("inside-noise",),
    ),
    "loads": Case(
        ELECTRICAL
        + zone("lug A", 8, 'load_a = 10\nrated_a = 100\nlimit = "conductor insulation 70"')
        + zone("lug B", 32, "load_a = 120\nrated_a = 100")
        + zone("lug C", 56, "load_a = 0\nrated_a = 100"),
        {"a.tif": lugs(12.0, 9.0, 6.0)},
        (
            "energised",
            "screening",
            "emissivity",
            "low-load",
            "overload",
            "heat-without-current",
            "far-from-load",
            "hotter-inside",
            "limit-from-memory",
        ),
    ),
    "wall inside": Case(
        wall("inside", 21.0, 3.0),
        {"a.tif": spot(-5.0, level=19.0)},
        ("indication", "one-moment", "surface-resistance", "not-only-conduction", "not-steady"),
    ),
    "wall outside": Case(
        wall("outside", 24.0, 20.0, wind=4.0),
        {"a.tif": spot(5.0)},
        ("seen-from-outside", "windy", "small-difference"),
    ),
    "cooled room": Case(wall("inside", 20.0, 33.0), {"a.tif": spot(5.0)}, ("indoors-colder",)),
}

CASE_OF = {code: name for name, case in CASES.items() for code in case.sets_off}


@dataclass(frozen=True)
class Run:
    result: SurveyResult
    content: dict[str, Any]
    report: str
    said: Mapping[str, set[str]]
    """What was said during the run, by code."""


def texts_of(code: str) -> tuple[str, Caution]:
    """Name in the module of the function behind a code, and its entry."""
    entry = CATALOGUE[code]
    for name, value in vars(cautions).items():
        if value is entry.text:
            return name, entry
    return "", entry


def listening(text: Callable[..., str], heard: set[str]) -> Callable[..., str]:
    def say(*numbers: Any) -> str:
        words = text(*numbers)
        heard.add(words)
        return words

    return say


def run_of(case: Case, folder: Path) -> Run:
    for name, image in case.images.items():
        write_image(folder / name, image)
    if case.sheet is not None:
        (folder / "survey.toml").write_text(case.sheet, encoding="utf-8")
    said: dict[str, set[str]] = {}
    with pytest.MonkeyPatch.context() as patch:
        for code in CATALOGUE:
            name, entry = texts_of(code)
            said[code] = set()
            if name:
                patch.setattr(cautions, name, listening(entry.text, said[code]))
            else:
                said[code].add(entry.text())
        result = run_survey(folder, options=OPTIONS)
    out = folder / "results"
    pages = " ".join(path.read_text("utf-8") for path in sorted(out.rglob("*.html")))
    content = json.loads((out / "findings.json").read_text("utf-8"))
    return Run(result, content, html.unescape(pages), said)


@pytest.fixture(scope="module")
def runs(tmp_path_factory: pytest.TempPathFactory) -> Callable[[str], Run]:
    done: dict[str, Run] = {}

    def run(name: str) -> Run:
        if name not in done:
            done[name] = run_of(CASES[name], tmp_path_factory.mktemp("survey"))
        return done[name]

    return run


def in_records(result: SurveyResult) -> set[str]:
    return {
        *result.cautions,
        *(text for image in result.images for text in image.every_caution),
        *(text for finding in result.findings for text in finding.every_caution),
    }


def in_json(content: Any) -> set[str]:
    """Everything that stands in a list called cautions, wherever it is."""
    if isinstance(content, dict):
        own = set(content.get("cautions", ()))
        return own.union(*(in_json(each) for each in content.values()))
    if isinstance(content, list):
        return set().union(*(in_json(each) for each in content))
    return set()


# ---- the catalogue -----------------------------------------------------------------------------


def test_codes_are_codes_and_each_says_when() -> None:
    assert len(CATALOGUE) >= 40
    for code, entry in CATALOGUE.items():
        assert entry.code == code
        assert re.fullmatch(r"[a-z]+(-[a-z]+)*", code)
        assert 3 < len(entry.when) < 90
        assert not entry.when.endswith(".")


def test_a_code_is_given_once() -> None:
    with pytest.raises(ValueError, match="low-load"):
        cautions._caution("low-load")(lambda: "again")


def test_every_text_of_the_module_is_in_the_catalogue() -> None:
    functions = {
        name
        for name, value in vars(cautions).items()
        if callable(value) and value.__module__ == cautions.__name__ and name.islower()
    }
    entered = {texts_of(code)[0] for code in CATALOGUE}
    assert functions - entered - {"_caution", "_standing", "_enter", "general"} == set()
    standing = {
        value for name, value in vars(cautions).items() if name.isupper() and isinstance(value, str)
    }
    assert standing == {entry.text() for code, entry in CATALOGUE.items() if not texts_of(code)[0]}


def test_the_documentation_lists_every_code_and_no_other() -> None:
    listed = re.findall(r"^\| `([a-z-]+)` \|", DOCS.read_text("utf-8"), re.MULTILINE)
    assert sorted(listed) == sorted(CATALOGUE)


def test_every_entry_has_a_case() -> None:
    assert sorted(CASE_OF) == sorted(CATALOGUE)


# ---- each of them, from the images to the report ----------------------------------------------


@pytest.mark.parametrize("code", CATALOGUE)
def test_it_reaches_records_json_and_report(code: str, runs: Callable[[str], Run]) -> None:
    run = runs(CASE_OF[code])
    assert run.result.failed == ()
    texts = run.said[code]
    assert texts
    # A text may be withdrawn by a stage; at least one must arrive, the same everywhere.
    arrived = texts & in_records(run.result)
    assert arrived
    assert arrived <= in_json(run.content)
    for text in arrived:
        assert " ".join(text.split()) in " ".join(run.report.split())
        assert text.endswith(".")
        assert "nan" not in text.split()
        assert "None" not in text


def test_a_sheet_that_tells_everything_leaves_a_sound_image_without_cautions(
    tmp_path: Path,
) -> None:
    run = run_of(Case(TOLD, {"a.tif": spot(6.0)}), tmp_path)
    (image,) = run.result.images
    (finding,) = run.result.findings
    assert image.cautions == ()
    assert finding.cautions == ()


# ---- what they say ----------------------------------------------------------------------------


def test_assumed_inputs_are_named(runs: Callable[[str], Run]) -> None:
    (image,) = runs("nothing told").result.images
    (text,) = (each for each in image.cautions if each.startswith("Assumed"))
    for key in ("emissivity", "reflected_c", "air_c", "humidity", "distance_m", "view_angle_deg"):
        assert key in text
    assert "camera.recorded" in text
    assert "band_um" not in text  # of no weight with the total model


def test_an_assumed_band_is_named_where_it_counts(tmp_path: Path) -> None:
    run = run_of(Case(TOLD + '[radiation]\nmodel = "band"\n', {"a.tif": spot(6.0)}), tmp_path)
    (image,) = run.result.images
    assert image.cautions == (cautions.assumed_inputs(("camera.band_um",)),)


def test_blank_pixels_and_unsolved_pixels_are_told_apart(runs: Callable[[str], Run]) -> None:
    run = runs("blank")
    (image,) = run.result.images
    # 3 x 4 pixels are blank; 10 x 12 lie 25 K below what a surface of emissivity 0.1 among
    # surroundings at 20 degC can send.
    assert cautions.no_reading(12) in image.cautions
    assert cautions.unsolved(120) in image.cautions
    assert image.unsolved_px == 120


def test_an_unknown_uncertainty_is_null_and_grades_nothing(runs: Callable[[str], Run]) -> None:
    for name in ("very hot", "not known"):
        run = runs(name)
        finding = run.content["findings"][0]
        assert finding["u_extreme_k"] is None
        assert finding["u_delta_k"] is None
        assert finding["interval95_c"] is None
        assert finding["grade"] is None
        assert finding["gradings"]
        for grading in finding["gradings"]:
            assert grading["grade"] is None
            assert grading["chances"] == {}


def test_a_defective_pixel_does_not_make_the_extreme(runs: Callable[[str], Run]) -> None:
    (finding,) = runs("defective").result.findings
    x, y = finding.extreme_px
    assert abs(x - 36) <= 1
    assert abs(y - 25) <= 1
    # Without the defect the top reads 26 degC; emissivity 0.9 among 20 degC adds (26 - 20) (1/0.9
    # - 1) = 0.7 K to first order, and the fourth power takes a little of it.
    assert finding.extreme_c == pytest.approx(26.5, abs=0.3)


def test_a_piled_up_end_is_counted(runs: Callable[[str], Run]) -> None:
    (image,) = runs("over the range").result.images
    assert cautions.saturated(120, "greatest", 24.0) in image.cautions
    (finding,) = runs("over the range").result.findings
    assert cautions.saturated_extreme("hot") in finding.cautions


def test_the_command_counts_what_has_cautions(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    write_image(tmp_path / "a.tif", spot(6.0, np.s_[0:12, 30:42]))
    write_image(tmp_path / "b.tif", spot(0.0))
    (tmp_path / "survey.toml").write_text(TOLD, encoding="utf-8")
    monkeypatch.setattr("sys.argv", ["thermo-fix", "run", str(tmp_path), "--no-pictures"])
    with pytest.raises(SystemExit) as leave:
        main()
    assert leave.value.code == 0
    assert "  cautions: 0 images, 1 findings; see the report\n" in capsys.readouterr().out
