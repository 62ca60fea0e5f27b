"""Lines of keys in a TOML file."""

from __future__ import annotations

import tomllib
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from meterlens.settings.key_lines import KeyPath, key_lines, line_of

DOCUMENT = '''\
# a comment with [brackets] and key = "no"
title = """
decoy = 1
[decoy]
quotes "" inside \\""" and at the end""""
literal = \'\'\'
other_decoy = 2
ends with ''\'\'\'

[site]
name = "a # no comment = 1"   # one
"odd key" . 'x.y' = 3
point = { x = 1, deep.er = [ 1,
    2, # comment ]
    { z = "}" },
] }

[[service]]
id = "one"
[service.columns]
v_a = "U"
[[service]]
id = "two"
columns.i_a = "I"
columns . i_b = "J"
[[service.parts]]
n = 1
[[service.parts]]
n = 2
[a.b.c]
d = 1979-05-27 07:32:00
[ "tab\\u0041le" ]
e = inf
'''

EXPECTED: dict[KeyPath, int] = {
    ("title",): 2,
    ("literal",): 6,
    ("site",): 10,
    ("site", "name"): 11,
    ("site", "odd key", "x.y"): 12,
    ("site", "point"): 13,
    ("site", "point", "x"): 13,
    ("site", "point", "deep", "er"): 13,
    ("site", "point", "deep", "er", 0): 13,
    ("site", "point", "deep", "er", 1): 14,
    ("site", "point", "deep", "er", 2, "z"): 15,
    ("service",): 18,
    ("service", 0): 18,
    ("service", 0, "id"): 19,
    ("service", 0, "columns"): 20,
    ("service", 0, "columns", "v_a"): 21,
    ("service", 1): 22,
    ("service", 1, "id"): 23,
    ("service", 1, "columns"): 24,
    ("service", 1, "columns", "i_a"): 24,
    ("service", 1, "columns", "i_b"): 25,
    ("service", 1, "parts", 0, "n"): 27,
    ("service", 1, "parts", 1): 28,
    ("service", 1, "parts", 1, "n"): 29,
    ("a",): 30,
    ("a", "b"): 30,
    ("a", "b", "c", "d"): 31,
    ("tabAle", "e"): 33,
}


def paths(value: Any, at: KeyPath = ()) -> set[KeyPath]:
    """Return every path that the parser itself sees."""
    pairs: list[tuple[str | int, Any]] = []
    if isinstance(value, dict):
        pairs = list(value.items())
    elif isinstance(value, list):
        pairs = list(enumerate(value))
    below = {(*at, key) for key, _ in pairs}
    for key, inner in pairs:
        below |= paths(inner, (*at, key))
    return below


def test_the_sample_has_exactly_the_paths_of_the_parser() -> None:
    assert set(key_lines(DOCUMENT)) == paths(tomllib.loads(DOCUMENT))


@pytest.mark.parametrize(("path", "line"), EXPECTED.items(), ids=str)
def test_line_of_each_key(path: KeyPath, line: int) -> None:
    assert key_lines(DOCUMENT)[path] == line


def test_a_key_that_is_not_written_stands_where_its_table_stands() -> None:
    lines = key_lines(DOCUMENT)
    assert line_of(lines, ("service", 1, "rating_a")) == 22
    assert line_of(lines, ("service", 0, "columns", "timestamp", 0)) == 20
    assert line_of(lines, ("nowhere",)) == 1


KEY = st.from_regex(r"[A-Za-z0-9_-]{1,6}", fullmatch=True)
VALUE = st.sampled_from(
    [
        ("1", 0),
        ('"[x] # = {"', 0),
        ("'\\'", 0),
        ('"\\\\"', 0),
        ('"""\nk = 1\n[[service]]\n"""', 3),
        ("'''\n]\n'''", 2),
        ("[\n  1, # ]\n  'x',\n]", 3),
        ("{ a = 1, b.c = '}' }", 0),
        ("[[], [{}]]", 0),
        ("2026-01-01T00:00:00Z # end", 0),
    ]
)
PAIRS = st.lists(st.tuples(KEY, VALUE, st.integers(0, 2)), max_size=5, unique_by=lambda p: p[0])


@given(st.lists(PAIRS, max_size=4))
def test_lines_of_any_list_of_tables(tables: list[list[tuple[str, tuple[str, int], int]]]) -> None:
    text, line = "", 1
    expected: dict[KeyPath, int] = {}
    for at, pairs in enumerate(tables):
        text += "[[ t ]]\n"
        expected["t", at] = line
        line += 1
        for key, (value, breaks), blanks in pairs:
            text += "\n" * blanks + f"  {key} = {value}\n"
            line += blanks
            expected["t", at, key] = line
            line += breaks + 1
    found = key_lines(text)
    assert set(found) == paths(tomllib.loads(text))
    assert {path: found[path] for path in expected} == expected
