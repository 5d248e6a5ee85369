"""Check values from outside: the rows of ``data/published_checks.json`` by their id.

Every expected number that a test takes from here carries its source, how it was obtained and the
tolerance that goes with it; ``data/README.md`` explains the columns.
"""

import json
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any, Literal

FILE = Path(__file__).parent / "data" / "published_checks.json"


@dataclass(frozen=True)
class Row:
    id: str
    quantity: str
    inputs: dict[str, Any]
    expected: Any
    unit: str
    tolerance: str
    source: str
    kind: Literal["found", "computed"]
    obtained: str

    def __str__(self) -> str:
        return self.id


@cache
def all_rows() -> dict[str, Row]:
    content = json.loads(FILE.read_text(encoding="utf-8"))
    return {entry["id"]: Row(**entry) for entry in content["rows"]}


def row(name: str) -> Row:
    return all_rows()[name]


def rows(*prefixes: str) -> list[Row]:
    found = [each for each in all_rows().values() if each.id.startswith(prefixes)]
    if not found:
        raise LookupError(f"no row starts with {prefixes}")
    return found
