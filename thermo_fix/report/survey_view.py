"""The survey as a whole, and its images, in words and rounded numbers."""

from collections.abc import Iterator, Sequence
from typing import Final

from thermo_fix import cautions
from thermo_fix.records import GRADES, Grade, ImageResult, InputLine, SurveyResult
from thermo_fix.report.assessment_view import assessment_views
from thermo_fix.report.camera_view import camera_rows
from thermo_fix.report.catalogue import Words
from thermo_fix.report.finding_view import FindingViews
from thermo_fix.report.formatting import Units, iso, percent
from thermo_fix.report.view import (
    GRADE_KEYS,
    CriterionText,
    FileRow,
    FindingView,
    GradeKey,
    ImageView,
    InputRow,
    Rank,
    ReportView,
    SettingRow,
)

MOST_CARDS: Final = 12
"""Findings shown as cards at the head of the report; the table holds them all."""

FEWEST_CARDS: Final = 3
"""Cards shown where no finding is graded ``act`` or ``plan``."""

DECISIVE_INPUTS: Final = frozenset({"emissivity", "reflected_c"})
"""Inputs that carry most of a correction: assumed, they are announced at the head."""


class SurveyViews:
    """Turns one SurveyResult into what the page says."""

    def __init__(
        self,
        result: SurveyResult,
        words: Words,
        *,
        version: str,
        criteria: Sequence[CriterionText] = (),
    ) -> None:
        self._result = result
        self._words = words
        self._version = version
        self._criteria = criteria
        self._units = Units(result.survey.temperature_unit, words("common.decimal_mark"))
        self._findings = FindingViews(result, words, self._units)
        self._image_numbers = {image.file: n for n, image in enumerate(result.images, start=1)}

    # ------------------------------------------------------------ the whole

    def report(self) -> ReportView:
        """Everything but the sections of the images."""
        result, words = self._result, self._words
        findings = tuple(self._findings.view(finding) for finding in result.findings)
        pressing = [view for view in findings if view.grade in ("act", "plan")]
        cards = tuple(pressing[:MOST_CARDS]) or findings[:FEWEST_CARDS]
        left_out = (len(pressing) or len(findings)) - len(cards)
        return ReportView(
            title=result.survey.title,
            purpose=result.survey.purpose,
            model=result.survey.model,
            facts=self._title_block(),
            assumed=self._assumed(),
            survey_notes=result.survey.notes,
            counts=tuple(
                (
                    key,
                    words.of("grade", key),
                    words.of("grade_meaning", key),
                    sum(view.grade == key for view in findings),
                )
                for key in GRADE_KEYS
            ),
            headline=self._headline(findings),
            ranks=self._ranks(findings, cards),
            cards=cards,
            more=words.count("act.more", left_out) if left_out else "",
            outcome=self._outcome(),
            failed=tuple(self.image(image) for image in result.failed),
            findings=findings,
            conditions=result.conditions,
            told=self._told(),
            untold=tuple(c.name for c in result.conditions if c.state == "not told"),
            criteria=self._criteria_texts(),
            cautions=self._cautions(),
            files=tuple(self._file_row(image) for image in result.images),
            camera=camera_rows(result.survey.camera, words, self._units),
            settings=tuple(
                SettingRow(key, self._units.shortest(value), words("origin.given"))
                for key, value in sorted(result.survey.criteria_settings.items())
            ),
            software=f"thermo_fix {self._version}",
            units=self._units,
        )

    def _told(self) -> tuple[tuple[str, tuple[str, ...]], ...]:
        by_state: dict[str, dict[str, None]] = {"not met": {}, "not told": {}, "met": {}}
        for each in self._result.conditions:
            text = f"{each.name}: {each.value}" if each.value else each.name
            by_state[each.state].setdefault(text)
        return tuple((state, tuple(texts)) for state, texts in by_state.items() if texts)

    def _file_row(self, image: ImageResult) -> FileRow:
        ranks = [
            -1 if finding.grade is None else GRADES.index(finding.grade)
            for finding in image.findings
        ]
        worst = max(ranks, default=None)
        grade: GradeKey | None = (
            None if worst is None else "ungraded" if worst < 0 else GRADES[worst]
        )
        return FileRow(
            number=self._image_numbers[image.file],
            file=image.file,
            title=image.asset or image.file,
            status=self._words.of("status", image.status),
            sha256=image.sha256 or "",
            findings=len(image.findings),
            grade=grade,
            grade_word="" if grade is None else self._words.of("grade", grade),
        )

    def images(self) -> Iterator[ImageView]:
        """The images one after another, so that a large survey does not fill the memory."""
        for image in self._result.images:
            yield self.image(image)

    def _title_block(self) -> tuple[tuple[str, str], ...]:
        survey, words = self._result.survey, self._words
        total, failed = len(self._result.images), len(self._result.failed)
        images = words.count("masthead.done", total, done=total - failed)
        if failed:
            images += "; " + words.count("masthead.failed", failed)
        not_told = words("common.not_told")
        return (
            (words("masthead.purpose"), words.of("purpose", survey.purpose)),
            (words("masthead.date"), iso(survey.date) if survey.date else not_told),
            (words("masthead.surveyor"), survey.surveyor or not_told),
            (words("masthead.images"), images),
        )

    def _headline(self, findings: Sequence[FindingView]) -> tuple[str, ...]:
        """What was measured and what to do, in plain words."""
        words = self._words
        if not findings:
            return ()
        done = len(self._result.images) - len(self._result.failed)
        acts, plans = (sum(view.grade == grade for view in findings) for grade in ("act", "plan"))
        sentences = [
            words.count("headline.images", done)
            + " "
            + words.count("headline.findings", len(findings))
        ]
        if acts:
            sentences.append(words.count("headline.act", acts))
        if plans:
            sentences.append(words.count("headline.plan", plans))
        if not acts and not plans:
            sentences.append(words("headline.calm"))
        sentences.append(
            words(
                "headline.worst",
                place=findings[0].title,
                temperature=(
                    findings[0].temperature.text
                    if findings[0].temperature
                    else words("common.not_known")
                ),
                comparison=findings[0].comparison,
            )
        )
        return tuple(sentences)

    def _ranks(
        self, findings: Sequence[FindingView], cards: Sequence[FindingView]
    ) -> tuple[Rank, ...]:
        words = self._words
        return tuple(
            Rank(
                grade=key,
                word=words.of("grade", key),
                meaning=words.of("grade_meaning", key),
                number=sum(view.grade == key for view in findings),
                step=words.of("step", f"{self._result.survey.purpose}.{key}"),
                cards=tuple(view for view in cards if view.grade == key),
            )
            for key in GRADE_KEYS
            if any(view.grade == key for view in cards)
        )

    def _assumed(self) -> tuple[str, ...]:
        """Sentences for the banner on the face of the report."""
        words = self._words
        lines = [(image.file, line) for image in self._result.images for line in image.inputs]
        assumed = [(file, line) for file, line in lines if line.origin == "assumed"]
        keys = {line.key for _, line in assumed}
        without_sheet = self._result.survey.sheet is None
        mostly = 2 * len(assumed) > len(lines)
        if not (without_sheet or keys & DECISIVE_INPUTS or mostly):
            return ()
        sentences = [words("assumed.no_sheet")] if without_sheet else []
        if assumed:
            sentences.append(words("assumed.count", n=len(assumed), total=len(lines)))
            parts = []
            for key in sorted(keys, key=lambda key: (key not in DECISIVE_INPUTS, key)):
                files = len({file for file, line in assumed if line.key == key})
                parts.append(words.count("assumed.input", files, name=words.of("input", key)))
            sentences.append(words("assumed.which", list="; ".join(parts)))
        return tuple(sentences)

    def _outcome(self) -> tuple[str, ...]:
        result, words = self._result, self._words
        if not result.images:
            return words("outcome.not_measured"), words("outcome.empty")
        if len(result.failed) == len(result.images):
            failed = words.count("outcome.all_failed", len(result.failed))
            return words("outcome.not_measured"), failed
        if result.findings:
            return ()
        return (words("outcome.no_findings"), *self._searched(), words("outcome.meaning"))

    def _searched(self) -> tuple[str, ...]:
        """What was looked for in vain, by the settings of the images that were used."""
        result, words = self._result, self._words
        done = {image.file for image in result.images if image.status == "done"}
        settings = [job.detect for job in result.survey.images if job.file in done]
        if not settings:
            return (words.count("outcome.none", len(done)),)
        delta = self._units.difference(min(s.min_delta_k for s in settings), sign=False)
        sentence = words.count(
            "outcome.none_by",
            len(done),
            area=min(s.min_area_px for s in settings),
            delta=delta.plain if delta else "",
        )
        if not any(s.cold for s in settings):
            return sentence, words("outcome.only_hot")
        if not any(s.warm for s in settings):
            return sentence, words("outcome.only_cold")
        return (sentence,)

    def _criteria_texts(self) -> tuple[CriterionText, ...]:
        """The texts that were handed over, and for other criteria what the gradings quote."""
        texts = {text.criterion: text for text in self._criteria}
        seen: dict[str, dict[tuple[str, str], Grade | None]] = {}
        titles: dict[str, str] = {}
        for finding in self._result.findings:
            for grading in finding.gradings:
                titles.setdefault(grading.criterion, grading.title)
                classes = seen.setdefault(grading.criterion, {})
                if grading.class_label or grading.class_text:
                    classes[grading.class_label, grading.class_text] = grading.grade
        for criterion, title in titles.items():
            if criterion not in texts:
                texts[criterion] = CriterionText(
                    criterion=criterion,
                    title=title,
                    classes=tuple((*key, grade) for key, grade in seen[criterion].items()),
                )
        return tuple(texts[key] for key in sorted(texts))

    def _cautions(self) -> tuple[str, ...]:
        standing = (
            *cautions.general(self._result.survey.purpose),
            self._words("caution.conditions"),
        )
        every = dict.fromkeys((*standing, *self._result.cautions))
        # Standing cautions are safety matters: a catalogue translates them by their own words.
        return tuple(self._words.of("standing", text) for text in every)

    # ------------------------------------------------------------ one image

    def image(self, image: ImageResult) -> ImageView:
        """One image with its findings in the order of their rank."""
        words = self._words
        number = self._image_numbers[image.file]
        findings = sorted(image.findings, key=self._findings.number)
        views = tuple(self._findings.view(finding) for finding in findings)
        done = image.status == "done"
        title = image.asset or image.file
        return ImageView(
            number=number,
            anchor=f"image-{number}",
            title=title,
            file=image.file,
            done=done,
            error=self._error(image),
            note=image.note,
            facts=self._image_facts(image),
            findings=views,
            inputs=tuple(self._input(line) for line in image.inputs),
            origins=self._origins(image.inputs),
            unsolved=self._unsolved(image),
            notes=image.notes,
            cautions=image.cautions,
            assessments=assessment_views(image.assessments, words, self._units),
            grade=views[0].grade if views else None,
            grade_word=views[0].grade_word if views else "",
            picture_text=" ".join(
                [
                    words("picture.alt", title=title),
                    *([view.summary for view in views] or [words("picture.alt_no_finding")]),
                ]
            ),
        )

    def _error(self, image: ImageResult) -> str:
        """Why an image failed, without its name in front."""
        if image.status == "done":
            return ""
        return (image.error or "").removeprefix(f"{image.file}: ") or self._words(
            "failed.no_reason"
        )

    def _image_facts(self, image: ImageResult) -> tuple[tuple[str, str], ...]:
        words, units = self._words, self._units
        facts: list[tuple[str, str]] = [(words("image.file"), image.file)]
        if image.taken is not None:
            facts.append((words("image.taken"), iso(image.taken)))
        if image.width and image.height:
            size = words("image.size_value", width=image.width, height=image.height)
            facts.append((words("image.size"), size))
        low, high = units.temperature(image.min_c), units.temperature(image.max_c)
        if low and high:
            text = words("image.range_value", low=low.value, high=high.plain)
            facts.append((words("image.range"), text))
        median = units.temperature(image.median_c, image.u_median_k)
        if median:
            facts.append((words("image.median"), median.text))
        recorded = units.temperature(image.recorded_median_c)
        if recorded:
            facts.append((words("image.recorded_median"), recorded.plain))
        return tuple(facts)

    def _unsolved(self, image: ImageResult) -> str:
        if not image.unsolved_px:
            return ""
        total = (image.width or 0) * (image.height or 0)
        if not total:
            return self._words.count("image.unsolved", image.unsolved_px)
        return self._words.count(
            "image.unsolved_share", image.unsolved_px, share=percent(image.unsolved_px / total)
        )

    def _origins(self, lines: Sequence[InputLine]) -> str:
        counts: dict[str, int] = {}
        for line in lines:
            counts[line.origin] = counts.get(line.origin, 0) + 1
        return ", ".join(
            f"{number} {self._words.of('origin', origin)}" for origin, number in counts.items()
        )

    def _input(self, line: InputLine) -> InputRow:
        words = self._words
        value, u = self._units.input_and_u(line.value, line.u, line.unit)
        return InputRow(
            label=words.of("input", line.key),
            where=line.where,
            value=line.text or value or words("common.not_told"),
            u=u or words("common.none"),
            origin=line.origin.replace(" ", "-"),
            origin_word=words.of("origin", line.origin),
            note=line.note,
        )
