"""The words of the report, kept in one file for each language so that they can be translated."""

import tomllib
from collections.abc import Mapping
from functools import lru_cache
from importlib.resources import files


class Words:
    """Looks words up by their dotted key, such as ``masthead.surveyor``."""

    def __init__(self, texts: Mapping[str, str]) -> None:
        self._texts = dict(texts)

    @property
    def keys(self) -> frozenset[str]:
        """All keys of the catalogue."""
        return frozenset(self._texts)

    def __call__(self, key: str, /, **values: object) -> str:
        """Text of ``key`` with its ``{fields}`` filled in; KeyError if there is none."""
        return self._texts[key].format(**values) if values else self._texts[key]

    def of(self, family: str, member: str, /, **values: object) -> str:
        """Text of one member of a family of keys; the member's own name if it has none."""
        key = f"{family}.{member}"
        return self(key, **values) if key in self._texts else member

    def family(self, family: str) -> dict[str, str]:
        """All members of a family of keys with their texts."""
        start = f"{family}."
        return {
            key.removeprefix(start): text
            for key, text in self._texts.items()
            if key.startswith(start)
        }

    def count(self, key: str, number: int, /, **values: object) -> str:
        """Text that agrees with a number: ``key.one`` or ``key.other``."""
        return self(f"{key}.one" if number == 1 else f"{key}.other", n=number, **values)


def _flatten(table: Mapping[str, object], prefix: str = "") -> dict[str, str]:
    texts: dict[str, str] = {}
    for key, value in table.items():
        if isinstance(value, Mapping):
            texts.update(_flatten(value, f"{prefix}{key}."))
        else:
            texts[prefix + key] = str(value)
    return texts


@lru_cache(maxsize=4)
def load_words(language: str = "en") -> Words:
    """Load the catalogue of one language."""
    source = files("thermo_fix.report").joinpath("words", f"{language}.toml")
    return Words(_flatten(tomllib.loads(source.read_text(encoding="utf-8"))))
