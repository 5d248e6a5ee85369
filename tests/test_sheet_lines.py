"""The lines of keys in a TOML text, checked against the keys that the parser finds."""

import tomllib

import pytest
import tomlkit
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.sheets import keys, paths_of, values
from thermo_fix.sheet.lines import line_numbers, line_of

TRICKY = {
    "plain": "a = 1\n[b]\nc = 2\n",
    "nested arrays of tables": "[[a]]\nx=1\n[[a.b]]\ny=1\n[[a.b]]\n[a.b.c]\nz=1\n[[a]]\n[[a.b]]\n",
    "dotted keys": "a.b.c = 1\na.d = 2\n[t]\nx . y = 3\n'q.r'.\"s\" = 4\n",
    "inline tables": "a = { b = 1, c = { d = [1, { e = 2 }] } }\nf = {}\ng = []\n",
    "multi-line arrays": "a = [ # note ]\n  1,\n  [2, 3], # more\n\n  { x = 1 },\n]\nb = 1\n",
    "multi-line strings": (
        'a = """\n[not]\nx = 1\n\\""" """\n' + "b = '''\n\"\"\"\n[[no]]\n'''\nc = 1\n"
    ),
    "quotes at the end": "a = \"\"\"x\"\"\"\"\"\nb = '''y'''''\nc = 1\n",
    "signs in strings": 'a = "# [x] = {\\" }"\nb = \'# ] \\\'\nc = "," # "\n',
    "comments": "# [x]\n  # y = 1\na = 1 # b = 2\n\n\t[t] # [u]\nc=1\n",
    "quoted keys": '"a b" = 1\n"c\\"d\\u00e9\\U0001F321" = 2\n\'e"f\' = 3\n'
    + '"" = 4\n[ "g.h" . i ]\nj = 1\n',
    "dates": "a = 1979-05-27 07:32:00\nb = 1979-05-27T07:32:00Z\nc = [1979-05-27, 07:32:00]\n",
    "carriage returns": '[a]\r\nb = [\r\n1,\r\n2]\r\nc = """\r\n"""\r\nd = 1\r\n',
    "tables out of order": "[a.b.c]\nx = 1\n[a]\ny = 1\n[a.b]\nz = 1\n",
    "no line end": "[a]\nb = 'c'",
    "unicode": 'ключ = 1\n"ключ" = 2\n',
    "empty": "",
}


@pytest.mark.parametrize("case", [case for case in TRICKY if case != "unicode"])
def test_line_numbers_find_what_the_parser_finds(case: str) -> None:
    text = TRICKY[case]
    assert set(line_numbers(text)) == paths_of(tomllib.loads(text))


def test_line_numbers_by_hand() -> None:
    lines = line_numbers(
        "# one\n[scene]\nair_c = 1\n[[image]]\npolygon = [\n  [1, 2],\n  [3,\n   4],\n]\n"
        '[[image]]\nnote = """\n[scene]\n"""\nwindow = { transmittance = 0.9 }\n[[image.zone]]\n'
        "sky.cloud = 1\n"
    )
    assert lines["scene", "air_c"] == 3
    assert lines["image", 0] == 4
    assert lines["image", 0, "polygon", 1] == 7
    assert lines["image", 0, "polygon", 1, 1] == 8
    assert lines["image", 1] == 10
    assert lines["image", 1, "window", "transmittance"] == 14
    assert lines["image", 1, "zone", 0] == 15
    assert lines["image", 1, "zone", 0, "sky", "cloud"] == 16


@settings(max_examples=60, deadline=None, derandomize=True)
@given(st.dictionaries(keys, values, max_size=5))
def test_line_numbers_of_any_document(document: dict[str, object]) -> None:
    text = tomlkit.dumps(document)
    assert set(line_numbers(text)) == paths_of(tomllib.loads(text))


@settings(max_examples=150, deadline=None, derandomize=True)
@given(st.text(st.sampled_from(list("[]{}=.,\"'\\#\n\r ab1")), max_size=40))
def test_line_numbers_never_raise(text: str) -> None:
    assert isinstance(line_numbers(text), dict)


def test_line_of_something_absent_is_that_of_what_is_around_it() -> None:
    lines = line_numbers("\n[scene]\n\nair_c = { u = 1 }\n")
    assert line_of(lines, ("scene", "air_c", "value")) == 4
    assert line_of(lines, ("scene", "humidity")) == 2
    assert line_of(lines, ("camera",)) == 1
