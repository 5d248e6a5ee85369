"""Everything that the product warns of, in one place, as a catalogue that can be walked.

General cautions are printed in every report; the functions give those that belong to one image
or one finding, with the numbers that set them off. Each has a code that does not change when its
text is improved. A test walks the catalogue and sets off every entry in a run.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from types import MappingProxyType
from typing import ParamSpec

_Numbers = ParamSpec("_Numbers")


@dataclass(frozen=True, slots=True)
class Caution:
    """An entry of the catalogue."""

    code: str
    """Stable, lower case with hyphens."""
    when: str
    """What sets it off, in a few words."""
    text: Callable[..., str]
    """Takes the numbers that set it off."""


_entries: dict[str, Caution] = {}

CATALOGUE = MappingProxyType(_entries)
"""Every caution by its code, in the order of this file."""


def _caution(code: str) -> Callable[[Callable[_Numbers, str]], Callable[_Numbers, str]]:
    """Enter a function under its code; its docstring says when it is used."""

    def enter(text: Callable[_Numbers, str]) -> Callable[_Numbers, str]:
        when = (text.__doc__ or "").strip().removesuffix(".")
        _enter(Caution(code, when, text))
        return text

    return enter


def _standing(code: str, when: str, words: str) -> str:
    """Enter a caution that needs no numbers."""
    _enter(Caution(code, when, lambda: words))
    return words


def _enter(caution: Caution) -> None:
    if caution.code in _entries:
        raise ValueError(f"two cautions with the code {caution.code}")
    _entries[caution.code] = caution


ENERGISED = _standing(
    "energised",
    "Every electrical survey",
    "Energised equipment is opened and worked near only by qualified people under the site's "
    "electrical safety programme and local code. This report is not permission to do so.",
)
SCREENING = _standing(
    "screening",
    "Always",
    "Grades are screening aids. The criteria's own text, the manufacturer's limits and the "
    "responsible engineer decide.",
)
INDICATION = _standing(
    "indication",
    "Every building survey",
    "Building findings are indications, to be confirmed by other means before anything is opened.",
)
EMISSIVITY = _standing(
    "emissivity",
    "Always",
    "Below an emissivity of 0.6 the temperature is not reliable without a reference patch.",
)


def general(purpose: str) -> tuple[str, ...]:
    """Return the cautions that every report prints, for ``building`` or ``electrical``."""
    own = (ENERGISED,) if purpose == "electrical" else (INDICATION,)
    return (*own, SCREENING, EMISSIVITY)


@_caution("low-emissivity")
def low_emissivity(where: str, value: float) -> str:
    """Emissivity below 0.6."""
    return (
        f"Emissivity of {where} is {value:.2f}, below 0.6: its temperature is not reliable "
        "without a reference patch."
    )


@_caution("bounded")
def bounded(where: str, value: float, u: float) -> str:
    """Emissivity whose interval crosses 0 or 1."""
    return (
        f"Emissivity of {where}, {value:.3f} with a standard uncertainty of {u:.3f}, reaches "
        "beyond 0 or 1: a distribution cut off at the bound was used."
    )


@_caution("steep-view")
def steep_view(where: str, angle_deg: float) -> str:
    """View angle above 60 degrees."""
    return (
        f"View angle of {where} is {angle_deg:.0f} degrees, above 60: emissivity falls steeply "
        "there and the reflection grows."
    )


@_caution("stretched-air")
def stretched_air(distance_m: float) -> str:
    """Air path longer than the formula was checked for."""
    return f"The air path of {distance_m:.0f} m stretches the air model, which is checked to 200 m."


@_caution("unsolved")
def unsolved(pixels: int) -> str:
    """Pixels without a solution."""
    return (
        f"{pixels} pixels have no surface temperature under these inputs and are left blank: "
        "check the emissivity and the reflected temperature."
    )


@_caution("no-reading")
def no_reading(pixels: int) -> str:
    """Pixels without a reading in the file."""
    return f"{pixels} pixels hold no reading in the file and are left blank."


@_caution("unknown-uncertainty")
def unknown_uncertainty(pixels: int, low_c: float, high_c: float) -> str:
    """Pixels with a temperature whose uncertainty cannot be told."""
    return (
        f"{pixels} pixels have a surface temperature, but no uncertainty: the difference to the "
        "band model is a part of it, and that model gives them no temperature (it is tabulated "
        f"from {low_c:.0f} to {high_c:.0f} degC)."
    )


@_caution("assumed-inputs")
def assumed_inputs(keys: Sequence[str]) -> str:
    """Inputs of the temperature that the sheet does not tell."""
    return (
        f"Assumed, because the sheet does not tell them: {', '.join(keys)}. The uncertainty allows "
        "for that as far as the defaults are wide enough; state them to be sure."
    )


@_caution("inferred-encoding")
def inferred_encoding(words: str) -> str:
    """Meaning of the pixel values not stated in the sheet."""
    return (
        f"The sheet does not state what the pixel values mean; they are read as {words}. If that "
        "is wrong, every temperature is: state camera.pixel."
    )


@_caution("not-long-wave")
def not_long_wave(low_um: float, high_um: float) -> str:
    """Long-wave formula or table used for another band."""
    return (
        f"The camera's band, {low_um:g} to {high_um:g} um, is not the long-wave one for which the "
        "air formula and the table of surfaces hold: state transmittance and emissivity."
    )


@_caution("computed-reflected")
def computed_reflected(where: str) -> str:
    """Reflected temperature from a model of sky and ground."""
    return (
        f"The reflected temperature of {where} was computed from a model of sky and ground, not "
        "measured: trees, neighbours and the camera's band change it by kelvins."
    )


@_caution("saturated")
def saturated(pixels: int, end: str, reading_c: float) -> str:
    """Many pixels at the same greatest or least reading."""
    return (
        f"{pixels} pixels share the {end} reading, {reading_c:.1f} degC, as when a range is "
        "exceeded: temperatures there are bounds and not values."
    )


@_caution("saturated-extreme")
def saturated_extreme(sense: str) -> str:
    """Extreme on readings at the end of the range."""
    beyond = "hotter" if sense == "hot" else "colder"
    return (
        "The extreme lies on readings at the end of the camera's range: the surface may be "
        f"{beyond} than stated, by an unknown amount that is not in the uncertainty."
    )


@_caution("defective-pixels")
def defective_pixels(pixels: int) -> str:
    """Single pixels that stand out from all their neighbours."""
    one = pixels == 1
    return (
        f"{pixels} isolated pixel{' was' if one else 's were'} taken as defective and bridged when "
        f"looking for findings; the planes and the image's least and greatest temperature still "
        f"hold {'it' if one else 'them'}."
    )


@_caution("defective-extreme")
def defective_extreme() -> str:
    """Extreme or reference beside a pixel that was taken as defective."""
    return (
        "A pixel at the extreme or its reference was taken as defective and left out: the value is "
        "the mean of its neighbours, which understates a peak."
    )


@_caution("shape-no-proof")
def shape_no_proof() -> str:
    """Pattern that the shape of a finding resembles."""
    return "A shape is no proof of a cause: confirm by other means before anything is opened."


@_caution("shape-cut")
def shape_cut() -> str:
    """Pattern of a region at the edge of the image."""
    return "The region is cut by the edge of the image, and its shape is not whole."


@_caution("cut-by-frame")
def cut_by_frame() -> str:
    """Region at the edge of the image."""
    return "The region is cut by the edge of the image: its true extreme and area may be greater."


@_caution("too-small")
def too_small(width: int, height: int) -> str:
    """Region of a target that is no wider than three footprints."""
    return (
        f"The region is outlined at {width} x {height} pixels, blur of the optics included: its "
        "target is no larger than 3 x 3 footprints, too small to measure, and its extreme is "
        "understated."
    )


@_caution("near-reflected")
def near_reflected(separation_k: float) -> str:
    """Surface close to the reflected temperature, first order not enough."""
    return (
        f"The surface lies within {abs(separation_k):.1f} K of the reflected temperature; the "
        "emissivity hardly matters there, and neither does the reading tell it."
    )


@_caution("not-linear")
def not_linear() -> str:
    """First-order propagation was not good enough."""
    return (
        "The temperature does not follow its inputs linearly within their uncertainty: the "
        "uncertainty was obtained by Monte Carlo (JCGM 101)."
    )


@_caution("lost-draws")
def lost_draws(share: float) -> str:
    """Part of the draws has no solution."""
    return (
        f"{share:.0%} of the possible inputs explain the reading by no temperature at all: the "
        "emissivity or the reflected temperature is not known well enough."
    )


@_caution("no-uncertainty")
def no_uncertainty() -> str:
    """More than half of the draws has no solution."""
    return (
        "The uncertainty of this temperature is not known, because most of the possible inputs "
        "explain the reading by no temperature: do not grade by it."
    )


@_caution("beyond-band-tables")
def beyond_band_tables(value_c: float, low_c: float, high_c: float) -> str:
    """Temperature of the total model for which the band model has none."""
    return (
        f"At {value_c:.0f} degC the uncertainty is not known: the difference to the band model is "
        "a part of it, and that model gives no temperature here (it is tabulated from "
        f"{low_c:.0f} to {high_c:.0f} degC)."
    )


@_caution("no-difference-uncertainty")
def no_difference_uncertainty(delta_k: float) -> str:
    """Difference whose uncertainty cannot be told."""
    return (
        f"The uncertainty of the difference of {abs(delta_k):.1f} K is not known, because that of "
        "the finding or of its reference is not: the difference may not be real."
    )


@_caution("inside-noise")
def inside_noise(delta_k: float, u_delta_k: float) -> str:
    """Difference smaller than its expanded uncertainty."""
    return (
        f"The difference of {abs(delta_k):.1f} K is not larger than its expanded uncertainty of "
        f"{2.0 * u_delta_k:.1f} K (k = 2): it may not be real."
    )


@_caution("overload")
def overload(load_a: float, rated_a: float) -> str:
    """Load above the rating."""
    return (
        f"Load was {load_a:g} A, above the rated {rated_a:g} A: the part is overloaded, and at its "
        "rated load it would be cooler."
    )


@_caution("heat-without-current")
def heat_without_current(where: str) -> str:
    """Warm part that is said to carry no current."""
    return (
        f"{where} is warm and is said to carry no current: the heat has another source, such as a "
        "neighbour, the sun, a leakage or an eddy current, or the current was misread. It is not "
        "brought to another load."
    )


@_caution("far-from-load")
def far_from_load(share: float, factor: float) -> str:
    """Extrapolation over a wide range of load."""
    return (
        f"The values at another load are extrapolated from {share:.0%} of the rating, by a factor "
        f"of {factor:.1f}: repeat the image under more load before a costly decision."
    )


@_caution("hotter-inside")
def hotter_inside() -> str:
    """Limit of what lies inside, compared with a surface."""
    return (
        "Infrared sees a surface. A conductor under its insulation, a contact in its housing or a "
        "winding in its frame is hotter than that: a surface within the limit does not prove that "
        "the inside is."
    )


@_caution("limit-from-memory")
def limit_from_memory(name: str) -> str:
    """Limit that is not confirmed against its source."""
    return f'The limit "{name}" is quoted from memory: check it against the source before use.'


@_caution("low-load")
def low_load(share: float) -> str:
    """Load below 40 percent."""
    return (
        f"Load was {share:.0%} of the rating, below 40 %: the grade may be understated, because "
        "the difference grows with the load."
    )


@_caution("one-moment")
def one_moment() -> str:
    """Heat flow or temperature factor from one image."""
    return (
        "One image is one moment: walls lag behind the weather by hours. Repeat it on other nights "
        "before a decision rests on it."
    )


@_caution("surface-resistance")
def surface_resistance(rsi: float) -> str:
    """Temperature factor measured under the surface resistance of the moment."""
    return (
        "The temperature factor was measured at one moment, under the surface resistance of that "
        f"moment. Mould is judged for {rsi:g} m2 K/W (ISO 13788), as in corners and behind "
        "furniture, where a surface is colder than one that stands free."
    )


@_caution("not-only-conduction")
def not_only_conduction() -> str:
    """Cold surface that evaporation or incoming air may cool."""
    return (
        "Evaporation from a wet surface and outdoor air that is drawn in cool a surface too: then "
        "neither the heat flow nor the temperature factor is that of the construction."
    )


@_caution("seen-from-outside")
def seen_from_outside() -> str:
    """Heat flow from the outside of a wall."""
    return (
        "Seen from outside: wind and sky decide the heat flow, and neither is known well. An image "
        "from inside is to be preferred."
    )


@_caution("windy")
def windy(wind_m_s: float, most_m_s: float) -> str:
    """Heat flow seen from outside in too much wind."""
    return (
        f"The wind of {wind_m_s:.1f} m/s is above {most_m_s:g} m/s: the wind law makes most of the "
        "heat flow."
    )


@_caution("small-difference")
def small_difference(difference_k: float, good_k: float) -> str:
    """Heat flow at a small difference between indoors and outdoors."""
    return (
        f"Indoors and outdoors differ by {abs(difference_k):.1f} K only; from {good_k:g} K on a "
        "U-value says more."
    )


@_caution("not-steady")
def not_steady(hours: float | None, asked: float) -> str:
    """Heat flow without steady conditions before."""
    if hours is None:
        return (
            "It was not told for how long conditions had been steady (steady_hours): a U-value "
            f"asks for {asked:g} h."
        )
    return f"Conditions had been steady for {hours:g} h; a U-value asks for {asked:g} h."


@_caution("indoors-colder")
def indoors_colder() -> str:
    """Heat flows inwards."""
    return "Indoors is colder than outdoors: heat flows inwards, and a loss is here a gain."
