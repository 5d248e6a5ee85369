"""Pictures of both demo reports for the documentation: ``python tests/browser/screenshots.py``.

Written to docs/screenshots/, in fewer colours where a file would be large. They need Chromium
and Playwright, as the tests do.
"""

import io
import os
import shutil
import sys
import tempfile
from pathlib import Path
from typing import Any

from PIL import Image
from playwright.sync_api import sync_playwright

from thermo_fix.demo import demo_surveys
from thermo_fix.report.pdf import find_browser
from thermo_fix.survey import run_survey

FOLDER = Path(__file__).parents[2] / "docs" / "screenshots"
MOST_BYTES = 200_000
"""Of one picture."""
VIEWS = (("360", 360, 780), ("1280", 1280, 1000), ("print", 688, 992))
"""Name, width and height: a telephone, a laptop, the printable part of an A4 sheet."""


def save(png: bytes, path: Path) -> None:
    """Write a screenshot with as many colours as fit."""
    picture = Image.open(io.BytesIO(png)).convert("RGB")
    for colours in (None, 256, 128, 64):
        packed = io.BytesIO()
        shown = picture if colours is None else picture.quantize(colours)
        shown.save(packed, "PNG", optimize=True)
        if packed.tell() < MOST_BYTES:
            break
    path.write_bytes(packed.getvalue())


def read_a_picture(page: Any) -> None:
    """Keep two points and draw a line in the first picture that has a finding."""
    pane = page.locator('.picture[data-image="p1"][data-plane="c"] .pane')
    pane.focus()
    for key in ("Shift+ArrowDown", "Enter", *["Shift+ArrowLeft"] * 8, "Enter", "l"):
        page.keyboard.press(key)
    for _ in range(16):
        page.keyboard.press("Shift+ArrowRight")
    page.keyboard.press("l")
    page.locator('[data-bench="p1"] .profile figcaption').wait_for()


def shoot(page: Any, name: str, height: int) -> None:
    """The first screen, and the first image in use."""
    save(page.screenshot(), FOLDER / f"{name}_first.png")
    read_a_picture(page)
    box = page.locator("#image-1").bounding_box()
    top = box["y"] + page.evaluate("() => scrollY")
    width = page.viewport_size["width"]
    tall = min(1.6 * height, box["height"])
    clip = {"x": 0, "y": top, "width": width, "height": tall}
    save(page.screenshot(full_page=True, clip=clip), FOLDER / f"{name}_image.png")


def main() -> None:
    """Run both demo surveys and photograph their reports."""
    browser_path = find_browser()
    if browser_path is None:
        sys.exit("no Chromium on PATH")
    shutil.rmtree(FOLDER, ignore_errors=True)
    FOLDER.mkdir(parents=True)
    root = hasattr(os, "geteuid") and os.geteuid() == 0
    with tempfile.TemporaryDirectory() as name, sync_playwright() as playwright:
        browser = playwright.chromium.launch(
            executable_path=str(browser_path), args=["--no-sandbox"] if root else []
        )
        for survey, source in demo_surveys().items():
            folder = Path(name) / survey
            shutil.copytree(source, folder, ignore=shutil.ignore_patterns("results"))
            run_survey(folder)
            for view, width, height in VIEWS:
                page = browser.new_page(viewport={"width": width, "height": height})
                page.goto((folder / "results" / "report.html").as_uri())
                if view == "print":
                    page.emulate_media(media="print")
                shoot(page, f"{survey}_{view}", height)
                page.close()
        dark = browser.new_page(viewport={"width": 1280, "height": 1000}, color_scheme="dark")
        dark.goto((Path(name) / "electrical" / "results" / "report.html").as_uri())
        save(dark.screenshot(), FOLDER / "electrical_dark_first.png")
        browser.close()
    sizes = [path.stat().st_size for path in FOLDER.iterdir()]
    print(f"{len(sizes)} pictures, {sum(sizes) / 1e6:.1f} MB, largest {max(sizes) / 1e3:.0f} kB")


if __name__ == "__main__":
    main()
