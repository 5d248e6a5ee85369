"""A real browser for the tests of the report, and the pages that they open.

Without Chromium or Playwright these tests are skipped with a reason; with the environment
variable THERMO_FIX_REQUIRE_BROWSER=1 that is a failure.
"""

import os
import shutil
from collections.abc import Iterator
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from tests import make_fake_result as fake
from thermo_fix.demo import demo_surveys
from thermo_fix.records import PixelBudget, SurveyResult
from thermo_fix.report import Pictures, encode_pictures, write_report
from thermo_fix.survey import run_survey

BROWSERS = ("chromium", "chromium-browser", "google-chrome")
REQUIRED = os.environ.get("THERMO_FIX_REQUIRE_BROWSER") == "1"
WIDTH, HEIGHT = 1280, 900


def missing(reason: str) -> Any:
    """Skip, or fail where a browser is required."""
    if REQUIRED:
        pytest.fail(f"{reason}, and THERMO_FIX_REQUIRE_BROWSER is 1")
    pytest.skip(reason)


@dataclass
class Visit:
    """A page opened in the browser, and what the browser said about it."""

    page: Any
    requests: list[str] = field(default_factory=list)
    complaints: list[str] = field(default_factory=list)

    def settle(self) -> None:
        """Wait until the page has nothing left to do."""
        self.page.wait_for_load_state("load")
        self.page.evaluate("() => new Promise(done => requestAnimationFrame(() => done()))")


@pytest.fixture(scope="session")
def browser() -> Iterator[Any]:
    api = pytest.importorskip("playwright.sync_api") if not REQUIRED else None
    if api is None:
        try:
            from playwright import sync_api as api
        except ImportError:
            missing("Playwright is not installed")
    path = next((found for name in BROWSERS if (found := shutil.which(name))), None)
    if path is None:
        missing(f"no browser on PATH (tried {', '.join(BROWSERS)})")
    assert api is not None
    arguments = ["--disable-gpu", "--disable-background-networking"]
    if hasattr(os, "geteuid") and os.geteuid() == 0:
        arguments.append("--no-sandbox")
    with api.sync_playwright() as playwright:
        started = playwright.chromium.launch(executable_path=path, args=arguments)
        yield started
        started.close()


@pytest.fixture
def visit(browser: Any) -> Iterator[Any]:
    """Open a file: ``visit(path, width=360, scripts=False, dark=True)``."""
    contexts = []

    def open_page(
        path: Path,
        *,
        width: int = WIDTH,
        height: int = HEIGHT,
        scripts: bool = True,
        dark: bool = False,
        touch: bool = False,
    ) -> Visit:
        context = browser.new_context(
            viewport={"width": width, "height": height},
            java_script_enabled=scripts,
            color_scheme="dark" if dark else "light",
            has_touch=touch,
            bypass_csp=False,
        )
        contexts.append(context)
        page = context.new_page()
        seen = Visit(page)
        page.on("request", lambda request: seen.requests.append(request.url))
        page.on("console", lambda message: seen.complaints.append(message.text))
        page.on("pageerror", lambda error: seen.complaints.append(str(error)))
        page.goto(path.resolve().as_uri())
        if scripts:
            seen.settle()
        return seen

    yield open_page
    for context in contexts:
        context.close()


@pytest.fixture(scope="session")
def demos(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    """Results folders of both demo surveys."""
    folder = tmp_path_factory.mktemp("demos")
    found = {}
    for name, source in demo_surveys().items():
        target = folder / name
        shutil.copytree(source, target, ignore=shutil.ignore_patterns("results"))
        run_survey(target)
        found[name] = target / "results"
    return found


def by_pixel() -> tuple[SurveyResult, dict[str, Pictures]]:
    """A survey whose emissivity is a plane and whose camera had not recorded emissivity 1."""
    result, planes = fake.electrical()
    image = result.images[0]
    plane = planes[image.file]
    columns = np.broadcast_to(np.arange(plane.corrected_c.shape[1]), plane.corrected_c.shape)
    changed = replace(
        plane,
        labels=None,
        budgets=(PixelBudget("", None, np.empty(0), {}, ()),),
        emissivity=(0.5 + columns / 1000.0).astype(np.float32),
        apparent_c=plane.recorded_c - np.float32(0.7),
    )
    bare = replace(image, zones=())
    only = replace(result, images=(bare,))
    return only, {image.file: encode_pictures(changed, bare)}


@pytest.fixture(scope="session")
def fakes(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    """Pages of invented surveys, of every kind: one file, many files, nothing found, ..."""
    folder = tmp_path_factory.mktemp("fakes")
    fake.main(folder)
    result, planes = fake.electrical()
    large = folder / "large"
    large.mkdir()
    write_report(
        result,
        fake.pictures_of(result, planes),
        large / "report.html",
        sheet_text=fake.SHEET,
        run_time=fake.RUN_TIME,
        images_per_page=1,
    )
    write_report(
        *by_pixel(), folder / "by pixel.html", sheet_text=fake.SHEET, run_time=fake.RUN_TIME
    )
    pages = {path.stem: path for path in folder.glob("*.html")}
    pages["entry"] = large / "report.html"
    pages["image page"] = large / "pages" / "0001.html"
    pages["failed image page"] = large / "pages" / "0003.html"
    pages["list of findings"] = large / "pages" / "findings-001.html"
    pages["list of images"] = large / "pages" / "images-001.html"
    return pages
