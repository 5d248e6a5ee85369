"""Heat flow at a place of a building's envelope, from its temperature and what is told of the air.

The physics is in ``thermal``; here it gets inputs, their uncertainties and the side that is seen.
"""

import math
from dataclasses import dataclass

import numpy as np

from thermo_fix import cautions
from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.defaults import default_for, default_value
from thermo_fix.errors import DomainError
from thermo_fix.measure.spot import Spot, temperature_of
from thermo_fix.radiometry.blackbody import Real
from thermo_fix.records import CorrectedFrame, ImageJob, Input, SceneInputs
from thermo_fix.thermal.convection import (
    NATURAL_RELATIVE_U,
    WIND_RELATIVE_U,
    natural_coefficient,
    wind_coefficient,
)
from thermo_fix.thermal.heat_flow import (
    GOOD_DIFFERENCE_K,
    HEMISPHERICAL_RELATIVE_U,
    LEAST_DIFFERENCE_K,
    MOST_WIND_M_S,
    STEADY_HOURS,
    Exchange,
    hemispherical_ratio,
    surface_exchange,
    u_value,
)
from thermo_fix.uncertainty.combine import combined, combined_all, of_variable
from thermo_fix.uncertainty.estimate import Estimate
from thermo_fix.uncertainty.variables import Variable

_RATIO = "hemispherical emissivity"
_NATURAL = "law of natural convection"
_WIND = "law of convection in wind"
_LEAST_HEIGHT_M = 0.05
_LEAST_SCATTER = 0.05

SOURCE = (
    "Heat balance of the surface in the manner of ISO 9869-2:2018 (from memory); natural "
    "convection by Churchill and Chu (1975), wind by Juerges (1924) and McAdams (1954), taken as "
    "convection alone"
)


@dataclass(frozen=True, slots=True)
class HeatFlow:
    """Heat flow through the envelope at one place."""

    flux: Estimate
    """W/m2, positive from inside to outside."""
    coefficient: Estimate
    """Convection and radiation together, W m-2 K-1."""
    environment_c: Estimate
    """Environmental temperature of the side that is seen, degC."""
    difference_k: float
    """Indoors minus outdoors, air of the sides, K."""
    u_value: Estimate | None
    """W m-2 K-1; None where indoors and outdoors differ too little."""


def missing_inputs(inputs: SceneInputs) -> tuple[str, ...]:
    """Return the sheet keys that a heat flow lacks; empty where it can be computed."""
    inside = inputs.inside
    keys = ["emissivity", "reflected_c", "air_c"]
    if inside is not None:
        keys += ["outdoor_c"] if inside else ["wind_m_s", "indoor_c"]
    lacking = [key for key in keys if inputs.told(key) is None]
    return (*lacking, *(() if inside is not None else ("side",)))


def warm_side_is_inside(inputs: SceneInputs) -> bool | None:
    """Return whether indoors is warmer than outdoors; None where that is not told."""
    indoor = inputs.told("indoor_c") or (inputs.told("air_c") if inputs.inside else None)
    outdoor = inputs.told("outdoor_c") or (inputs.told("air_c") if inputs.inside is False else None)
    if indoor is None or outdoor is None:
        return None
    return indoor.value >= outdoor.value


def heat_flow(corrected: CorrectedFrame, spot: Spot, surface: Estimate | None = None) -> HeatFlow:
    """Heat flow at a place for which :func:`missing_inputs` names nothing.

    Parameters
    ----------
    corrected
        The image.
    spot
        The place.
    surface
        Its surface temperature, degC; computed where None.

    Returns
    -------
    HeatFlow
        Places of one image share the variables of air, surroundings, emissivity and laws, so that
        a difference of two flows loses what is common.

    """
    equation = corrected.equations[spot.label]
    inputs = corrected.inputs[spot.label]
    inside = bool(inputs.inside)
    if surface is None:
        surface = temperature_of(spot, equation)
    emissivity = equation.variables["emissivity"]
    normal = emissivity.value if spot.emissivity is None else spot.emissivity + emissivity.value
    mirrored = 0.0 if spot.reflected_c is None else spot.reflected_c
    ratio = hemispherical_ratio(min(normal, 1.0))
    eps_shift = 0.0 if spot.emissivity is None else spot.emissivity
    size = height_of(inputs) if inside else inputs.values["wind_m_s"]
    law = (
        Variable(_NATURAL, 1.0, NATURAL_RELATIVE_U, lower=0.0)
        if inside
        else Variable(_WIND, 1.0, WIND_RELATIVE_U, lower=0.0)
    )
    other = inputs.values["outdoor_c" if inside else "indoor_c"]
    parts = (
        surface,
        of_variable(equation.variables["reflected_c"]),
        of_variable(equation.variables["air_c"]),
        of_variable(emissivity),
        of_variable(Variable(_RATIO, ratio, HEMISPHERICAL_RELATIVE_U * ratio)),
        of_variable(law),
        of_variable(Variable(size.name, size.value, size.u, lower=0.0)),
    )
    outwards = -1.0 if inside else 1.0

    def exchange(
        surface_c: Real,
        reflected_c: Real,
        air_c: Real,
        eps: Real,
        by_angle: Real,
        scatter: Real,
        extent: Real,
    ) -> tuple[Exchange, Real]:
        # Far draws of a normal distribution may leave what is possible.
        scatter = np.maximum(scatter, _LEAST_SCATTER)
        surface_k, air_k = surface_c + ZERO_CELSIUS_K, air_c + ZERO_CELSIUS_K
        if inside:
            still = natural_coefficient(surface_k, air_k, np.maximum(extent, _LEAST_HEIGHT_M))
            convective = scatter * still
        else:
            convective = scatter * wind_coefficient(np.maximum(extent, 0.0))
        total = np.clip((eps + eps_shift) * by_angle, 0.0, 1.0)
        reflected_k = reflected_c + mirrored + ZERO_CELSIUS_K
        found = surface_exchange(surface_k, reflected_k, air_k, total, convective)
        return found, found.radiative_coefficient + convective

    def ends_k(environment_k: Real, far_c: Real) -> tuple[Real, Real]:
        far_k = far_c + ZERO_CELSIUS_K
        return (environment_k, far_k) if inside else (far_k, environment_k)

    def results(*values: Real) -> tuple[Real, Real, Real, Real]:
        *own, far_c = values
        found, both = exchange(*own)
        indoor_k, outdoor_k = ends_k(found.environment_k, far_c)
        through = outwards * found.flux
        return (
            through,
            both,
            found.environment_k - ZERO_CELSIUS_K,
            through / (indoor_k - outdoor_k),
        )

    far = of_variable(Variable(other.name, other.value, other.u))
    flux, coefficient, environment_c, by_difference = combined_all(results, *parts, far)
    u_estimate: Estimate | None = by_difference
    try:
        u_value(flux.value, *ends_k(environment_c.value + ZERO_CELSIUS_K, other.value))
    except DomainError:
        u_estimate = None
    near = inputs.values["air_c"].value
    return HeatFlow(
        flux=flux,
        coefficient=coefficient,
        environment_c=environment_c,
        difference_k=near - other.value if inside else other.value - near,
        u_value=u_estimate,
    )


def area_of(area_m2: float, inputs: SceneInputs) -> Estimate:
    """Area of a region with the uncertainty of its distance and view angle, m2.

    Parameters
    ----------
    area_m2
        At the best estimates of distance and view angle.
    inputs
        Of its zone, with a distance above 0.

    """
    distance = inputs.values["distance_m"]
    parts = [of_variable(Variable(distance.name, distance.value, distance.u, lower=0.0))]
    angle = inputs.values.get("view_angle_deg")
    tilt = 0.0 if angle is None else angle.value
    if angle is not None:
        parts.append(of_variable(Variable(angle.name, angle.value, angle.u)))

    def area(reach_m: Real, angle_deg: Real = tilt) -> Real:
        tilted = np.cos(np.radians(np.clip(angle_deg, -89.0, 89.0)))
        result: Real = area_m2 * (reach_m / distance.value) ** 2
        result = result * math.cos(math.radians(tilt)) / tilted
        return result

    return combined(area, *parts)


def validity(job: ImageJob, inputs: SceneInputs, flow: HeatFlow) -> tuple[str, ...]:
    """Return the cautions of a heat flow: difference, wind, steadiness, side, one moment."""
    found = []
    if flow.difference_k < 0.0:
        found.append(cautions.indoors_colder())
    if abs(flow.difference_k) < GOOD_DIFFERENCE_K:
        found.append(cautions.small_difference(flow.difference_k, GOOD_DIFFERENCE_K))
    if not inputs.inside:
        found.append(cautions.seen_from_outside())
        wind = inputs.value("wind_m_s")
        if wind is not None and wind > MOST_WIND_M_S:
            found.append(cautions.windy(wind, MOST_WIND_M_S))
    hours = job.conditions.steady_hours
    if hours is None or hours < STEADY_HOURS:
        found.append(cautions.not_steady(hours, STEADY_HOURS))
    return (*found, cautions.one_moment())


def no_u_value() -> str:
    """Say why there is no U-value."""
    return f"No U-value is given below a difference of {LEAST_DIFFERENCE_K:g} K."


def height_of(inputs: SceneInputs) -> Input:
    """Return the height for natural convection, or its default."""
    default = default_for("height_m")
    return inputs.values.get("height_m") or Input(
        "height_m",
        default_value("height_m"),
        default.u or 0.0,
        "assumed",
        "default",
        "assumed",
        default.reason,
    )
