"""What the page says, as plain data: every number already rounded, every phrase already chosen.

Built by ``survey_view``, ``finding_view``, ``grading_view`` and ``budget_view`` from a
SurveyResult without any HTML, so that it can be tested without any.
"""

from dataclasses import dataclass
from typing import Final, Literal

from thermo_fix.records import Condition, Grade, ModelName, Purpose, Sense
from thermo_fix.report.formatting import Measured, Units

GradeKey = Literal["act", "plan", "watch", "note", "ungraded"]
GRADE_KEYS: Final[tuple[GradeKey, ...]] = ("act", "plan", "watch", "note", "ungraded")
"""Worst first, as the report counts them."""


@dataclass(frozen=True, slots=True)
class CriterionText:
    """A criterion with its published text, as the page prints it."""

    criterion: str
    """Identifier."""
    title: str
    source: str = ""
    classes: tuple[tuple[str, str, Grade | None], ...] = ()
    """Published class, published meaning, our grade."""
    note: str = ""


@dataclass(frozen=True, slots=True)
class Chance:
    """Probability of one grade, as a piece of a bar."""

    key: str
    word: str
    start: float
    width: float
    """Per cent of the bar."""
    text: str


@dataclass(frozen=True, slots=True)
class GradingView:
    """One criterion applied to one finding."""

    criterion: str
    title: str
    quantity: str
    value: str | None
    grade: GradeKey
    grade_word: str
    class_label: str
    class_text: str
    chances: tuple[Chance, ...]
    needs: str | None
    settle: str
    note: str
    scenario: str
    """Under which other conditions; empty as measured."""
    decides: bool
    """Whether the finding's grade comes from here."""


@dataclass(frozen=True, slots=True)
class FigureRow:
    """One number of an assessment."""

    label: str
    value: str
    note: str


@dataclass(frozen=True, slots=True)
class AssessmentView:
    """What a trade concludes beyond a grade."""

    title: str
    statement: str
    short: str
    """The beginning of the statement, in whole sentences."""
    figures: tuple[FigureRow, ...]
    cautions: tuple[str, ...]
    source: str


@dataclass(frozen=True, slots=True)
class BudgetRow:
    """One line of a budget."""

    input: str
    value: str
    u: str
    sensitivity: str
    contribution: str
    bar: float
    """Per cent of the longest bar."""
    share: str
    """Share of the variance."""


@dataclass(frozen=True, slots=True)
class BudgetView:
    """The contributions to one standard uncertainty, largest first."""

    of: str
    rows: tuple[BudgetRow, ...]
    total: str
    """Standard uncertainty, k = 1."""


@dataclass(frozen=True, slots=True)
class FindingView:
    """One finding."""

    number: int
    """Rank in the survey, 1 is the worst."""
    anchor: str
    id: str
    image_number: int
    image_anchor: str
    image_title: str
    file: str
    zone: str
    title: str
    """The zone, or without one the image's asset or file."""
    whereabouts: str
    """Asset and file, as far as the title does not say them."""
    sense: Sense
    sense_word: str
    grade: GradeKey
    grade_word: str
    doubt: str
    """How probable the grade is, in words; empty where not known."""
    temperature: Measured | None
    interval: str
    mean: Measured | None
    apparent: Measured | None
    reference: str
    reference_temperature: Measured | None
    difference: Measured | None
    gap: Measured | None
    """Size of the difference, without its sign."""
    comparison: str
    """Difference, its uncertainty and the reference in one phrase."""
    against: str
    """The phrase without the number: ``warmer than like component (lug A)``."""
    location: str
    area: str
    quote: GradingView | None
    """The grading that decided the grade."""
    ungraded_why: str
    gradings: tuple[GradingView, ...]
    worse_elsewhere: tuple[str, ...]
    """Other conditions under which the grade would be worse, in words."""
    assessments: tuple[AssessmentView, ...]
    settle: str
    step: str
    cautions: tuple[str, ...]
    budgets: tuple[BudgetView, ...]
    method: str
    band_model: str
    correlated: str
    summary: str
    """All that matters in one sentence; the text alternative of its pictures."""


@dataclass(frozen=True, slots=True)
class InputRow:
    """One input of one image."""

    label: str
    where: str
    value: str
    u: str
    origin: str
    """Key of the origin, without spaces."""
    origin_word: str
    note: str


@dataclass(frozen=True, slots=True)
class ImageView:
    """One image."""

    number: int
    anchor: str
    title: str
    file: str
    done: bool
    error: str
    note: str
    facts: tuple[tuple[str, str], ...]
    findings: tuple[FindingView, ...]
    inputs: tuple[InputRow, ...]
    origins: str
    """How many inputs came from where, in words."""
    unsolved: str
    notes: tuple[str, ...]
    cautions: tuple[str, ...]
    assessments: tuple[AssessmentView, ...]
    grade: GradeKey | None
    """Of its worst finding; None without findings."""
    grade_word: str
    picture_text: str
    """Text alternative of the corrected picture."""


@dataclass(frozen=True, slots=True)
class FileRow:
    """One source file."""

    number: int
    file: str
    title: str
    status: str
    sha256: str
    findings: int
    grade: GradeKey | None
    """Of its worst finding; None without findings."""
    grade_word: str


@dataclass(frozen=True, slots=True)
class Rank:
    """Findings of one grade at the head of the report."""

    grade: GradeKey
    word: str
    meaning: str
    number: int
    step: str
    cards: tuple[FindingView, ...]


@dataclass(frozen=True, slots=True)
class SettingRow:
    """One property of the camera or the survey that numbers depend on."""

    label: str
    value: str
    origin_word: str


@dataclass(frozen=True, slots=True)
class ReportView:
    """The page, apart from its images, which are built one at a time."""

    title: str
    purpose: Purpose
    model: ModelName
    facts: tuple[tuple[str, str], ...]
    """Label and value of each field of the title block."""
    assumed: tuple[str, ...]
    """Sentences of the banner; empty where the inputs were given."""
    survey_notes: tuple[str, ...]
    counts: tuple[tuple[GradeKey, str, str, int], ...]
    """Grade, word, meaning, number of findings."""
    headline: tuple[str, ...]
    """The outcome in plain words, a sentence each."""
    ranks: tuple[Rank, ...]
    """The cards by grade."""
    cards: tuple[FindingView, ...]
    more: str
    """What the cards leave out, in words."""
    outcome: tuple[str, ...]
    """Why there is no finding to show and what that means: a heading and sentences. Empty where
    there are findings."""
    failed: tuple[ImageView, ...]
    findings: tuple[FindingView, ...]
    conditions: tuple[Condition, ...]
    told: tuple[tuple[str, tuple[str, ...]], ...]
    """Conditions by state, for the head of the report; what is in doubt stands first."""
    untold: tuple[str, ...]
    """Names of the conditions that the survey was not told."""
    criteria: tuple[CriterionText, ...]
    cautions: tuple[str, ...]
    files: tuple[FileRow, ...]
    camera: tuple[SettingRow, ...]
    settings: tuple[SettingRow, ...]
    """Limits that the criteria were given."""
    software: str
    units: Units
