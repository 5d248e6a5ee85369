"""What the survey says of the camera, so that every number can be computed again."""

from thermo_fix.records import Camera, Origin
from thermo_fix.report.catalogue import Words
from thermo_fix.report.formatting import Units, with_unit
from thermo_fix.report.view import SettingRow


def camera_rows(camera: Camera, words: Words, units: Units) -> tuple[SettingRow, ...]:
    """Properties of the camera and the settings that it had applied, with their origin."""
    blank = words("common.not_told")

    def row(key: str, value: str, origin: Origin | None) -> SettingRow:
        shown = words.of("origin", origin) if origin and value else words("common.none")
        return SettingRow(words.of("input", f"camera.{key}"), value or blank, shown)

    def kelvin(value_k: float) -> str:
        return units.input_and_u(value_k, None, "K")[0]

    def celsius(value_c: float) -> str:
        return units.input_and_u(value_c, None, "degC")[0]

    band = ""
    if camera.response_file is not None:
        band = camera.response_file.name
    elif camera.band_um is not None:
        low, high = (units.shortest(end) for end in camera.band_um)
        band = with_unit(f"{low}–{high}", "µm")
    ifov = "" if camera.ifov_mrad is None else with_unit(units.shortest(camera.ifov_mrad), "mrad")
    recorded = camera.recorded
    return (
        row("band_um", band, "given"),
        row("ifov_mrad", ifov, "given"),
        row("noise_k", kelvin(camera.noise_k), camera.noise_origin),
        row("accuracy_k", kelvin(camera.accuracy_k), camera.accuracy_origin),
        row(
            "accuracy_fraction",
            with_unit(units.shortest(100.0 * camera.accuracy_fraction), "%"),
            camera.accuracy_origin,
        ),
        row("nonuniformity_k", kelvin(camera.nonuniformity_k), camera.nonuniformity_origin),
        row("recorded.emissivity", units.shortest(recorded.emissivity), recorded.origin),
        row("recorded.reflected_c", celsius(recorded.reflected_c), recorded.origin),
        row("recorded.air_c", celsius(recorded.air_c), recorded.origin),
        row("recorded.transmittance", units.shortest(recorded.transmittance), recorded.origin),
    )
