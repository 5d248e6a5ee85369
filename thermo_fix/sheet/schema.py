"""The survey sheet as models: which keys there are, of what type and in what range.

A rule that concerns one table stands here. What needs the folder, another table or the whole
sheet (files, names of zones, inheritance) is in ``load.py``.
"""

import datetime as calendar
import math
from difflib import get_close_matches
from typing import Annotated, Literal

from pydantic import AfterValidator, BaseModel, BeforeValidator, ConfigDict, PlainValidator
from pydantic import model_validator as check_whole
from pydantic_core import PydanticCustomError

from thermo_fix.limits import UnknownLimit, find_limit, stated_limit
from thermo_fix.records import Language, Limit, ModelName, PixelUnit, Purpose, Side, TemperatureUnit
from thermo_fix.sheet import files, ranges, zones
from thermo_fix.sheet.lines import KeyPath
from thermo_fix.surfaces import Surface, UnknownSurface, find_surface

SHEET_NAME = "survey.toml"
SHEET_VERSION = 1
"""Version of the sheet that this program reads."""

_BAND_LIMITS_UM = (0.7, 30.0)
_LARGEST_PX = 2**31


def wrong(words: str, *inner: str | int) -> PydanticCustomError:
    """Build an error with our own words; ``inner`` leads from the key to the part at fault."""
    return PydanticCustomError("sheet", "{words}", {"words": words, "inner": inner})


# ---------------------------------------------------------------- single values


def _number(raw: object) -> float:
    if isinstance(raw, str):
        raise wrong("write the number without quotation marks")
    if isinstance(raw, bool) or not isinstance(raw, int | float):
        raise wrong("write a number")
    try:
        number = float(raw)
    except OverflowError:
        number = math.inf
    if not math.isfinite(number):
        raise wrong("the number must be finite")
    return number


def _whole_number(raw: object) -> int:
    if isinstance(raw, bool) or not isinstance(raw, int):
        raise wrong("write a whole number, without a decimal point")
    if abs(raw) >= _LARGEST_PX:
        raise wrong("the number is too large")
    return raw


def _within(low: float, high: float, words: str, *, open_low: bool = False) -> AfterValidator:
    def check(value: float) -> float:
        if not low <= value <= high or (open_low and value == low):
            raise wrong(words)
        return value

    return AfterValidator(check)


def _flag(raw: object) -> bool:
    if not isinstance(raw, bool):
        raise wrong("write true or false, without quotation marks")
    return raw


def _text(raw: object) -> str:
    if not isinstance(raw, str):
        raise wrong("write a text in quotation marks")
    return raw


def _one_line(raw: object) -> str:
    text = _text(raw).strip()
    if any(ord(character) < 32 or ord(character) == 127 for character in text):
        raise wrong("write it on one line, without tabs or other control characters")
    return text


def _name(raw: object) -> str:
    text = _one_line(raw)
    if not text:
        raise wrong("it must not be empty")
    return text


def _file(raw: object) -> str:
    name = _text(raw)
    problem = files.name_problem(name)
    if problem is not None:
        raise wrong(problem)
    return files.normal_name(name)


def _date(raw: object) -> calendar.date:
    if not isinstance(raw, calendar.date) or isinstance(raw, calendar.datetime):
        raise wrong("write a date alone, without quotation marks: 2026-01-14")
    return raw


def _moment(raw: object) -> calendar.datetime:
    if not isinstance(raw, calendar.datetime):
        raise wrong(
            "write date and time with seconds, without quotation marks: 2026-01-14T07:12:00"
        )
    # Local time as the clock on site showed it, like the date tag of an image.
    return raw.replace(tzinfo=None)


def _one_of(*words: str) -> PlainValidator:
    def check(raw: object) -> str:
        if isinstance(raw, str) and raw in words:
            return raw
        listed = ", ".join(f'"{word}"' for word in words)
        near = get_close_matches(raw.strip().lower(), words, n=1) if isinstance(raw, str) else []
        hint = f'; did you mean "{near[0]}"?' if near else ""
        raise wrong(f"write one of {listed}{hint}")

    return PlainValidator(check)


def _surface(raw: object) -> Surface:
    try:
        return find_surface(_name(raw))
    except UnknownSurface as error:
        raise wrong(str(error)) from None


def _limit(raw: object) -> Limit:
    if isinstance(raw, int | float) and not isinstance(raw, bool):
        degrees = _number(raw)
        problem = ranges.range_problem("limit", degrees)
        if problem is not None:
            raise wrong(problem)
        return stated_limit(degrees)
    try:
        return find_limit(_name(raw))
    except UnknownLimit as error:
        raise wrong(str(error)) from None


def _polygon(raw: object) -> tuple[tuple[float, float], ...]:
    form = "write a list of corners [x, y], in pixels: [[10, 20], [30, 20], [30, 40]]"
    if not isinstance(raw, list):
        raise wrong(form)
    points = []
    for place, corner in enumerate(raw):
        if not isinstance(corner, list) or len(corner) != 2:
            raise wrong(form, place)
        try:
            points.append((_number(corner[0]), _number(corner[1])))
        except PydanticCustomError as error:
            raise wrong(f"{error.message()}; {form}", place) from None
    cleaned = zones.clean_polygon(points)
    problem = zones.polygon_problem(cleaned)
    if problem is not None:
        raise wrong(problem)
    return cleaned


def _band(raw: object) -> tuple[float, float]:
    form = "write the two ends of the band in micrometres, the shorter first: [8.0, 14.0]"
    if not isinstance(raw, list) or len(raw) != 2:
        raise wrong(form)
    try:
        low, high = _number(raw[0]), _number(raw[1])
    except PydanticCustomError as error:
        raise wrong(f"{error.message()}; {form}") from None
    if not _BAND_LIMITS_UM[0] <= low < high <= _BAND_LIMITS_UM[1]:
        raise wrong(
            f"the band must rise and lie within {_BAND_LIMITS_UM[0]:g} to {_BAND_LIMITS_UM[1]:g} "
            f"micrometres; {form}"
        )
    return low, high


def _names(raw: object) -> tuple[str, ...]:
    form = 'write a list of names: ["iso13788-surface-factor"]'
    if not isinstance(raw, list):
        raise wrong(form)
    names: list[str] = []
    for place, entry in enumerate(raw):
        if not isinstance(entry, str) or not entry.strip():
            raise wrong(form, place)
        if entry.strip() in names:
            raise wrong("this name stands in the list twice; keep one", place)
        names.append(entry.strip())
    return tuple(names)


def _settings(raw: object) -> dict[str, float]:
    if not isinstance(raw, dict):
        raise wrong("write a table of numbers: { surface_factor_limit = 0.7 }")
    settings = {}
    for key, value in raw.items():
        try:
            settings[key] = _number(value)
        except PydanticCustomError as error:
            raise wrong(error.message(), key) from None
    return settings


Number = Annotated[float, PlainValidator(_number)]
WholeNumber = Annotated[int, PlainValidator(_whole_number)]
Flag = Annotated[bool, PlainValidator(_flag)]
Text = Annotated[str, PlainValidator(_text)]
OneLine = Annotated[str, PlainValidator(_one_line)]
Name = Annotated[str, PlainValidator(_name)]
FileName = Annotated[str, PlainValidator(_file)]
PositiveNumber = Annotated[Number, _within(0.0, math.inf, "it must be above zero", open_low=True)]
NonNegativeNumber = Annotated[Number, _within(0.0, math.inf, "it must not be below zero")]


def _in_range(key: str) -> AfterValidator:
    def check(value: float) -> float:
        problem = ranges.range_problem(key, value)
        if problem is not None:
            raise wrong(problem)
        return value

    return AfterValidator(check)


TemperatureNumber = Annotated[Number, _in_range("air_c")]
EmissivityNumber = Annotated[Number, _in_range("emissivity")]
TransmittanceNumber = Annotated[Number, _in_range("transmittance")]


# ---------------------------------------------------------------- quantities


class Table(BaseModel):
    """A table of the sheet: no key but those declared."""

    model_config = ConfigDict(extra="forbid", frozen=True)


class Quantity(Table):
    """``0.93`` or ``{ value = 0.93, u = 0.02 }``."""

    value: Number
    u: Number | None = None


class Emissivity(Table):
    """A quantity, or ``{ surface = .. }``, or ``{ file = .. }``."""

    value: Number | None = None
    u: Number | None = None
    surface: Annotated[Surface, PlainValidator(_surface)] | None = None
    file: FileName | None = None

    @check_whole(mode="after")
    def _sound(self) -> "Emissivity":
        _exactly_one(self, "value", "surface", "file")
        _check_numbers("emissivity", self.value, self.u)
        return self


class Sky(Table):
    """Reflected temperature of an exterior surface, to be computed."""

    cloud: Annotated[Number, _within(0.0, 1.0, "a cloud fraction is between 0 and 1")]
    tilt_deg: Annotated[
        Number, _within(0.0, 180.0, "a tilt is between 0 (faces the sky), 90 (a wall) and 180")
    ]
    ground_c: TemperatureNumber
    u: Annotated[
        Number | None,
        AfterValidator(lambda u: u if u is None or u > 0 else _raise_spread("reflected_c", u)),
    ] = None


class Reflected(Table):
    """A quantity, or ``{ file = .. }``, or ``{ zone = .. }``, or ``{ sky = .. }``."""

    value: Number | None = None
    u: Number | None = None
    file: FileName | None = None
    zone: Name | None = None
    sky: Sky | None = None

    @check_whole(mode="after")
    def _sound(self) -> "Reflected":
        _exactly_one(self, "value", "file", "zone", "sky")
        _check_numbers("reflected_c", self.value, self.u)
        if self.u is not None and self.zone is not None:
            raise wrong(
                "u is not stated for a foil zone: it follows from what is measured there", "u"
            )
        if self.u is not None and self.sky is not None:
            raise wrong("write u inside the sky table", "u")
        return self


def _raise_spread(key: str, u: float) -> float:
    raise wrong(ranges.spread_problem(key, None, u) or "", "u")


def _exactly_one(table: Table, *keys: str) -> None:
    if sum(getattr(table, key) is not None for key in keys) != 1:
        raise wrong(f"state exactly one of {', '.join(keys)}")


def _check_numbers(key: str, value: float | None, u: float | None) -> None:
    if value is not None:
        problem = ranges.range_problem(key, value)
        if problem is not None:
            raise wrong(problem, "value")
    if u is not None:
        problem = ranges.spread_problem(key, value, u)
        if problem is not None:
            raise wrong(problem, "u")


def _as_table(example: str) -> BeforeValidator:
    """Let a bare number stand for a table with that value."""

    def convert(raw: object) -> object:
        if isinstance(raw, int | float) and not isinstance(raw, bool):
            return {"value": raw}
        if isinstance(raw, dict):
            return raw
        raise wrong(f"write {example}")

    return BeforeValidator(convert)


def _quantity_checked(key: str) -> AfterValidator:
    def check(quantity: Quantity) -> Quantity:
        _check_numbers(key, quantity.value, quantity.u)
        return quantity

    return AfterValidator(check)


_PLAIN = _as_table("a number, or { value = .., u = .. }")
AirTemperature = Annotated[Quantity, _quantity_checked("air_c"), _PLAIN]
Humidity = Annotated[Quantity, _quantity_checked("humidity"), _PLAIN]
Distance = Annotated[Quantity, _quantity_checked("distance_m"), _PLAIN]
ViewAngle = Annotated[Quantity, _quantity_checked("view_angle_deg"), _PLAIN]
WindSpeed = Annotated[Quantity, _quantity_checked("wind_m_s"), _PLAIN]
LoadExponent = Annotated[Quantity, _quantity_checked("load_exponent"), _PLAIN]
Load = Annotated[Quantity, _quantity_checked("load_a"), _PLAIN]
Height = Annotated[Quantity, _quantity_checked("height_m"), _PLAIN]
DesignHumidity = Annotated[Quantity, _quantity_checked("design.humidity"), _PLAIN]
DegreeDays = Annotated[Quantity, _quantity_checked("design.degree_days_k"), _PLAIN]
UValue = Annotated[Quantity, _quantity_checked("conditions.u_value"), _PLAIN]
Transmittance = Annotated[Quantity, _quantity_checked("transmittance"), _PLAIN]
Reflectance = Annotated[Quantity, _quantity_checked("window.reflectance"), _PLAIN]


class Window(Table):
    """An infrared window in the path."""

    transmittance: Transmittance
    reflectance: Reflectance | None = None
    temperature_c: AirTemperature | None = None
    reflected_c: AirTemperature | None = None

    @check_whole(mode="after")
    def _sound(self) -> "Window":
        if self.reflectance is not None:
            total = self.transmittance.value + self.reflectance.value
            # Decimal fractions such as 0.9 + 0.1 need not add up to 1 exactly.
            if total > 1.0 + 1e-12:
                raise wrong(
                    f"transmittance and reflectance together are {total:g}, more than 1; "
                    "mend one of them"
                )
        return self


class SceneKeys(Table):
    """What may stand in ``[scene]``, in an ``[[image]]`` and in an ``[[image.zone]]``."""

    emissivity: (
        Annotated[
            Emissivity,
            _as_table(
                'a number, { value = .., u = .. }, { surface = "brick, red" } or { file = ".." }'
            ),
        ]
        | None
    ) = None
    reflected_c: (
        Annotated[
            Reflected,
            _as_table(
                "a number, { value = .., u = .. }, { zone = .. }, { sky = .. } or { file = .. }"
            ),
        ]
        | None
    ) = None
    air_c: AirTemperature | None = None
    humidity: Humidity | None = None
    distance_m: Distance | None = None
    view_angle_deg: ViewAngle | None = None
    indoor_c: AirTemperature | None = None
    outdoor_c: AirTemperature | None = None
    wind_m_s: WindSpeed | None = None
    side: Annotated[Side, _one_of("inside", "outside")] | None = None
    height_m: Height | None = None
    outdoors: Flag | None = None
    load_exponent: LoadExponent | None = None
    target_load_a: PositiveNumber | None = None
    limit: Annotated[Limit, PlainValidator(_limit)] | None = None
    design_air_c: TemperatureNumber | None = None
    transmittance: Transmittance | None = None
    window: Window | None = None


# ---------------------------------------------------------------- tables


class SurveyTable(Table):
    """``[survey]``."""

    title: OneLine | None = None
    purpose: Annotated[Purpose, _one_of("building", "electrical")] | None = None
    date: Annotated[calendar.date, PlainValidator(_date)] | None = None
    surveyor: OneLine = ""
    weather: FileName | None = None
    utc_offset_hours: (
        Annotated[Number, _within(-14.0, 14.0, "an offset from UTC is between -14 and 14 hours")]
        | None
    ) = None
    temperature_unit: Annotated[TemperatureUnit, _one_of("celsius", "fahrenheit")] = "celsius"
    language: Annotated[Language, _one_of("en", "de")] = "en"


class RecordedTable(Table):
    """Settings that the camera had applied to its readings."""

    emissivity: EmissivityNumber | None = None
    reflected_c: TemperatureNumber | None = None
    air_c: TemperatureNumber | None = None
    transmittance: TransmittanceNumber | None = None


class CameraTable(Table):
    """``[camera]``."""

    pixel: Annotated[PixelUnit, _one_of("celsius", "kelvin", "linear")] | None = None
    scale: Number | None = None
    offset: Number | None = None
    band_um: Annotated[tuple[float, float], PlainValidator(_band)] | None = None
    response_file: FileName | None = None
    ifov_mrad: (
        Annotated[
            Number,
            _within(0.0, 100.0, "it is above 0 and at most 100 milliradians", open_low=True),
        ]
        | None
    ) = None
    noise_k: PositiveNumber | None = None
    accuracy_k: NonNegativeNumber | None = None
    accuracy_fraction: (
        Annotated[
            Number, _within(0.0, 0.5, "it is a fraction of the reading in degC; write 0.02 for 2 %")
        ]
        | None
    ) = None
    nonuniformity_k: NonNegativeNumber | None = None
    recorded: RecordedTable | None = None

    @check_whole(mode="after")
    def _sound(self) -> "CameraTable":
        if self.pixel == "linear":
            if self.scale is None:
                raise wrong(
                    'pixel = "linear" needs a scale: kelvin = scale * count + offset, such as '
                    "scale = 0.01",
                    "pixel",
                )
            if self.scale == 0.0:
                raise wrong("a scale of zero makes all pixels alike; write such as 0.01", "scale")
        elif self.pixel is None:
            for key in ("scale", "offset"):
                if getattr(self, key) is not None:
                    raise wrong(
                        f'{key} goes with pixel = "linear" (kelvin = scale * count + offset); '
                        "state pixel too",
                        key,
                    )
        return self


class RadiationTable(Table):
    """``[radiation]``."""

    model: Annotated[ModelName, _one_of("total", "band")] = "total"


class DetectTable(Table):
    """``[detect]`` and ``[image.detect]``."""

    warm: Flag | None = None
    cold: Flag | None = None
    min_delta_k: PositiveNumber | None = None
    min_area_px: (
        Annotated[WholeNumber, _within(1, _LARGEST_PX, "it is at least 1 pixel")] | None
    ) = None


class CriteriaTable(Table):
    """``[criteria]``."""

    use: Annotated[tuple[str, ...], PlainValidator(_names)] = ()
    file: FileName | None = None
    settings: Annotated[dict[str, float], PlainValidator(_settings)] = {}


class ConditionsTable(Table):
    """``[conditions]``: the weather and the building at the survey."""

    rain: Flag | None = None
    sun_hours_since: NonNegativeNumber | None = None
    steady_hours: NonNegativeNumber | None = None
    pressure_difference_pa: (
        Annotated[
            Number, _within(-1000.0, 1000.0, "a pressure difference is within 1000 Pa; write Pa")
        ]
        | None
    ) = None
    u_value: UValue | None = None


class DesignTable(Table):
    """``[design]``: conditions for which a building is judged besides those of the survey."""

    indoor_c: AirTemperature | None = None
    humidity: DesignHumidity | None = None
    outdoor_c: AirTemperature | None = None
    degree_days_k: DegreeDays | None = None
    climate: OneLine = ""

    @check_whole(mode="after")
    def _sound(self) -> "DesignTable":
        indoor, outdoor = self.indoor_c, self.outdoor_c
        if indoor is not None and outdoor is not None and not indoor.value > outdoor.value:
            raise wrong(
                f"it must lie below indoor_c = {indoor.value:g}; mould and heat loss are judged "
                "for a cold day",
                "outdoor_c",
            )
        return self


class ZoneTable(SceneKeys):
    """``[[image.zone]]``."""

    name: Name
    polygon: Annotated[tuple[tuple[float, float], ...], PlainValidator(_polygon)]
    like: Name | None = None
    load_a: Load | None = None
    rated_a: PositiveNumber | None = None
    ignore: Flag = False
    role: Annotated[Literal["foil", "tape"], _one_of("foil", "tape")] | None = None


class ImageTable(SceneKeys):
    """``[[image]]``; its zones are checked one by one, see ``load.py``."""

    file: FileName
    asset: OneLine = ""
    photo: FileName | None = None
    taken: Annotated[calendar.datetime, PlainValidator(_moment)] | None = None
    note: Text = ""
    detect: DetectTable = DetectTable()


TABLES: dict[str, type[Table]] = {
    "survey": SurveyTable,
    "camera": CameraTable,
    "radiation": RadiationTable,
    "scene": SceneKeys,
    "detect": DetectTable,
    "criteria": CriteriaTable,
    "conditions": ConditionsTable,
    "design": DesignTable,
}
"""Tables that stand once at the top of the sheet."""

TOP_KEYS = ("sheet_version", *TABLES, "image")
IMAGE_KEYS = (*ImageTable.model_fields, "zone")


def known_keys(table: KeyPath) -> tuple[str, ...]:
    """Keys that the table at a path may hold."""
    names = [step for step in table if isinstance(step, str)]
    if not names:
        return TOP_KEYS
    if names == ["image"]:
        return IMAGE_KEYS
    return tuple(_model_at(names).model_fields)


def _model_at(names: list[str]) -> type[Table]:
    last = names[-1]
    inner: dict[str, type[Table]] = {
        "emissivity": Emissivity,
        "reflected_c": Quantity if "window" in names else Reflected,
        "sky": Sky,
        "window": Window,
        "recorded": RecordedTable,
        "zone": ZoneTable,
        "detect": DetectTable,
    }
    if len(names) == 1:
        return TABLES[last]
    return inner.get(last, Quantity)


def homes_of(key: str) -> tuple[str, ...]:
    """Tables, as written in the sheet, in which a key is known."""
    homes = [f"[{name}]" for name, model in TABLES.items() if key in model.model_fields]
    if key in IMAGE_KEYS:
        homes.append("[[image]]")
    if key in ZoneTable.model_fields:
        homes.append("[[image.zone]]")
    return tuple(homes)
