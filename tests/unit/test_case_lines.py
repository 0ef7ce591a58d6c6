"""The lines of keys in a TOML text, against texts counted by eye and tomllib's own keys."""

from __future__ import annotations

import tomllib
from collections.abc import Iterator
from typing import Any

import pytest

from bemwave.case.lines import line_of_keys, nearest_line

TEXT = '''\
title = "a = b # no comment"  # a comment
note = """
[not.a.table]
x = 1
"""
[water]
depth = 10.0
"odd key" = 'c:\\dir'
a.b = 1
[[body]]
name = "one"
position = [
    1.0, # first

    2.0,
]
[[body]]
name = "two"
forced = { mode = "heave", amplitude = 0.1 }
[body.deeper]
level = 1
[[body.part]]
size = 1
[[body.part]]
size = 2
[run]
when = 1979-05-27 07:32:00
list = [{ a = 1 }, { a = [2,
  3] }]
empty = {}
quoted = "he said \\"]\\" and left"
'''

EXPECTED = {
    ("title",): 1,
    ("note",): 2,
    ("water",): 6,
    ("water", "depth"): 7,
    ("water", "odd key"): 8,
    ("water", "a"): 9,
    ("water", "a", "b"): 9,
    ("body",): 10,
    ("body", 0): 10,
    ("body", 0, "name"): 11,
    ("body", 0, "position"): 12,
    ("body", 0, "position", 0): 13,
    ("body", 0, "position", 1): 15,
    ("body", 1): 17,
    ("body", 1, "name"): 18,
    ("body", 1, "forced"): 19,
    ("body", 1, "forced", "mode"): 19,
    ("body", 1, "forced", "amplitude"): 19,
    ("body", 1, "deeper"): 20,
    ("body", 1, "deeper", "level"): 21,
    ("body", 1, "part"): 22,
    ("body", 1, "part", 0): 22,
    ("body", 1, "part", 0, "size"): 23,
    ("body", 1, "part", 1): 24,
    ("body", 1, "part", 1, "size"): 25,
    ("run",): 26,
    ("run", "when"): 27,
    ("run", "list"): 28,
    ("run", "list", 0): 28,
    ("run", "list", 0, "a"): 28,
    ("run", "list", 1): 28,
    ("run", "list", 1, "a"): 28,
    ("run", "list", 1, "a", 0): 28,
    ("run", "list", 1, "a", 1): 29,
    ("run", "empty"): 30,
    ("run", "quoted"): 31,
}


def paths(value: Any, path: tuple[str | int, ...] = ()) -> Iterator[tuple[str | int, ...]]:
    if path:
        yield path
    if isinstance(value, dict):
        for key, entry in value.items():
            yield from paths(entry, (*path, key))
    elif isinstance(value, list):
        for number, entry in enumerate(value):
            yield from paths(entry, (*path, number))


def test_every_key_has_its_line() -> None:
    assert line_of_keys(TEXT) == EXPECTED


def test_the_keys_are_those_of_tomllib() -> None:
    assert set(line_of_keys(TEXT)) == set(paths(tomllib.loads(TEXT)))


@pytest.mark.parametrize(
    ("path", "line"),
    [
        (("body", 1, "forced", "period"), 19),
        (("water", "density"), 6),
        (("surface", "size"), None),
    ],
)
def test_a_missing_key_is_looked_for_in_the_table_round_it(
    path: tuple[str | int, ...], line: int | None
) -> None:
    assert nearest_line(line_of_keys(TEXT), path) == line
