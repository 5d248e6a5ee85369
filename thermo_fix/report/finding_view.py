"""Findings in words and rounded numbers."""

from typing import Final

from thermo_fix.records import GRADES, Finding, SurveyResult
from thermo_fix.report.assessment_view import assessment_views
from thermo_fix.report.budget_view import budget_views
from thermo_fix.report.catalogue import Words
from thermo_fix.report.formatting import (
    COVERAGE,
    Measured,
    Units,
    known,
    percent,
    with_unit,
)
from thermo_fix.report.grading_view import grading_views
from thermo_fix.report.view import FindingView, GradeKey, GradingView

_SMALL_AREA_M2: Final = 0.1
"""Areas below are printed in square centimetres."""

_CM2_PER_M2: Final = 1e4


class FindingViews:
    """Numbers the findings of a survey, worst first, and puts each into words."""

    def __init__(self, result: SurveyResult, words: Words, units: Units) -> None:
        self._words = words
        self._units = units
        self._purpose = result.survey.purpose
        self._ranks = {id(finding): n for n, finding in enumerate(result.findings, start=1)}
        self._numbers = {finding.id: n for n, finding in enumerate(result.findings, start=1)}
        self._images = {image.file: (n, image) for n, image in enumerate(result.images, start=1)}

    def number(self, finding: Finding) -> int:
        """Rank of a finding in the survey; 1 is the worst."""
        return self._ranks[id(finding)]

    def view(self, finding: Finding) -> FindingView:
        """One finding, ready to be printed."""
        words, units = self._words, self._units
        image_number, image = self._images[finding.image]
        number = self.number(finding)
        grade: GradeKey = finding.grade or "ungraded"
        gradings = grading_views(finding, words, units)
        quote = next((view for view in gradings if view.decides), None)
        temperature = units.temperature(finding.extreme_c, finding.u_extreme_k)
        reference = self._reference(finding)
        comparison = self._comparison(finding, reference)
        image_title = image.asset or image.file
        title = finding.zone or image_title
        place = dict.fromkeys(text for text in (title, image.asset, image.file) if text)
        return FindingView(
            number=number,
            anchor=f"finding-{number}",
            id=finding.id,
            image_number=image_number,
            image_anchor=f"image-{image_number}",
            image_title=image_title,
            file=finding.image,
            zone=finding.zone or "",
            title=title,
            whereabouts=", ".join(text for text in place if text != title),
            sense=finding.sense,
            sense_word=words.of("sense", finding.sense),
            grade=grade,
            grade_word=words.of("grade", grade),
            doubt=self._doubt(finding),
            temperature=temperature,
            interval=self._interval(finding),
            mean=units.temperature(finding.mean_c),
            apparent=units.temperature(finding.apparent_c),
            reference=reference,
            reference_temperature=units.temperature(finding.reference_c),
            difference=units.difference(finding.delta_k, finding.u_delta_k),
            gap=self._gap(finding),
            comparison=comparison,
            against=self._against(finding, reference),
            location=words("finding.location", x=finding.extreme_px[0], y=finding.extreme_px[1]),
            area=self._area(finding),
            quote=quote,
            ungraded_why="" if finding.grade else self._why(gradings),
            gradings=gradings,
            worse_elsewhere=self._worse_elsewhere(finding),
            assessments=assessment_views(finding.assessments, words, units),
            settle=finding.settle or (quote.settle if quote else ""),
            step=words.of("step", f"{self._purpose}.{grade}"),
            cautions=finding.cautions,
            budgets=budget_views(finding, words, units),
            method=words.of("method_name", finding.method),
            band_model=self._band_model(finding),
            correlated=self._correlated(finding),
            summary=words(
                "finding.summary",
                number=number,
                sense=words.of("sense", finding.sense),
                place=", ".join(place),
                temperature=temperature.text if temperature else words("common.not_known"),
                comparison=comparison,
                grade=words.of("grade", grade),
            ),
        )

    def _reference(self, finding: Finding) -> str:
        kind = self._words.of("reference", finding.reference_kind)
        name = finding.reference_name
        if not name or name in (kind, finding.reference_kind):
            return kind
        return self._words("finding.reference_named", kind=kind, name=name)

    def _comparison(self, finding: Finding, reference: str) -> str:
        against = self._against(finding, reference)
        size = self._gap(finding)
        return f"{size.text} {against}" if size else against

    def _gap(self, finding: Finding) -> Measured | None:
        if finding.delta_k is None:
            return None
        return self._units.difference(abs(finding.delta_k), finding.u_delta_k, sign=False)

    def _against(self, finding: Finding, reference: str) -> str:
        if finding.delta_k is None or not known(finding.delta_k):
            return self._words("finding.no_difference", reference=reference)
        if finding.delta_k < 0.0:
            return self._words("finding.cooler", reference=reference)
        return self._words("finding.warmer", reference=reference)

    def _why(self, gradings: tuple[GradingView, ...]) -> str:
        """Why a finding has no grade."""
        if not gradings:
            return self._words("grading.empty")
        reasons = [
            f"{view.title}: {view.needs or view.grade_word}"
            for view in gradings
            if not view.scenario
        ]
        return "; ".join(reasons)

    def _worse_elsewhere(self, finding: Finding) -> tuple[str, ...]:
        """The worst grade of each set of other conditions, where it beats the headline."""
        worst: dict[str, int] = {}
        for grading in finding.gradings:
            if grading.scenario and grading.grade is not None:
                rank = GRADES.index(grading.grade)
                worst[grading.scenario] = max(rank, worst.get(grading.scenario, -1))
        own = -1 if finding.grade is None else GRADES.index(finding.grade)
        return tuple(
            self._words(
                "finding.elsewhere",
                scenario=self._words.of("scenario", scenario),
                grade=self._words.of("grade", GRADES[rank]),
            )
            for scenario, rank in worst.items()
            if rank > own
        )

    def _doubt(self, finding: Finding) -> str:
        words = self._words
        if finding.grade is None or finding.grade_probability is None:
            return ""
        likely = percent(finding.grade_probability)
        if finding.grade == GRADES[-1]:
            return words("finding.doubt_highest", likely=likely)
        if finding.worse_probability is None:
            return words("finding.doubt_likely", likely=likely)
        return words("finding.doubt", likely=likely, worse=percent(finding.worse_probability))

    def _interval(self, finding: Finding) -> str:
        if finding.interval_c is None or not all(known(end) for end in finding.interval_c):
            return ""
        low, high = (self._units.fixed(self._units.from_celsius(c), 1) for c in finding.interval_c)
        return self._words("finding.interval", low=low, high=with_unit(high, self._units.sign))

    def _area(self, finding: Finding) -> str:
        words = self._words
        pixels = words.count("finding.area_px", finding.area_px)
        if finding.area_m2 is None or not known(finding.area_m2):
            return pixels
        factor, unit = (1.0, "m²") if finding.area_m2 >= _SMALL_AREA_M2 else (_CM2_PER_M2, "cm²")
        u = finding.u_area_m2
        spread = None if u is None else COVERAGE * u * factor
        size = self._units.measured(finding.area_m2 * factor, spread, unit, decimals=2)
        return words("finding.area", pixels=pixels, area=size.text)

    def _band_model(self, finding: Finding) -> str:
        moved = self._units.difference(finding.model_difference_k)
        return self._words("finding.band_model", difference=moved.plain) if moved else ""

    def _correlated(self, finding: Finding) -> str:
        numbers = sorted(self._numbers.get(other, 0) for other in finding.correlated_with)
        shown = [str(number) for number in numbers if number]
        if not shown:
            return ""
        return self._words.count("finding.correlated", len(shown), list=", ".join(shown))
