"""How the report speaks of input variables, and what it advises to know them better."""

import math

from thermo_fix.records import CorrectedFrame, SceneInputs, VariableWords
from thermo_fix.uncertainty.equation import (
    AIR_FORMULA,
    CALIBRATION,
    MODEL,
    NOISE,
    NONUNIFORMITY,
    MeasurementEquation,
)

UNITS = {
    "emissivity": "1",
    "reflected_c": "degC",
    "air_c": "degC",
    "humidity": "1",
    "distance_m": "m",
    "view_angle_deg": "degree",
    "transmittance": "1",
    "window.transmittance": "1",
    "window.reflectance": "1",
    "window.temperature_c": "degC",
    "window.reflected_c": "degC",
    "indoor_c": "degC",
    "outdoor_c": "degC",
    "wind_m_s": "m/s",
    "height_m": "m",
    "load_exponent": "1",
    "target_load_a": "A",
    "design_air_c": "degC",
}
"""Unit of each input of the sheet."""
_WORDS = {
    "emissivity": ("emissivity", "measure the emissivity of {0} with a tape or paint patch"),
    "reflected_c": (
        "reflected temperature",
        "measure the reflected temperature of {0} with crumpled foil",
    ),
    "air_c": ("air temperature", "measure the air temperature at {0}"),
    "humidity": ("humidity of the air", "measure the humidity of the air at {0}"),
    "distance_m": ("distance", "measure the distance to {0}"),
    "view_angle_deg": ("view angle", "view {0} squarely, or measure the view angle"),
    "transmittance": ("air transmittance", "measure the transmittance of the air path to {0}"),
    "window.transmittance": (
        "window transmittance",
        "measure the transmittance of the infrared window with and without it in the path",
    ),
    "window.reflectance": (
        "window reflectance",
        "shade the infrared window from what it mirrors, or measure its reflectance",
    ),
    "window.temperature_c": (
        "window temperature",
        "measure the temperature of the infrared window",
    ),
    "window.reflected_c": (
        "temperature mirrored by the window",
        "measure the temperature of what the infrared window mirrors",
    ),
    "indoor_c": ("indoor air temperature", "measure the indoor air temperature"),
    "outdoor_c": ("outdoor air temperature", "measure the outdoor air temperature"),
    "wind_m_s": ("wind", "measure the wind at {0}"),
    "load_exponent": (
        "exponent of the load",
        "measure {0} again under another load",
    ),
}


def input_words(key: str, inputs: SceneInputs, where: str) -> VariableWords:
    """Return the words for an input of a zone.

    Parameters
    ----------
    key
        Sheet key.
    inputs
        The zone's.
    where
        ``lug B``, or the asset or file name for the rest of an image.

    """
    given = inputs.values[key]
    noun, remedy = _WORDS[key]
    target = inputs.surface if key == "emissivity" and inputs.surface else where
    words = f"{noun} of {target}" if key in ("emissivity", "reflected_c") else noun
    value = None if math.isnan(given.value) else given.value
    return VariableWords(words, remedy.format(where), value, given.u, UNITS[key])


def camera_words(equation: MeasurementEquation, reading_k: float) -> dict[str, VariableWords]:
    """Return the words for what comes from the camera, the air formula and the model."""
    half_width = float(equation.calibration_half_width_k(reading_k))
    return {
        CALIBRATION: VariableWords(
            "camera calibration",
            "check the camera against a reference of known temperature",
            None,
            half_width / 3.0**0.5,
            "K",
        ),
        AIR_FORMULA: VariableWords(
            "air transmittance formula",
            "go closer, or measure the transmittance of the air path",
            equation.transmittance,
            equation.air_formula_u,
            "1",
        ),
        MODEL: VariableWords(
            "radiation model",
            'use the band model of the camera (model = "band")',
            None,
            0.0,
            "K",
        ),
    }


def place_words(name: str, equation: MeasurementEquation, gain: float) -> dict[str, VariableWords]:
    """Return the words for the errors that a place shares with no other."""
    return {
        f"{NOISE} of {name}": VariableWords(
            "pixel noise",
            "average several images",
            None,
            equation.noise_k * gain,
            "K",
        ),
        f"{NONUNIFORMITY} of {name}": VariableWords(
            "non-uniformity of the camera",
            "take the image again with the target at another place of the frame",
            None,
            equation.nonuniformity_k,
            "K",
        ),
    }


def where_words(corrected: CorrectedFrame, label: int) -> str:
    """Return the name of a zone, or that of the asset or file for the rest of the image."""
    job = corrected.job
    if label > 0:
        return job.zones[label - 1].name
    return job.asset or job.file
