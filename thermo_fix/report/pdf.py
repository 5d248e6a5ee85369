"""A report on paper: printed to PDF by the browser that this machine has, if it has one.

The browser gets the report as a local file and is told to stay off the network.
"""

import base64
import hashlib
import os
import shutil
import subprocess
import tempfile
from pathlib import Path
from typing import Final, Literal

Paper = Literal["A4", "letter"]

BROWSERS: Final = ("chromium", "chromium-browser", "google-chrome")
"""Names looked for on PATH, in this order."""

_LONGEST_S: Final = 600

_POLICY: Final = "style-src &#39;"
"""Where the report's Content Security Policy lists its style."""


class PrintError(Exception):
    """The report could not be printed; the message is one line that says what to do."""


def find_browser() -> Path | None:
    """The first browser found that can print; None without one."""
    for name in BROWSERS:
        found = shutil.which(name)
        if found is not None:
            return Path(found)
    return None


def print_pdf(report: Path, pdf: Path, *, paper: Paper = "A4") -> None:
    """Print a report to PDF.

    Parameters
    ----------
    report
        The entry page. Pages of the images of a large survey are not printed with it.
    pdf
        Where to write; moved into place when complete.
    paper
        Size of the sheets.

    Raises
    ------
    PrintError
        There is no browser, or it fails.

    """
    browser = find_browser()
    if browser is None:
        raise PrintError(
            f"no browser to print with (looked for {', '.join(BROWSERS)}); open {report} in any "
            'browser, print it and choose "Save as PDF"'
        )
    with tempfile.TemporaryDirectory(prefix="thermo_fix_print_") as name:
        work = Path(name)
        source, target = work / "report.html", work / "report.pdf"
        source.write_text(
            on_paper(report.read_text(encoding="utf-8"), paper), encoding="utf-8", newline="\n"
        )
        command = [
            str(browser),
            "--headless",
            "--disable-gpu",
            "--disable-background-networking",
            "--no-pdf-header-footer",
            f"--user-data-dir={work / 'profile'}",
            f"--print-to-pdf={target}",
            source.as_uri(),
        ]
        # A browser refuses to start for root with its sandbox on.
        if hasattr(os, "geteuid") and os.geteuid() == 0:
            command.insert(1, "--no-sandbox")
        _run(command)
        if not target.is_file():
            raise PrintError(
                f"{browser.name} wrote no PDF; open {report} in a browser and print it there"
            )
        partial = pdf.with_name(pdf.name + ".partial")
        shutil.copyfile(target, partial)
        partial.replace(pdf)


def on_paper(page: str, paper: Paper) -> str:
    """The page with the size of its sheets stated, admitted by its policy.

    The report itself does not state it, so that whoever prints it there can choose.
    """
    style = f"@page {{ size: {paper}; }}"
    digest = base64.b64encode(hashlib.sha256(style.encode()).digest()).decode()
    admitted = page.replace(_POLICY, f"style-src &#39;sha256-{digest}&#39; &#39;", 1)
    return admitted.replace("</head>", f"<style>{style}</style>\n</head>", 1)


def _run(command: list[str]) -> None:
    try:
        done = subprocess.run(
            command,
            stdin=subprocess.DEVNULL,
            capture_output=True,
            timeout=_LONGEST_S,
            check=False,
        )
    except subprocess.TimeoutExpired as error:
        raise PrintError(
            f"{Path(command[0]).name} did not finish printing within {_LONGEST_S} s; "
            "open the report in a browser and print it there"
        ) from error
    except OSError as error:
        raise PrintError(f"{command[0]}: cannot be started ({error.strerror})") from error
    if done.returncode != 0:
        raise PrintError(
            f"{Path(command[0]).name} failed with status {done.returncode}; open the report in a "
            "browser and print it there"
        )
