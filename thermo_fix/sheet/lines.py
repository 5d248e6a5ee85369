"""On which line of a TOML text each key stands.

The parser of the standard library does not say, and a message about a sheet of a thousand images
is of no use without the line. The scanner here is made for texts that have already been parsed
(so it need not judge them); on anything else it stops where it loses the thread.
"""

import json
import re
from bisect import bisect_left
from collections.abc import Mapping
from contextlib import suppress

KeyPath = tuple[str | int, ...]
"""Where something stands: table names, keys and places in arrays (from 0)."""

_SPACE = re.compile(r"[ \t\r]*")
_GAP = re.compile(r"(?:[ \t\r\n]+|#[^\n]*)*")
_REST_OF_LINE = re.compile(r"[^\n]*")
_BARE_KEY = re.compile(r"[^\s.=\[\]{}\"'#,]+")
_BASIC = re.compile(r'"(?:[^"\\\n]|\\.)*"')
_LITERAL = re.compile(r"'[^'\n]*'")
# Up to two quotation marks may stand directly before the closing three.
_LONG_BASIC = re.compile(r'"""(?:[^"\\]|\\.|"(?!""))*"{3,5}', re.DOTALL)
_LONG_LITERAL = re.compile(r"'''(?:[^']|'(?!''))*'{3,5}")
_BARE_VALUE = re.compile(r"[^,\]}\n#]*")
_LONG_UNICODE = re.compile(r"\\U([0-9A-Fa-f]{8})")


class _Lost(Exception):
    """The text is not what the scanner expects here."""


def line_numbers(text: str) -> dict[KeyPath, int]:
    """Line (from 1) of every table, key and array element of a TOML text.

    Never raises: after a syntax error the rest of the text is missing from the result.
    """
    scanner = _Scanner(text)
    with suppress(_Lost, IndexError):
        scanner.scan()
    return scanner.lines


def line_of(lines: Mapping[KeyPath, int], path: KeyPath) -> int:
    """Line of a path, or of the nearest thing around it; 1 for the sheet as a whole."""
    for length in range(len(path), 0, -1):
        line = lines.get(path[:length])
        if line is not None:
            return line
    return 1


class _Scanner:
    """One pass over the text, without recursion, so that nesting cannot exhaust the stack."""

    def __init__(self, text: str) -> None:
        self.text = text
        self.at = 0
        self.lines: dict[KeyPath, int] = {}
        self._ends = [match.start() for match in re.finditer("\n", text)]
        self._lengths: dict[KeyPath, int] = {}

    def scan(self) -> None:
        table: KeyPath = ()
        while True:
            self._skip(_GAP)
            if self.at >= len(self.text):
                return
            if self.text.startswith("[", self.at):
                table = self._heading()
            else:
                self._value(self._key(table))
            self._skip(_REST_OF_LINE)

    def _skip(self, pattern: re.Pattern[str]) -> str:
        match = pattern.match(self.text, self.at)
        if match is None:
            raise _Lost
        self.at = match.end()
        return match.group()

    def _note(self, path: KeyPath, position: int) -> None:
        self.lines.setdefault(path, bisect_left(self._ends, position) + 1)

    def _heading(self) -> KeyPath:
        """``[a.b]`` or ``[[a.b]]``; a step through an array of tables is to its last table."""
        start = self.at
        repeated = self.text.startswith("[[", start)
        self.at += 2 if repeated else 1
        self._skip(_SPACE)
        parts = self._parts()
        path: KeyPath = ()
        for place, part in enumerate(parts):
            path = (*path, part)
            self._note(path, start)
            if repeated and place == len(parts) - 1:
                self._lengths[path] = self._lengths.get(path, 0) + 1
            if path in self._lengths:
                path = (*path, self._lengths[path] - 1)
                self._note(path, start)
        return path

    def _key(self, table: KeyPath) -> KeyPath:
        """``a.b =``: the path of the key, with the scanner at its value."""
        start = self.at
        path = table
        for part in self._parts():
            path = (*path, part)
            self._note(path, start)
        if self.text[self.at] != "=":
            raise _Lost
        self.at += 1
        self._skip(_SPACE)
        return path

    def _parts(self) -> list[str]:
        parts = []
        while True:
            parts.append(self._key_part())
            self._skip(_SPACE)
            if not self.text.startswith(".", self.at):
                return parts
            self.at += 1
            self._skip(_SPACE)

    def _key_part(self) -> str:
        opening = self.text[self.at]
        if opening == "'":
            return self._skip(_LITERAL)[1:-1]
        if opening != '"':
            return self._skip(_BARE_KEY)
        quoted = _LONG_UNICODE.sub(lambda m: chr(int(m.group(1), 16)), self._skip(_BASIC))
        try:
            return str(json.loads(quoted, strict=False))
        except ValueError as error:
            raise _Lost from error

    def _value(self, path: KeyPath) -> None:
        """Pass over a value, noting the elements of arrays and the keys of inline tables."""
        open_ones: list[tuple[KeyPath, int | None]] = []
        """Path, and the place in it for an array or None for an inline table."""
        pending: KeyPath | None = path
        while True:
            if pending is not None:
                opened = self._opening(pending)
                if opened is not None:
                    open_ones.append(opened)
                pending = None
            if not open_ones:
                return
            self._skip(_GAP)
            inside, place = open_ones[-1]
            character = self.text[self.at]
            if character == ("}" if place is None else "]"):
                self.at += 1
                open_ones.pop()
            elif character == ",":
                self.at += 1
                if place is not None:
                    open_ones[-1] = (inside, place + 1)
            elif place is None:
                pending = self._key(inside)
            else:
                pending = (*inside, place)
                self._note(pending, self.at)

    def _opening(self, path: KeyPath) -> tuple[KeyPath, int | None] | None:
        """Begin a value: what was opened, or None when a scalar has been passed over."""
        character = self.text[self.at]
        if character in "[{":
            self.at += 1
            return (path, 0 if character == "[" else None)
        if self.text.startswith('"""', self.at):
            self._skip(_LONG_BASIC)
        elif self.text.startswith("'''", self.at):
            self._skip(_LONG_LITERAL)
        elif character == '"':
            self._skip(_BASIC)
        elif character == "'":
            self._skip(_LITERAL)
        elif not self._skip(_BARE_VALUE).strip():
            raise _Lost
        return None
