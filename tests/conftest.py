"""Settings of the test run."""

from pathlib import Path

import pytest


def pytest_ignore_collect(collection_path: Path, config: pytest.Config) -> bool | None:
    """Leave the benchmarks to those who ask for them: they measure, and take their time."""
    asked = any("benchmarks" in argument for argument in config.args)
    if "benchmarks" in collection_path.parts and not asked:
        return True
    return None
