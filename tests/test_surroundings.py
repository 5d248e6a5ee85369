"""The same result wherever and however it is computed, and without a network."""

import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from tests.simulator.survey import write_survey
from tests.test_rerun import bytes_of

ROOT = Path(__file__).parents[1]
SURROUNDINGS = Path(__file__).parent / "surroundings"


def command(*arguments: str | Path, **environment: str) -> "subprocess.CompletedProcess[str]":
    clean = {
        name: value
        for name, value in os.environ.items()
        if not name.startswith(("LC_", "LANG", "PYTHON", "TZ"))
    }
    path = os.pathsep.join((str(ROOT), str(SURROUNDINGS)))
    return subprocess.run(
        [sys.executable, "-m", "thermo_fix", *map(str, arguments)],
        capture_output=True,
        text=True,
        encoding="utf-8",
        errors="backslashreplace",
        env={**clean, "PYTHONPATH": path, **environment},
        timeout=300,
        check=False,
    )


def test_the_same_bytes_in_any_surroundings(tmp_path: Path) -> None:
    folder = tmp_path / "survey"
    write_survey(folder, "electrical", 5, images=3, shape=(90, 120))
    # The folder's own order of files is what remains: the sheet lists none of them.
    sheet = (folder / "survey.toml").read_text("utf-8")
    (folder / "survey.toml").write_text(sheet[: sheet.index("[[image]]")], encoding="utf-8")
    worlds: list[tuple[tuple[str, ...], dict[str, str]]] = [
        (("--jobs", "1"), {"PYTHONHASHSEED": "1", "TZ": "UTC", "LC_ALL": "C.UTF-8"}),
        (
            ("--jobs", "2"),
            {"PYTHONHASHSEED": "2", "TZ": "Asia/Kathmandu", "LC_ALL": "C", "TEST_REVERSED": "1"},
        ),
        (
            ("--jobs", "1"),
            {
                "PYTHONHASHSEED": "3",
                "TZ": "America/St_Johns",
                "LC_ALL": "tr_TR.UTF-8",
                "PYTHONUTF8": "0",
                "PYTHONCOERCECLOCALE": "0",
                "OMP_NUM_THREADS": "1",
            },
        ),
    ]
    results = []
    for number, (options, environment) in enumerate(worlds):
        out = tmp_path / f"results {number}"
        done = command("run", folder, "--out", out, *options, **environment)
        assert done.returncode == 0, done.stderr
        results.append(bytes_of(out))
    assert {"report.html", "findings.json", "findings.csv"} <= set(results[0])
    assert len(results[0]) > 6
    assert results[1] == results[0]
    assert results[2] == results[0]


def reaches_for_the_network(statement: str) -> bool:
    done = subprocess.run(
        [sys.executable, "-c", statement],
        capture_output=True,
        env={**os.environ, "PYTHONPATH": str(SURROUNDINGS), "TEST_NO_NETWORK": "1"},
        check=False,
    )
    return done.returncode == 77


@pytest.mark.parametrize(
    "statement",
    [
        "import socket; socket.create_connection(('192.0.2.1', 80), 0.1)",  # RFC 5737
        "import urllib.request as r; r.urlopen('http://example.invalid')",  # RFC 6761
        "import socket; socket.getaddrinfo('example.invalid', 80)",
        "import socket; socket.socket().bind(('127.0.0.1', 0))",
    ],
)
def test_the_watch_sees_what_it_is_for(statement: str) -> None:
    assert reaches_for_the_network(statement)
    assert not reaches_for_the_network("import socket; socket.socketpair()")


def without_network() -> list[str]:
    """Start of a command that runs another one without any network, where the system can."""
    unshare = shutil.which("unshare")
    if unshare is None:
        return []
    command = [unshare, "--map-root-user", "--net"]
    return command if subprocess.run([*command, "true"], check=False).returncode == 0 else []


def test_both_demo_surveys_without_a_network(tmp_path: Path) -> None:
    done = subprocess.run(
        [
            *without_network(),
            *(sys.executable, "-m", "thermo_fix", "demo", str(tmp_path / "demo")),
        ],
        capture_output=True,
        text=True,
        env={
            **os.environ,
            "PYTHONPATH": os.pathsep.join((str(ROOT), str(SURROUNDINGS))),
            "TEST_NO_NETWORK": "1",
        },
        timeout=300,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    assert "network" not in done.stderr
    for name in ("building", "electrical"):
        assert (tmp_path / "demo" / name / "results" / "report.html").is_file()
