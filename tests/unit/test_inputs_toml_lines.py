"""Lines of keys: texts with the line written into each value."""

import tomllib
from typing import Any

import pytest

from charging.toml_lines import index, line_of

SAMPLE = '''\
# 1
title = 2
"quoted \\u00e9 . key" = 3
'literal # key' = 4

[a.b]  # 6: also the first mention of a
  c . "d" = 7
c.e = 8
array = [ 9, [
  10, 10 ], # ] comment " \'
  11,
]
long = """
13 [not.a.table] = 4
""\\" """
after = 16
literal_long = \'\'\'
[[no]]
\'\'\'\'\'
after_literal = 20
inline = { x = 21, "y" = { z = 21 }, list = [21,
  22] }
[[t]]
line = 24
[t.sub]
line = 26
[[t.more]]
line = 28
[[t.more]]
line = 30
[[t]]
line = 32
[t.sub]
line = 34
[[t.more]]
line = 36
[zero]
date = 1979-05-27 07:32:00
[x.y.z]
line = 40
[x]
line = 42
'''


def _numbers(value: Any, path: tuple[Any, ...] = ()) -> Any:
    if isinstance(value, dict):
        for key, child in value.items():
            yield from _numbers(child, (*path, key))
    elif isinstance(value, list):
        for position, child in enumerate(value):
            yield from _numbers(child, (*path, position))
    elif isinstance(value, int):
        yield path, value


@pytest.mark.parametrize("line_end", ["\n", "\r\n"])
def test_every_number_stands_at_its_own_line(line_end: str) -> None:
    text = SAMPLE.replace("\n", line_end)
    lines = index(text)
    found = dict(_numbers(tomllib.loads(text)))
    assert len(found) >= 20
    assert {path: lines[path] for path in found} == found


def test_tables_stand_at_their_headers() -> None:
    lines = index(SAMPLE)
    assert lines["a",] == lines["a", "b"] == 6
    assert lines["t",] == lines["t", 0] == 23
    assert lines["t", 1] == 31
    assert lines["t", 0, "more", 1] == 29
    assert lines["t", 1, "more", 0] == 35
    assert lines["x",] == 41  # its own header, though named in line 39 before
    assert lines["zero", "date"] == 38


def test_line_of_falls_back_to_the_table_around() -> None:
    lines = index("[body]\nradius_m = 1\n")
    assert line_of(lines, ("body", "radius_m")) == 2
    assert line_of(lines, ("body", "collection")) == 1
    assert line_of(lines, ("surface", 0)) is None
    assert line_of(lines, ()) is None


@pytest.mark.parametrize(
    "text", ["=", "a", "a =", "a = [1", "[a", "a = {b", "[[a]", 'a = "x', "a = ['1' 2]", "\0"]
)
def test_what_is_no_toml_is_an_error_not_a_loop(text: str) -> None:
    with pytest.raises(ValueError, match="line 1"):
        index(text)
