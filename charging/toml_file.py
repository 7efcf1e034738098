"""A TOML file or text, read with care: whatever it holds, the answer is a document or an error."""

from __future__ import annotations

import re
import tomllib
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from charging import toml_lines
from charging.errors import InputError, KeyPath, printable
from charging.file_content import bytes_of

LARGEST_FILE_BYTES = 1_000_000
_MOST_DOTS_IN_KEY = 200  # far beyond use; the reader's time grows with their square
_DEEPEST = 20  # levels of tables and arrays; far beyond use


@dataclass(frozen=True, slots=True)
class TomlFile:
    """A parsed text: its document, the name to call it by, and the line of every key."""

    file: str
    text: str
    document: dict[str, Any]
    lines: dict[KeyPath, int]


def read_toml(path: Path, *, file: str | None = None, absent: str | None = None) -> TomlFile:
    """Return the document of a TOML file.

    Parameters
    ----------
    path : Path
        Where it is.
    file : str, optional
        How messages call it; default: the path as given.
    absent : str, optional
        What to do where there is no such file.

    Raises
    ------
    InputError
        Missing, no file, unreadable, above 1 MB, no UTF-8 or no TOML.
    """
    file = str(path) if file is None else file
    return parse_toml(
        _decoded(bytes_of(path, file, LARGEST_FILE_BYTES, absent=absent), file), file=file
    )


def parse_toml(text: str, *, file: str) -> TomlFile:
    """Return the document of a TOML text; see `read_toml`."""
    content = text.removeprefix("\ufeff")  # byte order mark of some editors
    dots = max(part.count(".") for part in re.split(r"[=,{}\[\]#\n]", content))
    if dots > _MOST_DOTS_IN_KEY:
        raise InputError("a key has too many parts", file=file, allowed=f"{_MOST_DOTS_IN_KEY} dots")
    too_deep = InputError(
        "tables or arrays are nested too deeply", file=file, allowed=f"{_DEEPEST} levels"
    )
    try:
        document = tomllib.loads(content)
    except RecursionError:
        raise too_deep from None
    except ValueError as error:  # also numbers and dates beyond Python's range
        raise _syntax_error(str(error), content, file) from None
    if _depth(document) > _DEEPEST:
        raise too_deep
    return TomlFile(file=file, text=text, document=document, lines=toml_lines.index(content))


def _depth(value: object) -> int:
    """Return how many tables and arrays stand inside each other, counted up to `_DEEPEST` + 1."""
    level, inside = 0, [value]
    while inside and level <= _DEEPEST:
        level += 1
        inside = [
            child
            for entry in inside
            if isinstance(entry, dict | list)
            for child in (entry.values() if isinstance(entry, dict) else entry)
            if isinstance(child, dict | list)
        ]
    return level


def _decoded(content: bytes, file: str) -> str:
    try:
        return content.decode("utf-8")
    except UnicodeDecodeError as error:
        raise InputError(
            f"byte 0x{content[error.start]:02x} is not UTF-8 text",
            file=file,
            line=content.count(b"\n", 0, error.start) + 1,
            next_step="Save the file as UTF-8.",
        ) from None


def _syntax_error(message: str, content: str, file: str) -> InputError:
    line: int | None = None
    column = ""
    place = re.search(r" ?\(at (?:line (\d+), column (\d+)|end of document)\)", message)
    problem = message if place is None else message[: place.start()]
    if place is not None and place.group(1):
        line, column = int(place.group(1)), f", column {place.group(2)}"
    elif place is not None:
        line = content.rstrip().count("\n") + 1
        column = ", at the end of the file"
    if "Exceeds the limit" in problem:
        problem = "a number has too many digits"
    problem = printable(problem[:1].lower() + problem[1:])
    return InputError(f"this is no TOML: {problem}{column}", file=file, line=line)
