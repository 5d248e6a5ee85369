"""The records that one stage hands to the next.

Frozen dataclasses, no behaviour beyond small derived properties. The order in this file is the
order of the data flow: what the sheet says, what was read, what was corrected, what was found,
what was graded, and what the survey as a whole came to.

Temperatures are in degC in everything that came from the sheet and goes to the results, and in
kelvins (names end in ``_k``) inside the radiometry. Arrays are (rows, columns). Pixel
coordinates are (x, y) with the origin at the outer corner of the first pixel.
"""

import datetime as calendar
from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime
from pathlib import Path
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from thermo_fix.uncertainty.equation import MeasurementEquation
from thermo_fix.uncertainty.estimate import Estimate

FloatArray = NDArray[np.float32] | NDArray[np.float64]
LabelArray = NDArray[np.int16]
MaskArray = NDArray[np.bool_]

Origin = Literal["given", "surface table", "measured", "computed", "inferred", "assumed"]
"""Where a value comes from; printed beside every input in the report."""

Sense = Literal["hot", "cold"]
Purpose = Literal["building", "electrical"]
Side = Literal["inside", "outside"]
TemperatureUnit = Literal["celsius", "fahrenheit"]
Language = Literal["en", "de"]
"""Of the report; one catalogue of words each."""
PixelUnit = Literal["celsius", "kelvin", "linear"]
ModelName = Literal["total", "band"]
Grade = Literal["note", "watch", "plan", "act"]
GRADES: tuple[Grade, ...] = ("note", "watch", "plan", "act")
"""Our own ladder, mildest first."""


# ---------------------------------------------------------------- what the sheet says


@dataclass(frozen=True, slots=True)
class Input:
    """One input variable of the measurement.

    Two regions that use an Input with the same ``name`` use the same variable, so that its error
    is common to both.
    """

    key: str
    """Key of the sheet, with a dot for a nested one: ``emissivity``, ``window.transmittance``."""
    value: float
    """In the unit that the key names (degC, m, 1)."""
    u: float
    """Standard uncertainty (k = 1), same unit."""
    origin: Origin
    scope: str
    """Where it was stated: ``scene``, ``image IR_1.tif``, ``zone lug B of IR_1.tif``,
    ``surface brick, red``, ``default``."""
    u_origin: Origin = "assumed"
    note: str = ""
    """Reason for a default, or source of a tabulated value."""

    @property
    def name(self) -> str:
        """Identity of the variable."""
        return f"{self.key} [{self.scope}]"


@dataclass(frozen=True, slots=True)
class SkyAndGround:
    """Reflected temperature to be computed for an exterior surface."""

    cloud: float
    """Cloud fraction, 0 to 1."""
    tilt_deg: float
    """0 is a surface facing the sky, 90 a wall."""
    ground_c: float
    u_k: float
    """Standard uncertainty of the reflected temperature that results, K."""


@dataclass(frozen=True, slots=True)
class Limit:
    """A temperature, or a rise over the air, that a part may not exceed."""

    name: str
    of: str
    """What it is for: ``conductor``, ``winding``."""
    source: str
    obtained: Literal["found", "from memory"]
    temperature_c: float | None = None
    rise_k: float | None = None
    """Over the air or other coolant; exactly one of the two is given."""
    aliases: tuple[str, ...] = ()

    @property
    def names(self) -> tuple[str, ...]:
        """The name and its aliases."""
        return (self.name, *self.aliases)


@dataclass(frozen=True, slots=True)
class SceneInputs:
    """All inputs in force for one zone (or for the rest of an image)."""

    values: Mapping[str, Input]
    """By sheet key. Absent: not told (and no default is defensible)."""
    emissivity_file: Path | None = None
    """TIFF of the image's shape; ``values['emissivity']`` then holds only its uncertainty."""
    reflected_file: Path | None = None
    """TIFF of the image's shape, degC."""
    reflected_zone: str | None = None
    """Name of the crumpled-foil zone on which the reflected temperature is measured."""
    sky: SkyAndGround | None = None
    surface: str | None = None
    """Name in the surface table, when the emissivity came from there."""
    outdoors: bool | None = None
    """Whether the part stands in the open; None where it was not told."""
    limit: Limit | None = None
    target_load_a: float | None = None
    """Load to which a rise is to be brought, besides the rated one, A."""
    design_air_c: float | None = None
    """Air for which the installation is designed, degC."""
    side: Side | None = None
    """Of the building's envelope that is seen; None where it was not told."""

    def value(self, key: str) -> float | None:
        """Value of an input, or None where it was not told."""
        found = self.values.get(key)
        return None if found is None else found.value

    def told(self, key: str) -> Input | None:
        """Return an input that was stated or measured; a default is a guess, and is not."""
        found = self.values.get(key)
        return None if found is None or found.origin == "assumed" else found

    @property
    def inside(self) -> bool | None:
        """Whether the surface is inside: as told, else the air before it is nearer to indoors.

        None where neither tells.
        """
        if self.side is not None:
            return self.side == "inside"
        air, indoor, outdoor = (self.told(key) for key in ("air_c", "indoor_c", "outdoor_c"))
        if air is None or indoor is None or outdoor is None:
            return None
        to_indoor, to_outdoor = abs(air.value - indoor.value), abs(air.value - outdoor.value)
        return None if to_indoor == to_outdoor else to_indoor < to_outdoor


@dataclass(frozen=True, slots=True)
class Zone:
    """A named polygon of one image with its own surface, load and role."""

    name: str
    polygon: tuple[tuple[float, float], ...]
    """(x, y) in pixels, corner-based."""
    inputs: SceneInputs
    like: str | None = None
    load_a: float | None = None
    rated_a: float | None = None
    ignore: bool = False
    role: str | None = None
    """``foil`` or ``tape``: a reference patch."""
    load_u_a: float | None = None
    """Standard uncertainty (k = 1) of ``load_a``, A; None where the default is to be taken."""


@dataclass(frozen=True, slots=True)
class SurveyConditions:
    """What the sheet says of the weather and the building at the survey; None: not told."""

    rain: bool | None = None
    """Rain on the surface, before or during the survey."""
    sun_hours_since: float | None = None
    """Hours between the last direct sun on the surface and the survey."""
    steady_hours: float | None = None
    """Hours before the survey for which indoor and outdoor air had been steady."""
    pressure_difference_pa: float | None = None
    """Outside minus inside, Pa; positive drives outdoor air in."""
    u_value: Input | None = None
    """Of the sound construction, W m-2 K-1."""


@dataclass(frozen=True, slots=True)
class Design:
    """Conditions for which a building is judged besides those of the survey; None: not told."""

    indoor_c: Input | None = None
    humidity: Input | None = None
    outdoor_c: Input | None = None
    degree_days_k: Input | None = None
    """Heating degree days of a year, K day."""
    climate: str = ""
    """Where the degree days come from, in words."""


@dataclass(frozen=True, slots=True)
class WeatherLog:
    """Weather by time, in the local time of the images' clock, in order."""

    file: str
    times: tuple[datetime, ...]
    columns: Mapping[str, tuple[float, ...]]
    """By ``air_c`` (degC), ``humidity`` (0 to 1), ``wind_m_s``, ``rain``, ``sun`` (0: none);
    NaN where a cell is empty."""
    resolution: Mapping[str, float]
    """Smallest step in which a column is written."""
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class WeatherFacts:
    """What a weather log says of the survey as a whole; None where it does not cover that."""

    file: str
    first: datetime
    """When the first image was taken."""
    last: datetime
    outdoor_before_k: float | None = None
    """Greatest departure of the outdoor air from its value at the first image, 24 h before, K."""
    outdoor_during_k: float | None = None
    """The same between the first and the last image, K."""
    wind_max_m_s: float | None = None
    """Between the first and the last image."""
    dry_hours: float | None = None
    """Hours without rain up to the first image, as far back as the log goes; 0 with rain during
    the survey."""
    rain_seen: bool = False
    """Whether ``dry_hours`` ends at rain, and not at the beginning of the log."""
    sunless_hours: float | None = None
    """The same for sun."""
    sun_seen: bool = False


@dataclass(frozen=True, slots=True)
class DetectSettings:
    """Which findings are wanted."""

    warm: bool = True
    cold: bool = True
    min_delta_k: float = 1.5
    min_area_px: int = 9


@dataclass(frozen=True, slots=True)
class ImageJob:
    """One image of the survey and everything the sheet says of it."""

    file: str
    """Path relative to the survey folder, with forward slashes."""
    path: Path
    inputs: SceneInputs
    zones: tuple[Zone, ...] = ()
    detect: DetectSettings = field(default_factory=DetectSettings)
    asset: str = ""
    photo: Path | None = None
    taken: datetime | None = None
    note: str = ""
    conditions: SurveyConditions = field(default_factory=SurveyConditions)
    """Of the survey as a whole; here because the image is judged by them."""
    design: Design = field(default_factory=Design)
    """Of the survey as a whole."""


@dataclass(frozen=True, slots=True)
class Recorded:
    """The settings that the camera had applied when it wrote its readings."""

    emissivity: float = 1.0
    reflected_c: float = 20.0
    air_c: float = 20.0
    transmittance: float = 1.0
    origin: Origin = "assumed"


@dataclass(frozen=True, slots=True)
class Camera:
    """What the sheet says of the camera."""

    pixel: PixelUnit | None = None
    """None: not stated, to be inferred."""
    scale: float | None = None
    offset: float | None = None
    band_um: tuple[float, float] | None = None
    response_file: Path | None = None
    """Two-column CSV: wavelength in um, relative response."""
    ifov_mrad: float | None = None
    noise_k: float = 0.1
    noise_origin: Origin = "assumed"
    accuracy_k: float = 2.0
    accuracy_fraction: float = 0.02
    accuracy_origin: Origin = "assumed"
    nonuniformity_k: float = 0.0
    """Standard uncertainty of the fixed difference between two places of one image, K."""
    nonuniformity_origin: Origin = "assumed"
    recorded: Recorded = field(default_factory=Recorded)


@dataclass(frozen=True, slots=True)
class Survey:
    """One folder, as the sheet (or, without one, the defaults) describes it."""

    folder: Path
    sheet: Path | None
    title: str
    purpose: Purpose
    images: tuple[ImageJob, ...]
    camera: Camera
    model: ModelName = "total"
    criteria: tuple[str, ...] = ()
    criteria_settings: Mapping[str, float] = field(default_factory=dict)
    """Settings of criteria, such as ``surface_factor_limit``."""
    criteria_file: Path | None = None
    date: calendar.date | None = None
    surveyor: str = ""
    temperature_unit: TemperatureUnit = "celsius"
    language: Language = "en"
    notes: tuple[str, ...] = ()
    """What was assumed about the survey as a whole, one sentence each."""
    conditions: SurveyConditions = field(default_factory=SurveyConditions)
    design: Design = field(default_factory=Design)
    weather_file: Path | None = None
    utc_offset_hours: float | None = None
    """Of the images' clock; needed where the weather log is in another time."""
    weather: WeatherFacts | None = None
    """What the weather log says, once it is read."""


# ---------------------------------------------------------------- what was read


@dataclass(frozen=True, slots=True)
class Encoding:
    """How pixel values turn into temperature."""

    unit: PixelUnit
    scale: float
    """``kelvin = scale * value + offset`` for ``linear``; 1 otherwise."""
    offset: float
    origin: Origin
    note: str = ""


@dataclass(frozen=True, slots=True)
class Frame:
    """One radiometric image as read."""

    path: Path
    values: NDArray[np.generic]
    """(rows, columns), native byte order, as stored: float32, float64, uint16 or int16; integers
    with missing pixels become float32 with NaN."""
    encoding: Encoding
    sha256: str
    taken: datetime | None = None
    """From the DateTime tag."""
    notes: tuple[str, ...] = ()
    carried_tags: tuple[tuple[int, int, int, object], ...] = ()
    """Georeference and date tags to be kept, as (code, TIFF data type, count, value)."""

    @property
    def shape(self) -> tuple[int, int]:
        """(rows, columns)."""
        rows, columns = self.values.shape
        return int(rows), int(columns)


# ---------------------------------------------------------------- what was corrected


@dataclass(frozen=True, slots=True)
class RangeEnds:
    """Readings at which an image ends although its scene may go on; None where it does not."""

    least_k: float | None = None
    greatest_k: float | None = None
    least_px: int = 0
    """Pixels at the least reading."""
    greatest_px: int = 0


@dataclass(frozen=True, slots=True)
class CorrectedFrame:
    """One image with its surface temperatures and the equations behind them.

    A label says which equation holds for a pixel: 0 is the rest of the image, i + 1 zone i.
    """

    job: ImageJob
    frame: Frame
    labels: LabelArray
    """(rows, columns)."""
    reading_k: NDArray[np.float32]
    """(rows, columns), K; NaN where the file holds no value."""
    surface_k: NDArray[np.float32]
    """(rows, columns), K; NaN where unsolved."""
    uncertainty_k: NDArray[np.float32]
    """(rows, columns), standard uncertainty (k = 1), K."""
    equations: tuple[MeasurementEquation, ...]
    """By label."""
    inputs: tuple[SceneInputs, ...]
    """By label; with measured and computed values filled in."""
    emissivity_planes: Mapping[int, NDArray[np.float32]] = field(default_factory=dict)
    """By label, (rows, columns), where the sheet gives a plane."""
    reflected_planes: Mapping[int, NDArray[np.float32]] = field(default_factory=dict)
    """By label, (rows, columns), degC."""
    notes: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()
    range_ends_k: RangeEnds = RangeEnds()

    @property
    def unsolved_px(self) -> int:
        """Pixels with a reading but without a surface temperature."""
        return int(np.count_nonzero(np.isnan(self.surface_k) & np.isfinite(self.reading_k)))

    @property
    def ignored(self) -> MaskArray:
        """Pixels of zones that the sheet leaves out, (rows, columns)."""
        flags = np.array([False, *(zone.ignore for zone in self.job.zones)])
        return np.asarray(flags[self.labels])


# ---------------------------------------------------------------- what was found and graded


@dataclass(frozen=True, slots=True)
class Region:
    """One anomalous region as found, before it is measured."""

    label: int
    sense: Sense
    mask: MaskArray
    """Of the part of the image inside ``bbox_px``."""
    bbox_px: tuple[int, int, int, int]
    """x0, y0, x1, y1; half open."""
    extreme_px: tuple[int, int]
    """x, y of the pixel on whose 3 x 3 neighbourhood the extreme is measured."""
    reference_kind: Literal["like component", "surroundings"]
    reference_label: int | None = None
    """Label of the like zone, for ``like component``; None where it is the median of several."""
    reference_labels: tuple[int, ...] = ()
    """Labels of all like zones that the reference was made from."""
    reference_px: tuple[tuple[int, int], ...] = ()
    """x, y of the pixels that stand for the reference."""
    whole_zone: bool = False
    """The zone as a whole differs from its like, rather than a spot in it."""
    cut_by_frame: bool = False
    ring_delta_k: float = 0.0
    """Height over the smooth background at the extreme, K; signed."""
    defective_px: tuple[tuple[int, int], ...] = ()
    """x, y of pixels taken as defective within the 3 x 3 of the extreme or of a like component's:
    left out where the value is measured."""


@dataclass(frozen=True, slots=True)
class BudgetLine:
    """One contribution to the standard uncertainty of a temperature or a difference."""

    input: str
    """Words for the reader, such as ``emissivity of brick, red``."""
    name: str
    """Identity of the variable."""
    value: float | None
    u: float
    unit: str
    sensitivity: float
    """K per unit of the input."""
    contribution_k: float
    """|sensitivity| x u, K."""


@dataclass(frozen=True, slots=True)
class Grading:
    """One criterion applied to one finding."""

    criterion: str
    """Identifier of the criterion."""
    title: str
    quantity: str
    """What was compared, in words: ``difference to the coolest like component``."""
    value: float | None
    u: float | None
    unit: str
    grade: Grade | None
    """Most probable grade; None where the criterion names no deficiency or lacks an input."""
    class_label: str = ""
    """The published class, e.g. ``4 to 15 K``."""
    class_text: str = ""
    """The published meaning of the class, quoted."""
    chances: Mapping[str, float] = field(default_factory=dict)
    """Probability of each grade; ``none`` for no deficiency."""
    missing: tuple[str, ...] = ()
    """Inputs that the criterion lacks, by sheet key."""
    settle: str = ""
    """The one thing to measure better that would lower the doubt most."""
    note: str = ""
    scenario: str = ""
    """Empty: as measured. Else under which other conditions, such as ``full load``; such a
    grading does not head the finding."""


@dataclass(frozen=True, slots=True)
class Figure:
    """One number of an assessment, with its uncertainty."""

    label: str
    value: float | None
    u: float | None
    """Standard uncertainty (k = 1), same unit; None where not known."""
    unit: str
    note: str = ""


@dataclass(frozen=True, slots=True)
class Assessment:
    """What a trade concludes from a finding or an image beyond its grade: load, heat flow, ..."""

    kind: str
    """``load``, ``wind``, ``phases``, ``limit``, ``moisture``, ``heat flow``, ``pattern``."""
    title: str
    statement: str
    """The conclusion, one or two plain sentences."""
    figures: tuple[Figure, ...] = ()
    """The evidence in numbers."""
    cautions: tuple[str, ...] = ()
    source: str = ""


@dataclass(frozen=True, slots=True)
class Finding:
    """One anomalous region, hot or cold."""

    id: str
    image: str
    zone: str | None
    sense: Sense
    bbox_px: tuple[int, int, int, int]
    """x0, y0, x1, y1; half open."""
    area_px: int
    area_m2: float | None
    u_area_m2: float | None
    extreme_c: float
    extreme_px: tuple[int, int]
    mean_c: float
    reference_kind: str
    """``like component``, ``surroundings``, ``air`` or ``limit``."""
    reference_name: str
    """Which one, in words."""
    reference_c: float | None
    delta_k: float | None
    u_extreme_k: float | None
    u_delta_k: float | None
    gradings: tuple[Grading, ...] = ()
    grade: Grade | None = None
    grade_probability: float | None = None
    worse_probability: float | None = None
    """Chance of a grade above the most probable one."""
    criterion: str | None = None
    cautions: tuple[str, ...] = ()
    contours: tuple[tuple[tuple[float, float], ...], ...] = ()
    """Outline, (x, y) in pixels, corner-based, closed."""
    budget: tuple[BudgetLine, ...] = ()
    """Of the extreme temperature."""
    delta_budget: tuple[BudgetLine, ...] = ()
    correlated_with: tuple[str, ...] = ()
    """Findings that share input variables with this one."""
    settle: str = ""
    apparent_c: float | None = None
    """Apparent temperature at the extreme."""
    model_difference_k: float | None = None
    """How far the band model would move the extreme, K (total model only)."""
    method: str = "first order"
    """How the uncertainty was obtained: ``first order`` or ``Monte Carlo``."""
    interval_c: tuple[float, float] | None = None
    """95 % interval of the extreme temperature, degC."""
    assessments: tuple[Assessment, ...] = ()

    @property
    def every_caution(self) -> tuple[str, ...]:
        """Its cautions and those of its assessments."""
        return (*self.cautions, *(text for each in self.assessments for text in each.cautions))


@dataclass(frozen=True, slots=True)
class VariableWords:
    """How the report speaks of an input variable."""

    words: str
    """``emissivity of brick, red``."""
    remedy: str
    """What to do to know it better: ``measure the emissivity of brick, red with a tape patch``."""
    value: float | None
    u: float
    unit: str
    rectangular: bool = False
    """Whether the variable's distribution is rectangular instead of normal."""


@dataclass(frozen=True, slots=True)
class MeasuredRegion:
    """A finding with the quantities that criteria compare, before it is graded."""

    finding: Finding
    quantities: Mapping[str, Estimate]
    """By the quantity names of the criteria."""
    missing: Mapping[str, tuple[str, ...]]
    """Sheet keys that a quantity lacks, by its name."""
    inside: bool | None
    """Whether the surface is on the warm side of the envelope; None where it was not told."""
    variables: Mapping[str, VariableWords]
    """By variable name."""
    scenarios: Mapping[str, Mapping[str, Estimate]] = field(default_factory=dict)
    """Quantities under other conditions, by the scenario's name: ``full load``."""
    settings: Mapping[str, float] = field(default_factory=dict)
    """Settings of criteria that hold for this finding and win over those of the survey, such as
    the limit of its zone."""


@dataclass(frozen=True, slots=True)
class InputLine:
    """One input as the report prints it."""

    key: str
    where: str
    """``whole image`` or ``zone lug B``."""
    value: float | None
    text: str
    """The value in words where it is no number (a file, a zone)."""
    u: float | None
    unit: str
    origin: Origin
    note: str = ""


@dataclass(frozen=True, slots=True)
class ImageResult:
    """What came of one image."""

    file: str
    status: Literal["done", "failed"]
    error: str | None = None
    sha256: str | None = None
    asset: str = ""
    note: str = ""
    photo: Path | None = None
    taken: datetime | None = None
    width: int | None = None
    height: int | None = None
    inputs: tuple[InputLine, ...] = ()
    unsolved_px: int | None = None
    min_c: float | None = None
    median_c: float | None = None
    max_c: float | None = None
    u_median_k: float | None = None
    recorded_median_c: float | None = None
    notes: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()
    findings: tuple[Finding, ...] = ()
    zones: tuple[Zone, ...] = ()
    assessments: tuple[Assessment, ...] = ()
    """Of groups of zones, or of the image as a whole."""
    pixel_m: float | None = None
    """Width of a pixel's footprint at the distance of the whole image, seen squarely, m."""

    @property
    def every_caution(self) -> tuple[str, ...]:
        """Its cautions and those of its assessments, without those of its findings."""
        return (*self.cautions, *(text for each in self.assessments for text in each.cautions))


@dataclass(frozen=True, slots=True)
class PixelBudget:
    """Where the uncertainty of a single pixel comes from, for all pixels of one label."""

    name: str
    """Of the zone; empty for the rest of the image."""
    emissivity: float | None
    """As used, the view angle included; None where a plane gives it."""
    reading_c: NDArray[np.float64]
    """(nodes,), degC, evenly spaced over the readings of the label."""
    parts_k: Mapping[str, NDArray[np.float64]]
    """Signed contribution to the surface temperature at the nodes, K (k = 1), by variable: equal
    names are one variable. Empty where it depends on a plane."""
    own: tuple[str, ...]
    """Those of them that no two pixels share."""


@dataclass(frozen=True, slots=True)
class Planes:
    """The arrays of one image that the report and the written planes need."""

    recorded_c: NDArray[np.float32]
    """Readings as recorded, degC, (rows, columns)."""
    corrected_c: NDArray[np.float32]
    """Surface temperature, degC, NaN where unsolved."""
    uncertainty_k: NDArray[np.float32]
    """Standard uncertainty (k = 1), K."""
    apparent_c: NDArray[np.float32] | None = None
    """Apparent temperature, degC; None where it is the reading."""
    labels: LabelArray | None = None
    """0 for the rest of the image, i + 1 for zone i; None without zones."""
    emissivity: NDArray[np.float32] | None = None
    """Per pixel; None where each label has one."""
    budgets: tuple[PixelBudget, ...] = ()
    """By label; empty where not known."""


@dataclass(frozen=True, slots=True)
class Condition:
    """One survey condition, checked."""

    name: str
    state: Literal["met", "not met", "not told"]
    value: str
    rule: str
    source: str


@dataclass(frozen=True, slots=True)
class SurveyResult:
    """What came of the survey."""

    survey: Survey
    images: tuple[ImageResult, ...]
    conditions: tuple[Condition, ...] = ()
    cautions: tuple[str, ...] = ()

    @property
    def findings(self) -> tuple[Finding, ...]:
        """All findings, worst first."""
        every = [finding for image in self.images for finding in image.findings]

        def weight(finding: Finding) -> tuple[int, float, str]:
            rank = -1 if finding.grade is None else GRADES.index(finding.grade)
            return (-rank, -abs(finding.delta_k or 0.0), finding.id)

        return tuple(sorted(every, key=weight))

    @property
    def failed(self) -> tuple[ImageResult, ...]:
        """Images that could not be used."""
        return tuple(image for image in self.images if image.status == "failed")
