"""Draws of the air, the distance and the reflected temperature that a survey might meet."""

from dataclasses import dataclass

import numpy as np

from tests.simulator.air import air_transmittance, water_vapour_g_m3


@dataclass(frozen=True)
class Surroundings:
    """The true inputs of one image apart from its emissivity."""

    reflected_c: float
    air_c: float
    humidity: float
    distance_m: float
    transmittance: float


def _with_air(reflected_c: float, air_c: float, humidity: float, distance_m: float) -> Surroundings:
    vapour = water_vapour_g_m3(air_c, humidity)
    return Surroundings(
        reflected_c, air_c, humidity, distance_m, air_transmittance(vapour, distance_m)
    )


def outdoors(rng: np.random.Generator) -> Surroundings:
    """A heating-season morning: air -14 to 8 degC, reflected 3 to 14 K colder, 6 to 40 m."""
    air_c = float(rng.uniform(-14.0, 8.0))
    reflected_c = air_c - float(rng.uniform(3.0, 14.0))
    return _with_air(
        reflected_c, air_c, float(rng.uniform(0.5, 0.9)), float(rng.uniform(6.0, 40.0))
    )


def indoors(rng: np.random.Generator) -> Surroundings:
    """A heated room: air 15 to 23 degC, reflected within 1 K of it, 1.5 to 5 m."""
    air_c = float(rng.uniform(15.0, 23.0))
    reflected_c = air_c + float(rng.uniform(-1.0, 0.7))
    return _with_air(
        reflected_c, air_c, float(rng.uniform(0.3, 0.65)), float(rng.uniform(1.5, 5.0))
    )


def switch_room(rng: np.random.Generator) -> Surroundings:
    """In front of a panel: air 12 to 32 degC, reflected up to 3 K warmer, 0.5 to 1.6 m."""
    air_c = float(rng.uniform(12.0, 32.0))
    reflected_c = air_c + float(rng.uniform(0.0, 3.0))
    return _with_air(
        reflected_c, air_c, float(rng.uniform(0.25, 0.6)), float(rng.uniform(0.5, 1.6))
    )
