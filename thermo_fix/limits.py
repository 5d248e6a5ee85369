"""The table of limits: temperatures and rises that a part may not exceed, by name.

The data are in ``data/limits.toml``, whose head explains each key. A limit is a name in the
sheet (``limit = "conductor insulation 75"``), or a number in degC from a nameplate.
"""

import difflib
import tomllib
from collections.abc import Mapping
from functools import cache
from importlib import resources
from types import MappingProxyType

from thermo_fix.records import Limit

STATED = "limit stated in the sheet"
"""Name of a limit that the sheet gives as a number."""
RISE_AIR_C = 40.0
"""Air up to which a limit of rise holds, degC (IEC 60034-1: coolant of 40 degC)."""
_NEAR = 0.4


class UnknownLimit(LookupError):
    """No limit has the name asked for; the message names the nearest."""


@cache
def all_limits() -> Mapping[str, Limit]:
    """Every limit by its name, in the order of the data file."""
    text = resources.files("thermo_fix").joinpath("data", "limits.toml").read_text("utf-8")
    limits = [
        Limit(**{**entry, "aliases": tuple(entry.get("aliases", ()))})
        for entry in tomllib.loads(text)["limit"]
    ]
    return MappingProxyType({each.name: each for each in limits})


def find_limit(name: str) -> Limit:
    """Return the limit of that name or alias; case, spacing and commas do not matter.

    Raises
    ------
    UnknownLimit
        No limit has that name; the message names the nearest three.

    """
    found = _by_key().get(_key(name))
    if found is not None:
        return found
    near = difflib.get_close_matches(_key(name), _by_key(), 3, _NEAR)
    names = dict.fromkeys(f'"{_by_key()[key].name}"' for key in near)
    hint = f"the nearest: {', '.join(names)}" if names else "write the limit as a number in degC"
    raise UnknownLimit(f'unknown limit "{name}"; {hint}')


def stated_limit(temperature_c: float) -> Limit:
    """Return a limit that the sheet gives as a number, degC."""
    return Limit(
        name=STATED,
        of="part",
        source="the survey sheet",
        obtained="found",
        temperature_c=temperature_c,
    )


@cache
def _by_key() -> Mapping[str, Limit]:
    return {_key(name): each for each in all_limits().values() for name in each.names}


def _key(name: str) -> str:
    return " ".join(name.casefold().replace(",", " ").split())
