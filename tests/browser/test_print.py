"""The report on paper: sheets of the right size, numbered, with nothing cut."""

import json
from pathlib import Path
from typing import Any

import pypdf
import pytest

from thermo_fix.report.pdf import PrintError, find_browser, on_paper, print_pdf

MM_PER_POINT = 25.4 / 72.0
PX_PER_MM = 96.0 / 25.4
SHEETS = {"A4": (210.0, 297.0), "letter": (215.9, 279.4)}
"""Width and height, mm: ISO 216; ANSI/ASME Y14.1."""

MARGINS_MM = (14.0, 17.0)
"""As in the style sheet: sides, and top and bottom."""


def drawn_pictures(page: Any) -> list[tuple[float, float, float, float]]:
    """Corners of every raster picture of a page, points."""
    found: list[tuple[float, float, float, float]] = []

    def before(operator: bytes, operands: list[Any], cm: list[float], tm: list[float]) -> None:
        if operator == b"Do" and str(operands[0]) in images:
            a, b, c, d, e, f = cm
            xs, ys = (e, e + a, e + c, e + a + c), (f, f + b, f + d, f + b + d)
            found.append((min(xs), min(ys), max(xs), max(ys)))

    objects = page["/Resources"].get("/XObject", {})
    images = {name for name, one in objects.items() if one.get_object()["/Subtype"] == "/Image"}
    page.extract_text(visitor_operand_before=before)
    return found


@pytest.mark.parametrize(("survey", "paper"), [("electrical", "A4"), ("building", "letter")])
def test_the_printed_report(
    survey: str, paper: Any, demos: Any, browser: Any, tmp_path: Path
) -> None:
    pdf = tmp_path / "report.pdf"
    print_pdf(demos[survey] / "report.html", pdf, paper=paper)
    pages = pypdf.PdfReader(pdf).pages
    # Eight and nine images with up to ten findings, their evidence, budgets and inputs in full.
    assert 10 <= len(pages) <= 60
    whole = 0
    for number, page in enumerate(pages, 1):
        width, height = float(page.mediabox.width), float(page.mediabox.height)
        assert (width * MM_PER_POINT, height * MM_PER_POINT) == pytest.approx(
            SHEETS[paper], abs=0.5
        )
        text = " ".join(page.extract_text().split())
        assert f"{number} / {len(pages)}" in text
        assert "Infrared survey report" in text
        assert "Marlhythe" in text
        for left, low, right, high in drawn_pictures(page):
            inside = left >= 0.0 and low >= 0.0 and right <= width and high <= height
            whole += inside
    # A picture cut by the end of a sheet is drawn on two, on neither whole. Pictures of cards are
    # windows into larger ones and need not be whole.
    document = json.loads((demos[survey] / "findings.json").read_text(encoding="utf-8"))
    done = [image for image in document["images"] if image["status"] == "done"]
    assert whole >= 2 * len(done)
    text = "".join(page.extract_text() for page in pages)
    for words in ("Sign-off", "Signature", "SHA-256", "Uncertainty budget"):
        assert words in text


@pytest.mark.parametrize("paper", ["A4", "letter"])
@pytest.mark.parametrize("survey", ["electrical", "building"])
def test_no_figure_is_wider_or_higher_than_a_sheet(
    survey: str, paper: str, demos: Any, visit: Any
) -> None:
    width = (SHEETS[paper][0] - 2 * MARGINS_MM[0]) * PX_PER_MM
    height = (SHEETS[paper][1] - 2 * MARGINS_MM[1]) * PX_PER_MM
    page = visit(demos[survey] / "report.html", width=int(width), height=int(height)).page
    page.emulate_media(media="print")
    page.evaluate("() => { for (const e of document.querySelectorAll('details')) e.open = 1; }")
    boxes = page.evaluate(
        "() => [...document.querySelectorAll('figure, .exhibit, .card, .sign, table, .plot')]"
        ".filter(e => e.checkVisibility()).map(e => {"
        " const b = e.getBoundingClientRect();"
        " return [e.className + ' ' + e.tagName, b.left, b.right, b.height]; })"
    )
    assert len(boxes) > 30
    for name, left, right, tall in boxes:
        assert left >= -1.0, name
        assert right <= width + 1.0, (name, right, width)
        assert tall <= height or "TABLE" in name, name


def test_without_a_browser_one_line_says_what_to_do(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("PATH", str(tmp_path))
    assert find_browser() is None
    with pytest.raises(PrintError, match="print it and choose") as caught:
        print_pdf(tmp_path / "report.html", tmp_path / "report.pdf")
    assert "\n" not in str(caught.value)


def test_the_size_of_the_sheets_is_admitted_by_the_policy(fakes: Any, visit: Any) -> None:
    page = fakes["electrical"].read_text(encoding="utf-8")
    copy = fakes["electrical"].with_name("on_paper.htm")
    copy.write_text(on_paper(page, "letter"), encoding="utf-8")
    seen = visit(copy)
    assert "@page { size: letter; }" in copy.read_text(encoding="utf-8")
    assert seen.complaints == []  # a refused style would be a complaint
