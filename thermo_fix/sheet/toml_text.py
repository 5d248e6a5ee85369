"""From the bytes of a survey sheet to a plain dictionary, with mistakes explained."""

import re
import tomllib
from pathlib import Path

from thermo_fix.errors import SheetError
from thermo_fix.text_file import read_text_file

MAX_BYTES = 64 * 1024 * 1024
"""More than any survey needs (about 400,000 images); a larger file is something else."""

_MAX_KEY_PARTS = 32
_LONG_DOTTED_KEY = re.compile(
    r"^[ \t]*\[*(?:[ \t]*(?:[A-Za-z0-9_-]+|\"[^\"\n]*\"|'[^'\n]*')[ \t]*\.)"
    f"{{{_MAX_KEY_PARTS}}}",
    re.MULTILINE,
)
_PLACE = re.compile(r"\s*\(at (?:line (\d+), column (\d+)|end of document)\)$")


def read_text(path: Path) -> str:
    """Read a sheet as text, without a byte order mark.

    Raises ``SheetError`` when it cannot be read, is no ordinary file, is too large or is not
    UTF-8.
    """
    return read_text_file(
        path, MAX_BYTES, "a survey sheet", "split the survey into several folders"
    )


def parse(text: str, name: str) -> dict[str, object]:
    """Parse TOML; ``SheetError`` says line, column and, in plain words, what is wrong."""
    deep = _LONG_DOTTED_KEY.search(text)
    if deep is not None:
        line = text.count("\n", 0, deep.start()) + 1
        raise SheetError(f"{name}, line {line}: a key of more than {_MAX_KEY_PARTS} parts")
    try:
        return tomllib.loads(text)
    except RecursionError as error:
        raise SheetError(
            f"{name}: brackets are nested too deeply; look for one that is not closed"
        ) from error
    except ValueError as error:  # also integers of thousands of digits
        raise SheetError(_explain(error, text, name)) from error


def _explain(error: ValueError, text: str, name: str) -> str:
    message = str(error)
    place = _PLACE.search(message)
    if place is None:
        return f"{name}: not valid TOML: {_one_line(message)}"
    what = _one_line(message[: place.start()])
    all_lines = text.replace("\r\n", "\n").split("\n")
    if place.group(1) is None:
        while len(all_lines) > 1 and not all_lines[-1].strip():
            all_lines.pop()
        where, content = f"line {len(all_lines)}", all_lines[-1]
    else:
        number = int(place.group(1))
        where = f"line {number}, column {place.group(2)}"
        content = all_lines[number - 1] if number <= len(all_lines) else ""
    return f"{name}, {where}: not valid TOML: {_in_plain_words(what, content)}"


_LINE_HINTS: tuple[tuple[re.Pattern[str], str], ...] = (
    (re.compile(r"[“”„‘’«»]"), 'use straight quotation marks: "'),
    (
        re.compile(r"=[^\"'#\[]*?[-+]?\d+,\d"),
        "write a decimal point, not a comma: 0.93",
    ),
    (re.compile(r"=\s*[-+]?\.\d"), "write a digit before the decimal point: 0.93"),
    (re.compile(r"=\s*[-+]?\d+\.(?!\d)"), "write a digit after the decimal point: 20.0"),
    (
        re.compile(r"=\s*\d{1,2}[./-]\d{1,2}[./-]\d{2,4}\b"),
        "write a date as year-month-day: 2026-01-14",
    ),
    (re.compile(r"=\s*[-+]?[\d.]+\s*%"), "write a fraction without the percent sign: 0.75"),
    (
        re.compile(r"=\s*[-+]?[\d.]+\s*(?:°|[A-Za-z])"),
        "write the number alone; its unit goes with the key",
    ),
    (re.compile(r"=\s*(?i:true|false|yes|no|on|off)\b"), "write true or false, in small letters"),
    (re.compile(r"=\s*[-+]?0\d"), "write numbers without leading zeros"),
    (re.compile(r"=\s*[^\W\d]"), 'text stands in quotation marks: key = "text"'),
    (re.compile(r"=\s*(?:#.*)?$"), "a value is missing after the ="),
    (re.compile(r"^\s*[A-Za-z_]\w*\s*:"), "write = between key and value, not a colon"),
)


def _in_plain_words(what: str, content: str) -> str:
    """Explain the parser's words with the help of the line that it stopped at."""
    twice = re.match(r"Cannot declare \((.*?),?\) twice", what)
    if twice is not None:
        heading = ".".join(part.strip(" '\"") for part in twice.group(1).split(","))
        return f"[{heading}] is declared twice; put its keys together under one heading"
    if what.startswith(("Cannot overwrite a value", "Duplicate inline table key")):
        return "this key is stated twice; keep one of the two"
    if what.startswith("Unescaped '\\'") or "Invalid hex value" in what:
        return "a backslash in a text; write / between the names of folders"
    if what.startswith("Unclosed array"):
        return "a list that is not closed; each [ needs its ]"
    if what.startswith("Unclosed inline table"):
        return "a table that is not closed; each { needs its } on the same line"
    if "\r" in content:
        return "a line ends in a bare carriage return; save the file with ordinary line ends"
    if content.strip():
        for pattern, hint in _LINE_HINTS:
            if pattern.search(content):
                return hint
    if what.startswith(("Unterminated string", "Illegal character")):
        return f"{what}; a text ends with the quotation mark that it began with, on the same line"
    return what


def _one_line(message: str) -> str:
    return " ".join(message.split())[:200]
