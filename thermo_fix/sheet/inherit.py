"""From what each table states to the inputs in force: ``[scene]``, then image, then zone.

An input keeps the scope in which it was stated, and key and scope together are its identity: two
zones that inherit one value share one variable, and its error is common to both.
"""

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace
from pathlib import Path

from thermo_fix.defaults import Default, default_for
from thermo_fix.radiometry.surroundings import REFLECTED_U_K
from thermo_fix.records import Input, Limit, SceneInputs, Side, SkyAndGround
from thermo_fix.sheet.lines import KeyPath
from thermo_fix.sheet.ranges import assumed_spread
from thermo_fix.sheet.schema import Emissivity, Quantity, Reflected, SceneKeys, Window

NOT_YET = math.nan
"""Value of an input that stands in a file, or is measured or computed once the image is read."""

_PLAIN_KEYS = (
    "air_c",
    "humidity",
    "distance_m",
    "view_angle_deg",
    "indoor_c",
    "outdoor_c",
    "wind_m_s",
    "load_exponent",
    "height_m",
    "transmittance",
)
_DEFAULTED = ("emissivity", "air_c", "humidity", "distance_m", "view_angle_deg")


@dataclass(frozen=True, slots=True)
class Stated:
    """What one table states, or what is in force after inheritance; no defaults yet."""

    values: Mapping[str, Input] = field(default_factory=dict)
    emissivity_file: Path | None = None
    surface: str | None = None
    reflected_file: Path | None = None
    reflected_zone: str | None = None
    reflected_stated_at: KeyPath = ()
    sky: SkyAndGround | None = None
    outdoors: bool | None = None
    limit: Limit | None = None
    target_load_a: float | None = None
    design_air_c: float | None = None
    side: Side | None = None


_FACTS = ("outdoors", "limit", "target_load_a", "design_air_c", "side")
"""Keys that are no measured quantities and have no uncertainty."""

_U_ASSUMED = "Its standard uncertainty was not told and is assumed (common practice, no source)."

FileFinder = Callable[[str, KeyPath], Path]
"""From the name of a file and where it is named to its path; notes a mistake itself."""


def stated(table: SceneKeys, scope: str, path: KeyPath, find_file: FileFinder) -> Stated:
    """Turn the scene keys of one table into inputs of that scope."""
    values: dict[str, Input] = {}
    result = Stated(values, **{key: getattr(table, key) for key in _FACTS})
    if table.emissivity is not None:
        result = _emissivity(table.emissivity, scope, path, find_file, result)
    if table.reflected_c is not None:
        result = _reflected(table.reflected_c, scope, path, find_file, result)
    values = dict(result.values)
    for key in _PLAIN_KEYS:
        quantity: Quantity | None = getattr(table, key)
        if quantity is not None:
            values[key] = _given(key, quantity.value, quantity.u, scope)
    if table.window is not None:
        values.update(_window(table.window, scope))
    return replace(result, values=values)


def merged(outer: Stated, inner: Stated) -> Stated:
    """Let an inner table win over the one around it, key by key; a window wins as a whole."""
    values = dict(outer.values)
    if "window.transmittance" in inner.values:
        values = {key: one for key, one in values.items() if not key.startswith("window.")}
    values.update(inner.values)
    emissivity = inner if "emissivity" in inner.values else outer
    reflected = inner if "reflected_c" in inner.values else outer
    facts = {key: getattr(outer if getattr(inner, key) is None else inner, key) for key in _FACTS}
    return Stated(
        values,
        **facts,
        emissivity_file=emissivity.emissivity_file,
        surface=emissivity.surface,
        reflected_file=reflected.reflected_file,
        reflected_zone=reflected.reflected_zone,
        reflected_stated_at=reflected.reflected_stated_at,
        sky=reflected.sky,
    )


def completed(in_force: Stated) -> SceneInputs:
    """Add the defaults of what nobody stated."""
    values = dict(in_force.values)
    for key in _DEFAULTED:
        if key not in values:
            values[key] = _default(key)
    air = values["air_c"]
    if "reflected_c" not in values:
        values["reflected_c"] = (
            _default("reflected_c")
            if air.origin == "assumed"
            else _from_air("reflected_c", air, default_for("reflected_c.from_air"))
        )
    if "window.transmittance" in values:
        if "window.temperature_c" not in values:
            values["window.temperature_c"] = _from_air(
                "window.temperature_c", air, default_for("window.temperature_c")
            )
        for key in ("window.reflectance", "window.reflected_c"):
            if key not in values:
                values[key] = _default(key)
        rest = 1.0 - values["window.transmittance"].value
        reflectance = values["window.reflectance"]
        if reflectance.origin == "assumed" and reflectance.value > rest:
            values["window.reflectance"] = replace(
                reflectance,
                value=rest,
                scope=f"default, from transmittance of {values['window.transmittance'].scope}",
                note="All that the window's transmittance leaves.",
            )
    return SceneInputs(
        values=values,
        emissivity_file=in_force.emissivity_file,
        reflected_file=in_force.reflected_file,
        reflected_zone=in_force.reflected_zone,
        sky=in_force.sky,
        surface=in_force.surface,
        **{key: getattr(in_force, key) for key in _FACTS},
    )


def _given(key: str, value: float, u: float | None, scope: str) -> Input:
    if u is not None:
        return Input(key, value, u, "given", scope, "given")
    assumed = assumed_spread(key, value, default_for(key).u_for(value))
    return Input(key, value, assumed, "given", scope, "assumed", _U_ASSUMED)


def _default(key: str) -> Input:
    default = default_for(key)
    if default.value is None or default.u is None:
        raise LookupError(f"no default value for {key}")
    return Input(key, default.value, default.u, "assumed", "default", "assumed", default.reason)


def _from_air(key: str, air: Input, default: Default) -> Input:
    if default.u is None:
        raise LookupError(f"no default uncertainty for {default.key}")
    scope = "default" if air.origin == "assumed" else f"default, from air_c of {air.scope}"
    return Input(key, air.value, default.u, "assumed", scope, "assumed", default.reason)


def _emissivity(
    said: Emissivity,
    scope: str,
    path: KeyPath,
    find_file: FileFinder,
    result: Stated,
) -> Stated:
    key = "emissivity"
    if said.value is not None:
        return replace(result, values={key: _given(key, said.value, said.u, scope)})
    if said.file is not None:
        default = default_for("emissivity.file")
        u = default.u_for(0.0) if said.u is None else said.u
        entry = Input(
            key,
            NOT_YET,
            u,
            "given",
            scope,
            "assumed" if said.u is None else "given",
            default.reason if said.u is None else "",
        )
        file = find_file(said.file, (*path, key, "file"))
        return replace(result, values={key: entry}, emissivity_file=file)
    surface = said.surface
    if surface is None:
        return result
    scope = f"surface {surface.name}"
    if said.u is not None and said.u != surface.u:
        # One variable has one uncertainty; the same surface judged differently is another one.
        scope += f", u {said.u:g}"
    entry = Input(
        key,
        surface.emissivity,
        surface.u if said.u is None else said.u,
        "surface table",
        scope,
        "surface table" if said.u is None else "given",
        surface.source,
    )
    return replace(result, values={key: entry}, surface=surface.name)


def _reflected(
    said: Reflected, scope: str, path: KeyPath, find_file: FileFinder, result: Stated
) -> Stated:
    key = "reflected_c"
    result = replace(result, reflected_stated_at=(*path, key))
    values = dict(result.values)
    if said.value is not None:
        values[key] = _given(key, said.value, said.u, scope)
        return replace(result, values=values)
    if said.file is not None:
        default = default_for("reflected_c.file")
        values[key] = Input(
            key,
            NOT_YET,
            default.u_for(0.0) if said.u is None else said.u,
            "given",
            scope,
            "assumed" if said.u is None else "given",
            default.reason if said.u is None else "",
        )
        file = find_file(said.file, (*path, key, "file"))
        return replace(result, values=values, reflected_file=file)
    if said.zone is not None:
        values[key] = Input(key, NOT_YET, NOT_YET, "measured", scope, "measured")
        return replace(result, values=values, reflected_zone=said.zone)
    sky = said.sky
    if sky is None:
        return result
    u = REFLECTED_U_K if sky.u is None else sky.u
    values[key] = Input(key, NOT_YET, u, "computed", scope, "assumed" if sky.u is None else "given")
    return replace(
        result,
        values=values,
        sky=SkyAndGround(cloud=sky.cloud, tilt_deg=sky.tilt_deg, ground_c=sky.ground_c, u_k=u),
    )


def _window(said: Window, scope: str) -> dict[str, Input]:
    values = {}
    for name in Window.model_fields:
        quantity: Quantity | None = getattr(said, name)
        if quantity is not None:
            key = f"window.{name}"
            values[key] = _given(key, quantity.value, quantity.u, scope)
    return values
