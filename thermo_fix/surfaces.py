"""The table of surfaces: emissivities that a survey sheet can refer to by name.

The data are in ``data/surfaces.toml``, whose head explains each column; ``docs/surfaces.md`` says
how the table was made. A value from a table is a stand-in for a measured one: its standard
uncertainty covers what is published about surfaces of that name, not the one in the image.
"""

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from difflib import SequenceMatcher
from functools import lru_cache
from importlib.resources import files
from types import MappingProxyType
from typing import Any, Final, Literal

from thermo_fix.errors import ThermoFixError

Band = Literal["total normal", "total hemispherical", "8-14 um"]
Obtained = Literal["found", "from memory"]
UncertaintyBasis = Literal["spread", "judged"]

LOW_EMISSIVITY: Final = 0.6
"""Below this a temperature is not reliable without a reference patch (common practice)."""

_MAX_SUGGESTIONS: Final = 3
_NEAR: Final = 0.5
"""Least similarity, 0 to 1, of a name worth suggesting."""
_SAME_WORD: Final = 0.75
"""Least similarity, 0 to 1, of two spellings of one word: "galvanized" and "galvanised"."""


class UnknownSurface(ThermoFixError, LookupError):
    """No surface has the name asked for.

    ``name`` is what was asked for, ``nearest`` up to three names of the table, nearest first.
    """

    def __init__(self, name: str, nearest: tuple[str, ...]) -> None:
        self.name = name
        self.nearest = nearest
        if nearest:
            hint = "the nearest are " if len(nearest) > 1 else "the nearest is "
            hint += ", ".join(f'"{near}"' for near in nearest)
        else:
            hint = "none in the table is near; give the emissivity as a number"
        super().__init__(f'unknown surface "{name}": {hint}')

    def __reduce__(self) -> tuple[type["UnknownSurface"], tuple[str, tuple[str, ...]]]:
        # Exceptions are otherwise rebuilt from their message alone when they cross processes.
        return type(self), (self.name, self.nearest)


@dataclass(frozen=True, slots=True)
class Surface:
    """One row of the table."""

    name: str
    """Lower case, noun first: ``brick, red``."""
    group: str
    """Family of materials: ``masonry``, ``metal``, ``coating``."""
    emissivity: float
    """0 to 1."""
    u: float
    """Standard uncertainty (k = 1) of the emissivity."""
    u_basis: UncertaintyBasis
    """``spread``: from the published range; ``judged``: our own judgement."""
    band: Band
    """What the source measured."""
    source: str
    """Author and table."""
    obtained: Obtained
    """Whether the source was read, or is recalled and still to be confirmed."""
    low: float | None = None
    """Lower end of the published range."""
    high: float | None = None
    """Upper end of the published range."""
    temperature_c: tuple[float, float] | None = None
    """Temperatures of the published measurement, from and to, degC."""
    aliases: tuple[str, ...] = ()
    """Other names of the same surface."""
    note: str = ""
    """What the user of the value must know."""

    @property
    def is_low_emissivity(self) -> bool:
        """Whether a temperature is not reliable here without a reference patch."""
        return self.emissivity < LOW_EMISSIVITY

    @property
    def names(self) -> tuple[str, ...]:
        """The name and its aliases."""
        return (self.name, *self.aliases)


@lru_cache(maxsize=1)
def load_surfaces() -> tuple[Surface, ...]:
    """Return all surfaces in the order of the data file."""
    text = files("thermo_fix").joinpath("data", "surfaces.toml").read_text(encoding="utf-8")
    return tuple(_surface(row) for row in tomllib.loads(text)["surface"])


def find_surface(name: str) -> Surface:
    """Return the surface of that name or alias.

    Case and spacing do not matter: ``Brick,red`` finds ``brick, red``. Nothing else is guessed,
    since a wrong emissivity is worse than a question.

    Raises:
        UnknownSurface: no surface has that name; the message names the nearest.
    """
    found = _by_key().get(_key(name))
    if found is None:
        raise UnknownSurface(name, _nearest(name))
    return found


def search(words: str) -> tuple[Surface, ...]:
    """Return the surfaces that have every one of ``words`` in their name, aliases or group.

    Parts of words count: ``oxid`` finds ``copper, oxidised``. The order is that of the table;
    no words at all give the whole table.
    """
    wanted = _words(words)
    return tuple(
        surface
        for surface in load_surfaces()
        if all(word in _key(" ".join((*surface.names, surface.group))) for word in wanted)
    )


def _surface(row: Mapping[str, Any]) -> Surface:
    fields = dict(row)
    fields["aliases"] = tuple(fields.get("aliases", ()))
    if "temperature_c" in fields:
        start, end = fields["temperature_c"]
        fields["temperature_c"] = (float(start), float(end))
    return Surface(**fields)


@lru_cache(maxsize=1)
def _by_key() -> Mapping[str, Surface]:
    return MappingProxyType(
        {_key(name): surface for surface in load_surfaces() for name in surface.names}
    )


def _words(text: str) -> list[str]:
    return text.casefold().replace(",", " ").split()


def _key(text: str) -> str:
    # Commas only structure a name, so that "brick,red" and "brick red" are the same.
    return " ".join(_words(text))


def _nearest(name: str) -> tuple[str, ...]:
    scored = [
        (max(_likeness(name, known) for known in surface.names), surface.name)
        for surface in load_surfaces()
    ]
    near = sorted(
        (pair for pair in scored if pair[0] >= _NEAR), key=lambda pair: (-pair[0], pair[1])
    )
    return tuple(known for _, known in near[:_MAX_SUGGESTIONS])


def _likeness(asked: str, known: str) -> float:
    """Similarity of two names, 0 to 1, whatever the order of their words."""
    asked_words, known_words = _words(asked), _words(known)
    if not asked_words:
        return 0.0
    shared = sum(
        any(_ratio(word, other) >= _SAME_WORD for other in known_words) for word in asked_words
    )
    overlap = 2 * shared / (len(asked_words) + len(known_words))
    letters = _ratio(" ".join(sorted(asked_words)), " ".join(sorted(known_words)))
    return (min(overlap, 1.0) + letters) / 2


def _ratio(a: str, b: str) -> float:
    return SequenceMatcher(None, a, b, autojunk=False).ratio()
