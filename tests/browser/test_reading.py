"""Reading temperatures off the pictures: what the page shows against what the planes hold."""

import json
import math
import random
import re
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import tifffile

from tests import make_fake_result as fake
from thermo_fix.correct import correct_frame, radiation_models
from thermo_fix.demo import demo_surveys
from thermo_fix.read import read_frame, reading_k
from thermo_fix.records import CorrectedFrame
from thermo_fix.sheet import label_zones
from thermo_fix.survey import open_survey

MINUS = "\N{MINUS SIGN}"


def number(text: str) -> float:
    return float(text.replace(MINUS, "-"))


def readout(page: Any, image: int) -> dict[str, float]:
    """Numbers of the line below a picture."""
    text = page.locator(f'[data-bench="p{image}"] [data-show="readout"]').inner_text()
    found = re.search(
        r"Column (\d+), row (\d+).*?: (\S+)\s°C ±\s(\S+)\sK\. Apparent temperature (\S+)\s°C.*"
        r"emissivity used (\S+)\.$",
        text,
    )
    assert found is not None, text
    names = ("x", "y", "corrected", "expanded", "apparent", "emissivity")
    return {name: number(part) for name, part in zip(names, found.groups(), strict=True)}


def point_at(page: Any, image: int, x: int, y: int, plane: str = "c") -> None:
    """Move the pointer to the centre of a pixel."""
    holder = page.locator(f'.picture[data-image="p{image}"][data-plane="{plane}"]')
    holder.scroll_into_view_if_needed()
    box = holder.bounding_box()
    width, height = holder.evaluate(
        "e => { const b = e.querySelector('.plane').viewBox.baseVal; return [b.width, b.height]; }"
    )
    page.mouse.move(
        box["x"] + (x + 0.5) * box["width"] / width, box["y"] + (y + 0.5) * box["height"] / height
    )
    text = f"Column {x}, row {y}"
    page.wait_for_function(
        "([image, text]) => document.querySelector("
        '`[data-bench="p${image}"] [data-show="readout"]`).textContent.startsWith(text)',
        arg=[image, text],
    )


def files_of(results: Path) -> list[str]:
    document = json.loads((results / "findings.json").read_text(encoding="utf-8"))
    return [image["file"] for image in document["images"] if image["status"] == "done"]


@pytest.mark.parametrize("survey", ["building", "electrical"])
def test_readout_equals_the_written_planes(survey: str, demos: Any, visit: Any) -> None:
    results = demos[survey]
    seen = visit(results / "report.html")
    pick = random.Random(11)
    for image, file in enumerate(files_of(results), 1):
        stem = Path(file).with_suffix(".tif")
        corrected = tifffile.imread(results / "corrected" / stem)
        uncertainty = tifffile.imread(results / "uncertainty" / stem)
        rows, columns = corrected.shape
        done = 0
        while done < 4:
            x, y = pick.randrange(columns), pick.randrange(rows)
            if not math.isfinite(corrected[y, x]):
                continue
            done += 1
            point_at(seen.page, image, x, y)
            shown = readout(seen.page, image)
            # Half a step of the 16-bit plane and half a digit of the text, 0.01 K together.
            assert shown["corrected"] == pytest.approx(float(corrected[y, x]), abs=0.0101)
            # Two significant digits of k = 2, and the table of the uncertainty.
            wanted = 2.0 * float(uncertainty[y, x])
            assert shown["expanded"] == pytest.approx(wanted, rel=0.06, abs=0.01)
    assert seen.complaints == []


def corrected_demo(survey: str, image: int) -> CorrectedFrame:
    """The corrected image, computed again from the survey."""
    sheet = open_survey(demo_surveys()[survey])
    job = sheet.images[image - 1]
    frame = read_frame(job.path, sheet.camera)
    return correct_frame(
        frame,
        reading_k(frame),
        job,
        label_zones(job.zones, frame.shape),
        sheet.camera,
        radiation_models(sheet.model, sheet.camera, None),
    )


def difference_u(frame: CorrectedFrame, one: tuple[int, int], other: tuple[int, int]) -> float:
    """Standard uncertainty of a difference, straight from the measurement equations (JCGM 100)."""
    parts = []
    for x, y in (one, other):
        equation = frame.equations[int(frame.labels[y, x])]
        found = equation.contributions_k(float(frame.reading_k[y, x]))
        parts.append(
            {
                (
                    f"{key} of {x}, {y}"
                    if key in ("noise", "non-uniformity")
                    else equation.variables[key].name
                    if key in equation.variables
                    else key
                ): float(part)
                for key, part in found.items()
            }
        )
    names = {*parts[0], *parts[1]}
    return math.sqrt(sum((parts[0].get(n, 0.0) - parts[1].get(n, 0.0)) ** 2 for n in names))


def pixel_in_zone(frame: CorrectedFrame, label: int, share: float) -> tuple[int, int]:
    rows, columns = np.nonzero((frame.labels == label) & np.isfinite(frame.surface_k))
    place = int(share * (len(rows) - 1))
    return int(columns[place]), int(rows[place])


@pytest.mark.parametrize(("one", "other"), [(2, 2), (1, 2), (0, 2), (0, 0)])
def test_difference_of_two_points_with_its_uncertainty(
    one: int, other: int, demos: Any, visit: Any
) -> None:
    frame = corrected_demo("electrical", 1)
    first, second = pixel_in_zone(frame, one, 0.3), pixel_in_zone(frame, other, 0.8)
    assert first != second
    seen = visit(demos["electrical"] / "report.html")
    for x, y in (first, second):
        point_at(seen.page, 1, x, y)
        seen.page.mouse.down()
        seen.page.mouse.up()
    row = seen.page.locator('[data-bench="p1"] .points tbody tr').nth(1)
    row.wait_for()
    text = row.locator("td").nth(4).inner_text().replace("\u00a0", " ")
    found = re.fullmatch(r"\+?(\S+) ± (\S+) K", text)
    assert found is not None, text
    (x0, y0), (x1, y1) = first, second
    wanted = float(frame.surface_k[y1, x1]) - float(frame.surface_k[y0, x0])
    assert number(found[1]) == pytest.approx(wanted, abs=0.0151)
    u = 2.0 * difference_u(frame, first, second)
    assert number(found[2]) == pytest.approx(u, rel=0.06, abs=0.006)
    # Inside one image a difference is better known than either temperature.
    assert u < 2.0 * float(frame.uncertainty_k[y1, x1])


def test_apparent_temperature_and_emissivity_by_zone(demos: Any, visit: Any) -> None:
    frame = corrected_demo("electrical", 1)
    seen = visit(demos["electrical"] / "report.html")
    for label in (0, 2):
        x, y = pixel_in_zone(frame, label, 0.5)
        point_at(seen.page, 1, x, y)
        shown = readout(seen.page, 1)
        # The demo camera recorded emissivity 1 and transmittance 1: apparent is the reading.
        assert shown["apparent"] == pytest.approx(float(frame.reading_k[y, x]) - 273.15, abs=0.0101)
        factor = float(np.asarray(frame.equations[label].path().emissivity))
        assert shown["emissivity"] == pytest.approx(factor, abs=0.0006)


def test_recorded_picture_reads_the_same_pixel(demos: Any, visit: Any) -> None:
    seen = visit(demos["electrical"] / "report.html")
    point_at(seen.page, 1, 30, 40)
    by_corrected = readout(seen.page, 1)
    point_at(seen.page, 1, 100, 100)
    point_at(seen.page, 1, 30, 40, plane="r")
    assert readout(seen.page, 1) == by_corrected


def test_keyboard_alone_reads_pins_and_draws(demos: Any, visit: Any) -> None:
    seen = visit(demos["electrical"] / "report.html")
    page = seen.page
    for _ in range(300):
        page.keyboard.press("Tab")
        if page.evaluate("document.activeElement.className") == "pane":
            break
    else:
        pytest.fail("Tab does not reach the picture")
    page.wait_for_function(
        "() => document.querySelector("
        "'[data-bench=\"p1\"] [data-show=\"spoken\"]').textContent !== ''"
    )
    begun = readout(page, 1)
    assert (begun["x"], begun["y"]) == (160, 120)
    for key in ("ArrowRight", "ArrowRight", "ArrowUp", "Shift+ArrowDown", "Shift+ArrowLeft"):
        page.keyboard.press(key)
    moved = readout(page, 1)
    assert (moved["x"], moved["y"]) == (152, 129)
    spoken = page.locator('[data-bench="p1"] [data-show="spoken"]').inner_text()
    assert spoken.startswith("Column 152, row 129")
    page.keyboard.press("Enter")
    page.keyboard.press("Shift+ArrowRight")
    page.keyboard.press("Enter")
    assert page.locator('[data-bench="p1"] .points tbody tr').count() == 2
    page.keyboard.press("l")
    for _ in range(3):
        page.keyboard.press("Shift+ArrowUp")
    page.keyboard.press("l")
    caption = page.locator('[data-bench="p1"] .profile figcaption').inner_text()
    assert caption.startswith("Along the line from 162, 129 to 162, 99 (")
    # Arithmetic: 30 pixels of 1.3 mrad x 0.8 m are 3.12 cm.
    assert "(3.12\u00a0cm)" in caption
    page.keyboard.press("Delete")
    assert page.locator('[data-bench="p1"] .points tbody tr').count() == 1
    page.keyboard.press("Escape")
    assert page.locator('[data-bench="p1"] [data-show="points"]').is_hidden()
    assert page.locator('[data-bench="p1"] [data-show="profile"]').is_hidden()
    # No trap: Tab leads on, to the tools.
    page.keyboard.press("Tab")
    assert page.evaluate("document.activeElement.className") != "pane"
    assert seen.complaints == []


def test_touch_reads_and_pins(demos: Any, visit: Any) -> None:
    seen = visit(demos["electrical"] / "report.html", width=360, touch=True)
    pane = seen.page.locator('.picture[data-image="p1"][data-plane="c"] .pane')
    pane.scroll_into_view_if_needed()
    box = pane.bounding_box()
    seen.page.touchscreen.tap(box["x"] + box["width"] / 2, box["y"] + box["height"] / 2)
    seen.page.locator('[data-bench="p1"] .points tbody tr').first.wait_for()
    assert readout(seen.page, 1)["x"] == pytest.approx(160, abs=1)


def test_line_gives_the_profile_of_the_plane(demos: Any, visit: Any) -> None:
    results = demos["electrical"]
    seen = visit(results / "report.html")
    page = seen.page
    page.locator('[data-bench="p1"] [data-do="line"]').click()
    point_at(page, 1, 40, 142)
    page.mouse.down()
    point_at(page, 1, 280, 142)
    page.mouse.up()
    caption = page.locator('[data-bench="p1"] .profile figcaption').inner_text()
    plane = tifffile.imread(results / "corrected" / "IR_0201.tif")[142, 40:281]
    for word, value in (("lowest", plane.min()), ("highest", plane.max()), ("mean", plane.mean())):
        found = re.search(rf"{word} (\S+)\s°C", caption)
        assert found is not None
        assert number(found[1]) == pytest.approx(float(value), abs=0.061)


def colour_at(page: Any, selector: str, x: int, y: int) -> list[int]:
    """Colour of a pixel of a picture, as the browser decodes it."""
    shown = page.evaluate(
        """async ([selector, x, y]) => {
            const image = new Image();
            image.src = document.querySelector(selector).getAttribute('href');
            await image.decode();
            const canvas = document.createElement('canvas');
            canvas.width = image.width; canvas.height = image.height;
            const context = canvas.getContext('2d');
            context.drawImage(image, 0, 0);
            return [...context.getImageData(x, y, 1, 1).data].slice(0, 3);
        }""",
        [selector, x, y],
    )
    assert isinstance(shown, list)
    return shown


def test_colour_map_and_span_for_one_image_and_for_all(demos: Any, visit: Any) -> None:
    import matplotlib

    results = demos["electrical"]
    seen = visit(results / "report.html")
    page = seen.page
    bench = page.locator('[data-bench="p1"]')
    before = page.locator("#p2c").get_attribute("href")
    bench.locator('[data-do="map"]').select_option("viridis")
    bench.locator('[data-do="low"]').fill("20")
    bench.locator('[data-do="low"]').press("Tab")
    bench.locator('[data-do="high"]').fill("60")
    bench.locator('[data-do="high"]').press("Tab")
    page.wait_for_function(
        "() => document.querySelector("
        "'[data-scale=\"p1\"]').getAttribute('aria-label').includes('60')"
    )
    plane = tifffile.imread(results / "corrected" / "IR_0201.tif")
    for x, y in ((160, 139), (10, 10), (80, 200)):
        share = (float(plane[y, x]) - 20.0) / 40.0
        # Source of the colours: matplotlib's own map; a step of the map may lie between.
        wanted = np.array(matplotlib.colormaps["viridis"](share)[:3]) * 255.0
        assert np.abs(np.array(colour_at(page, "#p1c", x, y)) - wanted).max() <= 4.0
    assert page.locator("#p2c").get_attribute("href") == before
    assert "20.0" in page.locator('[data-ends="p1"]').first.inner_text()
    bench.locator('[data-do="all"]').check()
    page.wait_for_function(
        "before => document.getElementById('p2c').getAttribute('href') !== before", arg=before
    )
    bench.locator('[data-do="reset"]').click()
    page.wait_for_function(
        "before => document.getElementById('p2c').getAttribute('href') === before", arg=before
    )
    assert seen.complaints == []


def test_swapping_shows_the_recorded_picture_on_the_same_scale(demos: Any, visit: Any) -> None:
    seen = visit(demos["electrical"] / "report.html")
    page = seen.page
    label = page.locator('[data-shown="p1"]')
    assert label.inner_text() == "Corrected"
    page.locator('[data-bench="p1"] [data-do="recorded"]').click()
    assert label.inner_text() == "As recorded"
    assert page.locator(".swapped").get_attribute("href") == "#p1r"
    pressed = page.locator('[data-bench="p1"] [data-do="recorded"]').get_attribute("aria-pressed")
    assert pressed == "true"
    page.locator('[data-bench="p1"] [data-do="corrected"]').click()
    assert page.locator(".swapped").count() == 0


def test_planes_by_pixel_are_read_and_a_difference_is_only_bounded(fakes: Any, visit: Any) -> None:
    result, planes = fake.electrical()
    plane = planes[result.images[0].file]
    seen = visit(fakes["by pixel"])
    page = seen.page
    places = ((40, 50), (162, 100))
    for x, y in places:
        point_at(page, 1, x, y)
        text = page.locator('[data-bench="p1"] [data-show="readout"]').inner_text()
        found = re.search(
            r": (\S+)\s°C ±\s(\S+)\sK\. Apparent temperature (\S+)\s°C; reading (\S+)\s°C; "
            r"emissivity used (\S+)\.$",
            text,
        )
        assert found is not None, text
        shown = [number(part) for part in found.groups()]
        reading = float(plane.recorded_c[y, x])
        wanted = [float(plane.corrected_c[y, x]), reading - 0.7, reading]
        assert [shown[0], *shown[2:4]] == pytest.approx(wanted, abs=0.0101)
        assert shown[1] == pytest.approx(2.0 * float(plane.uncertainty_k[y, x]), rel=0.06)
        # As made up: 0.5 and a thousandth for each column.
        assert shown[4] == pytest.approx(0.5 + x / 1000.0, abs=0.0006)
        page.mouse.down()
        page.mouse.up()
    row = page.locator('[data-bench="p1"] .points tbody tr').nth(1)
    row.wait_for()
    text = row.locator("td").nth(4).inner_text().replace("\u00a0", " ")
    bound = re.search(r"at most (\S+) K$", text)
    assert bound is not None, text
    # No correlation makes the uncertainty of a difference more than the sum of both.
    total = 2.0 * sum(float(plane.uncertainty_k[y, x]) for x, y in places)
    assert number(bound[1]) == pytest.approx(total, rel=0.06)
    assert seen.complaints == []
