"""From what the sheet says of a zone to its measurement equation."""

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.radiometry.blackbody import RadiationModel, TotalModel, band_model
from thermo_fix.radiometry.path import OpticalPath
from thermo_fix.radiometry.surroundings import sky_and_ground_temperature_c
from thermo_fix.records import Camera, Input, ModelName, Recorded, SceneInputs
from thermo_fix.uncertainty.equation import MeasurementEquation
from thermo_fix.uncertainty.variables import Variable

ASSUMED_BAND_UM = (8.0, 14.0)
"""Band of a camera whose sheet names none: the long-wave window of uncooled cameras."""

_BOUNDS = {
    "emissivity": (1e-3, 1.0),
    "humidity": (0.0, 1.0),
    "transmittance": (1e-3, 1.0),
    "distance_m": (0.0, math.inf),
    "window.transmittance": (1e-3, 1.0),
    "window.reflectance": (0.0, 1.0),
}
_PATH_KEYS = ("emissivity", "reflected_c", "air_c", "view_angle_deg")
_AIR_KEYS = ("humidity", "distance_m")


class Models(NamedTuple):
    """The radiation model in force, and the one to which its difference is reported."""

    model: RadiationModel
    alternative: RadiationModel | None


def radiation_models(
    name: ModelName, camera: Camera, response: Sequence[tuple[float, float]] | None = None
) -> Models:
    """Return the radiation model that the sheet asks for.

    Parameters
    ----------
    name
        ``total`` or ``band``.
    camera
        For the band; 8 to 14 um is assumed where the sheet names none.
    response
        Points of the camera's response curve (um, relative), where the sheet names a file.

    """
    band = band_model(
        camera.band_um or ASSUMED_BAND_UM, None if response is None else tuple(response)
    )
    if name == "band":
        return Models(band, None)
    return Models(TotalModel(), band)


def recorded_path(recorded: Recorded) -> OpticalPath:
    """Return the optical path that the camera had assumed."""
    return OpticalPath(
        emissivity=recorded.emissivity,
        reflected_k=recorded.reflected_c + ZERO_CELSIUS_K,
        air_k=recorded.air_c + ZERO_CELSIUS_K,
        transmittance=recorded.transmittance,
    )


def fill_sky(inputs: SceneInputs) -> SceneInputs:
    """Compute the reflected temperature from sky and ground where the sheet asks for it."""
    if inputs.sky is None:
        return inputs
    sky = inputs.sky
    air, humidity = inputs.values["air_c"], inputs.values["humidity"]
    value = sky_and_ground_temperature_c(
        air.value, humidity.value, sky.cloud, sky.tilt_deg, sky.ground_c
    )
    note = (
        f"from a sky with cloud fraction {sky.cloud:g}, a surface tilted {sky.tilt_deg:g} degrees "
        f"and ground at {sky.ground_c:g} degC"
    )
    return with_input(
        inputs,
        Input(
            "reflected_c",
            value,
            sky.u_k,
            "computed",
            f"sky and ground, {air.scope}",
            "assumed",
            note,
        ),
    )


def with_input(inputs: SceneInputs, new: Input) -> SceneInputs:
    """Return the inputs with one of them replaced."""
    return replace(inputs, values={**inputs.values, new.key: new})


def equation_of(inputs: SceneInputs, camera: Camera, models: Models) -> MeasurementEquation:
    """Build the measurement equation of a zone.

    Parameters
    ----------
    inputs
        Complete: reflected temperature measured or computed where the sheet asked for that.
    camera
        Accuracy, noise and recorded settings.
    models
        From :func:`radiation_models`.

    """
    values = inputs.values
    keys = [*_PATH_KEYS, *(("transmittance",) if "transmittance" in values else _AIR_KEYS)]
    keys += [key for key in values if key.startswith("window.")]
    # The value of an input that stands in a file is NaN, which no variable may have.
    in_files = {
        *(() if inputs.emissivity_file is None else ("emissivity",)),
        *(() if inputs.reflected_file is None else ("reflected_c",)),
    }
    variables = {
        key: _variable(values[key]) for key in keys if key in values and key not in in_files
    }
    if inputs.emissivity_file is not None:
        variables["emissivity"] = Variable(values["emissivity"].name, 0.0, values["emissivity"].u)
    if inputs.reflected_file is not None:
        variables["reflected_c"] = Variable(
            values["reflected_c"].name, 0.0, values["reflected_c"].u
        )
    return MeasurementEquation(
        model=models.model,
        recorded=recorded_path(camera.recorded),
        variables=variables,
        accuracy_k=camera.accuracy_k,
        accuracy_fraction=camera.accuracy_fraction,
        noise_k=camera.noise_k,
        nonuniformity_k=camera.nonuniformity_k,
        alternative=models.alternative,
        emissivity_is_plane=inputs.emissivity_file is not None,
        reflected_is_plane=inputs.reflected_file is not None,
    )


def _variable(given: Input) -> Variable:
    lower, upper = _BOUNDS.get(given.key, (-math.inf, math.inf))
    return Variable(given.name, given.value, given.u, lower=lower, upper=upper)
