"""The weather log: what is read, what is refused and in which words, what it fills.

Expected numbers are those written in the log of the test, or arithmetic on them; the defaults are
those of ``docs/survey_sheet.md`` (common practice, no source).
"""

import math
from datetime import datetime
from pathlib import Path

import numpy as np
import pytest

from tests.sheets import load
from tests.simulator.survey import stored, write_tiff
from thermo_fix.correct.weather import Columns, Reading, log_at, with_weather
from thermo_fix.errors import SheetError
from thermo_fix.read.moment import image_moment
from thermo_fix.read.weather import read_weather
from thermo_fix.records import Survey, WeatherLog
from thermo_fix.survey import open_survey

LOG = """\
time,air_c,humidity,wind_m_s,rain,sun
2026-01-20T05:00,-2.0,0.80,1.0,0,0
2026-01-20T06:00,-1.0,0.82,2.0,0,0
2026-01-20T07:00,0.0,0.84,3.0,0,0
2026-01-20T08:00,1.0,0.86,4.0,0,0
"""
HOURS = "2026-01-20T0{0}:00,{1},0.8,1,0,0\n"


def read(folder: Path, text: str, offset: float | None = None) -> WeatherLog:
    path = folder / "weather.csv"
    path.write_text(text, encoding="utf-8")
    return read_weather(path, offset)


def at(log: WeatherLog, hour: int, minute: int = 0, column: str = "air_c") -> Reading | str:
    return log_at(Columns(log), column, datetime(2026, 1, 20, hour, minute))


def value_at(log: WeatherLog, hour: int, minute: int = 0, column: str = "air_c") -> Reading:
    found = at(log, hour, minute, column)
    assert isinstance(found, Reading), found
    return found


def filled(folder: Path, sheet: str, text: str = LOG, offset: float | None = None) -> Survey:
    survey = load(folder, sheet, "a.tif", "b.tif")
    log = read(folder, text, offset)
    return with_weather(survey, log, {job.file: job.taken for job in survey.images})


IMAGES = """
[[image]]
file = "a.tif"
taken = 2026-01-20T06:30:00
side = "outside"
[[image]]
file = "b.tif"
taken = 2026-01-20T07:00:00
side = "inside"
"""

# ---------------------------------------------------------------- reading


def test_a_log_is_read_as_written(tmp_path: Path) -> None:
    log = read(tmp_path, LOG)
    assert log.times[0] == datetime(2026, 1, 20, 5)
    assert log.columns["air_c"] == (-2.0, -1.0, 0.0, 1.0)
    assert log.columns["humidity"][-1] == 0.86
    assert log.resolution["air_c"] == pytest.approx(0.1)
    assert log.resolution["humidity"] == pytest.approx(0.01)
    assert log.notes == ()


def test_semicolons_decimal_commas_and_empty_cells(tmp_path: Path) -> None:
    text = "Time;air_c;station\n2026-01-20 05:00;-2,5;A\n\n2026-01-20 06:00;;A\n"
    log = read(tmp_path, "\ufeff" + text)
    assert log.columns["air_c"][0] == -2.5
    assert math.isnan(log.columns["air_c"][1])
    (note,) = log.notes
    assert "station" in note


def test_offsets_are_converted_where_the_clock_of_the_images_is_told(tmp_path: Path) -> None:
    text = "time,air_c\n2026-01-20T05:00Z,-2.0\n2026-01-20T08:00+02:00,0.0\n"
    log = read(tmp_path, text, 1.0)
    assert log.times == (datetime(2026, 1, 20, 6), datetime(2026, 1, 20, 7))
    with pytest.raises(SheetError) as caught:
        read(tmp_path, text)
    (line,) = caught.value.problems
    assert line.startswith("weather.csv:")
    assert "utc_offset_hours" in line
    assert "[survey]" in line


def test_rows_out_of_order_are_sorted_with_a_note(tmp_path: Path) -> None:
    lines = LOG.splitlines(keepends=True)
    log = read(tmp_path, "".join([lines[0], lines[3], lines[1], lines[4], lines[2]]))
    assert log.columns["air_c"] == (-2.0, -1.0, 0.0, 1.0)
    assert any("not in order of time" in note for note in log.notes)


def test_a_time_that_stands_twice_is_averaged_with_a_note(tmp_path: Path) -> None:
    log = read(tmp_path, LOG + "2026-01-20T07:00,1.0,,3.0,0,0\n2026-01-20T07:00,2.0,,3.0,0,0\n")
    assert len(log.times) == 4
    # Mean of 0, 1 and 2; an empty cell does not count.
    assert log.columns["air_c"][2] == pytest.approx(1.0)
    assert log.columns["humidity"][2] == pytest.approx(0.84)
    assert any("2 rows repeat a time" in note for note in log.notes)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", ["first line", "time"]),
        ("time,station\n", ["first line", "air_c"]),
        ("air_c\n1\n", ["first line", "time"]),
        ("time,air_c\n", ["no rows"]),
        ("time,air_c,air_c\n2026-01-20T05:00,1,2\n", ["air_c", "twice"]),
        ("time,air_c\nyesterday,1\n", ["line 2", "yesterday", "ISO 8601"]),
        ("time,air_c\n2026-01-20T05:00,cold\n", ["line 2", "air_c", "cold"]),
        ("time,humidity\n2026-01-20T05:00,80\n", ["line 2", "humidity", "0.8"]),
        ("time,air_c\n2026-01-20T05:00,280\n", ["line 2", "280", "degC"]),
        ("time,sun\n2026-01-20T05:00,400\n", ["line 2", "sun", "share"]),
        (
            "time,air_c\n2026-01-20T05:00,1\n2026-01-20T06:00Z,1\n",
            ["line 3", "write all alike"],
        ),
    ],
)
def test_a_wrong_log_is_refused_in_one_line(tmp_path: Path, text: str, words: list[str]) -> None:
    with pytest.raises(SheetError) as caught:
        read(tmp_path, text, 1.0)
    (line,) = caught.value.problems
    assert line.startswith("weather.csv")
    assert "\n" not in line
    for word in words:
        assert word in line


def test_a_file_that_is_no_text_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "weather.csv"
    path.write_bytes(b"\xff\xfe\x00")
    with pytest.raises(SheetError, match=r"weather\.csv: the text is UTF-16; save it as UTF-8"):
        read_weather(path, None)


# ---------------------------------------------------------------- interpolation


def test_value_between_rows_and_on_a_row(tmp_path: Path) -> None:
    log = read(tmp_path, LOG)
    assert value_at(log, 6, 30).value == pytest.approx(-0.5)
    assert value_at(log, 6, 45, "humidity").value == pytest.approx(0.835)
    assert value_at(log, 7).value == 0.0
    assert value_at(log, 5).value == -2.0


def test_uncertainty_joins_spread_resolution_and_sensor(tmp_path: Path) -> None:
    log = read(tmp_path, LOG)
    # 06:30: rows -1 and 0 lie within the hour, standard deviation sqrt(0.5); step 0.1; sensor 0.5.
    expected = math.sqrt(0.5 + 0.1**2 / 12.0 + 0.5**2)
    assert value_at(log, 6, 30).u == pytest.approx(expected, rel=1e-12)
    # 07:00: rows -1, 0 and 1, standard deviation 1.
    assert value_at(log, 7).u == pytest.approx(math.sqrt(1.0 + 0.1**2 / 12.0 + 0.25), rel=1e-12)
    flat = read(tmp_path, "time,air_c\n2026-01-20T05:00,3\n2026-01-20T06:00,3\n")
    # No spread is seen; written in whole degrees, the step is 1.
    assert value_at(flat, 5, 30).u == pytest.approx(math.sqrt(1.0 / 12.0 + 0.25), rel=1e-12)


def test_gaps_and_ends_are_not_bridged(tmp_path: Path) -> None:
    # Three hours is the longest gap that is bridged.
    three = read(tmp_path, "time,air_c\n" + "2026-01-20T04:00,0\n2026-01-20T07:00,3\n")
    assert value_at(three, 5).value == pytest.approx(1.0)
    gap = read(tmp_path, "time,air_c\n" + "2026-01-20T03:59,0\n2026-01-20T07:00,3\n")
    assert at(gap, 5) == "has a gap of more than 3 hours there"
    # On a row there is no gap to bridge.
    assert value_at(gap, 7).value == 3.0
    assert at(gap, 7, 1) == "does not cover the time"
    assert at(gap, 3) == "does not cover the time"
    assert at(gap, 5, column="humidity") == "has no column humidity"


def test_an_empty_cell_is_no_row(tmp_path: Path) -> None:
    log = read(tmp_path, LOG.replace("06:00,-1.0", "06:00,"))
    assert value_at(log, 6).value == pytest.approx(-1.0)  # between -2 and 0
    assert value_at(log, 6, column="humidity").value == 0.82


# ---------------------------------------------------------------- filling


def test_outdoor_air_is_filled_and_the_rest_only_outside(tmp_path: Path) -> None:
    outside, inside = filled(tmp_path, IMAGES).images
    values = outside.inputs.values
    assert (values["outdoor_c"].value, values["outdoor_c"].origin) == (-0.5, "measured")
    assert values["outdoor_c"].scope == "weather log"
    assert values["air_c"].value == -0.5
    assert values["humidity"].value == pytest.approx(0.83)
    assert values["wind_m_s"].value == pytest.approx(2.5)
    # A reflected temperature that was only assumed follows the air, as without a log.
    assert (values["reflected_c"].value, values["reflected_c"].u) == (-0.5, 3.0)
    inner = inside.inputs.values
    assert inner["outdoor_c"].value == 0.0
    assert inner["air_c"].origin == "assumed"
    assert inner["humidity"].origin == "assumed"
    assert "wind_m_s" not in inner


def test_what_the_sheet_states_wins(tmp_path: Path) -> None:
    sheet = "[scene]\noutdoor_c = -9\nair_c = -8\nwind_m_s = 7\nreflected_c = -20\n" + IMAGES
    outside, _ = filled(tmp_path, sheet).images
    told = {key: outside.inputs.value(key) for key in ("outdoor_c", "air_c", "wind_m_s")}
    assert told == {"outdoor_c": -9.0, "air_c": -8.0, "wind_m_s": 7.0}
    assert outside.inputs.value("reflected_c") == -20.0
    assert outside.inputs.values["humidity"].scope == "weather log"


def test_the_side_may_follow_from_the_filled_outdoor_air(tmp_path: Path) -> None:
    sheet = (
        "[scene]\nindoor_c = 20\nair_c = 1\n"
        '[[image]]\nfile = "a.tif"\ntaken = 2026-01-20T06:30:00\n'
    )
    (image,) = filled(tmp_path, sheet).images
    assert image.inputs.inside is False
    assert image.inputs.value("wind_m_s") == pytest.approx(2.5)


def test_zones_are_filled_as_images_are(tmp_path: Path) -> None:
    sheet = (
        '[[image]]\nfile = "a.tif"\ntaken = 2026-01-20T06:30:00\n[[image.zone]]\nname = "z"\n'
        'polygon = [[0, 0], [4, 0], [4, 4], [0, 4]]\nside = "outside"\n'
    )
    (image,) = filled(tmp_path, sheet).images
    assert image.inputs.values["air_c"].origin == "assumed"
    zone = image.zones[0].inputs.values
    assert zone["air_c"].value == -0.5
    # The same variable in both.
    assert zone["outdoor_c"].name == image.inputs.values["outdoor_c"].name


def test_an_image_that_is_not_covered_keeps_what_was_told(tmp_path: Path) -> None:
    sheet = IMAGES.replace("2026-01-20T06:30:00", "2026-01-21T06:30:00")
    survey = filled(tmp_path, sheet)
    outside, inside = survey.images
    assert "outdoor_c" not in outside.inputs.values
    assert outside.inputs.values["air_c"].origin == "assumed"
    assert inside.inputs.value("outdoor_c") == 0.0
    lines = [note for note in survey.notes if "does not cover the time" in note]
    assert len(lines) == 4
    assert any("outdoor_c stays not told" in line and "a.tif" in line for line in lines)
    assert all("b.tif" not in line for line in lines)


def test_an_image_in_a_gap_gets_a_note(tmp_path: Path) -> None:
    text = "time,air_c\n2026-01-20T02:00,-3.0\n2026-01-20T07:00,0.0\n2026-01-20T08:00,1.0\n"
    survey = filled(tmp_path, IMAGES, text)
    outside, inside = survey.images
    assert "outdoor_c" not in outside.inputs.values
    assert inside.inputs.value("outdoor_c") == 0.0
    assert any("gap of more than 3 hours" in note and "a.tif" in note for note in survey.notes)
    # Humidity and wind are not in this log at all: that is no failure of the image.
    assert not any("humidity" in note and "weather.csv" in note for note in survey.notes)


def test_an_image_without_a_time_gets_a_note(tmp_path: Path) -> None:
    survey = filled(tmp_path, '[[image]]\nfile = "a.tif"\n')
    assert "outdoor_c" not in survey.images[0].inputs.values
    assert any("not told when they were taken: a.tif" in note for note in survey.notes)
    assert survey.weather is None


def test_a_log_in_another_zone_gives_the_weather_of_the_moment(tmp_path: Path) -> None:
    # 05:30 UTC is 06:30 on the images' clock, where LOG has -0.5 degC.
    lines = ["time,air_c"]
    lines += [f"2026-01-20T0{hour - 1}:00Z,{value}" for hour, value in ((6, -1.0), (7, 0.0))]
    survey = filled(tmp_path, IMAGES, "\n".join(lines) + "\n", offset=1.0)
    assert survey.images[0].inputs.value("outdoor_c") == pytest.approx(-0.5)


# ---------------------------------------------------------------- the survey as a whole


def test_facts_for_the_conditions(tmp_path: Path) -> None:
    rows = [(f"2026-01-19T{hour:02d}:00", 3.0, 0, 1 if hour <= 15 else 0) for hour in range(6, 24)]
    rows += [(f"2026-01-20T0{hour}:00", hour - 7.0, 1 if hour == 2 else 0, 0) for hour in range(9)]
    text = "time,air_c,wind_m_s,rain,sun\n"
    text += "".join(f"{time},{air},{air + 8},{rain},{sun}\n" for time, air, rain, sun in rows)
    facts = filled(tmp_path, IMAGES, text).weather
    assert facts is not None
    assert (facts.first, facts.last) == (
        datetime(2026, 1, 20, 6, 30),
        datetime(2026, 1, 20, 7, 0),
    )
    # At 06:30 the air has -0.5; in the 24 h before it had between -7 (00:00) and 3.
    assert facts.outdoor_before_k == pytest.approx(6.5)
    assert facts.outdoor_during_k == pytest.approx(0.5)
    # Wind is air + 8: 7.5 at the first image, 8 at the last.
    assert facts.wind_max_m_s == pytest.approx(8.0)
    assert facts.dry_hours == pytest.approx(4.5)
    assert facts.sunless_hours == pytest.approx(15.5)
    assert facts.rain_seen
    assert facts.sun_seen


def test_facts_say_how_far_back_the_log_reaches(tmp_path: Path) -> None:
    facts = filled(tmp_path, IMAGES).weather
    assert facts is not None
    assert facts.outdoor_before_k is None
    assert facts.dry_hours == pytest.approx(1.5)
    assert not facts.rain_seen
    wet = LOG.replace("07:00,0.0,0.84,3.0,0,", "07:00,0.0,0.84,3.0,0.2,")
    raining = filled(tmp_path, IMAGES, wet).weather
    assert raining is not None
    assert (raining.dry_hours, raining.rain_seen) == (0.0, True)


# ---------------------------------------------------------------- the whole way


def test_the_date_in_the_file_serves_where_the_sheet_has_none(tmp_path: Path) -> None:
    taken = datetime(2026, 1, 20, 6, 30)
    readings = stored(np.full((8, 8), 12.0), "linear")
    write_tiff(tmp_path / "a.tif", readings, compression="zlib", taken=taken, predictor=True)
    assert image_moment(tmp_path / "a.tif") == taken
    (tmp_path / "broken.tif").write_bytes((tmp_path / "a.tif").read_bytes()[:40])
    assert image_moment(tmp_path / "broken.tif") is None
    assert image_moment(tmp_path / "absent.tif") is None
    (tmp_path / "weather.csv").write_text(LOG)
    (tmp_path / "survey.toml").write_text(
        '[survey]\nweather = "weather.csv"\n[scene]\nside = "outside"\n[camera]\npixel = "linear"\n'
        'scale = 0.01\n[[image]]\nfile = "a.tif"\n'
    )
    survey = open_survey(tmp_path)
    assert survey.images[0].inputs.value("outdoor_c") == pytest.approx(-0.5)
    # What the log gave is not said to be assumed.
    assert not any(note.startswith("air_c was not told") for note in survey.notes)
    assert any(note.startswith("emissivity was not told") for note in survey.notes)


def test_a_named_log_must_be_there(tmp_path: Path) -> None:
    with pytest.raises(SheetError, match=r"weather = \"weather.csv\": no such file"):
        load(tmp_path, '[survey]\nweather = "weather.csv"\n', "a.tif")
