"""The measurement equation: surface temperature from a reading and named inputs.

One ``MeasurementEquation`` stands for one zone of one image. It gives the surface temperature,
the signed contribution of each named variable to its uncertainty (analytic sensitivities), and
draws of it (Monte Carlo). Everything that a pixel or a finding says about its uncertainty comes
from here.
"""

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.radiometry.air import (
    air_transmittance,
    air_transmittance_slopes,
    air_transmittance_u,
)
from thermo_fix.radiometry.blackbody import RadiationModel, Real
from thermo_fix.radiometry.path import (
    OpticalPath,
    Window,
    sensitivities,
    surface_temperature,
)
from thermo_fix.radiometry.surface import DIELECTRIC_FROM, directional_factor
from thermo_fix.uncertainty.variables import DRAWS, SEED, Variable, uniform_draws

CALIBRATION = "camera calibration"
AIR_FORMULA = "air transmittance formula"
MODEL = "radiation model"
NOISE = "noise"
NONUNIFORMITY = "non-uniformity"
RECTANGULAR = frozenset({CALIBRATION, MODEL})
"""Variables of the camera and the model whose distribution is rectangular."""

_WINDOW_KEYS = (
    "window.transmittance",
    "window.reflectance",
    "window.temperature_c",
    "window.reflected_c",
)
_SMALLEST_EMISSIVITY = 1e-3
_ANGLE_STEP_DEG = 0.05
_ANGLES = np.linspace(0.0, 89.0, 357)
_LEAST_EMISSIVITY_STEP = 1e-3


@dataclass(frozen=True)
class MeasurementEquation:
    """Surface temperature of one zone as a function of the reading and its named inputs."""

    model: RadiationModel
    recorded: OpticalPath
    """What the camera assumed, free of uncertainty: it is what was written into the file."""
    variables: Mapping[str, Variable]
    """By sheet key: ``emissivity``, ``reflected_c``, ``air_c``, ``humidity``, ``distance_m``,
    ``view_angle_deg``, ``transmittance`` (instead of humidity and distance), ``window.*``."""
    accuracy_k: float = 0.0
    accuracy_fraction: float = 0.0
    """The stated accuracy is a rectangular half-width: the larger of ``accuracy_k`` and this
    fraction of the reading in degC."""
    noise_k: float = 0.0
    nonuniformity_k: float = 0.0
    alternative: RadiationModel | None = None
    """The model to whose result the radiation-model difference is taken."""
    emissivity_is_plane: bool = False
    """The variable ``emissivity`` is then an error common to a per-pixel plane."""
    reflected_is_plane: bool = False
    _cache: dict[str, object] = field(default_factory=dict, repr=False, compare=False)

    # ------------------------------------------------------------ the path

    def path(
        self,
        values: Mapping[str, Real] | None = None,
        emissivity: Real | None = None,
        reflected_c: Real | None = None,
    ) -> OpticalPath:
        """Return the optical path for given values of the variables.

        Parameters
        ----------
        values
            By sheet key; what is absent takes its best estimate. ``air_formula`` is the error of
            the transmittance formula.
        emissivity, reflected_c
            The planes, or parts of them, where the sheet gives planes; 1 and degC.

        """

        def at(key: str) -> Real:
            found = None if values is None else values.get(key)
            return self.variables[key].value if found is None else found

        eps = at("emissivity")
        if self.emissivity_is_plane:
            eps = np.clip(_needed(emissivity, "emissivity") + eps, _SMALLEST_EMISSIVITY, 1.0)
        eps = eps * self._angle_factor(values)
        reflected = at("reflected_c")
        if self.reflected_is_plane:
            reflected = _needed(reflected_c, "reflected_c") + reflected
        air_c = at("air_c")
        window = None
        if _WINDOW_KEYS[0] in self.variables:
            tau_w, rho_w, own_c, mirrored_c = (at(key) for key in _WINDOW_KEYS)
            window = Window(
                tau_w,
                np.minimum(rho_w, 1.0 - tau_w),
                own_c + ZERO_CELSIUS_K,
                mirrored_c + ZERO_CELSIUS_K,
            )
        return OpticalPath(
            emissivity=eps,
            reflected_k=reflected + ZERO_CELSIUS_K,
            air_k=air_c + ZERO_CELSIUS_K,
            transmittance=self._transmittance(values),
            window=window,
        )

    @property
    def uses_air_formula(self) -> bool:
        """Whether the air transmittance comes from the formula."""
        return "transmittance" not in self.variables

    def _transmittance(self, values: Mapping[str, Real] | None) -> Real:
        if not self.uses_air_formula:
            given = None if values is None else values.get("transmittance")
            return self.variables["transmittance"].value if given is None else given
        air, humidity, distance = (
            self.variables[key].value for key in ("air_c", "humidity", "distance_m")
        )
        if "tau" not in self._cache:
            self._cache["tau"] = float(air_transmittance(air, humidity, distance))
        best = float(self._cache["tau"])  # type: ignore[arg-type]
        if values is None:
            return best
        # The formula is linear enough over the spread of its inputs, and a draw of the humidity
        # must not leave the range in which the formula can be evaluated.
        slopes = self._air_slopes()
        tau: Real = best + values.get("air_formula", 0.0)
        for key, slope in zip(("air_c", "humidity", "distance_m"), slopes, strict=True):
            if key in values:
                tau = tau + slope * (values[key] - self.variables[key].value)
        return np.clip(tau, 1e-3, 1.0)

    def _air_slopes(self) -> tuple[float, float, float]:
        if "slopes" not in self._cache:
            self._cache["slopes"] = air_transmittance_slopes(
                *(self.variables[key].value for key in ("air_c", "humidity", "distance_m"))
            )
        return self._cache["slopes"]  # type: ignore[return-value]

    @property
    def air_formula_u(self) -> float:
        """Standard uncertainty of the transmittance formula for this path; 0 if not used."""
        if not self.uses_air_formula:
            return 0.0
        return air_transmittance_u(
            *(self.variables[key].value for key in ("air_c", "humidity", "distance_m"))
        )

    @property
    def transmittance(self) -> float:
        """Best estimate of the air transmittance."""
        return float(self._transmittance(None))

    def _angle_factor(self, values: Mapping[str, Real] | None) -> Real:
        angle = self.variables.get("view_angle_deg")
        if angle is None or self.emissivity_is_plane:
            return 1.0
        normal = self.variables["emissivity"].value
        if values is None or "view_angle_deg" not in values:
            return directional_factor(normal, angle.value)
        # Tabulated over the spread of the angle: the draws are many, the curve is smooth.
        # Draws below zero are views from the other side.
        drawn = np.abs(values["view_angle_deg"])
        factor = np.interp(drawn, _ANGLES, _factor_curve(normal))
        if "emissivity" in values:
            # The index, and so the curve, follows the normal emissivity; linear over its spread.
            u = self.variables["emissivity"].u
            slope = np.interp(drawn, _ANGLES, _factor_slope_curve(normal, u))
            factor = np.clip(factor + slope * (values["emissivity"] - normal), 1e-3, 1.0)
        return np.asarray(factor)

    def _emissivity_gain(self) -> float:
        """Return d(eps at the view angle)/d(normal eps)."""
        angle = self.variables.get("view_angle_deg")
        if angle is None or self.emissivity_is_plane:
            return 1.0
        given = self.variables["emissivity"]
        slope = _factor_slope(given.value, given.u, angle.value)
        return directional_factor(given.value, angle.value) + given.value * slope

    def _angle_slope(self) -> float:
        """Return d(eps)/d(view angle), 1/degree."""
        angle = self.variables.get("view_angle_deg")
        if angle is None or self.emissivity_is_plane:
            return 0.0
        normal = self.variables["emissivity"].value
        above = directional_factor(normal, abs(angle.value + _ANGLE_STEP_DEG))
        below = directional_factor(normal, abs(angle.value - _ANGLE_STEP_DEG))
        return normal * (above - below) / (2.0 * _ANGLE_STEP_DEG)

    # ------------------------------------------------------------ the temperature

    def temperature_k(
        self,
        reading_k: Real,
        *,
        emissivity: Real | None = None,
        reflected_c: Real | None = None,
        model: RadiationModel | None = None,
    ) -> Real:
        """Surface temperature, K, at the best estimates of all inputs.

        Parameters
        ----------
        reading_k
            K, any shape.
        emissivity, reflected_c
            Planes of that shape, where the sheet gives planes.
        model
            Another radiation model than that of the equation.

        Returns
        -------
        float or ndarray
            K, NaN where unsolved.

        """
        path = self.path(None, emissivity, reflected_c)
        return surface_temperature(reading_k, path, self.recorded, model or self.model)

    def calibration_half_width_k(self, reading_k: Real) -> Real:
        """Half-width of the stated accuracy at a reading, K."""
        if self.accuracy_fraction == 0.0:
            return self.accuracy_k
        return np.maximum(
            self.accuracy_k, self.accuracy_fraction * np.abs(reading_k - ZERO_CELSIUS_K)
        )

    def contributions_k(
        self,
        reading_k: Real,
        *,
        emissivity: Real | None = None,
        reflected_c: Real | None = None,
    ) -> dict[str, Real]:
        """Signed contribution of each input to the surface temperature, K.

        Parameters
        ----------
        reading_k, emissivity, reflected_c
            As for :meth:`temperature_k`.

        Returns
        -------
        dict
            By sheet key, or by the names of this module for the camera, the air formula and the
            radiation model: sensitivity times standard uncertainty, K, of the shape of the
            reading. ``NOISE`` and ``NONUNIFORMITY`` are those of one pixel.

        """
        path = self.path(None, emissivity, reflected_c)
        surface_k = surface_temperature(reading_k, path, self.recorded, self.model)
        slopes = sensitivities(reading_k, surface_k, path, self.recorded, self.model)
        u = {key: variable.u for key, variable in self.variables.items()}
        half_width = self.calibration_half_width_k(reading_k)
        result: dict[str, Real] = {
            CALIBRATION: slopes["reading"] * half_width / math.sqrt(3.0),
            NOISE: slopes["reading"] * self.noise_k,
            NONUNIFORMITY: slopes["reading"] * self.nonuniformity_k,
            "emissivity": slopes["emissivity"] * self._emissivity_gain() * u["emissivity"],
            "reflected_c": slopes["reflected"] * u["reflected_c"],
        }
        if "view_angle_deg" in u:
            result["view_angle_deg"] = (
                slopes["emissivity"] * self._angle_slope() * u["view_angle_deg"]
            )
        by_air = slopes["air"]
        if self.uses_air_formula:
            tau_by_air, tau_by_humidity, tau_by_distance = self._air_slopes()
            by_tau = slopes["transmittance"]
            by_air = by_air + by_tau * tau_by_air
            result["humidity"] = by_tau * tau_by_humidity * u["humidity"]
            result["distance_m"] = by_tau * tau_by_distance * u["distance_m"]
            result[AIR_FORMULA] = by_tau * self.air_formula_u
        else:
            result["transmittance"] = slopes["transmittance"] * u["transmittance"]
        result["air_c"] = by_air * u["air_c"]
        if path.window is not None:
            for key, name in zip(
                _WINDOW_KEYS,
                (
                    "window.transmittance",
                    "window.reflectance",
                    "window.temperature",
                    "window.reflected",
                ),
                strict=True,
            ):
                result[key] = slopes[name] * u[key]
        if self.alternative is not None:
            other_k = surface_temperature(reading_k, path, self.recorded, self.alternative)
            result[MODEL] = (other_k - surface_k) / math.sqrt(3.0)
        return result

    def u_k(
        self,
        reading_k: Real,
        *,
        emissivity: Real | None = None,
        reflected_c: Real | None = None,
    ) -> Real:
        """Standard uncertainty of one pixel's surface temperature, K (k = 1), first order."""
        parts = self.contributions_k(reading_k, emissivity=emissivity, reflected_c=reflected_c)
        return np.sqrt(sum(np.square(part) for part in parts.values()))

    # ------------------------------------------------------------ draws

    def draw_k(
        self,
        reading_k: float,
        *,
        independent: Mapping[str, float],
        emissivity: float | None = None,
        reflected_c: float | None = None,
        draws: int = DRAWS,
        seed: int = SEED,
    ) -> NDArray[np.float64]:
        """Draw the surface temperature of one region, K.

        Parameters
        ----------
        reading_k
            Representative reading of the region, K.
        independent
            Standard uncertainties, K, of the reading that this region shares with no other, by a
            name that is unique to the region (noise of its mean, non-uniformity).
        emissivity, reflected_c
            The region's value of the planes, where the sheet gives planes.
        draws, seed
            As for :meth:`Variable.draw`.

        Returns
        -------
        ndarray
            (draws,), K; NaN where a draw has no solution.

        """
        unit = 2.0 * uniform_draws(CALIBRATION, draws, seed) - 1.0
        reading = reading_k + self.calibration_half_width_k(reading_k) * unit
        for name, u in independent.items():
            reading = reading + Variable(name, 0.0, u).draw(draws, seed)
        path = self._drawn_path(emissivity, reflected_c, draws, seed)
        result = np.asarray(surface_temperature(reading, path, self.recorded, self.model))
        if self.alternative is not None:
            nominal = self.path(None, emissivity, reflected_c)
            gap = np.asarray(
                surface_temperature(reading_k, nominal, self.recorded, self.alternative)
            ) - np.asarray(surface_temperature(reading_k, nominal, self.recorded, self.model))
            result = result + gap * (2.0 * uniform_draws(MODEL, draws, seed) - 1.0)
        return result

    def _drawn_path(
        self, emissivity: float | None, reflected_c: float | None, draws: int, seed: int
    ) -> OpticalPath:
        # Every region of a zone needs the same draws of the path: kept, because drawing costs
        # more than the temperatures do.
        key = f"path {emissivity} {reflected_c} {draws} {seed}"
        if key not in self._cache:
            values: dict[str, Real] = {
                name: variable.draw(draws, seed) for name, variable in self.variables.items()
            }
            if self.uses_air_formula:
                formula = Variable(AIR_FORMULA, 0.0, self.air_formula_u)
                values["air_formula"] = formula.draw(draws, seed)
            self._cache[key] = self.path(values, emissivity, reflected_c)
        return self._cache[key]  # type: ignore[return-value]


@lru_cache(maxsize=64)
def _factor_curve(normal: float) -> NDArray[np.float64]:
    return np.array([directional_factor(normal, angle) for angle in _ANGLES])


@lru_cache(maxsize=64)
def _factor_slope_curve(normal: float, u: float) -> NDArray[np.float64]:
    return np.array([_factor_slope(normal, u, angle) for angle in _ANGLES])


def _factor_slope(normal: float, u: float, angle_deg: float) -> float:
    """Return the slope of the directional factor by the normal emissivity, over +/- u.

    A secant over the standard uncertainty (JCGM 100:2008, 5.1.3 note 2), because near an
    emissivity of 1 the factor falls steeply and the tangent says nothing.
    """
    if normal < DIELECTRIC_FROM:
        return 0.0
    # Both ends must belong to the same kind of surface, and to emissivities that exist.
    step = max(u, _LEAST_EMISSIVITY_STEP)
    low, high = max(normal - step, DIELECTRIC_FROM), min(normal + step, 1.0)
    rise = directional_factor(high, angle_deg) - directional_factor(low, angle_deg)
    return rise / (high - low)


def _needed(plane: Real | None, what: str) -> Real:
    if plane is None:
        raise TypeError(f"this equation takes its {what} from a plane; none was given")
    return plane
