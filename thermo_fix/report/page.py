"""The HTML pages: no network, no script and no style from outside.

A survey of usual size is one file. A large one is an entry page, a page for each image and lists
of findings and images, all in the folder ``pages`` beside it. Images are taken one at a time.
"""

import base64
import hashlib
import shutil
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from importlib.metadata import PackageNotFoundError
from importlib.metadata import version as package_version
from importlib.resources import files
from pathlib import Path
from typing import Final, Literal

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup

from thermo_fix.records import Finding, ImageResult, SurveyResult
from thermo_fix.report import drawing, plots, reader
from thermo_fix.report.catalogue import Words, load_words
from thermo_fix.report.cleaning import clean, css_string
from thermo_fix.report.formatting import Units
from thermo_fix.report.links import LIST_LENGTH, PAGES, Links, list_name
from thermo_fix.report.pictures import COLOUR_MAPS, Pictures, colour_stops, crop_png
from thermo_fix.report.survey_view import SurveyViews
from thermo_fix.report.view import CriterionText, FindingView, ImageView
from thermo_fix.version import __version__

IMAGES_PER_PAGE: Final = 60
"""Images up to which a report is one file."""

ENTRY_ROWS: Final = 100
"""Findings in the table of the entry page of a large survey; the lists hold them all."""

_PACKAGES: Final = (
    "numpy",
    "scipy",
    "scikit-image",
    "opencv-python-headless",
    "tifffile",
    "imagecodecs",
)
"""Libraries whose versions can change a number."""


@dataclass(frozen=True, slots=True)
class PictureView:
    """The pictures of one image with all that is drawn over them."""

    key: str
    """Prefix of the identifiers in the page."""
    width: int
    height: int
    pen: float
    shape: str
    """``wide``, ``tall`` or ``narrow``."""
    recorded: Markup
    corrected: Markup
    photo: Markup
    """``data:`` addresses; the photograph's is empty where there is none."""
    marks: tuple[drawing.Mark, ...]
    zones: tuple[drawing.ZoneMark, ...]
    ticks: tuple[drawing.Tick, ...]
    low: str
    high: str
    """Ends of the colour scale."""
    stops: tuple[str, ...]
    """Colours of the scale, evenly spaced."""
    key_texts: tuple[str, ...]
    """What the lines and marks mean, as far as they occur."""
    scale_bar: plots.ScaleBar | None
    histogram: plots.Histogram | None
    numbers: Markup
    """JSON for the reader."""


@dataclass(frozen=True, slots=True)
class CropView:
    """The picture of a card: a window into the corrected picture."""

    window: drawing.Crop
    low: str
    high: str
    """Ends of the colour scale."""
    address: Markup
    """Of the part alone; empty where the whole picture stands further down the page."""
    x: int
    y: int
    """Corner of the part in the picture."""
    outline: str
    """Of the finding; needed with a part alone."""


def write_report(
    result: SurveyResult,
    pictures: Mapping[str, Pictures],
    path: Path,
    *,
    sheet_text: str | None,
    run_time: str,
    criteria: Sequence[CriterionText] = (),
    images_per_page: int = IMAGES_PER_PAGE,
    single_file: bool = False,
) -> None:
    """Write the whole survey as self-contained HTML.

    ``pictures`` is asked for one image at a time (key: ``ImageResult.file``), so it may load them
    when asked; an image that it lacks is reported without pictures. ``run_time`` stands in one
    place of a page; nothing else in it depends on the clock. ``criteria`` are texts to print in
    full; criteria without one are printed as far as the gradings quote them.

    Past ``images_per_page`` images, ``path`` becomes an entry page with a page for each image in
    the folder ``pages`` beside it, unless ``single_file`` asks for one file all the same.

    Raises OSError if ``path`` cannot be written. Everything is written beside its place and moved
    there, so that no half-written report is left.
    """
    book = _Book(result, pictures, sheet_text=sheet_text, run_time=run_time, criteria=criteria)
    partial = path.with_name(path.name + ".partial")
    folder = path.with_name(PAGES)
    partial_folder = path.with_name(PAGES + ".partial")
    try:
        if single_file or len(result.images) <= images_per_page:
            _write(partial, book.whole())
        else:
            _write(partial, book.entry())
            shutil.rmtree(partial_folder, ignore_errors=True)
            partial_folder.mkdir()
            for name, pieces in book.pages():
                _write(partial_folder / name, pieces)
            shutil.rmtree(folder, ignore_errors=True)
            partial_folder.replace(folder)
        partial.replace(path)
    finally:
        partial.unlink(missing_ok=True)
        shutil.rmtree(partial_folder, ignore_errors=True)


def _write(path: Path, pieces: Iterator[str]) -> None:
    with path.open("w", encoding="utf-8", newline="\n") as stream:
        stream.writelines(pieces)


class _Book:
    """Everything that the pages of one report share."""

    def __init__(
        self,
        result: SurveyResult,
        pictures: Mapping[str, Pictures],
        *,
        sheet_text: str | None,
        run_time: str,
        criteria: Sequence[CriterionText],
    ) -> None:
        self._result = result
        self._pictures = pictures
        self._words = words = load_words(result.survey.language)
        self._views = SurveyViews(result, words, version=__version__, criteria=criteria)
        self._report = self._views.report()
        self._ranked = result.findings
        self._images = {image.file: image for image in result.images}
        style = _static("report.css") + _page_header(self._report.title, words)
        script = _static("report.js")
        self._shared = {
            "w": words,
            "report": self._report,
            "style": Markup(style),
            "script": Markup(script),
            "policy": content_policy(style, script),
            "run_time": run_time,
            "maps": COLOUR_MAPS,
            "page_data": reader.page_data(words, self._report.units),
            "neighbours": None,
        }
        self._sheet = {
            "sheet_text": sheet_text,
            "sheet_sha256": (
                "" if sheet_text is None else hashlib.sha256(sheet_text.encode()).hexdigest()
            ),
            "versions": _versions(),
            "overview": plots.overview(self._ranked, self._report.units),
        }

    def whole(self) -> Iterator[str]:
        """The report in one file."""
        frames = {
            file: found
            for file in sorted({view.file for view in self._report.cards})
            if (found := self._frame(file)) is not None
        }

        def crop(view: FindingView) -> CropView | None:
            frame = frames.get(view.file)
            return None if frame is None else self._crop(view, *frame, None)

        return self._render(
            "page.html",
            Links("whole"),
            images=((view, self._drawn(view)) for view in self._views.images()),
            crop=crop,
            rows=self._report.findings,
            lists=None,
            **self._sheet,
        )

    def entry(self) -> Iterator[str]:
        """The entry page of a large survey."""

        def crop(view: FindingView) -> CropView | None:
            found = self._pictures.get(view.file)
            if found is None:
                return None
            ends = _ends(found, self._report.units)
            return self._crop(view, found.width, found.height, *ends, found.corrected_png)

        return self._render(
            "page.html",
            Links("entry"),
            images=(),
            crop=crop,
            rows=self._report.findings[:ENTRY_ROWS],
            lists={
                "findings": _lists(len(self._report.findings)),
                "images": _lists(len(self._result.images)),
            },
            **self._sheet,
        )

    def pages(self) -> Iterator[tuple[str, Iterator[str]]]:
        """File name and pieces of each further page of a large survey."""
        last = len(self._result.images)
        for view in self._views.images():
            number = view.number
            neighbours = (number - 1 if number > 1 else None, number + 1 if number < last else None)
            yield (
                f"{number:04d}.html",
                self._render(
                    "image_page.html",
                    Links("page", number),
                    image=view,
                    picture=self._drawn(view),
                    neighbours=neighbours,
                ),
            )
        yield from self._listing("findings", self._report.findings)
        yield from self._listing("images", self._report.files)

    def _listing(
        self, kind: Literal["findings", "images"], rows: Sequence[object]
    ) -> Iterator[tuple[str, Iterator[str]]]:
        numbers = _lists(len(rows))
        for number in numbers:
            part = rows[(number - 1) * LIST_LENGTH : number * LIST_LENGTH]
            yield (
                list_name(kind, number),
                self._render(
                    f"{kind}_page.html", Links("page"), rows=part, number=number, numbers=numbers
                ),
            )

    def _render(self, template: str, link: Links, **values: object) -> Iterator[str]:
        return _environment().get_template(template).generate(link=link, **(self._shared | values))

    def _frame(self, file: str) -> tuple[int, int, str, str] | None:
        found = self._pictures.get(file)
        if found is None:
            return None
        return (found.width, found.height, *_ends(found, self._report.units))

    def _crop(
        self,
        view: FindingView,
        width: int,
        height: int,
        low: str,
        high: str,
        png: bytes | None,
    ) -> CropView:
        finding = self._ranked[view.number - 1]
        window = drawing.crop(finding, width, height)
        if png is None:
            return CropView(window, low, high, Markup(), 0, 0, "")
        part = crop_png(png, window.x, window.y, window.width, window.height)
        return CropView(
            window,
            low,
            high,
            _data_address("image/png", part),
            int(window.x),
            int(window.y),
            drawing.outline(finding),
        )

    def _drawn(self, view: ImageView) -> PictureView | None:
        found = self._pictures.get(view.file)
        if found is None:
            return None
        findings = [(finding.number, self._ranked[finding.number - 1]) for finding in view.findings]
        image = self._images[view.file]
        return _draw(view, found, image, findings, self._report.units, self._words)


def content_policy(style: str, script: str) -> str:
    """Content Security Policy of a page: its own style, script and inline pictures only."""
    return (
        f"default-src 'none'; img-src data:; style-src 'sha256-{_digest(style)}'; "
        f"script-src 'sha256-{_digest(script)}'; base-uri 'none'; form-action 'none'"
    )


def _digest(text: str) -> str:
    return base64.b64encode(hashlib.sha256(text.encode()).digest()).decode()


@lru_cache(maxsize=1)
def _environment() -> Environment:
    return Environment(
        loader=PackageLoader("thermo_fix.report"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        finalize=clean,
    )


@lru_cache(maxsize=2)
def _static(name: str) -> str:
    source = files("thermo_fix.report").joinpath("static", name)
    return source.read_text(encoding="utf-8").replace("\r\n", "\n")


def _page_header(title: str, words: Words) -> str:
    """Margin boxes of the printed pages: what they belong to, and their number."""
    font = "font: 8pt sans-serif; color: #545d6b;"
    return (
        f"@page {{ @top-left {{ content: {css_string(title or words('page.no_title'))}; {font} }} "
        f"@top-right {{ content: {css_string(words('page.kind'))}; {font} }} "
        f"@bottom-left {{ content: {css_string(words('page.print_caution'))}; {font} }} "
        f'@bottom-right {{ content: counter(page) " / " counter(pages); {font} }} }}\n'
    )


def _lists(rows: int) -> range:
    return range(1, 1 + -(-rows // LIST_LENGTH))


def _draw(
    view: ImageView,
    pictures: Pictures,
    image: ImageResult,
    findings: Sequence[tuple[int, Finding]],
    units: Units,
    words: Words,
) -> PictureView:
    width, height = pictures.width, pictures.height
    low, high = _ends(pictures, units)
    senses = {finding.sense for _, finding in findings}
    bar = plots.scale_bar(image.pixel_m, width, units)
    keys = (
        (words("picture.hot_key"), "hot" in senses),
        (words("picture.cold_key"), "cold" in senses),
        (words("picture.extreme_key"), bool(findings)),
        (words("picture.zone_key"), bool(image.zones)),
        (words("picture.hatch_key"), bool(image.unsolved_px)),
        (words("picture.bar_key"), bar is not None),
        (words("picture.scale_key"), True),
    )
    return PictureView(
        key=f"p{view.number}",
        width=width,
        height=height,
        pen=drawing.pen(width),
        shape="wide" if width >= height else "tall" if 2 * width >= height else "narrow",
        recorded=_data_address("image/png", pictures.recorded_png),
        corrected=_data_address("image/png", pictures.corrected_png),
        photo=_photo_address(pictures),
        marks=drawing.marks(findings, width, height),
        zones=drawing.zone_marks(image.zones, width, height),
        ticks=drawing.ticks(pictures.low_c, pictures.high_c, units),
        low=low,
        high=high,
        stops=colour_stops(pictures.colour_map),
        key_texts=tuple(text for text, needed in keys if needed),
        scale_bar=bar,
        histogram=plots.histogram(
            pictures.histogram, pictures.low_c, pictures.high_c, findings, words
        ),
        numbers=reader.image_data(pictures, image.pixel_m),
    )


def _ends(pictures: Pictures, units: Units) -> tuple[str, str]:
    """Ends of the colour scale in words."""
    low, high = units.temperature(pictures.low_c), units.temperature(pictures.high_c)
    return (low.plain if low else "", high.plain if high else "")


def _photo_address(pictures: Pictures) -> Markup:
    if pictures.photo_jpeg:
        return _data_address("image/jpeg", pictures.photo_jpeg)
    if pictures.photo_png:
        return _data_address("image/png", pictures.photo_png)
    return Markup()


def _data_address(media_type: str, content: bytes) -> Markup:
    """The bytes inline. Base 64 needs no escaping, and is long: it is marked as safe."""
    return Markup(f"data:{media_type};base64,{base64.b64encode(content).decode()}")


def _versions() -> tuple[tuple[str, str], ...]:
    rows = [("thermo_fix", __version__)]
    for name in _PACKAGES:
        try:
            rows.append((name, package_version(name)))
        except PackageNotFoundError:
            continue
    return tuple(rows)
