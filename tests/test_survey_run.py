"""The run as a whole: what it writes, that it repeats, and what it does when something fails."""

import csv
import json
import re
import shutil
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import jsonschema
import numpy as np
import pytest
import tifffile

import thermo_fix.survey
from tests.survey_folders import (
    SHAPE,
    SHEET,
    files_below,
    picture,
    write_folder,
    write_image,
)
from thermo_fix import run_survey
from thermo_fix.errors import FolderError, SheetError
from thermo_fix.records import SurveyResult
from thermo_fix.results import read_plane
from thermo_fix.results.table import COLUMNS
from thermo_fix.survey import RunOptions

FRESH = RunOptions(jobs=1, fresh=True)
WITHOUT_PICTURES = RunOptions(jobs=1, pictures=False)


def written(folder: Path) -> dict[str, Any]:
    content: dict[str, Any] = json.loads(
        (folder / "results" / "findings.json").read_text(encoding="utf-8")
    )
    return content


def run(folder: Path, *, options: RunOptions = WITHOUT_PICTURES) -> SurveyResult:
    return run_survey(folder, options=options)


# ---- what is written ---------------------------------------------------------------------------


def test_the_files_of_a_result(tmp_path: Path) -> None:
    images = '[[image]]\nfile = "IR_1.tif"\n[[image]]\nfile = "sub/IR_2.tiff"\n'
    folder = write_folder(tmp_path / "survey", "IR_1.tif", "sub/IR_2.tiff", sheet=SHEET + images)
    before = files_below(folder)
    result = run(folder)
    assert result.failed == ()
    after = files_below(folder)
    seen = {name.removeprefix("results/") for name in after if name.startswith("results/")}
    assert {name for name in seen if not name.startswith(".")} == {
        "report.html",
        "findings.json",
        "findings.csv",
        "corrected/IR_1.tif",
        "corrected/sub/IR_2.tif",
        "uncertainty/IR_1.tif",
        "uncertainty/sub/IR_2.tif",
    }
    assert {name: after[name] for name in before} == before
    assert sorted(path.name for path in folder.iterdir()) == [
        "IR_1.tif",
        "results",
        "sub",
        "survey.toml",
    ]


def test_json_and_csv_of_a_run(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, "a.tif", "b.tif")
    result = run(folder)
    content = written(folder)
    schema = Path(thermo_fix.survey.__file__).parent / "data" / "findings.schema.json"
    jsonschema.Draft202012Validator(json.loads(schema.read_text("utf-8"))).validate(content)
    assert [image["file"] for image in content["images"]] == ["a.tif", "b.tif"]
    assert {finding["id"] for finding in content["findings"]} == {"1.1", "2.1"}
    assert [finding["sense"] for finding in content["findings"]] == ["hot", "hot"]
    assert {finding["id"] for finding in content["findings"]} == {
        finding.id for finding in result.findings
    }
    with (folder / "results" / "findings.csv").open(encoding="utf-8", newline="") as stream:
        rows = list(csv.reader(stream))
    assert rows[0] == list(COLUMNS)
    assert len(rows) == 3


def test_planes_have_the_shape_and_the_holes_of_the_image(tmp_path: Path) -> None:
    folder = write_folder(tmp_path)
    values = picture()
    values[0:5, 0:7] = np.nan
    write_image(folder / "a.tif", values, datetime="2026:02:03 07:30:00")
    result = run(folder)
    holes = np.isnan(values)
    for name in ("corrected", "uncertainty"):
        path = folder / "results" / name / "a.tif"
        plane = read_plane(path)
        assert plane.dtype == np.float32
        assert plane.shape == SHAPE
        assert np.array_equal(np.isnan(plane), holes)
        with tifffile.TiffFile(path) as tiff:
            page = tiff.pages.first
            assert page.compression == tifffile.COMPRESSION.ADOBE_DEFLATE
            assert page.tags["DateTime"].value == "2026:02:03 07:30:00"
    corrected = read_plane(folder / "results" / "corrected" / "a.tif")
    (image,) = result.images
    assert image.median_c == pytest.approx(float(np.nanmedian(corrected)), abs=1e-4)
    assert image.max_c == pytest.approx(float(np.nanmax(corrected)), abs=1e-4)
    # Surroundings as warm as the wall: what is read at 20 degC is 20 degC.
    assert image.median_c == pytest.approx(20.0, abs=0.02)


def test_georeference_is_kept(tmp_path: Path) -> None:
    folder = write_folder(tmp_path)
    # ModelPixelScale and ModelTiepoint (OGC GeoTIFF 1.1, 7.1).
    scale, tie = (0.5, 0.5, 0.0), (0.0, 0.0, 0.0, 431000.25, 6213000.5, 0.0)
    tags = [(33550, "d", 3, scale, True), (33922, "d", 6, tie, True)]
    write_image(folder / "a.tif", extratags=tags)
    run(folder)
    with tifffile.TiffFile(folder / "results" / "corrected" / "a.tif") as tiff:
        assert tiff.pages.first.tags[33550].value == scale
        assert tiff.pages.first.tags[33922].value == tie


def test_pixels_without_a_solution_are_blank_and_counted(tmp_path: Path) -> None:
    # A shiny surface that reads 0 degC among surroundings at 20 degC: less arrives than the
    # surroundings alone would send, so no temperature explains it.
    sheet = SHEET.replace("value = 0.95, u = 0.02", "value = 0.1, u = 0.02")
    folder = write_folder(tmp_path, sheet=sheet)
    values = np.full(SHAPE, 20.0, np.float32)
    values[10:20, 10:30] = 0.0
    write_image(folder / "a.tif", values)
    run(folder)
    (image,) = written(folder)["images"]
    assert image["unsolved_px"] == 200
    assert any("200 pixels" in caution for caution in image["cautions"])
    assert np.isnan(read_plane(folder / "results" / "corrected" / "a.tif")[10:20, 10:30]).all()


def test_two_images_of_one_stem_keep_their_endings(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, "a.tif", "a.tiff")
    run(folder)
    corrected = folder / "results" / "corrected"
    assert sorted(path.name for path in corrected.iterdir()) == ["a.tif.tif", "a.tiff.tif"]


def test_without_planes_and_pictures(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, "a.tif")
    run(folder, options=RunOptions(jobs=1, planes=False, pictures=False))
    results = folder / "results"
    assert not (results / "corrected").exists()
    assert not (results / "uncertainty").exists()
    assert written(folder)["findings"]


# ---- the same again ----------------------------------------------------------------------------


class Clock:
    """Stands for the class `datetime`: its present is what it is set to."""

    def __init__(self, present: datetime) -> None:
        self.present = present

    def now(self, _: object = None) -> datetime:
        return self.present


CHRISTMAS = datetime(2041, 12, 25, 7, 8, 9, tzinfo=UTC)
MIDSUMMER = datetime(2053, 6, 24, 19, 18, 17, tzinfo=UTC)


def run_at(
    moment: datetime, folder: Path, patch: pytest.MonkeyPatch, options: RunOptions = FRESH
) -> dict[str, bytes]:
    """Run as at that moment, and return the files with the run time blanked.

    It stands in one place of findings.json and of report.html, and nowhere else.
    """
    patch.setattr(thermo_fix.survey, "datetime", Clock(moment))
    run(folder, options=options)
    files = files_below(folder / "results")
    year = str(moment.year).encode()
    stamps = {
        name: re.findall(rb"(?<![0-9.])" + year + rb"-[0-9]{2}-[0-9]{2}[^<\"]*", data)
        for name, data in files.items()
    }
    assert [len(found) for found in stamps.values() if found] == [1, 1]
    assert stamps["findings.json"] == [moment.isoformat().encode()]
    assert len(stamps["report.html"]) == 1
    return {
        name: data.replace(stamps[name][0], b"") if stamps[name] else data
        for name, data in files.items()
    }


def test_the_same_inputs_give_the_same_bytes(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    first = write_folder(tmp_path / "one" / "survey", "a.tif", "b.tif")
    second = tmp_path / "two" / "survey"
    shutil.copytree(first, second)
    one = run_at(CHRISTMAS, first, monkeypatch)
    two = run_at(MIDSUMMER, second, monkeypatch)
    assert sorted(one) == sorted(two)
    assert [name for name in one if one[name] != two[name]] == []


def test_what_is_taken_over_is_the_same_as_what_is_computed(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    folder = write_folder(tmp_path, "a.tif", "b.tif")
    computed = run_at(CHRISTMAS, folder, monkeypatch)
    taken_over = run_at(MIDSUMMER, folder, monkeypatch, RunOptions(jobs=1))
    assert taken_over == computed


def test_a_changed_sheet_is_noticed(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, "a.tif")
    before = run(folder).images[0].max_c
    sheet = folder / "survey.toml"
    sheet.write_text(SHEET.replace("value = 0.95", "value = 0.7"), encoding="utf-8")
    after = run(folder).images[0].max_c
    assert before is not None
    assert after is not None
    assert after > before + 1.0


def test_a_changed_image_is_noticed(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, "a.tif")
    assert len(run(folder).findings) == 1
    write_image(folder / "a.tif", picture(spot_k=0.0))
    assert run(folder).findings == ()


# ---- something fails ---------------------------------------------------------------------------


def test_the_rest_is_done_when_an_image_fails(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, "a.tif", "c.tif")
    (folder / "b.tif").write_bytes((folder / "a.tif").read_bytes()[:500])
    result = run(folder)
    assert [image.file for image in result.failed] == ["b.tif"]
    by_file = {image["file"]: image for image in written(folder)["images"]}
    assert by_file["b.tif"]["status"] == "failed"
    assert by_file["b.tif"]["error"].startswith("b.tif: ")
    assert "\n" not in by_file["b.tif"]["error"]
    assert by_file["b.tif"]["min_c"] is None
    assert [by_file[name]["status"] for name in ("a.tif", "c.tif")] == ["done", "done"]
    assert len(written(folder)["findings"]) == 2
    assert "b.tif" in (folder / "results" / "report.html").read_text("utf-8")


def test_all_images_failing_still_gives_a_result(tmp_path: Path) -> None:
    folder = write_folder(tmp_path)
    (folder / "a.tif").write_bytes(b"no image")
    result = run(folder)
    assert len(result.failed) == 1
    assert written(folder)["findings"] == []
    assert (folder / "results" / "report.html").is_file()


def test_an_image_of_nothing_but_nan(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, "b.tif")
    write_image(folder / "a.tif", np.full(SHAPE, np.nan, np.float32))
    result = run(folder)
    by_file = {image.file: image for image in result.images}
    assert by_file["b.tif"].status == "done"
    lost = by_file["a.tif"]
    assert lost.findings == ()
    assert lost.median_c is None
    if lost.status == "failed":
        assert lost.error is not None
        assert lost.error.startswith("a.tif: ")


def test_a_crash_in_the_middle_leaves_the_old_result_whole(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    folder = write_folder(tmp_path, "a.tif", "b.tif")
    run(folder)
    before = files_below(folder / "results")

    def failing(*_: object, **__: object) -> None:
        raise RuntimeError("disk on fire")

    monkeypatch.setattr(thermo_fix.survey, "write_report", failing)
    write_image(folder / "a.tif", picture(seed=77))
    with pytest.raises(RuntimeError, match="disk on fire"):
        run(folder)
    assert files_below(folder / "results") == before
    assert not [path for path in folder.iterdir() if ".partial-" in path.name]
    # And the next run is not disturbed by it.
    monkeypatch.undo()
    assert run(folder).failed == ()
    assert files_below(folder / "results") != before
    assert sorted(path.name for path in folder.iterdir()) == [
        "a.tif",
        "b.tif",
        "results",
        "survey.toml",
    ]


def test_a_sheet_with_mistakes_writes_nothing(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, "a.tif", sheet=SHEET + "air = 3\n")
    before = files_below(folder)
    with pytest.raises(SheetError):
        run(folder)
    assert files_below(folder) == before


@pytest.mark.parametrize("name", ["none", "a.tif"])
def test_no_folder(tmp_path: Path, name: str) -> None:
    write_folder(tmp_path, "a.tif")
    with pytest.raises(FolderError) as error:
        run(tmp_path / name)
    assert "\n" not in str(error.value)


# ---- where the results go ----------------------------------------------------------------------


def test_results_elsewhere(tmp_path: Path) -> None:
    folder = write_folder(tmp_path / "survey", "a.tif")
    before = files_below(folder)
    out = tmp_path / "far" / "away"
    run_survey(folder, out, options=WITHOUT_PICTURES)
    assert files_below(folder) == before
    assert (out / "report.html").is_file()


def test_results_inside_the_survey_are_no_images_of_it(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, "a.tif")
    for _ in range(2):
        result = run_survey(folder, folder / "out of today", options=WITHOUT_PICTURES)
        assert [image.file for image in result.images] == ["a.tif"]
    # Nor are those of a run with another --out.
    assert [image.file for image in run(folder).images] == ["a.tif"]
    assert [image.file for image in run(folder).images] == ["a.tif"]


def test_a_foreign_folder_is_left_alone(tmp_path: Path) -> None:
    folder = write_folder(tmp_path / "survey", "a.tif")
    out = tmp_path / "documents"
    out.mkdir()
    (out / "thesis.txt").write_text("years of work", encoding="utf-8")
    with pytest.raises(FolderError, match=r"findings\.json"):
        run_survey(folder, out, options=WITHOUT_PICTURES)
    assert files_below(out) == {"thesis.txt": b"years of work"}


def test_the_survey_folder_itself_is_no_place_for_results(tmp_path: Path) -> None:
    folder = write_folder(tmp_path / "old" / "survey", "a.tif")
    # Even where an older result lies around the survey, which would be replaced as a whole.
    for place in (folder, folder.parent):
        (place / "findings.json").write_text("{}", encoding="utf-8")
    before = files_below(tmp_path)
    for out in (folder, folder.parent, folder / ".." / "survey"):
        with pytest.raises(FolderError, match="holds the survey"):
            run_survey(folder, out, options=WITHOUT_PICTURES)
    assert files_below(tmp_path) == before


# ---- without a sheet ---------------------------------------------------------------------------


def test_without_a_sheet_the_inputs_are_assumed(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, "a.tif", sheet=None)
    result = run(folder)
    assert result.failed == ()
    content = written(folder)
    assert content["survey"]["sheet_sha256"] is None
    assert content["survey"]["notes"]
    origins = {line["key"]: line["origin"] for line in content["images"][0]["inputs"]}
    assert origins["emissivity"] == "assumed"
    assert origins["reflected_c"] == "assumed"
    assert "assumed" in (folder / "results" / "report.html").read_text("utf-8")
    (finding,) = content["findings"]
    by_criterion = {each["criterion"]: each for each in finding["gradings"]}
    assert by_criterion["house-difference"]["grade"] is not None


def test_progress_is_told_image_by_image(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, "a.tif", "b.tif")
    told: list[tuple[int, int, str]] = []
    run_survey(
        folder,
        options=WITHOUT_PICTURES,
        progress=lambda done, total, file: told.append((done, total, file)),
    )
    assert told == [(1, 2, "a.tif"), (2, 2, "b.tif")]
