"""The report: what it says, how it says it, and that the page is sound."""

import base64
import hashlib
import json
import math
import re
from collections.abc import Callable, Iterator, Mapping
from dataclasses import replace
from datetime import date, datetime
from functools import lru_cache
from itertools import pairwise
from pathlib import Path
from typing import Any, get_args

import html5lib
import pytest

import thermo_fix.report
from tests import make_fake_result as fake
from thermo_fix import cautions
from thermo_fix.records import (
    DetectSettings,
    Figure,
    Finding,
    ImageResult,
    Language,
    Planes,
    SurveyResult,
)
from thermo_fix.report import CriterionText, Pictures, encode_pictures, write_report
from thermo_fix.report.catalogue import Words, load_words
from thermo_fix.report.drawing import crop, marks, outline, shares, ticks
from thermo_fix.report.formatting import Units, fixed, iso, measured, percent, shortest
from thermo_fix.report.plots import histogram, overview, scale_bar
from thermo_fix.report.survey_view import MOST_CARDS, SurveyViews
from thermo_fix.report.view import FindingView, ReportView

FOLDER = Path(thermo_fix.report.__file__).parent
Case = Callable[[], tuple[SurveyResult, dict[str, Planes]]]

CASES: dict[str, Case] = {
    "electrical": fake.electrical,
    "fahrenheit": lambda: fake.electrical("fahrenheit"),
    "building": fake.building,
    "without sheet": lambda: fake.building(sheet=False),
    "nothing found": fake.empty,
    "all failed": fake.all_failed,
    "bare": fake.bare,
    "no images": lambda: (replace(fake.electrical()[0], images=()), {}),
}


def page_of(case: tuple[SurveyResult, dict[str, Planes]], path: Path, **options: Any) -> str:
    result, planes = case
    settings = {"sheet_text": fake.SHEET, "run_time": fake.RUN_TIME} | options
    write_report(result, fake.pictures_of(result, planes), path, **settings)
    return path.read_text(encoding="utf-8")


def view_of(case: tuple[SurveyResult, dict[str, Planes]]) -> ReportView:
    return SurveyViews(case[0], load_words(), version="9.9").report()


def finding_of(case: tuple[SurveyResult, dict[str, Planes]], identifier: str) -> FindingView:
    return next(view for view in view_of(case).findings if view.id == identifier)


@lru_cache(maxsize=2)
def elements(page: str) -> list[Any]:
    """All elements of a page; a parse error of any kind fails the test."""
    parser = html5lib.HTMLParser(strict=True, namespaceHTMLElements=False)
    return list(parser.parse(page).iter())


def local(tag: object) -> str:
    return str(tag).rpartition("}")[2]


def text_of(element: Any) -> str:
    return " ".join("".join(element.itertext()).split())


@pytest.fixture(scope="module", params=CASES)
def page(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> str:
    return page_of(CASES[request.param](), tmp_path_factory.mktemp("page") / "report.html")


# ---------------------------------------------------------------- the page as HTML


def test_page_is_strict_html(page: str) -> None:
    tags = [local(element.tag) for element in elements(page)]
    for tag in ("header", "main", "nav", "h1", "section"):
        assert tag in tags
    assert tags.count("h1") == tags.count("main") == 1


def test_identifiers_are_unique_and_links_resolve(page: str) -> None:
    found = elements(page)
    ids = [element.get("id") for element in found if element.get("id")]
    assert len(ids) == len(set(ids))
    references: list[str] = []
    for element in found:
        for name, value in element.attrib.items():
            if local(name) == "href" and value.startswith("#"):
                references.append(value[1:])
            elif local(name) in ("aria-labelledby", "aria-describedby", "for", "headers"):
                references.extend(value.split())
            elif "url(#" in value:
                references.extend(re.findall(r"url\(#([^)]+)\)", value))
    assert references
    assert set(references) <= set(ids)


def test_headings_descend_one_step_at_a_time(page: str) -> None:
    levels = [
        int(local(element.tag)[1])
        for element in elements(page)
        if re.fullmatch(r"h[1-6]", local(element.tag))
    ]
    assert levels[0] == 1
    assert all(after <= before + 1 for before, after in pairwise(levels))


def test_nothing_comes_from_outside(page: str) -> None:
    found = elements(page)
    policy = next(
        element.get("content")
        for element in found
        if element.get("http-equiv") == "Content-Security-Policy"
    )
    assert policy.startswith("default-src 'none'; img-src data:; style-src 'sha256-")
    assert "unsafe" not in policy
    for element in found:
        assert local(element.tag) not in ("link", "iframe", "object", "embed", "base")
        assert local(element.tag) != "script" or element.get("src") is None
        for name, value in element.attrib.items():
            assert local(name) != "style", "the policy forbids style attributes"
            assert not local(name).startswith("on")
            if local(name) in ("href", "src"):
                assert value.startswith(("#", "data:image/"))


@pytest.mark.parametrize("tag", ["style", "script"])
def test_policy_admits_exactly_the_style_and_the_script_of_the_page(page: str, tag: str) -> None:
    found = re.findall(rf"<{tag}>(.*?)</{tag}>", page, re.DOTALL)
    assert len(found) == 1
    digest = base64.b64encode(hashlib.sha256(found[0].encode()).digest()).decode()
    escaped = digest.replace("+", "&#43;")
    assert f"{tag}-src 'sha256-{digest}'".replace("'", "&#39;") in page or (
        f"{tag}-src 'sha256-{escaped}'".replace("'", "&#39;") in page
    )
    assert "url(" not in found[0]
    assert "@import" not in found[0]


def test_data_of_the_reader_are_data(page: str) -> None:
    blocks = [element for element in elements(page) if local(element.tag) == "script"]
    assert [block.get("type") for block in blocks].count(None) == 1
    for block in blocks:
        if block.get("type") is not None:
            assert block.get("type") == "application/json"
            assert isinstance(json.loads(block.text), dict)


def test_script_asks_for_nothing() -> None:
    source = (FOLDER / "static" / "report.js").read_text(encoding="utf-8")
    for word in ("fetch(", "XMLHttpRequest", "WebSocket", "import(", "eval(", "innerHTML", "http:"):
        assert word not in source.replace("http://www.w3.org/2000/svg", "")
    assert "localStorage" not in source
    assert "</" not in source


def test_tables_have_captions_and_scopes(page: str) -> None:
    for table in (element for element in elements(page) if local(element.tag) == "table"):
        assert any(local(child.tag) == "caption" for child in table)
        headers = [cell for cell in table.iter() if local(cell.tag) == "th"]
        assert headers
        assert all(cell.get("scope") in ("col", "row", "colgroup", "rowgroup") for cell in headers)


def test_pictures_have_text_alternatives(page: str) -> None:
    for element in elements(page):
        if local(element.tag) == "img":
            assert element.get("alt")
        if local(element.tag) == "svg" and element.get("aria-hidden") != "true":
            # Labels inside a drawing belong to it.
            assert element.get("aria-label") or element.get("x") is not None


def test_page_has_no_leftovers(page: str) -> None:
    text = re.sub(r"<(style|script)\b.*?</\1>", "", page, flags=re.DOTALL)
    text = re.sub(r"data:image/[^\"]*", "", text)
    assert not re.search(r"\bNone\b(?! of)|\bnan\b|\binf\b|\{\{|\}\}|Undefined", text)
    assert not re.search(r"\{[a-z_]+\}", re.sub(r"<pre.*?</pre>", "", text, flags=re.DOTALL))


def test_run_time_stands_in_one_place(page: str) -> None:
    assert page.count(fake.RUN_TIME) == 1


def test_same_inputs_same_bytes(tmp_path: Path) -> None:
    first = page_of(fake.electrical(), tmp_path / "a.html")
    second = page_of(fake.electrical(), tmp_path / "b.html")
    assert first == second
    later = page_of(fake.electrical(), tmp_path / "c.html", run_time="LATER")
    assert later.replace("LATER", fake.RUN_TIME) == first


def test_nothing_half_written_is_left(tmp_path: Path) -> None:
    class Broken(dict[str, Any]):
        def get(self, key: str, default: Any = None) -> Any:
            raise RuntimeError(key)

    result, _ = fake.electrical()
    path = tmp_path / "report.html"
    with pytest.raises(RuntimeError):
        write_report(result, Broken(), path, sheet_text=None, run_time="x")
    assert list(tmp_path.iterdir()) == []


def test_photograph_is_shown_beside(tmp_path: Path) -> None:
    result, planes = fake.electrical()
    pictures = fake.pictures_of(result, planes)
    file = result.images[0].file
    pictures[file] = replace(pictures[file], photo_jpeg=b"\xff\xd8photo")
    write_report(result, pictures, tmp_path / "r.html", sheet_text=None, run_time="x")
    page = (tmp_path / "r.html").read_text(encoding="utf-8")
    images = [element for element in elements(page) if local(element.tag) == "img"]
    assert len(images) == 1
    assert images[0].get("src") == "data:image/jpeg;base64," + base64.b64encode(
        b"\xff\xd8photo"
    ).decode("ascii")
    assert "panel 3, incoming breaker" in images[0].get("alt")


def test_images_without_pictures_are_still_reported(tmp_path: Path) -> None:
    result, _ = fake.electrical()
    write_report(result, {}, tmp_path / "r.html", sheet_text=None, run_time="x")
    page = (tmp_path / "r.html").read_text(encoding="utf-8")
    assert load_words()("picture.missing") in page
    assert "72.4" in page
    elements(page)


# ---------------------------------------------------------------- untrusted text

HOSTILE = "<script>alert(1)</script>\"'><img src=x onerror=alert(2)>&amp;"


def hostile_case() -> tuple[SurveyResult, dict[str, Planes]]:
    result, planes = fake.electrical()
    image = result.images[0]
    finding = image.findings[0]
    grading = replace(
        finding.gradings[0],
        title=HOSTILE,
        quantity=HOSTILE,
        class_label=HOSTILE,
        class_text=HOSTILE,
        missing=(HOSTILE,),
        note=HOSTILE,
        settle=HOSTILE,
    )
    assessment = replace(
        finding.assessments[0],
        title=HOSTILE,
        statement=HOSTILE,
        figures=(Figure(HOSTILE, 1.0, 0.1, HOSTILE, HOSTILE),),
        cautions=(HOSTILE,),
        source=HOSTILE,
    )
    finding = replace(
        finding,
        assessments=(assessment,),
        id=HOSTILE,
        image=HOSTILE,
        zone=HOSTILE,
        reference_name=HOSTILE,
        reference_kind=HOSTILE,
        cautions=(HOSTILE,),
        gradings=(grading,),
        settle=HOSTILE,
        method=HOSTILE,
        budget=(replace(finding.budget[0], input=HOSTILE, unit=HOSTILE),),
    )
    line = replace(
        image.inputs[0], key=HOSTILE, where=HOSTILE, text=HOSTILE, unit=HOSTILE, note=HOSTILE
    )
    image = replace(
        image,
        file=HOSTILE,
        asset=HOSTILE,
        note=HOSTILE,
        notes=(HOSTILE,),
        cautions=(HOSTILE,),
        findings=(finding,),
        inputs=(line,),
        zones=(replace(image.zones[0], name=HOSTILE),),
    )
    failed = ImageResult(HOSTILE + "2", "failed", error=HOSTILE)
    survey = replace(result.survey, title=HOSTILE, surveyor=HOSTILE, notes=(HOSTILE,))
    condition = replace(result.conditions[0], name=HOSTILE, value=HOSTILE, rule=HOSTILE)
    hostile = SurveyResult(survey, (image, failed), (condition,), (HOSTILE,))
    marked = fake.with_zones(planes["IR_0007.tif"], image.zones)
    return hostile, {HOSTILE: marked}


def test_hostile_names_stay_text(tmp_path: Path) -> None:
    text = CriterionText("x", HOSTILE, HOSTILE, ((HOSTILE, HOSTILE, "act"),), HOSTILE)
    page = page_of(
        hostile_case(), tmp_path / "r.html", sheet_text="</code></pre>" + HOSTILE, criteria=(text,)
    )
    found = elements(page)
    tags = {local(element.tag) for element in found}
    assert "img" not in tags
    running = [e for e in found if local(e.tag) == "script" and e.get("type") is None]
    assert len(running) == 1
    assert "alert" not in running[0].text
    data = [json.loads(e.text) for e in found if local(e.tag) == "script" and e.get("type")]
    assert any(budget["name"] == HOSTILE for block in data for budget in block.get("budgets", ()))
    assert not any(name == "onerror" for element in found for name in element.attrib)
    assert any(HOSTILE in (element.get("aria-label") or "") for element in found)
    assert next(text_of(e) for e in found if local(e.tag) == "h1") == HOSTILE


def test_characters_without_a_place_in_a_page_are_replaced(tmp_path: Path) -> None:
    result, planes = fake.electrical()
    # A half surrogate from an undecodable file name, a control character, and a mark that would
    # turn "fit.exe" into "exe.tif" for the eye.
    survey = replace(result.survey, title="a\udcffb\x00c\u202ed\ufffee")
    page = page_of((replace(result, survey=survey), planes), tmp_path / "r.html")
    title = next(text_of(e) for e in elements(page) if local(e.tag) == "h1")
    assert title == "a�b�c�d�e"


# ---------------------------------------------------------------- what it says


def test_words_are_complete_and_none_is_idle() -> None:
    keys: set[str] = set()
    families: set[str] = set()
    for path in [*FOLDER.glob("*.py"), *FOLDER.glob("templates/*.html")]:
        source = path.read_text(encoding="utf-8")
        for call, key in re.findall(
            r"\b(?:w|words|_words)(\.count|\.of|\.family)?\(\s*[\"']([^\"']+)[\"']", source
        ):
            if call == ".count":
                keys |= {f"{key}.one", f"{key}.other"}
            elif call in (".of", ".family"):
                families.add(key)
            else:
                keys.add(key)
    # Standing cautions are translated by their own English words.
    families.remove("standing")
    catalogue = load_words().keys
    assert keys <= catalogue
    idle = {
        key
        for key in catalogue - keys
        if not any(key.startswith(f"{family}.") for family in families)
    }
    assert idle == set()
    assert families <= {key.partition(".")[0] for key in catalogue}


def test_the_script_uses_its_words_and_no_others() -> None:
    source = (FOLDER / "static" / "report.js").read_text(encoding="utf-8")
    used = set(re.findall(r"\bwords\.(\w+)", source))
    assert used == set(load_words().family("reader"))


@pytest.mark.parametrize("language", [path.stem for path in FOLDER.glob("words/*.toml")])
def test_every_language_has_every_word_with_its_fields(language: str) -> None:
    english, other = load_words(), load_words(language)
    keys = {key for key in other.keys if not key.startswith("standing.")}
    assert keys == english.keys
    for key in keys:
        fields = [sorted(re.findall(r"\{(\w+)\}", words(key))) for words in (english, other)]
        assert fields[0] == fields[1], key
        assert bool(english(key)) == bool(other(key)) or key == "page.quoted"
    if language != "en":
        for purpose in ("electrical", "building"):
            for caution in cautions.general(purpose):
                assert other.of("standing", caution) != caution


def test_languages_are_those_of_the_sheet() -> None:
    assert {path.stem for path in FOLDER.glob("words/*.toml")} == set(get_args(Language))


def german() -> tuple[SurveyResult, dict[str, Planes]]:
    result, planes = fake.electrical()
    return replace(result, survey=replace(result.survey, language="de")), planes


def test_german_has_decimal_commas_and_says_what_stays_english(tmp_path: Path) -> None:
    page = page_of(german(), tmp_path / "r.html")
    html = next(element for element in elements(page) if local(element.tag) == "html")
    assert html.get("lang") == "de"
    text = text_of(html)
    for words in ("72,4 °C ± 2,8 K", "Handlungsbedarf", "Im englischen Wortlaut", "2026-02-03"):
        assert words in text.replace("\u00a0", " ")
    assert "Bei Volllast: handeln." in text
    result, _ = german()
    for caution in cautions.general("electrical"):
        assert load_words("de").of("standing", caution) in text
        assert caution not in text
    views = SurveyViews(result, load_words("de"), version="1").report()
    assert views.findings[0].temperature is not None
    assert views.findings[0].temperature.value == "72,4"
    assert views.findings[1].budgets[0].rows[1].sensitivity.endswith("je 0,01")


@pytest.mark.parametrize(
    ("family", "members"),
    [
        ("grade", ("act", "plan", "watch", "note", "ungraded")),
        ("grade_meaning", ("act", "plan", "watch", "note", "ungraded")),
        ("step.electrical", ("act", "plan", "watch", "note", "ungraded")),
        ("step.building", ("act", "plan", "watch", "note", "ungraded")),
        ("sense", ("hot", "cold")),
        ("state", ("met", "not met", "not told")),
        ("status", ("done", "failed")),
        ("purpose", ("building", "electrical")),
        ("model", ("total", "band")),
        ("reference", ("like component", "surroundings", "air", "limit")),
        ("method_name", ("first order", "Monte Carlo")),
        (
            "origin",
            ("given", "surface table", "measured", "computed", "inferred", "assumed"),
        ),
    ],
)
def test_families_name_every_member(family: str, members: tuple[str, ...]) -> None:
    for member in members:
        assert f"{family}.{member}" in load_words().keys


def test_a_missing_word_is_an_error_not_a_gap() -> None:
    with pytest.raises(KeyError):
        Words({"a": "b"})("c")


def test_worst_first_and_counted() -> None:
    view = view_of(fake.electrical())
    assert [finding.grade for finding in view.findings] == ["act", "plan", "watch", "ungraded"]
    assert {key: number for key, _, _, number in view.counts} == {
        "act": 1,
        "plan": 1,
        "watch": 1,
        "note": 0,
        "ungraded": 1,
    }
    assert [card.grade for card in view.cards] == ["act", "plan"]
    assert [finding.number for finding in view.findings] == [1, 2, 3, 4]
    assert view.more == ""


def test_cards_are_limited_and_say_what_they_leave_out() -> None:
    result, _ = fake.electrical()
    image = result.images[0]
    many = tuple(replace(image.findings[0], id=f"f{n}") for n in range(MOST_CARDS + 5))
    view = view_of((replace(result, images=(replace(image, findings=many),)), {}))
    assert len(view.cards) == MOST_CARDS
    assert view.more.startswith("5 more findings")


def test_temperature_and_difference_with_expanded_uncertainty() -> None:
    finding = finding_of(fake.electrical(), "IR_0007-1")
    assert finding.temperature is not None
    assert finding.difference is not None
    # 2 x 1.41 K = 2.82 K and 2 x 0.62 K = 1.24 K, to two digits (JCGM 100:2008, 7.2.6).
    assert finding.temperature.text == "72.4\u00a0°C\u00a0±\u00a02.8\u00a0K"
    assert finding.difference.text == "+41.2\u00a0K\u00a0±\u00a01.2\u00a0K"
    assert finding.comparison == (
        "41.2\u00a0K\u00a0±\u00a01.2\u00a0K warmer than like component (lug A)"
    )
    assert finding.interval == "95\u00a0% interval 69.7 to 75.3\u00a0°C"
    assert finding.doubt == "94\u00a0% likely; there is no worse grade"
    assert finding.quote is not None
    assert finding.quote.class_text == "Major discrepancy; repair immediately"
    assert "qualified" in finding.step


def test_fahrenheit_converts_temperatures_and_differences_apart() -> None:
    finding = finding_of(fake.electrical("fahrenheit"), "IR_0007-1")
    assert finding.temperature is not None
    assert finding.difference is not None
    # Arithmetic: 72.36 x 1.8 + 32 = 162.248; 41.19 x 1.8 = 74.142; 2.82 x 1.8 = 5.076.
    assert finding.temperature.text == "162.2\u00a0°F\u00a0±\u00a05.1\u00a0°F"
    assert finding.difference.text == "+74.1\u00a0°F\u00a0±\u00a02.2\u00a0°F"
    assert finding.quote is not None
    assert finding.quote.value is not None
    assert finding.quote.value.endswith("(41.2\u00a0K\u00a0±\u00a01.2\u00a0K)")


def test_cold_findings_are_cooler_and_carry_a_true_minus() -> None:
    finding = finding_of(fake.building(), "IR_0101-1")
    assert finding.difference is not None
    assert finding.difference.value == "\N{MINUS SIGN}5.8"
    assert "cooler than surroundings" in finding.comparison
    assert finding.sense_word == "cold"


def test_missing_inputs_of_a_criterion_are_named() -> None:
    finding = finding_of(fake.electrical(), "IR_0008-2")
    assert finding.grade == "ungraded"
    assert finding.gradings[0].needs == ("needs air temperature on the path (air_c), load (load_a)")
    assert "needs air temperature" in finding.ungraded_why


def test_worse_grade_under_other_conditions_is_said_in_one_line(tmp_path: Path) -> None:
    finding = finding_of(fake.electrical(), "IR_0007-2")
    assert finding.grade == "plan"
    assert finding.worse_elsewhere == ("At full load: act.",)
    other = finding.gradings[-1]
    assert (other.scenario, other.decides, other.grade) == ("full load", False, "act")
    assert finding_of(fake.electrical(), "IR_0007-1").worse_elsewhere == ()
    page = page_of(fake.electrical(), tmp_path / "r.html")
    cards = [e for e in elements(page) if "card" in (e.get("class") or "").split()]
    assert any("At full load: act." in text_of(card) for card in cards)


def test_assessments_are_printed_with_their_evidence(tmp_path: Path) -> None:
    finding = finding_of(fake.electrical(), "IR_0007-1")
    (load,) = finding.assessments
    assert load.statement.startswith("The load was 62 A.")
    assert [(row.label, row.value) for row in load.figures] == [
        ("load", "62.0\u00a0A\u00a0±\u00a02.0\u00a0A"),
        ("difference at full load", "90\u00a0K\u00a0±\u00a016\u00a0K"),
        ("share of the rated current", "0.62"),
        ("wind", "not known"),
    ]
    page = page_of(fake.electrical(), tmp_path / "r.html")
    found = elements(page)
    sections = [e for e in found if "assessment" in (e.get("class") or "").split()]
    assert len(sections) == 2
    for section in sections:
        for words in ("The exponent is common practice.", "exponent 1.6", "no source"):
            assert words in text_of(section)
    card = next(e for e in found if "card" in (e.get("class") or "").split())
    assert "At full load the difference would be about 90 K." in text_of(card)
    assert "exponent 1.6" not in text_of(card)


def test_band_model_is_stated_on_each_finding(tmp_path: Path) -> None:
    page = page_of(fake.electrical(), tmp_path / "r.html")
    sections = [e for e in elements(page) if "finding" in (e.get("class") or "").split()]
    assert len(sections) == 4
    for section in sections:
        assert "+0.4 K if the 8–14 µm or stated band model is used" in text_of(section).replace(
            "\u00a0", " "
        )


def test_camera_and_limits_are_printed() -> None:
    result, _ = fake.electrical()
    survey = replace(result.survey, criteria_settings={"absolute_limit_c": 70.0})
    view = SurveyViews(replace(result, survey=survey), load_words(), version="1").report()
    rows = {row.label: row.value for row in view.camera}
    assert rows["spectral band of the camera"] == "8–14\u00a0µm"
    assert rows["accuracy of the camera"] == "2\u00a0K"
    assert rows["emissivity recorded by the camera"] == "1"
    assert [(row.label, row.value) for row in view.settings] == [("absolute_limit_c", "70")]


# ---------------------------------------------------------------- large surveys


def large(number: int) -> tuple[SurveyResult, dict[str, Planes]]:
    """The first fake image, ``number`` times."""
    result, planes = fake.electrical()
    first = result.images[0]
    images = tuple(
        replace(
            first,
            file=f"IR_{n:05d}.tif",
            findings=tuple(
                replace(f, id=f"{n}.{k}", image=f"IR_{n:05d}.tif")
                for k, f in enumerate(first.findings)
            ),
        )
        for n in range(1, number + 1)
    )
    plane = planes[first.file]
    return replace(result, images=images), {image.file: plane for image in images}


class Counted(Mapping[str, Pictures]):
    """Pictures that count how often they were asked for."""

    def __init__(self, pictures: Pictures, files: list[str]) -> None:
        self.pictures = pictures
        self.files = files
        self.asked = 0

    def __getitem__(self, file: str) -> Pictures:
        self.asked += 1
        # For the cards of the entry page; the pages themselves are quicker without.
        if self.asked > MOST_CARDS:
            raise KeyError(file)
        return self.pictures

    def __iter__(self) -> Iterator[str]:
        return iter(self.files)

    def __len__(self) -> int:
        return len(self.files)


def test_a_large_survey_has_an_entry_page_and_a_page_for_each_image(tmp_path: Path) -> None:
    result, planes = large(7)
    pictures = fake.pictures_of(result, planes)
    path = tmp_path / "report.html"
    options: dict[str, Any] = {"sheet_text": None, "run_time": "x"}
    write_report(result, pictures, path, **options, images_per_page=7)
    assert not (tmp_path / "pages").exists()
    write_report(result, pictures, path, **options, images_per_page=6, single_file=True)
    assert not (tmp_path / "pages").exists()
    write_report(result, pictures, path, **options, images_per_page=6)
    names = sorted(each.name for each in (tmp_path / "pages").iterdir())
    wanted = [f"{n:04d}.html" for n in range(1, 8)]
    assert names == [*wanted, "findings-001.html", "images-001.html"]
    assert sorted(each.name for each in tmp_path.iterdir()) == ["pages", "report.html"]
    for file in [path, *(tmp_path / "pages").iterdir()]:
        for element in elements(file.read_text(encoding="utf-8")):
            href = element.get("href") or ""
            if local(element.tag) != "a" or href.startswith("#"):
                continue
            target, _, anchor = href.partition("#")
            aim = (file.parent / target).resolve()
            assert aim.is_file(), href
            if anchor:
                assert f'id="{anchor}"' in aim.read_text(encoding="utf-8"), href


def test_the_entry_page_of_a_thousand_images_is_small(tmp_path: Path) -> None:
    result, planes = large(1000)
    file = result.images[0].file
    one = encode_pictures(planes[file], result.images[0])
    pictures = Counted(one, [image.file for image in result.images])
    write_report(result, pictures, tmp_path / "report.html", sheet_text=None, run_time="x")
    # Given by the specification: under 2 MB.
    assert (tmp_path / "report.html").stat().st_size < 2_000_000
    assert len(list((tmp_path / "pages").glob("[0-9]*.html"))) == 1000
    assert pictures.asked <= 1000 + MOST_CARDS
    for name in ("findings-001.html", "findings-002.html", "images-001.html"):
        assert (tmp_path / "pages" / name).is_file()


def test_summary_states_the_finding() -> None:
    finding = finding_of(fake.electrical(), "IR_0007-2")
    for part in ("Finding 2", "hot", "lug C", "IR_0007.tif", "36.8", "5.6", "grade: plan"):
        assert part in finding.summary


def test_budget_is_sorted_and_adds_up() -> None:
    finding = finding_of(fake.electrical(), "IR_0007-2")
    budget = finding.budgets[0]
    assert [row.input for row in budget.rows][:2] == [
        "accuracy of the camera",
        "emissivity of paint, grey",
    ]
    assert budget.rows[0].bar == 100.0
    assert budget.rows[1].bar == pytest.approx(100.0 * 0.76 / 1.08)
    assert budget.rows[1].sensitivity == "\N{MINUS SIGN}0.38\u00a0K per 0.01"
    assert budget.total == "1.4\u00a0K"


def test_assumed_inputs_are_announced() -> None:
    view = view_of(fake.building(sheet=False))
    assert view.assumed[0].startswith("There was no survey sheet")
    assert "emissivity (4 images)" in view.assumed[-1]
    assert view_of(fake.building()).assumed == ()
    result, _ = fake.electrical()
    image = replace(result.images[0], inputs=fake.input_lines(assumed=True))
    told = view_of((replace(result, images=(image,)), {}))
    assert told.assumed, "an assumed emissivity is announced although there is a sheet"


def test_nothing_found_is_said_with_its_limits(tmp_path: Path) -> None:
    case = fake.empty()
    assert view_of(case).outcome[:2] == (
        "No findings",
        "In the 4 images that were used, no region of 9 pixels or more differed from its "
        "reference by 1.5\u00a0K or more.",
    )
    assert "does not mean that there is no defect" in page_of(case, tmp_path / "r.html")


def test_a_search_for_one_sense_says_so() -> None:
    result, _ = fake.empty()
    jobs = tuple(replace(job, detect=DetectSettings(cold=False)) for job in result.survey.images)
    survey = replace(result.survey, images=jobs)
    assert (
        "Only hot regions were looked for." in view_of((replace(result, survey=survey), {})).outcome
    )


def test_all_failed_is_no_clean_bill(tmp_path: Path) -> None:
    case = fake.all_failed()
    title, sentence = view_of(case).outcome
    assert title == "Nothing was measured"
    assert sentence.startswith("None of the 3 images could be used.")
    page = page_of(case, tmp_path / "r.html")
    for image in case[0].images:
        assert image.file in page
    assert "not a radiometric image" in page


def test_failed_images_are_named_with_the_reason() -> None:
    view = view_of(fake.electrical())
    assert [image.file for image in view.failed] == ["IR_0009.tif"]
    assert view.failed[0].error == "the file ends early; copy it again"
    assert ("Images", "2 of 3 done; 1 failed") in view.facts


@pytest.mark.parametrize("purpose", ["electrical", "building"])
def test_standing_cautions_are_always_printed(purpose: str, tmp_path: Path) -> None:
    case = fake.electrical() if purpose == "electrical" else fake.building()
    page = " ".join(page_of(case, tmp_path / "r.html").replace("&#39;", "'").split())
    for caution in cautions.general(purpose):
        assert caution in page
    assert ("One image was lost." in page) == (purpose == "electrical")


def test_conditions_not_told_are_named() -> None:
    assert view_of(fake.electrical()).untold == ("wind",)


def test_criteria_are_printed_in_full_where_the_text_is_at_hand() -> None:
    result, _ = fake.electrical()
    text = CriterionText("over-air", "Rise over air", "made-up table", (("a", "b", "act"),))
    views = SurveyViews(result, load_words(), version="1", criteria=(text,)).report()
    assert [criterion.criterion for criterion in views.criteria] == [
        "like-component",
        "over-air",
    ]
    assert views.criteria[1] is text
    assert ("more than 15 K", "Major discrepancy; repair immediately", "act") in (
        views.criteria[0].classes
    )


def test_inputs_say_where_they_came_from() -> None:
    result, _ = fake.electrical()
    image = next(SurveyViews(result, load_words(), version="1").images())
    rows = {(row.label, row.where): row for row in image.inputs}
    emissivity = rows["emissivity", "whole image"]
    assert (emissivity.value, emissivity.u) == ("0.930", "0.020")
    assert emissivity.origin_word == "surface table"
    reflected = rows["reflected apparent temperature", "whole image"]
    assert (reflected.value, reflected.u) == ("21.0\u00a0°C", "1.2\u00a0K")
    assert rows["reflected apparent temperature", "zone busbar"].value == "file sky.tif"
    assert rows["noise of the camera", "whole image"].u == "–"


def test_unsolved_pixels_are_counted() -> None:
    result, _ = fake.electrical()
    image = next(SurveyViews(result, load_words(), version="1").images())
    assert image.unsolved.startswith("644 pixels (<\u00a01\u00a0% of the image)")


def test_everything_unknown_is_said_to_be_unknown() -> None:
    view = view_of(fake.bare())
    finding = view.findings[0]
    assert finding.temperature is None
    assert finding.difference is None
    assert finding.comparison == "no difference known; reference: surroundings"
    assert finding.ungraded_why == "no criterion was in use for this finding"
    assert "not known" in finding.summary
    assert dict(view.facts)["Surveyor"] == "not told"


# ---------------------------------------------------------------- numbers


@pytest.mark.parametrize(
    ("value", "uncertainty", "expected"),
    [
        # JCGM 100:2008, 7.2.6: 10.057 62 ohm with u = 27 milliohm is given as 10.058 ohm.
        (10.05762, 0.027, ("10.058", "0.027")),
        # JCGM 100:2008, 7.2.2: 100.021 47 g with u = 0.35 mg.
        (100.02147, 0.00035, ("100.02147", "0.00035")),
        # Arithmetic from here on.
        (72.36, 2.82, ("72.4", "2.8")),
        (1234.5, 120.0, ("1230", "120")),
        (20.04, 0.0996, ("20.04", "0.10")),
        (20.04, 9.96, ("20", "10")),
        (-0.04, 1.3, ("0.0", "1.3")),
        (-3.16, 1.3, ("\N{MINUS SIGN}3.2", "1.3")),
    ],
)
def test_rounding_to_two_digits_of_the_uncertainty(
    value: float, uncertainty: float, expected: tuple[str, str]
) -> None:
    both = measured(value, uncertainty, "x")
    assert (both.value, both.uncertainty) == expected


@pytest.mark.parametrize("uncertainty", [None, 0.0, math.nan, math.inf])
def test_without_an_uncertainty_one_decimal(uncertainty: float | None) -> None:
    both = measured(21.26, uncertainty, "K")
    assert (both.text, both.spread) == ("21.3\u00a0K", None)


def test_percentages_never_claim_certainty() -> None:
    assert percent(0.0) == percent(0.004) == "<\u00a01\u00a0%"
    assert percent(1.0) == ">\u00a099\u00a0%"
    assert percent(0.874) == "87\u00a0%"


def test_small_formats() -> None:
    assert fixed(0.5, 0) == "0"
    assert fixed(2.0, 1, sign=True) == "+2.0"
    assert shortest(-0.0000123, 2) == "\N{MINUS SIGN}0.000012"
    assert shortest(20.0) == "20"
    assert iso(date(2026, 2, 3)) == "2026-02-03"
    assert iso(datetime(2026, 2, 3, 9, 5)) == "2026-02-03 09:05:00"


def test_fahrenheit_fixed_points() -> None:
    # Definition: 0 degC = 32 degF, 100 degC = 212 degF (NIST SP 811, B.8); -40 on both scales.
    units = Units("fahrenheit")
    assert units.from_celsius(0.0) == 32.0
    assert units.from_celsius(100.0) == pytest.approx(212.0)
    assert units.from_celsius(-40.0) == pytest.approx(-40.0)
    assert units.from_kelvin_difference(10.0) == pytest.approx(18.0)


# ---------------------------------------------------------------- drawing


def spot(x: float, y: float, half: float = 6.0) -> Finding:
    return fake.make_finding(
        "s",
        "a.tif",
        None,
        "hot",
        (x, y, half, half, 5.0),
        extreme=30.0,
        delta=5.0,
        reference=("surroundings", ""),
        gradings=(),
        grade=None,
    )


@pytest.mark.parametrize("units", [Units("celsius"), Units("fahrenheit")])
@pytest.mark.parametrize(("low", "high"), [(9.5, 21.5), (25.5, 72.4), (-40.0, 900.0), (0.0, 0.3)])
def test_ticks_are_round_and_lie_on_the_scale(units: Units, low: float, high: float) -> None:
    drawn = ticks(low, high, units)
    assert 2 <= len(drawn) <= 7
    span = units.from_celsius(high) - units.from_celsius(low)
    values = [float(tick.text.replace("\N{MINUS SIGN}", "-")) for tick in drawn]
    step = values[1] - values[0]
    assert round(step / 10 ** math.floor(math.log10(step) + 1e-9), 6) in (1.0, 2.0, 5.0)
    for tick, value in zip(drawn, values, strict=True):
        assert 0.0 <= tick.percent <= 100.0
        place = 100.0 * (value - units.from_celsius(low)) / span
        assert tick.percent == pytest.approx(place, abs=0.01)


def test_outline_falls_back_on_the_box() -> None:
    finding = replace(spot(20.0, 30.0), contours=())
    assert outline(finding) == "M14 24L26 24L26 36L14 36Z"
    broken = replace(finding, contours=(((math.nan, 0.0), (1.0, 1.0), (2.0, 0.0)),))
    assert outline(broken) == outline(finding)


def test_outline_follows_the_contour() -> None:
    square = ((1.0, 1.0), (3.0, 1.0), (3.0, 2.5), (1.0, 1.0))
    assert outline(replace(spot(2.0, 2.0), contours=(square,))) == "M1 1L3 1L3 2.5Z"


def test_labels_stay_inside_and_apart() -> None:
    findings = [(n, spot(40.0 + 9 * n, 3.0 + 11 * (n % 3))) for n in range(1, 7)]
    drawn = marks(findings, 160, 120)
    for mark in drawn:
        assert 0.0 < mark.label_x < 100.0
        assert 0.0 < mark.label_y < 100.0
    places = {(round(mark.label_x, 3), round(mark.label_y, 3)) for mark in drawn}
    assert len(places) == len(drawn)


@pytest.mark.parametrize(("x", "y", "half"), [(3, 3, 6), (150, 110, 8), (80, 60, 50)])
def test_crop_lies_inside_the_picture_and_holds_the_finding(x: int, y: int, half: int) -> None:
    finding = replace(
        spot(x, y, half),
        bbox_px=(max(x - half, 0), max(y - half, 0), min(x + half, 160), min(y + half, 120)),
    )
    window = crop(finding, 160, 120)
    x0, y0, x1, y1 = finding.bbox_px
    assert window.x >= 0.0
    assert window.y >= 0.0
    assert window.x + window.width <= 160.0 + 1e-9
    assert window.y + window.height <= 120.0 + 1e-9
    assert window.x <= x0
    assert window.x + window.width >= x1
    assert window.y <= y0
    assert window.y + window.height >= y1
    assert 0.0 < window.label_x < 100.0
    assert 0.0 < window.label_y < 100.0


def test_bars_are_shares_of_the_longest() -> None:
    assert shares([2.0, 1.0, 0.0]) == (100.0, 50.0, 0.0)
    assert shares([0.0]) == (0.0,)
    assert shares([]) == ()


# ---------------------------------------------------------------- the style sheet


def luminance(colour: str) -> float:
    """Relative luminance (WCAG 2.2, definitions)."""
    channels = [int(colour[i : i + 2], 16) / 255.0 for i in (1, 3, 5)]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: str, other: str) -> float:
    """Contrast ratio (WCAG 2.2, definitions)."""
    light, dark = sorted((luminance(one), luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_colours_of_text_have_contrast(scheme: str) -> None:
    style = (FOLDER / "static" / "report.css").read_text(encoding="utf-8")
    blocks = re.findall(r":root \{(.*?)\}", style, re.DOTALL)
    tokens = dict(re.findall(r"--([a-z-]+): (#[0-9a-f]{6});", blocks[scheme == "dark"]))
    assert contrast("#000000", "#ffffff") == pytest.approx(21.0)  # WCAG 2.2, definitions
    for text in ("ink", "soft", "link", "act", "plan", "watch", "note", "ungraded"):
        for ground in ("paper", "sheet", "warn-paper"):
            # WCAG 2.2, success criterion 1.4.3 (AA).
            assert contrast(tokens[text], tokens[ground]) >= 4.5, (scheme, text, ground)
    for mark in ("bar", "strong-rule", "warn-rule"):
        # WCAG 2.2, success criterion 1.4.11 (AA).
        assert contrast(tokens[mark], tokens["sheet"]) >= 3.0, (scheme, mark)


# ---------------------------------------------------------------- plots


def test_scale_bar_is_a_round_length_that_fits() -> None:
    # Arithmetic: 320 pixels of 1.56 mm are 499 mm; 30 % of that are 150 mm.
    bar = scale_bar(0.00156, 320, Units())
    assert bar is not None
    assert bar.text == "10\u00a0cm"
    assert bar.percent == pytest.approx(100.0 * 100.0 / 499.2)
    assert scale_bar(None, 320, Units()) is None
    wide = scale_bar(0.02, 640, Units())  # 12.8 m across
    assert wide is not None
    assert wide.text == "2\u00a0m"


def test_histogram_marks_extremes_and_references() -> None:
    result, _ = fake.electrical()
    findings = list(enumerate(result.images[0].findings, 1))
    drawn = histogram([0, 4, 16, 0], 20.0, 80.0, findings, load_words())
    assert drawn is not None
    # Square roots: 4 of 16 stand half as high, 100 being the foot.
    assert drawn.path == "M0 100L0 100h1L1 50h1L2 0h1L3 100h1L4 100Z"
    places = {(round(marker.percent, 1), marker.reference) for marker in drawn.markers}
    # Arithmetic: (72.36 - 20) / 60, (36.81 - 20) / 60; both references are at 31.17.
    assert (87.3, False) in places
    assert (28.0, False) in places
    assert (18.6, True) in places
    assert "ref. 1, 2" in {marker.text for marker in drawn.markers}
    assert histogram([0, 0], 20.0, 80.0, findings, load_words()) is None


def test_overview_holds_every_finding_with_a_difference() -> None:
    result, _ = fake.building()
    plot = overview(result.findings, Units())
    assert plot is not None
    assert [dot.number for dot in plot.dots] == [1, 2, 3, 4, 5]
    assert plot.left_out == 0
    assert all(0.0 < dot.x < 100.0 and 0.0 < dot.y < 100.0 for dot in plot.dots)
    by_number = {dot.number: dot for dot in plot.dots}
    ordered = sorted(result.findings, key=lambda finding: abs(finding.delta_k or 0.0))
    numbers = [result.findings.index(finding) + 1 for finding in ordered]
    across = [by_number[number].x for number in numbers]
    assert across == sorted(across)
    assert overview(fake.bare()[0].findings, Units()) is None
