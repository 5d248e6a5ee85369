"""Check values from outside for buildings: the rows of ``data/published_building_checks.json``."""

import json
from functools import cache
from pathlib import Path

from tests.published_checks import Row

FILE = Path(__file__).parent / "data" / "published_building_checks.json"


@cache
def building_rows() -> dict[str, Row]:
    content = json.loads(FILE.read_text(encoding="utf-8"))
    return {entry["id"]: Row(**entry) for entry in content["rows"]}


def building_row(name: str) -> Row:
    return building_rows()[name]


def rows_like(prefix: str) -> list[Row]:
    found = [each for each in building_rows().values() if each.id.startswith(prefix)]
    if not found:
        raise LookupError(f"no row starts with {prefix}")
    return found
