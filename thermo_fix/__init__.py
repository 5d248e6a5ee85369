"""thermo_fix: from a folder of radiometric infrared images to a report that stands up.

The data flow is the file tree: ``read`` -> ``correct`` -> ``find`` -> ``measure`` -> ``grade`` ->
``report``. ``radiometry`` and ``uncertainty`` are pure functions below all of them; ``survey``
joins the stages; ``cli`` is the command line.

Public names: :func:`correct` for numbers and arrays, :func:`run_survey` for a folder.
"""

import sys
from types import ModuleType
from typing import TYPE_CHECKING, Any

from thermo_fix.version import __version__

if TYPE_CHECKING:
    from thermo_fix.point import Corrected, correct
    from thermo_fix.survey import run_survey

__all__ = ["Corrected", "__version__", "correct", "run_survey"]

_HOMES = {
    "correct": "thermo_fix.point",
    "Corrected": "thermo_fix.point",
    "run_survey": "thermo_fix.survey",
}


class _Package(ModuleType):
    """The package, whose function ``correct`` the stage of that name does not hide.

    Python sets a folder of a package as its attribute when that is imported.
    """

    def __setattr__(self, name: str, value: object) -> None:
        if not (name in _HOMES and isinstance(value, ModuleType)):
            super().__setattr__(name, value)


sys.modules[__name__].__class__ = _Package


def __getattr__(name: str) -> Any:
    """Import a public name when it is first used, so that the command starts quickly."""
    if name not in _HOMES:
        raise AttributeError(f"module 'thermo_fix' has no attribute {name!r}")
    from importlib import import_module

    return getattr(import_module(_HOMES[name]), name)
