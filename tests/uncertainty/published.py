"""The worked examples of ``tests/data/published_uncertainty_checks.json``, by id."""

import json
from functools import cache
from pathlib import Path
from typing import Any

FILE = Path(__file__).parents[1] / "data" / "published_uncertainty_checks.json"


@cache
def _rows() -> dict[str, dict[str, Any]]:
    return {row["id"]: row for row in json.loads(FILE.read_text(encoding="utf-8"))}


def inputs(name: str) -> dict[str, Any]:
    """Inputs of a row."""
    found: dict[str, Any] = _rows()[name]["inputs"]
    return found


def expected(name: str) -> Any:
    """Expected numbers of a row; source and tolerance stand in the row."""
    return _rows()[name]["expected"]


def names() -> tuple[str, ...]:
    """Every id."""
    return tuple(_rows())
