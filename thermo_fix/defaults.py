"""What is taken when the survey sheet does not say: values, uncertainties and why.

The numbers stand in ``data/defaults.toml``; here they get types.
"""

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from importlib import resources
from types import MappingProxyType


@dataclass(frozen=True, slots=True)
class Default:
    """Default of one sheet key; None where no default is defensible."""

    key: str
    """Sheet key, with a dot for a nested one."""
    unit: str
    reason: str
    value: float | None = None
    u: float | None = None
    """Standard uncertainty (k = 1) of the default value, same unit."""
    u_given: float | None = None
    """Standard uncertainty taken when the sheet states a value without one."""
    u_given_relative: float | None = None
    """The same, as a fraction of the stated value."""

    def u_for(self, value: float) -> float:
        """Standard uncertainty of a value that the sheet states without one.

        Raises ``LookupError`` for a key that has none (settings of the camera).
        """
        if self.u_given is not None:
            return self.u_given
        if self.u_given_relative is not None:
            return self.u_given_relative * abs(value)
        raise LookupError(f"no default uncertainty for {self.key}")


@cache
def all_defaults() -> Mapping[str, Default]:
    """Every default by its key, in the order of the data file."""
    text = resources.files(__package__).joinpath("data", "defaults.toml").read_text("utf-8")
    entries = [Default(**entry) for entry in tomllib.loads(text)["default"]]
    return MappingProxyType({entry.key: entry for entry in entries})


def default_for(key: str) -> Default:
    """Return the default of a sheet key; ``KeyError`` for a key that has none."""
    return all_defaults()[key]


def default_value(key: str) -> float:
    """Return the default value of a key that must have one (``LookupError`` otherwise)."""
    value = default_for(key).value
    if value is None:
        raise LookupError(f"no default value for {key}")
    return value
