"""The pages in a real browser: sound, reachable, without network, legible at every width."""

from pathlib import Path
from typing import Any

import html5lib
import pytest

AXE = Path(__file__).parent / "vendor" / "axe.min.js"
RULES = ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa", "wcag22aa", "best-practice"]
KINDS = (
    "electrical",
    "building",
    "empty",
    "all-failed",
    "bare",
    "electrical-fahrenheit",
    "entry",
    "image page",
    "failed image page",
    "list of findings",
    "list of images",
)


def violations(page: Any) -> list[str]:
    """What axe-core finds, one line each. Evaluated by the debugger, past the page's policy."""
    page.evaluate(f"() => {{ {AXE.read_text(encoding='utf-8')} }}")
    found = page.evaluate(
        "rules => axe.run(document, {runOnly: rules, resultTypes: ['violations']})"
        ".then(result => result.violations.map(one => one.id + ': ' + one.help + ' '"
        " + one.nodes.slice(0, 3).map(node => node.html.slice(0, 200)).join(' | ')))",
        RULES,
    )
    assert isinstance(found, list)
    return [str(line) for line in found]


@pytest.mark.parametrize(
    ("kind", "dark"),
    [*((kind, False) for kind in KINDS), *((kind, True) for kind in ("electrical", "entry"))],
)
def test_axe_finds_nothing(kind: str, dark: bool, fakes: Any, visit: Any) -> None:
    seen = visit(fakes[kind], dark=dark)
    seen.page.evaluate(
        "() => { for (const e of document.querySelectorAll('details')) e.open = 1; }"
    )
    assert violations(seen.page) == []
    assert seen.complaints == []


@pytest.mark.parametrize("survey", ["building", "electrical"])
def test_axe_finds_nothing_in_the_demo_reports_in_use(survey: str, demos: Any, visit: Any) -> None:
    seen = visit(demos[survey] / "report.html")
    pane = seen.page.locator('.picture[data-image="p1"][data-plane="c"] .pane')
    pane.focus()
    for key in ("Enter", "Shift+ArrowLeft", "Enter", "l", "Shift+ArrowLeft", "l"):
        seen.page.keyboard.press(key)
    seen.page.locator('[data-bench="p1"] .profile figcaption').wait_for()
    assert violations(seen.page) == []
    assert seen.complaints == []


@pytest.mark.parametrize("kind", KINDS)
def test_pages_are_strict_html(kind: str, fakes: Any) -> None:
    html5lib.HTMLParser(strict=True).parse(fakes[kind].read_text(encoding="utf-8"))


def test_nothing_is_asked_of_any_network(demos: Any, fakes: Any, visit: Any) -> None:
    for path in (demos["building"] / "report.html", fakes["entry"], fakes["image page"]):
        seen = visit(path)
        pane = seen.page.locator(".pane").first
        if pane.count():
            pane.hover()
            pane.click()
            seen.page.locator('[data-do="map"]').first.select_option("magma")
        seen.page.wait_for_timeout(300)
        outside = [url for url in seen.requests if not url.startswith("data:")]
        assert outside == [path.resolve().as_uri()]
        assert seen.complaints == []


@pytest.mark.parametrize("kind", ["electrical", "building", "image page"])
def test_without_scripts_everything_that_matters_is_there(
    kind: str, fakes: Any, visit: Any
) -> None:
    page = visit(fakes[kind], scripts=False).page
    assert page.locator(".tools").count() == 0
    assert page.locator(".readout").count() == 0
    pictures = page.locator(".exhibit .picture")
    assert pictures.count() >= 2
    for number in range(pictures.count()):
        assert pictures.nth(number).bounding_box()["height"] > 100
    body = page.locator("body").inner_text()
    for words in ("Finding", "±", "Corrected", "As recorded"):
        assert words in body
    if kind == "electrical":
        for words in ("72.4", "At full load: act.", "Load:", "act", "Next step", "SHA-256"):
            assert words in body


@pytest.mark.parametrize("width", [360, 640, 1280])
@pytest.mark.parametrize("kind", ["electrical", "building", "entry", "image page"])
def test_nothing_runs_off_the_side(kind: str, width: int, fakes: Any, visit: Any) -> None:
    # 1280 px at 200 % zoom are 640 CSS px (WCAG 2.2, 1.4.4 and 1.4.10).
    page = visit(fakes[kind], width=width).page
    pane = page.locator(".pane").first
    if pane.count():
        pane.focus()
        for key in ("Enter", "Shift+ArrowLeft", "Enter", "l", "Shift+ArrowUp", "l"):
            page.keyboard.press(key)
        page.locator(".profile figcaption").first.wait_for()
        clipped = page.evaluate(
            "() => [...document.querySelectorAll('.main > *, .side > *, .tools > *, .profile > *')]"
            ".map(e => e.getBoundingClientRect().right - "
            "e.closest('.main, .side').getBoundingClientRect().right).filter(over => over > 1)"
        )
        assert clipped == []
    assert page.evaluate("() => document.documentElement.scrollWidth") <= width


@pytest.mark.parametrize("survey", ["building", "electrical"])
def test_first_screen_shows_the_outcome(survey: str, demos: Any, visit: Any) -> None:
    page = visit(demos[survey] / "report.html", width=1280, height=800).page
    for selector in (".headline", ".counts", ".strip", ".card .big", ".step"):
        box = page.locator(selector).first.bounding_box()
        assert box["y"] + box["height"] <= 800.0, selector


def test_keyboard_reaches_every_control_and_shows_where_it_is(fakes: Any, visit: Any) -> None:
    page = visit(fakes["electrical"]).page
    wanted = page.evaluate(
        "() => [...document.querySelectorAll('a[href], button, select, input, summary, "
        '[tabindex="0"]\')].filter(e => e.checkVisibility()).length'
    )
    reached = set()
    for _ in range(wanted + 20):
        page.keyboard.press("Tab")
        state = page.evaluate(
            "() => { const e = document.activeElement; if (e === document.body) return null;"
            " window.seen ??= []; if (!window.seen.includes(e)) window.seen.push(e);"
            " const style = getComputedStyle(e); const box = e.getBoundingClientRect();"
            " return [window.seen.indexOf(e), style.outlineStyle, box.width * box.height]; }"
        )
        if state is None:
            continue
        number, outline, area = state
        assert outline != "none"
        assert area > 0
        reached.add(number)
    assert len(reached) >= wanted


def test_controls_are_large_enough(fakes: Any, visit: Any) -> None:
    page = visit(fakes["electrical"], width=360).page
    small = page.evaluate(
        "() => [...document.querySelectorAll('button, select, input')]"
        ".filter(e => e.checkVisibility()).map(e => e.getBoundingClientRect())"
        ".filter(box => box.width < 24 || box.height < 24).length"
    )
    assert small == 0  # WCAG 2.2, success criterion 2.5.8 (AA)


def test_links_between_the_pages_of_a_large_survey_lead_there(fakes: Any, visit: Any) -> None:
    page = visit(fakes["entry"]).page
    page.locator("#findings table a").first.click()
    page.wait_for_url("**/pages/0001.html#finding-1")
    assert page.locator("#finding-1").count() == 1
    page.get_by_role("link", name="Next image").click()
    page.wait_for_url("**/pages/0002.html")
    page.get_by_role("link", name="What to act on").click()
    page.wait_for_url("**/report.html#act")
    page.get_by_role("link", name="List of images, part 1").click()
    page.wait_for_url("**/pages/images-001.html")
    assert page.locator("tbody tr").count() == 3
