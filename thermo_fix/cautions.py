"""Everything that the product warns of, in one place.

General cautions are printed in every report; the functions give those that belong to one image
or one finding, with the numbers that set them off.
"""

ENERGISED = (
    "Energised equipment is opened and worked near only by qualified people under the site's "
    "electrical safety programme and local code. This report is not permission to do so."
)
SCREENING = (
    "Grades are screening aids. The criteria's own text, the manufacturer's limits and the "
    "responsible engineer decide."
)
INDICATION = (
    "Building findings are indications, to be confirmed by other means before anything is opened."
)
EMISSIVITY = "Below an emissivity of 0.6 the temperature is not reliable without a reference patch."


def general(purpose: str) -> tuple[str, ...]:
    """Return the cautions that every report prints, for ``building`` or ``electrical``."""
    own = (ENERGISED,) if purpose == "electrical" else (INDICATION,)
    return (*own, SCREENING, EMISSIVITY)


def low_emissivity(where: str, value: float) -> str:
    """Emissivity below 0.6."""
    return (
        f"Emissivity of {where} is {value:.2f}, below 0.6: its temperature is not reliable "
        "without a reference patch."
    )


def bounded(where: str, value: float, u: float) -> str:
    """Emissivity whose interval crosses 0 or 1."""
    return (
        f"Emissivity of {where}, {value:.3f} with a standard uncertainty of {u:.3f}, reaches "
        "beyond 0 or 1: a distribution cut off at the bound was used."
    )


def steep_view(where: str, angle_deg: float) -> str:
    """View angle above 60 degrees."""
    return (
        f"View angle of {where} is {angle_deg:.0f} degrees, above 60: emissivity falls steeply "
        "there and the reflection grows."
    )


def stretched_air(distance_m: float) -> str:
    """Air path longer than the formula was checked for."""
    return f"The air path of {distance_m:.0f} m stretches the air model, which is checked to 200 m."


def unsolved(pixels: int) -> str:
    """Pixels without a solution."""
    return (
        f"{pixels} pixels have no surface temperature under these inputs and are left blank: "
        "check the emissivity and the reflected temperature."
    )


def cut_by_frame() -> str:
    """Region at the edge of the image."""
    return "The region is cut by the edge of the image: its true extreme and area may be greater."


def too_small(width: int, height: int) -> str:
    """Region of a target that is no wider than three footprints."""
    return (
        f"The region is outlined at {width} x {height} pixels, blur of the optics included: its "
        "target is no larger than 3 x 3 footprints, too small to measure, and its extreme is "
        "understated."
    )


def near_reflected(separation_k: float) -> str:
    """Surface close to the reflected temperature, first order not enough."""
    return (
        f"The surface lies within {abs(separation_k):.1f} K of the reflected temperature; the "
        "emissivity hardly matters there, and neither does the reading tell it."
    )


def not_linear() -> str:
    """First-order propagation was not good enough."""
    return (
        "The temperature does not follow its inputs linearly within their uncertainty: the "
        "uncertainty was obtained by Monte Carlo (JCGM 101)."
    )


def lost_draws(share: float) -> str:
    """Part of the draws has no solution."""
    return (
        f"{share:.0%} of the possible inputs explain the reading by no temperature at all: the "
        "emissivity or the reflected temperature is not known well enough."
    )


def inside_noise(delta_k: float, u_delta_k: float) -> str:
    """Difference smaller than its expanded uncertainty."""
    return (
        f"The difference of {abs(delta_k):.1f} K is not larger than its expanded uncertainty of "
        f"{2.0 * u_delta_k:.1f} K (k = 2): it may not be real."
    )


def overload(load_a: float, rated_a: float) -> str:
    """Load above the rating."""
    return (
        f"Load was {load_a:g} A, above the rated {rated_a:g} A: the part is overloaded, and at its "
        "rated load it would be cooler."
    )


def heat_without_current(where: str) -> str:
    """Warm part that is said to carry no current."""
    return (
        f"{where} is warm and is said to carry no current: the heat has another source, such as a "
        "neighbour, the sun, a leakage or an eddy current, or the current was misread. It is not "
        "brought to another load."
    )


def far_from_load(share: float, factor: float) -> str:
    """Extrapolation over a wide range of load."""
    return (
        f"The values at another load are extrapolated from {share:.0%} of the rating, by a factor "
        f"of {factor:.1f}: repeat the image under more load before a costly decision."
    )


def hotter_inside() -> str:
    """Limit of what lies inside, compared with a surface."""
    return (
        "Infrared sees a surface. A conductor under its insulation, a contact in its housing or a "
        "winding in its frame is hotter than that: a surface within the limit does not prove that "
        "the inside is."
    )


def limit_from_memory(name: str) -> str:
    """Limit that is not confirmed against its source."""
    return f'The limit "{name}" is quoted from memory: check it against the source before use.'


def low_load(share: float) -> str:
    """Load below 40 percent."""
    return (
        f"Load was {share:.0%} of the rating, below 40 %: the grade may be understated, because "
        "the difference grows with the load."
    )


def one_moment() -> str:
    """Heat flow or temperature factor from one image."""
    return (
        "One image is one moment: walls lag behind the weather by hours. Repeat it on other nights "
        "before a decision rests on it."
    )


def surface_resistance(rsi: float) -> str:
    """Temperature factor measured under the surface resistance of the moment."""
    return (
        "The temperature factor was measured at one moment, under the surface resistance of that "
        f"moment. Mould is judged for {rsi:g} m2 K/W (ISO 13788), as in corners and behind "
        "furniture, where a surface is colder than one that stands free."
    )


def not_only_conduction() -> str:
    """Cold surface that evaporation or incoming air may cool."""
    return (
        "Evaporation from a wet surface and outdoor air that is drawn in cool a surface too: then "
        "neither the heat flow nor the temperature factor is that of the construction."
    )


def seen_from_outside() -> str:
    """Heat flow from the outside of a wall."""
    return (
        "Seen from outside: wind and sky decide the heat flow, and neither is known well. An image "
        "from inside is to be preferred."
    )


def windy(wind_m_s: float, most_m_s: float) -> str:
    """Heat flow seen from outside in too much wind."""
    return (
        f"The wind of {wind_m_s:.1f} m/s is above {most_m_s:g} m/s: the wind law makes most of the "
        "heat flow."
    )


def small_difference(difference_k: float, good_k: float) -> str:
    """Heat flow at a small difference between indoors and outdoors."""
    return (
        f"Indoors and outdoors differ by {abs(difference_k):.1f} K only; from {good_k:g} K on a "
        "U-value says more."
    )


def not_steady(hours: float | None, asked: float) -> str:
    """Heat flow without steady conditions before."""
    if hours is None:
        return (
            "It was not told for how long conditions had been steady (steady_hours): a U-value "
            f"asks for {asked:g} h."
        )
    return f"Conditions had been steady for {hours:g} h; a U-value asks for {asked:g} h."


def indoors_colder() -> str:
    """Heat flows inwards."""
    return "Indoors is colder than outdoors: heat flows inwards, and a loss is here a gain."
