"""The HTML page: one file, no network, no script, no style from outside."""

import base64
import hashlib
import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from importlib.metadata import PackageNotFoundError
from importlib.metadata import version as package_version
from importlib.resources import files
from pathlib import Path
from typing import Final

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup

from thermo_fix.records import Finding, ImageResult, SurveyResult
from thermo_fix.report import drawing
from thermo_fix.report.catalogue import Words, load_words
from thermo_fix.report.formatting import Units
from thermo_fix.report.pictures import Pictures, colour_stops
from thermo_fix.report.survey_view import SurveyViews
from thermo_fix.report.view import CriterionText, FindingView, ImageView
from thermo_fix.version import __version__

_PACKAGES: Final = (
    "numpy",
    "scipy",
    "scikit-image",
    "opencv-python-headless",
    "tifffile",
    "imagecodecs",
)
"""Libraries whose versions can change a number."""

_UNSAFE: Final = re.compile(
    "[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\ud800-\udfff\ufdd0-\ufdef\ufffe\uffff"
    "\u202a-\u202e\u2066-\u2069]|[\U0001fffe\U0001ffff]"
)
"""Control characters, half surrogates (from odd file names), non-characters, and marks that turn
the direction of the text around them."""


@dataclass(frozen=True, slots=True)
class PictureView:
    """The pictures of one image with all that is drawn over them."""

    key: str
    """Prefix of the identifiers in the page."""
    width: int
    height: int
    pen: float
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


@dataclass(frozen=True, slots=True)
class CropView:
    """The picture of a card: a window into the corrected picture further down the page."""

    window: drawing.Crop
    low: str
    high: str
    """Ends of the colour scale."""


@dataclass(frozen=True, slots=True)
class _Frame:
    width: int
    height: int
    low: str
    high: str


def write_report(
    result: SurveyResult,
    pictures: Mapping[str, Pictures],
    path: Path,
    *,
    sheet_text: str | None,
    run_time: str,
    criteria: Sequence[CriterionText] = (),
) -> None:
    """Write the whole survey as one self-contained HTML file.

    ``pictures`` is asked for one image at a time (key: ``ImageResult.file``), so it may load them
    when asked; an image that it lacks is reported without pictures. ``run_time`` stands in one
    place of the page; nothing else in it depends on the clock. ``criteria`` are texts to print in
    full; criteria without one are printed as far as the gradings quote them.

    Raises OSError if ``path`` cannot be written. The file is written beside ``path`` and moved
    into place, so that no half-written report is left.
    """
    partial = path.with_name(path.name + ".partial")
    try:
        with partial.open("w", encoding="utf-8", newline="\n") as stream:
            stream.writelines(
                render_report(
                    result, pictures, sheet_text=sheet_text, run_time=run_time, criteria=criteria
                )
            )
        partial.replace(path)
    finally:
        partial.unlink(missing_ok=True)


def render_report(
    result: SurveyResult,
    pictures: Mapping[str, Pictures],
    *,
    sheet_text: str | None,
    run_time: str,
    criteria: Sequence[CriterionText] = (),
) -> Iterator[str]:
    """Pieces of the page, in order; arguments as for ``write_report``."""
    words = load_words()
    builder = SurveyViews(result, words, version=__version__, criteria=criteria)
    report = builder.report()
    ranked = result.findings
    images = {image.file: image for image in result.images}
    framed: dict[str, _Frame] = {}
    for file in sorted({view.file for view in report.cards}):
        found = pictures.get(file)
        if found is not None:
            framed[file] = _Frame(found.width, found.height, *_ends(found, report.units))

    def drawn(view: ImageView) -> PictureView | None:
        found = pictures.get(view.file)
        if found is None:
            return None
        findings = [(finding.number, ranked[finding.number - 1]) for finding in view.findings]
        return _draw(view, found, images[view.file], findings, report.units, words)

    def crop(view: FindingView) -> CropView | None:
        frame = framed.get(view.file)
        if frame is None:
            return None
        window = drawing.crop(ranked[view.number - 1], frame.width, frame.height)
        return CropView(window, frame.low, frame.high)

    style = _style()
    yield from (
        _environment()
        .get_template("page.html")
        .generate(
            w=words,
            report=report,
            images=((view, drawn(view)) for view in builder.images()),
            crop=crop,
            style=Markup(style),
            policy=content_policy(style),
            run_time=run_time,
            sheet_text=sheet_text,
            versions=_versions(),
        )
    )


def content_policy(style: str) -> str:
    """Content Security Policy of the page: its own style and inline pictures, nothing else.

    A later inline script would be admitted the same way, by ``script-src`` and its hash.
    """
    digest = base64.b64encode(hashlib.sha256(style.encode()).digest()).decode()
    return (
        f"default-src 'none'; img-src data:; style-src 'sha256-{digest}'; "
        "base-uri 'none'; form-action 'none'"
    )


def clean(value: object) -> object:
    """Replace characters that have no place in a page; markup of our own passes unchanged."""
    if isinstance(value, str) and not isinstance(value, Markup) and not value.isprintable():
        return _UNSAFE.sub("\N{REPLACEMENT CHARACTER}", value)
    return value


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


@lru_cache(maxsize=1)
def _style() -> str:
    source = files("thermo_fix.report").joinpath("static", "report.css")
    return source.read_text(encoding="utf-8").replace("\r\n", "\n")


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
    keys = (
        (words("picture.hot_key"), "hot" in senses),
        (words("picture.cold_key"), "cold" in senses),
        (words("picture.extreme_key"), bool(findings)),
        (words("picture.zone_key"), bool(image.zones)),
        (words("picture.hatch_key"), bool(image.unsolved_px)),
        (words("picture.scale_key"), True),
    )
    return PictureView(
        key=f"p{view.number}",
        width=width,
        height=height,
        pen=drawing.pen(width),
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
