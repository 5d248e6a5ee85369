"""Write a first survey sheet for a folder, filled with what can be read from its images."""

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path

import tomlkit

from thermo_fix.defaults import default_value
from thermo_fix.records import DetectSettings, Origin, PixelUnit
from thermo_fix.sheet.files import name_problem
from thermo_fix.sheet.schema import SHEET_VERSION

_COMMENT_COLUMN = 34


@dataclass(frozen=True, slots=True)
class FileFacts:
    """What was read from one TIFF file."""

    file: str
    """Relative to the folder, with forward slashes."""
    width: int
    """Pixels."""
    height: int
    """Pixels."""
    taken: datetime | None = None
    """From the DateTime tag."""
    unit: PixelUnit | None = None
    """Meaning of the pixel values; None where it could not be told."""
    scale: float = 1.0
    """``linear`` only: kelvin = scale * value + offset."""
    offset: float = 0.0
    origin: Origin = "inferred"
    """How the unit was found: stated in the file, or inferred from the values."""
    note: str = ""
    """For the person, such as why the file cannot be used."""


def draft_sheet(folder: Path, facts: Sequence[FileFacts]) -> str:
    """Return the text of a survey sheet that loads as it stands.

    What the images tell is filled in. What only a person knows stands as a comment with an
    example; to answer, the ``#`` before the key is taken away.
    """
    title = _clean(Path(folder).resolve().name) or "Survey"
    return "\n".join(
        (
            _head(len(facts)),
            _survey(title, facts),
            _camera(facts),
            _scene(),
            _detect(),
            _images(facts),
        )
    )


def _head(count: int) -> str:
    files = "1 TIFF file" if count == 1 else f"{count} TIFF files"
    return (
        f"# Survey sheet, drafted from the {files} in this folder.\n"
        "#\n"
        "# What the images tell is filled in. A line such as '# key = value' is a question:\n"
        "# take away the '#' and put your own value. What you leave is not told: a wide default\n"
        "# is assumed where one can be defended, and the report says so.\n"
        "# Every quantity is a number, or { value = .., u = .. } with its standard uncertainty.\n"
        f"sheet_version = {SHEET_VERSION}\n"
    )


def _survey(title: str, facts: Sequence[FileFacts]) -> str:
    days = {one.taken.date() for one in facts if one.taken is not None}
    if len(days) == 1:
        date = _line(f"date = {next(iter(days)).isoformat()}", "from the images; check it")
    else:
        why = "the images are of several days" if days else "the images do not tell"
        date = _question("date = 2026-01-14", f"day of the survey; {why}")
    return "".join(
        (
            "[survey]\n",
            _line(f"title = {_quoted(title)}", "name of the folder; printed on the report"),
            _question('purpose = "building"', '"building" or "electrical"; selects the criteria'),
            date,
            _question('surveyor = ""', "who took the images"),
            _question('temperature_unit = "celsius"', 'of the report: "celsius" or "fahrenheit"'),
            _question('language = "en"', 'of the report: "en" or "de"'),
            _question('weather = "weather.csv"', "log with time, air_c, humidity, wind_m_s"),
            _question("utc_offset_hours = 1.0", "of the images' clock, if the log differs"),
        )
    )


def _camera(facts: Sequence[FileFacts]) -> str:
    units = {
        (one.unit, one.scale, one.offset) if one.unit == "linear" else (one.unit, 1.0, 0.0)
        for one in facts
        if one.unit is not None
    }
    lines = ["[camera]\n"]
    if len(units) == 1:
        unit, scale, offset = next(iter(units))
        told = all(one.origin == "given" for one in facts if one.unit is not None)
        how = "as the files say" if told else "inferred from the values; check it"
        lines.append(_line(f'pixel = "{unit}"', how))
        if unit == "linear":
            lines.append(_line(f"scale = {float(scale)!r}", "kelvin = scale * count + offset"))
            lines.append(_line(f"offset = {float(offset)!r}", ""))
    else:
        why = "the files differ" if units else "the files do not tell"
        lines.append(
            _question('pixel = "celsius"', f'"celsius", "kelvin" or "linear" (scale); {why}')
        )
    lines += [
        _question("band_um = [8.0, 14.0]", "spectral band, from the camera's data sheet"),
        _question("ifov_mrad = 1.3", "angle of one pixel; without it there are no areas in m2"),
        _question("noise_k = 0.05", "noise-equivalent temperature difference"),
        _question("accuracy_k = 2.0", "stated accuracy: the larger of this, in K,"),
        _question("accuracy_fraction = 0.02", "and this, as a fraction of the reading in degC"),
        "# The settings that the camera had applied when it wrote its readings:\n",
        _question(
            "recorded = { emissivity = 1.0, reflected_c = 20.0, air_c = 20.0, "
            "transmittance = 1.0 }",
            "",
        ),
        "\n[radiation]\n",
        _line('model = "total"', '"band" is nearer the truth where emissivity is low'),
    ]
    return "".join(lines)


def _scene() -> str:
    def default(key: str) -> str:
        return f"{key} = {default_value(key)!r}"

    return "".join(
        (
            "[scene]\n",
            "# In force for all images. Each key may also stand in an [[image]] or in a\n",
            "# zone, and wins there.\n",
            _question(default("emissivity"), 'or { surface = "brick, red" }'),
            _question(default("reflected_c"), "degC; best measured on crumpled foil"),
            _question(default("air_c"), "degC; air between camera and surface"),
            _question(default("humidity"), "fraction, 0 to 1, not percent"),
            _question(default("distance_m"), "from camera to surface"),
            _question(default("view_angle_deg"), "0 is square on"),
            _question("indoor_c = 20.5", "building: air on the warm side"),
            _question("outdoor_c = 2.0", "building: air outside"),
            _question("wind_m_s = 1.5", "at the surface"),
            _question('side = "inside"', 'building: or "outside"; else told by air_c'),
            _question("height_m = 2.5", "building: over which air flows along the surface"),
            _question("outdoors = false", "electrical: true where the wind reaches the parts"),
            _question(default("load_exponent"), "electrical: rise goes with current to this power"),
            _question("target_load_a = 80", "electrical: a load of interest besides the rated one"),
            _question('limit = "termination 75"', "electrical: or a number in degC"),
            _question("design_air_c = 40", "electrical: the air that the plant is made for"),
            _question("transmittance = 0.98", "of the air, if measured; replaces the formula"),
            "# An infrared window in the path:\n",
            _question(
                "window = { transmittance = 0.86, reflectance = 0.04, temperature_c = 20, "
                "reflected_c = 20 }",
                "",
            ),
        )
    )


def _detect() -> str:
    usual = DetectSettings()
    return "".join(
        (
            "[detect]\n",
            _line("warm = true", "hot findings"),
            _line("cold = true", "cold findings"),
            _line(f"min_delta_k = {usual.min_delta_k!r}", "smallest difference that matters"),
            _line(f"min_area_px = {usual.min_area_px}", "smallest finding"),
            "\n[criteria]\n",
            _question('use = ["iso13788-surface-factor"]', "else those of the purpose"),
            "\n[conditions]\n",
            "# Building: how it was before and during the survey. The report checks it.\n",
            _question("rain = false", "on the surface, before or during"),
            _question("sun_hours_since = 12", "hours since direct sun on the surface"),
            _question("steady_hours = 24", "hours that indoor and outdoor air were steady"),
            _question("pressure_difference_pa = 50", "outside minus inside, for air leakage"),
            _question("u_value = 0.3", "of the sound wall, W m-2 K-1"),
            "\n[design]\n",
            "# Building: the cold day for which moisture is judged, and a year's heating.\n",
            _question("indoor_c = 20", "degC"),
            _question("humidity = 0.5", "indoors, 0 to 1"),
            _question("outdoor_c = -5", "degC, below indoor_c"),
            _question("degree_days_k = 2500", "heating degree days of a year, K day"),
            _question('climate = ""', "where the degree days come from"),
        )
    )


_ZONE_EXAMPLE = """\
# A zone has its own surface, load and role, and wins over the image:
# [[image.zone]]
# name = "lug B"
# polygon = [[120, 80], [140, 80], [140, 96], [120, 96]]   # x, y of the corners, in pixels
# like = "lugs"                 # zones with the same word are compared
# load_a = 62                   # electrical: load at the time of the survey
# rated_a = 100
# ignore = false                # true: leave these pixels out
# role = "foil"                 # "foil" or "tape": a reference patch, not a target
"""


def _images(facts: Sequence[FileFacts]) -> str:
    parts = []
    seen: dict[str, str] = {}
    for one in sorted(facts, key=lambda entry: entry.file):
        problem = name_problem(one.file)
        if problem is None:
            earlier = seen.setdefault(one.file.casefold(), one.file)
            if earlier != one.file:
                problem = f"its name differs from {earlier} only in capital letters"
        if problem is not None:
            parts.append(f"# Left out, file {_clean(one.file)}: {problem}.\n\n")
            continue
        parts.append(_image(one))
        if len(parts) == 1:
            parts.append(_ZONE_EXAMPLE + "\n")
    if not parts:
        parts.append('# [[image]]\n# file = "IR_0001.tif"\n' + _ZONE_EXAMPLE)
    return "".join(parts).rstrip("\n") + "\n"


def _image(one: FileFacts) -> str:
    lines = ["[[image]]\n", _line(f"file = {_quoted(one.file)}", f"{one.width} x {one.height} px")]
    if one.note:
        lines.append(f"# {_clean(one.note)}\n")
    lines.append(_question('asset = ""', "what is looked at, in words"))
    lines.append(_question('photo = "VIS_0001.jpg"', "file of the photograph beside it"))
    if one.taken is not None:
        moment = one.taken.replace(tzinfo=None, microsecond=0)
        lines.append(_line(f"taken = {moment.isoformat()}", "from the file"))
    return "".join(lines) + "\n"


def _line(text: str, comment: str) -> str:
    return f"{text:<{_COMMENT_COLUMN - 2}}# {comment}\n" if comment else f"{text}\n"


def _question(text: str, comment: str) -> str:
    return "# " + _line(text, comment) if not comment else f"# {text:<29} # {comment}\n"


def _quoted(text: str) -> str:
    return tomlkit.item(text).as_string()


def _clean(text: str) -> str:
    """Make a text fit for a comment or a title: one line, and nothing that UTF-8 cannot hold."""
    return " ".join("".join(one if one.isprintable() else " " for one in text).split())
