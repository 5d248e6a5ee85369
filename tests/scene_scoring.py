"""Score a run against simulated surveys with known truth.

For people: ``python -m tests.scene_scoring FOLDER...`` runs each folder and prints a table. Results
go to a temporary folder, so that the surveys stay as they are.

A planted anomaly is found when a finding of the same sense overlaps its box. A finding is false
when it overlaps no planted box of its sense, widened by 4 pixels. Area and extreme are those of the
overlapping finding that shares most pixels with the box.
"""

import argparse
import json
import sys
import tempfile
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from scipy import constants

from thermo_fix.records import Finding, ImageResult, SurveyResult
from thermo_fix.sheet import zone_mask
from thermo_fix.survey import RunOptions, run_survey

NEAR_PX = 4
AREA_RATIO = (0.8, 1.25)
Box = tuple[int, int, int, int]


@dataclass(frozen=True)
class Score:
    """What came of one survey, or of several."""

    planted: int = 0
    found: int = 0
    findings: int = 0
    false: int = 0
    missed_names: tuple[str, ...] = ()
    false_names: tuple[str, ...] = ()
    area_ratios: tuple[float, ...] = ()
    extreme_errors_k: tuple[float, ...] = ()
    extreme_u_k: tuple[float, ...] = ()
    median_errors_k: tuple[float, ...] = ()
    failed: tuple[str, ...] = ()

    @property
    def found_share(self) -> float:
        return self.found / self.planted if self.planted else 1.0

    @property
    def false_share(self) -> float:
        return self.false / self.findings if self.findings else 0.0

    @property
    def area_share(self) -> float:
        """Share of the found anomalies whose area is about right."""
        low, high = AREA_RATIO
        return _share(low <= ratio <= high for ratio in self.area_ratios)

    def extreme_share(self, within_k: float) -> float:
        return _share(abs(error) <= within_k for error in self.extreme_errors_k)

    def coverage(self, factor: float = 2.0) -> float:
        """Share of the extremes whose truth lies within `factor` standard uncertainties."""
        return _share(
            abs(error) <= factor * u
            for error, u in zip(self.extreme_errors_k, self.extreme_u_k, strict=True)
        )


def _share(held: Iterable[bool]) -> float:
    each = list(held)
    return sum(each) / len(each) if each else 1.0


def added(scores: Iterable[Score]) -> Score:
    """The score of several surveys together."""
    each = list(scores)

    def joined(name: str) -> Any:
        return sum((getattr(score, name) for score in each), start=type(getattr(Score(), name))())

    return Score(**{name: joined(name) for name in Score.__dataclass_fields__})


def overlap_px(first: Sequence[int], second: Sequence[int]) -> int:
    """Pixels that two boxes [x0, y0, x1, y1) share."""
    width = min(first[2], second[2]) - max(first[0], second[0])
    height = min(first[3], second[3]) - max(first[1], second[1])
    return max(0, width) * max(0, height)


def _widened(box: Sequence[int], by_px: int) -> Box:
    return box[0] - by_px, box[1] - by_px, box[2] + by_px, box[3] + by_px


def score_image(findings: Sequence[Finding], planted: Sequence[dict[str, Any]]) -> Score:
    """Score the findings of one image against what was planted in it."""
    ratios, errors, us, missed = [], [], [], []
    for number, truth in enumerate(planted, start=1):
        same = [finding for finding in findings if finding.sense == truth["sense"]]
        best = max(same, key=lambda f: overlap_px(f.bbox_px, truth["bbox_px"]), default=None)
        if best is None or overlap_px(best.bbox_px, truth["bbox_px"]) == 0:
            missed.append(f"planted {number} ({truth['label']}, {truth['delta_k']:.1f} K)")
            continue
        ratios.append(best.area_px / truth["area_px"])
        errors.append(best.extreme_c - truth["true_extreme_c"])
        us.append(float("nan") if best.u_extreme_k is None else best.u_extreme_k)
    false = [
        finding
        for finding in findings
        if not any(
            finding.sense == truth["sense"]
            and overlap_px(finding.bbox_px, _widened(truth["bbox_px"], NEAR_PX))
            for truth in planted
        )
    ]
    return Score(
        planted=len(planted),
        found=len(planted) - len(missed),
        findings=len(findings),
        false=len(false),
        missed_names=tuple(missed),
        false_names=tuple(f"finding {f.id} ({f.sense}, {f.delta_k or 0:.1f} K)" for f in false),
        area_ratios=tuple(ratios),
        extreme_errors_k=tuple(errors),
        extreme_u_k=tuple(us),
    )


def true_median_c(image: ImageResult, truth: dict[str, Any], folder: Path) -> float:
    """True median of the pixels that the program takes the median of.

    Where the truth is known pixel by pixel, zones to be ignored are left out of it as well.
    """
    planes = folder / truth["file"].replace("IR_", "truth_").replace(".tif", ".npz")
    if not planes.exists():
        return float(truth["true_median_c"])
    with np.load(planes) as stored:
        true_c = stored["centikelvin"] / 100.0 - constants.zero_Celsius
    left_out = [zone_mask(zone.polygon, true_c.shape) for zone in image.zones if zone.ignore]
    kept = ~np.logical_or.reduce([np.zeros(true_c.shape, bool), *left_out])
    return float(np.median(true_c[kept]))


def score_result(result: SurveyResult, truths: Sequence[dict[str, Any]]) -> Score:
    """Score a run; images that are broken on purpose are left out.

    A finding in a zone whose difference the truth explains, by its current for instance, is true
    and yet no anomaly: it counts neither way.
    """
    folder = result.survey.folder
    by_file = {image.file: image for image in result.images}
    scores = []
    for truth in truths:
        if "broken" in truth:
            continue
        image = by_file[truth["file"]]
        explained = [each["zone"] for each in truth.get("explained", ())]
        findings = [each for each in image.findings if each.zone not in explained]
        score = score_image(findings, truth["planted"])
        names = {
            key: tuple(f"{image.file}: {name}" for name in getattr(score, key))
            for key in ("missed_names", "false_names")
        }
        median: tuple[float, ...] = ()
        if image.median_c is not None:
            median = (image.median_c - true_median_c(image, truth, folder),)
        failed = (image.file,) if image.status == "failed" else ()
        scores.append(
            Score(
                **{
                    **{key: getattr(score, key) for key in Score.__dataclass_fields__},
                    **names,
                    "median_errors_k": median,
                    "failed": failed,
                }
            )
        )
    return added(scores)


def score_folder(folder: Path, out: Path) -> Score:
    """Run a survey that has a truth.json, with its results in `out`, and score it."""
    truths = json.loads((folder / "truth.json").read_text("utf-8"))
    options = RunOptions(planes=False, pictures=False)
    return score_result(run_survey(folder, out, options=options), truths)


HEADER = (
    "survey                  found     missed  false     area ok  extreme <= 0.3 K  "
    "in 2 u  worst extreme  median error"
)


def line(name: str, score: Score) -> str:
    """One row of the table under HEADER."""
    extreme = max((abs(error) for error in score.extreme_errors_k), default=0.0)
    median = max((abs(error) for error in score.median_errors_k), default=0.0)
    return (
        f"{name:<22}  {score.found:>3}/{score.planted:<3}  {score.planted - score.found:>6}  "
        f"{score.false:>3}/{score.findings:<3}  {score.area_share:>8.1%}  "
        f"{score.extreme_share(0.3):>16.1%}  {score.coverage():>6.1%}  {extreme:>11.2f} K  "
        f"{median:>10.3f} K"
    )


def main(arguments: Sequence[str] | None = None) -> int:
    parser = argparse.ArgumentParser(prog="python -m tests.scene_scoring", description=__doc__)
    parser.add_argument("folder", type=Path, nargs="+", help="a survey with truth.json")
    given = parser.parse_args(arguments)
    print(HEADER)
    scores = []
    for folder in given.folder:
        with tempfile.TemporaryDirectory() as place:
            score = score_folder(folder, Path(place) / "results")
        scores.append(score)
        print(line(folder.name, score), flush=True)
        for name in (*score.missed_names, *score.false_names):
            print(f"    {name}")
    total = added(scores)
    print(line("total", total))
    ratios = total.area_ratios or (float("nan"),)
    areas = np.quantile(ratios, [0.05, 0.5, 0.95])
    print("area ratio, 5th, 50th, 95th percentile:", *(f"{ratio:.2f}" for ratio in areas))
    return 0


if __name__ == "__main__":
    sys.exit(main())
