"""The results folder: its documents against their schema and reference, and how it is replaced."""

import csv
import json
import re
from collections.abc import Iterator
from dataclasses import replace
from importlib import resources
from pathlib import Path
from typing import Any

import jsonschema
import numpy as np
import pytest

from tests import make_fake_result as fake
from tests.survey_folders import files_below
from thermo_fix.demo import demo_surveys
from thermo_fix.errors import FolderError
from thermo_fix.records import Finding, ImageResult, SurveyResult
from thermo_fix.results import Staging, findings_document, write_document, write_table
from thermo_fix.results import staging as staging_module
from thermo_fix.results.table import COLUMNS
from thermo_fix.survey import RunOptions, run_survey
from thermo_fix.version import __version__

SCHEMA: dict[str, Any] = json.loads(
    resources.files("thermo_fix").joinpath("data/findings.schema.json").read_text("utf-8")
)
REFERENCE = Path(__file__).parent.parent / "docs" / "results.md"
RUN_TIME = "2026-02-03T10:00:00+00:00"


def document(result: SurveyResult) -> dict[str, Any]:
    return findings_document(result, run_time=RUN_TIME, sheet_sha256="0" * 64)


def validated(content: Any) -> None:
    jsonschema.Draft202012Validator(
        SCHEMA, format_checker=jsonschema.Draft202012Validator.FORMAT_CHECKER
    ).validate(content)


@pytest.fixture(scope="module")
def result(tmp_path_factory: pytest.TempPathFactory) -> SurveyResult:
    out = tmp_path_factory.mktemp("demo") / "results"
    options = RunOptions(jobs=1, planes=False, pictures=False)
    return run_survey(demo_surveys()["electrical"], out, options=options)


# ---- findings.json -----------------------------------------------------------------------------


def test_schema_is_a_schema() -> None:
    jsonschema.Draft202012Validator.check_schema(SCHEMA)


def objects(schema: Any) -> Iterator[dict[str, Any]]:
    """Every schema of an object with named properties."""
    if isinstance(schema, dict):
        if "properties" in schema and isinstance(schema.get("type"), str):
            yield schema
        for value in schema.values():
            yield from objects(value)
    elif isinstance(schema, list):
        for value in schema:
            yield from objects(value)


def test_schema_is_strict_and_says_everything() -> None:
    every = list(objects(SCHEMA))
    assert len(every) >= 10
    for each in every:
        assert each["additionalProperties"] is False
        for name, described in each["properties"].items():
            assert described.get("description"), name


def test_schema_states_the_unit_of_each_number() -> None:
    units = ("K", "degC", "px", "m2", "0 to 1", "its unit", "same unit")
    for each in objects(SCHEMA):
        for name, described in each["properties"].items():
            kinds = described.get("type", ())
            if "number" in ([kinds] if isinstance(kinds, str) else kinds):
                assert any(unit in described["description"] for unit in units), name
                suffixes = {"_k": "K", "_c": "degC", "_px": "px", "_m2": "m2"}
                for suffix, unit in suffixes.items():
                    if name.endswith(suffix):
                        assert re.search(rf"\b{unit}\b", described["description"]), name


def test_document_validates(result: SurveyResult) -> None:
    validated(document(result))
    validated(json.loads(json.dumps(document(result), allow_nan=False)))


@pytest.mark.parametrize("name", ["electrical", "building", "empty", "all_failed", "bare"])
def test_document_of_made_up_results_validates(name: str) -> None:
    made_up, _ = getattr(fake, name)()
    validated(document(made_up))


def test_document_of_nothing_validates(result: SurveyResult) -> None:
    bare = SurveyResult(replace(result.survey, date=None, criteria=()), ())
    content = findings_document(bare, run_time=RUN_TIME, sheet_sha256=None)
    validated(content)
    assert content["findings"] == []
    assert content["survey"]["sheet_sha256"] is None


def test_document_of_a_failed_image_validates(result: SurveyResult) -> None:
    failed = ImageResult(file="a.tif", status="failed", error="a.tif: truncated")
    content = document(replace(result, images=(failed,)))
    validated(content)
    (image,) = content["images"]
    assert image["width"] is None
    assert image["min_c"] is None


@pytest.mark.parametrize("place", ["tool", "survey", "image", "input", "finding", "grading"])
def test_an_unknown_field_is_refused(result: SurveyResult, place: str) -> None:
    content = document(result)
    image = content["images"][0]
    finding = next(each for each in content["findings"] if each["gradings"])
    inner = {
        "tool": content["tool"],
        "survey": content["survey"],
        "image": image,
        "input": image["inputs"][0],
        "finding": finding,
        "grading": finding["gradings"][0],
    }[place]
    inner["surprise"] = 1
    with pytest.raises(jsonschema.ValidationError, match="surprise"):
        validated(content)


def test_numbers_that_json_lacks_become_null(result: SurveyResult) -> None:
    image = result.images[0]
    broken = replace(image.findings[0], u_extreme_k=float("nan"), area_m2=float("inf"))
    changed = replace(image, findings=(broken,), median_c=float("nan"))
    content = document(replace(result, images=(changed,)))
    validated(content)
    (finding,) = content["findings"]
    assert finding["u_extreme_k"] is None
    assert finding["area_m2"] is None
    assert content["images"][0]["median_c"] is None


def test_written_document_is_utf8_and_plain(result: SurveyResult, tmp_path: Path) -> None:
    named = replace(result, survey=replace(result.survey, title="Mühle – 水車"))
    path = tmp_path / "findings.json"
    write_document(path, document(named))
    raw = path.read_bytes()
    assert b"\r" not in raw
    assert raw.endswith(b"}\n")
    assert "Mühle – 水車" in raw.decode("utf-8")
    assert json.loads(raw) == document(named)


def test_tool_and_run_time(result: SurveyResult) -> None:
    content = document(result)
    assert content["schema"] == 1
    assert content["tool"] == {
        "name": "thermo_fix",
        "version": __version__,
        "run_time": RUN_TIME,
    }
    assert json.dumps(content).count(RUN_TIME) == 1


def test_shared_variables_name_each_other(result: SurveyResult) -> None:
    findings = {each["id"]: each for each in document(result)["findings"]}
    for name, finding in findings.items():
        for line in finding["budget"]:
            assert name not in line["correlated_with"]
            for other in line["correlated_with"]:
                assert findings[other]["image"] == finding["image"]
                assert line["variable"] in [each["variable"] for each in findings[other]["budget"]]


# ---- the reference page ------------------------------------------------------------------------


def names_in(text: str) -> set[str]:
    return set(re.findall(r"`([^`\n]+)`", text))


def test_reference_has_every_field_of_the_schema() -> None:
    named = names_in(REFERENCE.read_text("utf-8"))
    fields = {name for each in objects(SCHEMA) for name in each["properties"]}
    assert fields - named == set()


def test_reference_says_what_the_schema_says() -> None:
    text = REFERENCE.read_text("utf-8")
    for each in objects(SCHEMA):
        for name, described in each["properties"].items():
            if set(each["properties"]) == {"none", "note", "watch", "plan", "act"}:
                continue  # in words
            row = rf"^\| `{name}` \| .* \| {re.escape(described['description'])} \|$"
            assert re.search(row, text, re.MULTILINE), name


def test_reference_has_no_field_that_is_gone() -> None:
    fields = {name for each in objects(SCHEMA) for name in each["properties"]} | set(COLUMNS)
    rows = re.findall(r"^\| `([a-z0-9_A-Z]+)` \|", REFERENCE.read_text("utf-8"), re.MULTILINE)
    assert set(rows) - fields == set()


def test_reference_has_every_column_and_file() -> None:
    named = names_in(REFERENCE.read_text("utf-8"))
    assert set(COLUMNS) - named == set()
    files = {"report.html", "findings.json", "findings.csv"}
    assert files <= named
    assert {"corrected/NAME.tif", "uncertainty/NAME.tif", ".kept/"} <= named


# ---- findings.csv ------------------------------------------------------------------------------


def rows_of(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as stream:
        return list(csv.DictReader(stream))


def table_of(result: SurveyResult, folder: Path) -> list[dict[str, str]]:
    path = folder / "findings.csv"
    write_table(path, result)
    return rows_of(path)


def test_columns_carry_their_unit(result: SurveyResult, tmp_path: Path) -> None:
    write_table(tmp_path / "findings.csv", result)
    with (tmp_path / "findings.csv").open(encoding="utf-8", newline="") as stream:
        assert next(csv.reader(stream)) == list(COLUMNS)
    texts = {"id", "image", "zone", "sense", "reference_kind", "reference", "grade"}
    texts |= {"criterion", "settle", "cautions"}
    for column in set(COLUMNS) - texts:
        assert column.rsplit("_", 1)[1] in {"px", "m2", "degC", "K", "1"}, column


def test_one_row_a_finding_worst_first(result: SurveyResult, tmp_path: Path) -> None:
    rows = table_of(result, tmp_path)
    assert [row["id"] for row in rows] == [finding.id for finding in result.findings]
    order = ["act", "plan", "watch", "note", ""]
    ranks = [order.index(row["grade"]) for row in rows]
    assert ranks == sorted(ranks)


def test_rows_say_what_the_findings_say(result: SurveyResult, tmp_path: Path) -> None:
    for row, finding in zip(table_of(result, tmp_path), result.findings, strict=True):
        assert float(row["extreme_degC"]) == pytest.approx(finding.extreme_c, abs=0.0051)
        box = [int(row[f"{edge}_px"]) for edge in ("x0", "y0", "x1", "y1")]
        assert tuple(box) == finding.bbox_px
        assert (row["u_delta_K"] == "") == (finding.u_delta_k is None)
        if finding.delta_k is not None:
            assert float(row["delta_K"]) == pytest.approx(finding.delta_k, abs=0.0051)
        if finding.area_m2 is not None:
            assert float(row["area_m2"]) == pytest.approx(finding.area_m2, abs=5.1e-7)


def only_finding(result: SurveyResult, **changes: Any) -> SurveyResult:
    image = next(each for each in result.images if each.findings)
    changed: Finding = replace(image.findings[0], **changes)
    return replace(result, images=(replace(image, findings=(changed,)),))


STARTS = ["=", "+", "-", "@", "\t", "\r", "\n", " =", "\xa0=", "\u200b=", "\ufeff=", "\x00="]
STARTS += ["\x1b@", "＝", "＋", "－", "＠", "﹢", "\u3000＝"]


@pytest.mark.parametrize("start", STARTS)
def test_no_text_becomes_a_formula(result: SurveyResult, tmp_path: Path, start: str) -> None:
    text = f"{start}HYPERLINK(1)"
    changes = {"zone": text, "reference_name": text, "settle": text, "cautions": (text,)}
    (row,) = table_of(only_finding(result, **changes), tmp_path)
    for column in ("zone", "reference", "settle", "cautions"):
        assert row[column] == f"'{text}"


@pytest.mark.parametrize("mark", [";", "\t", ",", "\n", "\r\n", "; ", '"\n\t '])
@pytest.mark.parametrize("start", ["", "a", 'a"'])
def test_no_text_gets_a_cell_of_its_own(
    result: SurveyResult, tmp_path: Path, mark: str, start: str
) -> None:
    zone = f"{start}{mark}=HYPERLINK(1)"
    write_table(tmp_path / "findings.csv", only_finding(result, zone=zone))
    text = (tmp_path / "findings.csv").read_text("utf-8")
    # Whatever a spreadsheet takes for the separator, and however it treats quotation marks.
    for delimiter in ",;\t":
        for quoting in (csv.QUOTE_MINIMAL, csv.QUOTE_NONE):
            if delimiter == "," and quoting == csv.QUOTE_NONE:
                continue  # nobody reads CSV like that
            for row in csv.reader(text.splitlines(), delimiter=delimiter, quoting=quoting):
                assert not any(cell.strip(' "').startswith("=") for cell in row)


@pytest.mark.parametrize("text", ["lug B", "2 = 1", "a-b", "Ü", "端子", "", "'=1", "#1", "%"])
def test_plain_text_is_left_as_it_is(result: SurveyResult, tmp_path: Path, text: str) -> None:
    (row,) = table_of(only_finding(result, zone=text), tmp_path)
    assert row["zone"] == text


def test_negative_numbers_stay_numbers(result: SurveyResult, tmp_path: Path) -> None:
    (row,) = table_of(only_finding(result, delta_k=-4.25, extreme_c=-11.5), tmp_path)
    assert row["delta_K"] == "-4.25"
    assert row["extreme_degC"] == "-11.50"


def test_text_is_utf8_and_quoted(result: SurveyResult, tmp_path: Path) -> None:
    name = 'Klemme "Ü1", oben\nlinks – 端子'
    (row,) = table_of(only_finding(result, zone=name), tmp_path)
    assert row["zone"] == name
    assert "端子".encode() in (tmp_path / "findings.csv").read_bytes()


def test_unknown_is_an_empty_cell(result: SurveyResult, tmp_path: Path) -> None:
    unknown = {
        "area_m2": None,
        "reference_c": None,
        "delta_k": None,
        "u_extreme_k": float("nan"),
        "u_delta_k": None,
        "grade": None,
        "grade_probability": None,
        "criterion": None,
        "zone": None,
    }
    (row,) = table_of(only_finding(result, **unknown), tmp_path)
    columns = ["area_m2", "reference_degC", "delta_K", "u_extreme_K", "u_delta_K"]
    columns += ["grade", "grade_probability_1", "criterion", "zone"]
    assert [row[column] for column in columns] == [""] * len(columns)


# ---- a folder that is complete or not there ----------------------------------------------------


def complete(target: Path, text: str = "{}") -> None:
    with Staging(target) as staging:
        (staging.folder / "findings.json").write_text(text, encoding="utf-8")
        staging.finish()


def test_staging_a_new_folder(tmp_path: Path) -> None:
    target = tmp_path / "deep" / "er" / "results"
    complete(target)
    assert files_below(tmp_path) == {"deep/er/results/findings.json": b"{}"}
    # Readable as other new files are.
    other = tmp_path / "other"
    other.mkdir()
    assert target.stat().st_mode == other.stat().st_mode


def test_staging_replaces_an_older_result_as_a_whole(tmp_path: Path) -> None:
    target = tmp_path / "results"
    complete(target)
    (target / "left over.txt").write_text("old", encoding="utf-8")
    complete(target, '{"new": 1}')
    assert files_below(tmp_path) == {"results/findings.json": b'{"new": 1}'}


def test_an_empty_folder_may_be_used(tmp_path: Path) -> None:
    target = tmp_path / "results"
    target.mkdir()
    complete(target)
    assert (target / "findings.json").is_file()


def crash_in_the_middle(target: Path) -> None:
    with Staging(target) as staging:
        (staging.folder / "findings.json").write_text("half", encoding="utf-8")
        raise RuntimeError("in the middle")


def test_a_crash_leaves_the_older_result_whole(tmp_path: Path) -> None:
    target = tmp_path / "results"
    complete(target)
    before = files_below(tmp_path)
    with pytest.raises(RuntimeError, match="in the middle"):
        crash_in_the_middle(target)
    assert files_below(tmp_path) == before
    assert [path.name for path in tmp_path.iterdir()] == ["results"]


def test_without_finish_nothing_appears(tmp_path: Path) -> None:
    with Staging(tmp_path / "results") as staging:
        (staging.folder / "findings.json").write_text("{}", encoding="utf-8")
        assert not (tmp_path / "results").exists()
    assert list(tmp_path.iterdir()) == []


def unable_to_swap(first: Path, second: Path) -> bool:
    return False


def test_a_failing_move_puts_the_older_result_back(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(staging_module, "swap", unable_to_swap)
    target = tmp_path / "results"
    complete(target)
    before = files_below(tmp_path)
    rename = Path.rename

    def refusing(self: Path, other: Path) -> Path:
        if ".partial-" in self.name:
            raise PermissionError(13, "Permission denied")
        return rename(self, other)

    monkeypatch.setattr(Path, "rename", refusing)
    with pytest.raises(FolderError, match="cannot be put into place") as error:
        complete(target, "new")
    monkeypatch.undo()
    assert "\n" not in str(error.value)
    assert files_below(tmp_path) == before


def test_a_foreign_folder_is_refused(tmp_path: Path) -> None:
    (tmp_path / "thesis.txt").write_text("years of work", encoding="utf-8")
    with pytest.raises(FolderError, match=r"holds files but no findings\.json") as error:
        Staging(tmp_path)
    assert "--out" in str(error.value)
    assert files_below(tmp_path) == {"thesis.txt": b"years of work"}


def test_a_file_is_no_folder(tmp_path: Path) -> None:
    target = tmp_path / "results"
    target.write_text("a file", encoding="utf-8")
    with pytest.raises(FolderError, match="is no folder"):
        Staging(target)
    assert target.read_text("utf-8") == "a file"


def test_a_place_that_cannot_be_written(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("", encoding="utf-8")
    with pytest.raises(FolderError, match="cannot be written") as error:
        Staging(tmp_path / "file" / "results")
    assert "\n" not in str(error.value)


def test_finite_numbers_have_nine_digits(result: SurveyResult) -> None:
    content = document(only_finding(result, extreme_c=np.pi * 10))
    # 31.4159265358..., to nine significant digits.
    assert content["findings"][0]["extreme_c"] == 31.4159265
