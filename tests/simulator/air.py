"""The air between surface and camera, and the sky above it."""

import csv
from functools import lru_cache
from pathlib import Path
from typing import Final

import numpy as np
from scipy import constants

LOWTRAN_TABLE: Final = Path(__file__).parents[1] / "data" / "lowtran7_8_14um.csv"

VAPOUR_GAS_CONSTANT: Final = constants.R / 18.015268e-3
"""J kg-1 K-1: molar gas constant over the molar mass of water (18.015268 g/mol, IAPWS-95)."""


def saturation_pressure_pa(air_c: float) -> float:
    """Saturation vapour pressure over water, Magnus form of WMO No. 8 (2014), annex 4.B."""
    return 611.2 * float(np.exp(17.62 * air_c / (243.12 + air_c)))


def dew_point_c(air_c: float, humidity: float) -> float:
    """Dew point over water, degC, by inverting the same Magnus form; humidity 0 to 1."""
    ratio = float(np.log(humidity * saturation_pressure_pa(air_c) / 611.2))
    return float(243.12 * ratio / (17.62 - ratio))


def water_vapour_g_m3(air_c: float, humidity: float) -> float:
    """Mass of water vapour in a cubic metre of air, g; humidity 0 to 1."""
    pressure = humidity * saturation_pressure_pa(air_c)
    return float(1e3 * pressure / (VAPOUR_GAS_CONSTANT * (air_c + constants.zero_Celsius)))


@lru_cache(maxsize=1)
def _lowtran() -> dict[float, tuple[list[float], list[float]]]:
    """Water vapour (g/m3) -> root distances and log transmittances, driest atmosphere first."""
    rows: dict[float, tuple[list[float], list[float]]] = {}
    with LOWTRAN_TABLE.open(encoding="utf-8", newline="") as handle:
        for row in csv.DictReader(handle):
            vapour = float(row["water_vapour_g_m3"])
            roots, logs = rows.setdefault(vapour, ([0.0], [0.0]))
            roots.append(float(np.sqrt(float(row["distance_m"]))))
            logs.append(float(np.log(float(row["transmittance_8_14um"]))))
    return dict(sorted(rows.items()))


def air_transmittance(vapour_g_m3: float, distance_m: float) -> float:
    """Transmittance of an air path in the 8-14 um band, from the LOWTRAN7 table.

    Log transmittance is taken as linear in the root of the distance (0 at the camera) and as linear
    in water vapour between the standard atmospheres. Valid for 0 to 1000 m and 1.2 to 19 g/m3;
    drier or wetter air is given the nearest atmosphere.
    """
    if not 0.0 <= distance_m <= 1000.0:
        raise ValueError(f"distance {distance_m} m is outside the table (0 to 1000 m)")
    table = _lowtran()
    root = float(np.sqrt(distance_m))
    logs = [float(np.interp(root, roots, values)) for roots, values in table.values()]
    return float(np.exp(np.interp(vapour_g_m3, list(table), logs)))


def sky_and_ground_c(air_c: float, humidity: float, tilt_deg: float, ground_c: float) -> float:
    """Reflected apparent temperature, degC, of a surface under a cloudless sky.

    Sky emissivity 0.711 + 0.56 (t_dp/100) + 0.73 (t_dp/100)^2 (Berdahl and Martin, Solar Energy 32
    (1984) 663); the view factor of the sky is (1 + cos tilt)/2, and fourth powers are averaged.
    """
    dew = dew_point_c(air_c, humidity) / 100.0
    sky_emissivity = 0.711 + 0.56 * dew + 0.73 * dew**2
    sky_fourth = sky_emissivity * (air_c + constants.zero_Celsius) ** 4
    ground_fourth = (ground_c + constants.zero_Celsius) ** 4
    sky_share = 0.5 * (1.0 + float(np.cos(np.deg2rad(tilt_deg))))
    mean_fourth = sky_share * sky_fourth + (1.0 - sky_share) * ground_fourth
    return float(mean_fourth**0.25 - constants.zero_Celsius)
