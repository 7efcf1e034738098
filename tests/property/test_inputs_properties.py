"""Inputs under random texts: lines against the standard reader, and no way but InputError."""

import math
import random
import tomllib
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from charging.case import load_case_text
from charging.case_template import CASE_TEMPLATE
from charging.errors import InputError
from charging.toml_file import parse_toml, read_toml
from charging.toml_lines import index
from charging.units import UNITS, parse_quantity


def paths(value: Any, path: tuple[str | int, ...] = ()) -> set[tuple[str | int, ...]]:
    """Return the ways to every key and array element."""
    pairs = value.items() if isinstance(value, dict) else enumerate(value)
    found: set[tuple[str | int, ...]] = set()
    for key, child in pairs:
        found.add((*path, key))
        if isinstance(child, dict | list):
            found |= paths(child, (*path, key))
    return found


# texts of TOML, in all ways to write a thing ----------------------------------------------------

SPACE = st.sampled_from(["", " ", "\t", "  "])
BREAK = st.sampled_from(["\n", "\r\n", "\n\n", ' # it\'s a "comment" [x]\n', "\r\n # = ]\n"])
BARE = st.from_regex(r"[A-Za-z0-9_-]{1,4}", fullmatch=True)
PLAIN = st.text(st.characters(codec="utf-8", exclude_categories=["Cc"]), max_size=6)


def basic(text: str) -> str:
    return '"' + text.replace("\\", "\\\\").replace('"', '\\"') + '"'


@st.composite
def key_part(draw: st.DrawFn) -> str:
    if draw(st.booleans()):
        return draw(BARE)
    text = draw(PLAIN)
    if draw(st.booleans()) and "'" not in text:
        return f"'{text}'"
    if draw(st.booleans()):
        return '"' + "".join(f"\\U{ord(character):08x}" for character in text) + '"'
    return basic(text)


@st.composite
def key(draw: st.DrawFn) -> str:
    parts = draw(st.lists(key_part(), min_size=1, max_size=3))
    return (draw(SPACE) + "." + draw(SPACE)).join(parts)


SCALAR = st.one_of(
    st.sampled_from(
        ["1", "-0.5e-3", "true", "inf", "nan", "0xff", "1_0", "1979-05-27", "07:32:00.5",
         "1979-05-27 07:32:00Z", "1979-05-27T07:32:00+01:00", '"""a"""', '"""\n"a"\n# ""x\n"""',
         "'''\n'a' ''\n'''", "''''a'''''", '"""a\\\n   b\\\\"""', '"""\\""""""', '"""""a"""""',
         '"# no comment"', "'[x]'", '"a\\\\"', "''", '""', '""""""', "''''''"]
    ),
    PLAIN.map(basic),
)  # fmt: skip


@st.composite
def array(draw: st.DrawFn, inner: st.SearchStrategy[str]) -> str:
    gap = st.one_of(SPACE, BREAK)
    text = "[" + draw(gap)
    items = draw(st.lists(inner, max_size=3))
    for number, item in enumerate(items):
        text += item + draw(gap)
        if number < len(items) - 1 or draw(st.booleans()):
            text += "," + draw(gap)
    return text + "]"


@st.composite
def inline_table(draw: st.DrawFn, inner: st.SearchStrategy[str]) -> str:
    pairs = draw(st.lists(st.tuples(key(), inner), max_size=3))
    texts = [f"{draw(SPACE)}{name}{draw(SPACE)}={draw(SPACE)}{item}" for name, item in pairs]
    return "{" + (draw(SPACE) + ",").join(texts) + draw(SPACE) + "}"


VALUE = st.recursive(
    SCALAR, lambda inner: st.one_of(array(inner), inline_table(inner)), max_leaves=5
)


@st.composite
def toml_text(draw: st.DrawFn) -> str:
    text = draw(st.one_of(st.just(""), BREAK))
    heads = draw(st.lists(key(), min_size=1, max_size=3))
    for _ in range(draw(st.integers(0, 8))):
        kind = draw(st.sampled_from(["pair", "pair", "table", "array"]))
        if kind == "pair":
            text += f"{draw(SPACE)}{draw(key())}{draw(SPACE)}={draw(SPACE)}{draw(VALUE)}"
        else:
            head = draw(st.sampled_from(heads)) + draw(
                st.one_of(st.just(""), BARE.map(".".__add__))
            )
            text += f"[{head}]" if kind == "table" else f"[[{draw(SPACE)}{head}{draw(SPACE)}]]"
        text += draw(SPACE) + draw(BREAK)
    return text


@settings(max_examples=500, suppress_health_check=[HealthCheck.filter_too_much])
@given(toml_text())
def test_lines_know_the_keys_of_the_standard_reader(text: str) -> None:
    try:
        document = tomllib.loads(text)
    except tomllib.TOMLDecodeError:  # a key drawn twice
        with pytest.raises(InputError):
            parse_toml(text, file="x.toml")
        return
    lines = index(text)
    assert set(lines) == paths(document)
    assert all(1 <= line <= text.count("\n") + 1 for line in lines.values())


@settings(max_examples=300)
@given(st.data())
def test_lines_are_those_where_a_key_was_written(data: st.DataObject) -> None:
    expected: dict[tuple[str | int, ...], int] = {}
    table: tuple[str | int, ...] = ()
    text, count = "", 0
    for number in range(data.draw(st.integers(1, 8))):
        text += data.draw(st.sampled_from(["", "\n", "# x\n", "\r\n"]))
        line = text.count("\n") + 1
        match data.draw(st.sampled_from(["table", "array", "pair", "dotted", "inline", "list"])):
            case "table":
                table = (f"t{number}",)
                text += f"[t{number}]"
                expected[table] = line
            case "array":
                text += "[[many]]"
                table = ("many", count)
                expected[table] = line
                count += 1
            case "pair":
                skipped = data.draw(st.integers(0, 3))
                text += f'k{number} = """' + "\n" * skipped + '"""'
                expected[*table, f"k{number}"] = line
            case "dotted":
                text += f"k{number} . a = 1"
                expected[*table, f"k{number}", "a"] = line
            case "inline":
                text += f"k{number} = {{a = [\n1,\n2], b = 3}}"
                expected[*table, f"k{number}", "a", 1] = line + 2
                expected[*table, f"k{number}", "b"] = line + 2
            case _:
                text += f"k{number} = [ # [\n\n'a',\n{{x = 1}}]"
                expected[*table, f"k{number}", 0] = line + 2
                expected[*table, f"k{number}", 1, "x"] = line + 3
        text += "\n"
    lines = index(text)
    assert {path: lines[path] for path in expected} == expected
    assert set(lines) == paths(tomllib.loads(text))


def outcome(text: str) -> None:
    """Read a text as a case; anything but success or InputError is the test's failure."""
    try:
        load_case_text(text, file="x.toml")
        return
    except InputError as error:
        shown, line = str(error), error.line
    assert shown.startswith("x.toml")
    assert all(part.isprintable() for part in shown.split("\n"))
    assert line is None or 1 <= line <= text.count("\n") + 1


@settings(max_examples=300)
@given(st.binary(max_size=200))
def test_random_bytes_give_nothing_but_input_errors(
    tmp_path_factory: pytest.TempPathFactory, content: bytes
) -> None:
    path = tmp_path_factory.getbasetemp() / "random.toml"
    path.write_bytes(content)
    try:
        text = read_toml(path).text
    except InputError:
        return
    outcome(text)


PIECES = ["true", "nan", "-1", "1e400", '""', '"x"', "[]", "{}", "[1]", "2031-03-20", "0",
          "07:00:00", "[[]]", "{a = 1}", "9" * 30, '"/"', '".toml"', '"../a.toml"', '"\\u0000/"',
          "1e-320", "1e308", "0x" + "f" * 300, '"structure"', "2031-03-20T00:00:00Z",
          "false"]  # fmt: skip


@pytest.mark.parametrize("seed", range(400))
def test_mutations_of_a_case_give_nothing_but_input_errors(seed: int) -> None:
    draw = random.Random(seed)
    rows = CASE_TEMPLATE.replace("# [[l", "[[l").replace("\n# ", "\n").split("\n")
    for _ in range(draw.randint(1, 4)):
        place = draw.randrange(len(rows))
        row = rows[place]
        match draw.randrange(7):
            case 0:
                del rows[place]
            case 1:
                rows.insert(place, draw.choice(rows))
            case 2 | 3 if "=" in row:
                rows[place] = f"{row.split('=')[0]}= {draw.choice(PIECES)}"
            case 4 if row:
                cut = draw.randrange(len(row))
                rows[place] = row[:cut] + chr(draw.randrange(1, 300)) + row[cut + 1 :]
            case 5 if "_" in row:
                rows[place] = row.replace("_", "", 1)
            case _:
                rows[place] = draw.choice(["[time]", "[[surface]]", "[orbit.x]", "x = 1", "=", "'"])
    outcome("\n".join(rows))


@pytest.mark.parametrize("piece", PIECES)
def test_every_value_replaced_by_every_piece(piece: str) -> None:
    rows = CASE_TEMPLATE.split("\n")
    for place, row in enumerate(rows):
        if "=" in row and not row.startswith("#"):
            changed = [*rows[:place], f"{row.split('=')[0]}= {piece}", *rows[place + 1 :]]
            outcome("\n".join(changed))


@given(st.text(max_size=30), st.sampled_from(sorted(UNITS)))
def test_any_text_is_a_quantity_or_a_value_error(text: str, kind: str) -> None:
    try:
        value = parse_quantity(text, kind)
    except ValueError:
        return
    assert math.isfinite(value)


@given(st.floats(1e-30, 1e30), st.sampled_from(sorted(UNITS)), st.data())
def test_quantities_scale_with_their_unit(number: float, kind: str, data: st.DataObject) -> None:
    unit = data.draw(st.sampled_from(sorted(set(UNITS[kind]) - {"degC"})))
    expected = number * float(UNITS[kind][unit])
    assert parse_quantity(f"{number!r} {unit}", kind) == pytest.approx(expected, rel=1e-15)
