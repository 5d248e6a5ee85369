"""Invented survey results with synthetic planes, for tests of the report and for looking at it.

Nothing here is computed by the package: temperatures, uncertainties and grades are made up, and
only agree with each other. The place, Saltmere, does not exist. Preview:
``python tests/make_fake_result.py FOLDER``.
"""

import math
import sys
from collections.abc import Mapping, Sequence
from dataclasses import replace
from datetime import date, datetime
from pathlib import Path
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from thermo_fix.records import (
    Assessment,
    BudgetLine,
    Camera,
    Condition,
    DetectSettings,
    Figure,
    Finding,
    Grade,
    Grading,
    ImageJob,
    ImageResult,
    Input,
    InputLine,
    PixelBudget,
    Planes,
    Purpose,
    SceneInputs,
    Sense,
    Survey,
    SurveyResult,
    Zone,
)
from thermo_fix.report import Pictures, encode_pictures, write_report

SHEET = """[survey]
title = "Saltmere pumping station, motor control panel"
purpose = "electrical"
date = 2026-02-03

[scene]
emissivity = { value = 0.93, u = 0.02 }   # <painted> & insulated parts
"""
RUN_TIME = "2026-02-03 17:45:12 UTC"

Spot = tuple[float, float, float, float, float]
"""Column, row, half width, half height (pixels), rise in K."""


def make_planes(
    width: int, height: int, base_c: float, spots: Sequence[Spot], *, seed: int
) -> Planes:
    """A slanted field with smooth spots, noise, and a corner without a solution."""
    rows, columns = np.mgrid[0:height, 0:width].astype(np.float64) + 0.5
    random = np.random.default_rng(seed)
    surface = base_c + 1.5 * columns / width - 1.0 * rows / height
    surface += 0.4 * np.sin(columns / 9.0) * np.cos(rows / 13.0)
    for x, y, half_width, half_height, rise in spots:
        distance = ((columns - x) / half_width) ** 2 + ((rows - y) / half_height) ** 2
        surface += rise * np.exp(-(distance**1.5))
    corrected = (surface + random.normal(0.0, 0.05, surface.shape)).astype(np.float32)
    recorded = (base_c + 0.82 * (corrected - base_c) - 0.6).astype(np.float32)
    corrected[height - 14 :, : 20 + width // 12] = np.nan
    uncertainty = (1.0 + 0.02 * np.abs(corrected - base_c)).astype(np.float32)
    return Planes(recorded, corrected, uncertainty)


def with_zones(planes: Planes, zones: Sequence[Zone]) -> Planes:
    """The same planes with labels of rectangular zones and made-up budgets of a pixel."""
    labels = np.zeros(planes.corrected_c.shape, np.int16)
    budgets = []
    nodes = np.linspace(float(np.nanmin(planes.recorded_c)), float(np.nanmax(planes.recorded_c)), 9)
    for label, name in enumerate(("", *(zone.name for zone in zones))):
        if label:
            (x0, y0), _, (x1, y1), _ = zones[label - 1].polygon
            labels[int(y0) : int(y1), int(x0) : int(x1)] = label
        budgets.append(
            PixelBudget(
                name=name,
                emissivity=0.95 - 0.01 * label,
                reading_c=nodes,
                parts_k={
                    "camera calibration": np.full(9, 1.0),
                    f"emissivity of {name or 'the rest'}": 0.01 * (nodes - nodes[0]),
                    "noise": np.full(9, 0.06),
                },
                own=("noise",),
            )
        )
    return replace(planes, labels=labels, budgets=tuple(budgets))


def load_assessment() -> Assessment:
    """What a trade might conclude; invented."""
    return Assessment(
        kind="load",
        title="Load",
        statement="The load was 62 A. At full load the difference would be about 90 K.",
        figures=(
            Figure("load", 62.0, 1.0, "A"),
            Figure("difference at full load", 90.3, 8.0, "K", "exponent 1.6"),
            Figure("share of the rated current", 0.62, None, "1"),
            Figure("wind", None, None, "m/s"),
        ),
        cautions=("The exponent is common practice.",),
        source="common practice, no source",
    )


def ellipse(
    x: float, y: float, half_width: float, half_height: float
) -> tuple[tuple[float, float], ...]:
    """A closed outline around a spot."""
    angles = np.linspace(0.0, 2.0 * np.pi, 33)
    return tuple(
        (float(x + half_width * np.cos(a)), float(y + half_height * np.sin(a))) for a in angles
    )


def budget(extreme: float) -> tuple[BudgetLine, ...]:
    """Contributions whose root sum of squares is near 1.4 K."""
    return (
        BudgetLine("accuracy of the camera", "camera.accuracy", 0.0, 1.0, "K", 1.08, 1.08),
        BudgetLine("emissivity of paint, grey", "emissivity [zone]", 0.93, 0.02, "1", -38.0, 0.76),
        BudgetLine(
            "reflected apparent temperature", "reflected_c [scene]", 21.0, 2.0, "degC", -0.09, 0.18
        ),
        BudgetLine("air temperature on the path", "air_c [scene]", 21.5, 1.0, "degC", -0.01, 0.01),
        BudgetLine("distance", "distance_m [scene]", 1.2, 0.1, "m", 0.04, 0.004),
        BudgetLine("radiation model", "model", None, 1.0, "K", 0.01 * extreme / 70.0, 0.4),
    )


def like_grading(delta: float, grade: Grade | None) -> Grading:
    """A comparison with a like component; the published wording is shortened here."""
    classes: dict[Grade | None, tuple[str, str]] = {
        "act": ("more than 15 K", "Major discrepancy; repair immediately"),
        "plan": ("4 to 15 K", "Indicates probable deficiency; repair as time permits"),
        "watch": ("1 to 3 K", "Possible deficiency; warrants investigation"),
    }
    label, text = classes.get(grade, ("", ""))
    chances: dict[str, float] = {
        "act": {"act": 0.94, "plan": 0.06},
        "plan": {"watch": 0.08, "plan": 0.71, "act": 0.21},
        "watch": {"none": 0.12, "watch": 0.86, "plan": 0.02},
    }.get(grade or "", {"none": 1.0})
    return Grading(
        criterion="like-component",
        title="Like components under like load, maintenance test table",
        quantity="difference to the coolest like component",
        value=delta,
        u=0.62,
        unit="K",
        grade=grade,
        class_label=label,
        class_text=text,
        chances=chances,
        settle="load of lug B, to 2 %",
    )


def air_grading(missing: bool) -> Grading:
    """A rise over air, with or without the input it needs."""
    if missing:
        return Grading(
            "over-air",
            "Rise over air, maintenance test table",
            "rise over the air",
            None,
            None,
            "K",
            None,
            missing=("air_c", "load_a"),
        )
    return Grading(
        "over-air",
        "Rise over air, maintenance test table",
        "rise over the air",
        31.2,
        1.6,
        "K",
        "watch",
        "21 to 40 K",
        "Monitor until corrective measures can be accomplished",
        {"plan": 0.01, "watch": 0.98, "act": 0.01},
    )


def factor_grading(value: float, grade: Grade | None) -> Grading:
    """An interior surface factor."""
    return Grading(
        "surface-factor",
        "ISO 13788 temperature factor at the internal surface",
        "temperature factor",
        value,
        0.034,
        "1",
        grade,
        "below the limit" if grade else "at or above the limit",
        "surface humidity critical for mould growth" if grade else "",
        {"none": 0.17, grade: 0.83} if grade else {"none": 0.97, "plan": 0.03},
        settle="indoor air temperature, to 0.5 K",
        note="limit 0.70, 20 °C inside and −5 °C outside",
    )


def make_finding(
    identifier: str,
    image: str,
    zone: str | None,
    sense: Sense,
    spot: Spot,
    *,
    extreme: float,
    delta: float | None,
    reference: tuple[str, str],
    gradings: tuple[Grading, ...],
    grade: Grade | None,
    cautions: tuple[str, ...] = (),
    u: float | None = 1.41,
) -> Finding:
    """A finding around a spot."""
    x, y, half_width, half_height, _ = spot
    decisive = next((g for g in gradings if g.grade == grade), None)
    order = ("none", "note", "watch", "plan", "act")
    chances = decisive.chances if decisive and grade else {}
    return Finding(
        id=identifier,
        image=image,
        zone=zone,
        sense=sense,
        bbox_px=(
            math.floor(x - half_width),
            math.floor(y - half_height),
            math.ceil(x + half_width),
            math.ceil(y + half_height),
        ),
        area_px=round(math.pi * half_width * half_height),
        area_m2=None if zone is None else 0.00231,
        u_area_m2=None if zone is None else 0.00021,
        extreme_c=extreme,
        extreme_px=(int(x), int(y)),
        mean_c=extreme - 0.3 * (delta or 0.0),
        reference_kind=reference[0],
        reference_name=reference[1],
        reference_c=None if delta is None else extreme - delta,
        delta_k=delta,
        u_extreme_k=u,
        u_delta_k=None if u is None else 0.62,
        gradings=gradings,
        grade=grade,
        grade_probability=chances.get(grade) if grade else None,
        worse_probability=(
            sum(p for key, p in chances.items() if order.index(key) > order.index(grade))
            if grade
            else None
        ),
        criterion=decisive.criterion if decisive and grade else None,
        cautions=cautions,
        contours=(ellipse(x, y, half_width, half_height),),
        budget=budget(extreme) if u is not None else (),
        delta_budget=budget(extreme)[1:3] if u is not None else (),
        settle=decisive.settle if decisive and grade == "plan" else "",
        apparent_c=extreme - 3.1,
        model_difference_k=0.42,
        method="Monte Carlo" if grade == "act" else "first order",
        interval_c=(extreme - 2.7, extreme + 2.9) if grade == "act" else None,
    )


def input_lines(*, assumed: bool = False) -> tuple[InputLine, ...]:
    """Inputs of one image, one of every origin."""
    return (
        InputLine(
            "emissivity",
            "whole image",
            0.93,
            "",
            0.02,
            "1",
            "assumed" if assumed else "surface table",
            "paint, grey; handbook of emissivities, table 3",
        ),
        InputLine("emissivity", "zone lug B", 0.62, "", 0.05, "1", "given"),
        InputLine("reflected_c", "whole image", 21.04, "", 1.2, "degC", "measured", "foil zone"),
        InputLine("air_c", "whole image", 21.5, "", 1.0, "degC", "given"),
        InputLine("humidity", "whole image", 0.5, "", 0.15, "1", "assumed", "usual indoors"),
        InputLine("distance_m", "whole image", 1.2, "", 0.1, "m", "given"),
        InputLine("transmittance", "whole image", 0.98931, "", 0.0031, "1", "computed"),
        InputLine("reflected_c", "zone busbar", None, "file sky.tif", None, "degC", "given"),
        InputLine("camera.noise_k", "whole image", 0.05, "", None, "K", "inferred"),
    )


def scene() -> SceneInputs:
    """Inputs of zones; the report prints InputLine instead."""
    return SceneInputs({"emissivity": Input("emissivity", 0.93, 0.02, "given", "scene")})


def zone(name: str, x0: float, y0: float, x1: float, y1: float) -> Zone:
    """A rectangular zone."""
    return Zone(name, ((x0, y0), (x1, y0), (x1, y1), (x0, y1)), scene(), like="lugs")


def make_survey(
    purpose: Purpose,
    title: str,
    files: Sequence[str],
    *,
    sheet: bool = True,
    unit: Literal["celsius", "fahrenheit"] = "celsius",
) -> Survey:
    """A survey of some files."""
    folder = Path("survey")
    return Survey(
        folder=folder,
        sheet=folder / "survey.toml" if sheet else None,
        title=title,
        purpose=purpose,
        images=tuple(
            ImageJob(file, folder / file, scene(), detect=DetectSettings()) for file in files
        ),
        camera=Camera(band_um=(8.0, 14.0)),
        date=date(2026, 2, 3) if sheet else None,
        surveyor="inspection team 2" if sheet else "",
        temperature_unit=unit,
        notes=() if sheet else ("The pixel unit was inferred: degC.",),
    )


def electrical(
    unit: Literal["celsius", "fahrenheit"] = "celsius",
) -> tuple[SurveyResult, dict[str, Planes]]:
    """Two good images of a panel and one failed."""
    lugs: list[Spot] = [(70, 96, 17, 20, 4), (162, 100, 19, 22, 46), (250, 97, 17, 20, 11)]
    strip: list[Spot] = [(60, 44, 12, 9, 14), (98, 81, 5, 4, 6)]
    first, second, third = "IR_0007.tif", "panel 3/IR_0008.tif", "IR_0009.tif"
    findings = (
        make_finding(
            "IR_0007-1",
            first,
            "lug B",
            "hot",
            lugs[1],
            extreme=72.36,
            delta=41.19,
            reference=("like component", "lug A"),
            gradings=(like_grading(41.19, "act"), air_grading(True)),
            grade="act",
            cautions=(
                "Load 62 % of the rated current: at full load the difference would be larger.",
                "Emissivity 0.62 is uncertain: a reference patch would halve the uncertainty.",
            ),
        ),
        make_finding(
            "IR_0007-2",
            first,
            "lug C",
            "hot",
            lugs[2],
            extreme=36.81,
            delta=5.64,
            reference=("like component", "lug A"),
            gradings=(
                like_grading(5.64, "plan"),
                air_grading(False),
                replace(like_grading(19.2, "act"), scenario="full load"),
            ),
            grade="plan",
        ),
    )
    more = (
        make_finding(
            "IR_0008-1",
            second,
            None,
            "hot",
            strip[0],
            extreme=39.27,
            delta=2.31,
            reference=("surroundings", ""),
            gradings=(like_grading(2.31, "watch"),),
            grade="watch",
        ),
        make_finding(
            "IR_0008-2",
            second,
            None,
            "hot",
            strip[1],
            extreme=31.07,
            delta=None,
            reference=("surroundings", ""),
            gradings=(air_grading(True),),
            grade=None,
            u=None,
            cautions=("Smaller than 3 × 3 pixel footprints: its extreme is understated.",),
        ),
    )
    zones = (
        zone("lug A", 44, 66, 96, 128),
        zone("lug B", 136, 66, 188, 130),
        zone("lug C", 226, 66, 276, 128),
    )
    findings = (replace(findings[0], assessments=(load_assessment(),)), findings[1])
    planes = {
        first: with_zones(make_planes(320, 240, 27.0, lugs, seed=1), zones),
        second: make_planes(160, 120, 25.0, strip, seed=2),
    }
    images = (
        ImageResult(
            first,
            "done",
            sha256="3f" * 32,
            asset="panel 3, incoming breaker",
            note="door open, cover off",
            taken=datetime(2026, 2, 3, 9, 12, 40),
            width=320,
            height=240,
            inputs=input_lines(),
            unsolved_px=644,
            min_c=25.93,
            median_c=27.21,
            max_c=72.36,
            u_median_k=1.02,
            recorded_median_c=26.4,
            notes=("The date comes from the file's own tag.",),
            cautions=("The view angle was not told; 0° was assumed.",),
            findings=findings,
            zones=zones,
            assessments=(replace(load_assessment(), title="Like zones: lugs"),),
            pixel_m=0.00156,
        ),
        ImageResult(
            second,
            "done",
            sha256="a7" * 32,
            asset="panel 3, terminal strip",
            width=160,
            height=120,
            inputs=input_lines(),
            unsolved_px=0,
            min_c=24.1,
            median_c=25.2,
            max_c=39.27,
            u_median_k=1.0,
            recorded_median_c=24.6,
            findings=more,
        ),
        ImageResult(third, "failed", error=f"{third}: the file ends early; copy it again"),
    )
    conditions = (
        Condition("load", "met", "62 % of rated", "at least 40 % of rated", "NFPA 70B:2023, 7.4"),
        Condition("wind", "not told", "", "below 5 m/s", "common practice, no source"),
        Condition(
            "covers", "not met", "cover of bay 2 closed", "covers off", "common practice, no source"
        ),
    )
    survey = make_survey(
        "electrical",
        "Saltmere pumping station, motor control panel",
        [first, second, third],
        unit=unit,
    )
    return SurveyResult(survey, images, conditions, ("One image was lost.",)), planes


def building(*, sheet: bool = True) -> tuple[SurveyResult, dict[str, Planes]]:
    """Four images of a wall with cold and hot findings, one image without any."""
    corner: list[Spot] = [(40, 150, 30, 42, -5.8), (225, 40, 46, 20, -3.2), (260, 190, 14, 12, 3)]
    sill: list[Spot] = [(150, 200, 90, 12, -2.6)]
    planes = {
        "IR_0101.tif": make_planes(320, 240, 18.2, corner, seed=3),
        "IR_0102.tif": make_planes(320, 240, 18.0, sill, seed=4),
        "IR_0103.tif": make_planes(320, 240, 18.4, [], seed=5),
        "IR_0104.tif": make_planes(240, 320, 17.6, [(120, 60, 60, 26, -3.4)], seed=6),
    }
    table: dict[str, list[tuple[str | None, Sense, Spot, float, float, Grade | None]]] = {
        "IR_0101.tif": [
            ("corner", "cold", corner[0], 12.61, -5.83, "plan"),
            ("lintel", "cold", corner[1], 15.18, -3.22, None),
            (None, "hot", corner[2], 21.44, 3.05, "note"),
        ],
        "IR_0102.tif": [("sill", "cold", sill[0], 15.52, -2.61, "watch")],
        "IR_0103.tif": [],
        "IR_0104.tif": [(None, "cold", (120, 60, 60, 26, -3.4), 14.3, -3.4, "watch")],
    }
    assets = ("north wall, bay 3", "north wall, window sill", "north wall, bay 4", "stair head")
    images: list[ImageResult] = []
    for (file, rows), asset in zip(table.items(), assets, strict=True):
        height, width = planes[file].corrected_c.shape
        images.append(
            ImageResult(
                file,
                "done",
                sha256=f"{len(images) + 1}b" * 32,
                asset=asset,
                width=width,
                height=height,
                inputs=input_lines(assumed=not sheet),
                unsolved_px=644,
                min_c=float(np.nanmin(planes[file].corrected_c)),
                median_c=float(np.nanmedian(planes[file].corrected_c)),
                max_c=float(np.nanmax(planes[file].corrected_c)),
                u_median_k=1.05,
                recorded_median_c=17.3,
                findings=tuple(
                    make_finding(
                        f"{file[:7]}-{n}",
                        file,
                        name,
                        sense,
                        spot,
                        extreme=extreme,
                        delta=delta,
                        reference=("surroundings", "ring of 12 pixels"),
                        gradings=(factor_grading(0.66 if grade == "plan" else 0.81, grade),),
                        grade=grade,
                        cautions=("Sun on the wall until 10:40.",) if name == "lintel" else (),
                    )
                    for n, (name, sense, spot, extreme, delta, grade) in enumerate(rows, start=1)
                ),
            )
        )
    conditions = (
        Condition(
            "indoor to outdoor difference", "met", "18.5 K", "at least 10 K", "EN 13187 practice"
        ),
        Condition("sun before the survey", "not told", "", "none for 12 h", "EN 13187 practice"),
    )
    survey = make_survey(
        "building", "Saltmere grain mill, north elevation", list(table), sheet=sheet
    )
    return SurveyResult(survey, tuple(images), conditions), planes


def empty() -> tuple[SurveyResult, dict[str, Planes]]:
    """A building survey in which nothing stands out."""
    result, planes = building()
    images = tuple(replace(image, findings=()) for image in result.images)
    return replace(result, images=images), planes


def all_failed() -> tuple[SurveyResult, dict[str, Planes]]:
    """A survey of which no image could be used."""
    result, _ = electrical()
    images = tuple(
        ImageResult(image.file, "failed", error=f"{image.file}: not a radiometric image")
        for image in result.images
    )
    return SurveyResult(result.survey, images), {}


def bare() -> tuple[SurveyResult, dict[str, Planes]]:
    """Findings of which hardly anything is known: None wherever the records allow it."""
    result, planes = electrical()
    file = result.images[0].file
    finding = Finding(
        id="x",
        image=file,
        zone=None,
        sense="cold",
        bbox_px=(4, 5, 9, 11),
        area_px=1,
        area_m2=None,
        u_area_m2=None,
        extreme_c=math.nan,
        extreme_px=(6, 7),
        mean_c=math.nan,
        reference_kind="surroundings",
        reference_name="",
        reference_c=None,
        delta_k=None,
        u_extreme_k=None,
        u_delta_k=None,
    )
    image = ImageResult(file, "done", findings=(finding,))
    survey = make_survey("electrical", "", [file], sheet=False)
    return SurveyResult(survey, (image,)), {file: planes[file]}


def pictures_of(result: SurveyResult, planes: Mapping[str, Planes]) -> dict[str, Pictures]:
    """Encode the planes of every image that has some."""
    return {
        image.file: encode_pictures(planes[image.file], image)
        for image in result.images
        if image.file in planes
    }


def hatched_photo(width: int = 400, height: int = 300) -> NDArray[np.uint8]:
    """A stand-in for a visible photograph, (rows, columns, 3)."""
    rows, columns = np.mgrid[0:height, 0:width]
    grey = (140 + 60 * (((rows // 40) + (columns // 60)) % 2)).astype(np.uint8)
    return np.dstack([grey, grey, (grey * 0.8).astype(np.uint8)])


def main(folder: Path) -> None:
    """Write one page for each made-up survey."""
    folder.mkdir(parents=True, exist_ok=True)
    cases = {
        "electrical": (electrical(), SHEET),
        "electrical-fahrenheit": (electrical("fahrenheit"), SHEET),
        "building": (building(sheet=False), None),
        "empty": (empty(), SHEET),
        "all-failed": (all_failed(), SHEET),
        "bare": (bare(), None),
    }
    for name, ((result, planes), sheet) in cases.items():
        write_report(
            result,
            pictures_of(result, planes),
            folder / f"{name}.html",
            sheet_text=sheet,
            run_time=RUN_TIME,
        )


if __name__ == "__main__":
    main(Path(sys.argv[1]))
