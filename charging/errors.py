"""What can go wrong, as exceptions that carry the data of the failure.

One root, :class:`HalflitError`; the command line prints ``error: `` and its text. Nothing heavy
is imported here.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TypeAlias

KeyPath: TypeAlias = tuple[str | int, ...]
"""Way to a value in a file: table names, array indices from 0, keys."""

_INDENT = "\n       "  # puts the second line under the first one's text, after "error: "
_LONGEST = 1500  # characters of a sentence; names from a file cannot flood a terminal


class HalflitError(Exception):
    """Root of everything this program reports instead of a result."""


class InputError(HalflitError):
    r"""A file, name or number given by a person cannot be used.

    Parameters
    ----------
    message : str
        The problem in one sentence, without file, line and closing full stop.
    file : str, optional
        File as the person named it.
    line : int, optional
        Line in it, from 1.
    key : tuple of str and int, optional
        Way to the value inside the file, ``("surface", 2, "material")``.
    value : object, optional
        What stood there.
    allowed : str, optional
        What may stand there, in words.
    nearest : str, optional
        The nearest valid name.
    next_step : str, optional
        What to do or to run next.
    more : int, optional
        How many further problems the same file holds.

    Examples
    --------
    >>> print(InputError('surface "aft blanket": material = "polyimid" is unknown',
    ...                  file="cases/geo_day.toml", line=41, nearest="polyimide film",
    ...                  next_step="All names: halflit materials"))
    cases/geo_day.toml:41: surface "aft blanket": material = "polyimid" is unknown.
           Nearest: "polyimide film". All names: halflit materials
    """

    def __init__(
        self,
        message: str,
        *,
        file: str | None = None,
        line: int | None = None,
        key: KeyPath = (),
        value: object = None,
        allowed: str | None = None,
        nearest: str | None = None,
        next_step: str | None = None,
        more: int = 0,
    ) -> None:
        super().__init__(message)
        self.message = message
        self.file = file
        self.line = line
        self.key = key
        self.value = value
        self.allowed = allowed
        self.nearest = nearest
        self.next_step = next_step
        self.more = more

    def __str__(self) -> str:
        place = "" if self.file is None else printable(self.file)
        if place and self.line is not None:
            place += f":{self.line}"
        message = printable(self.message, _LONGEST)
        first = f"{place}: {message}" if place else message
        if not first.endswith((".", "?", "!")):
            first += "."
        second = []
        if self.nearest is not None:
            second.append(f'Nearest: "{printable(self.nearest)}".')
        if self.allowed is not None:
            second.append(f"Allowed: {printable(self.allowed, _LONGEST)}.")
        if self.next_step is not None:
            second.append(printable(self.next_step, _LONGEST))
        text = first
        if second:
            text += _INDENT + " ".join(second)
        if self.more:
            text += f"{_INDENT}(and {self.more} more)"
        return text


class NoSolutionError(HalflitError):
    """The equations were set up but no solution was found.

    Parameters
    ----------
    message : str
        What was looked for and how the search ended, one sentence without closing full stop.
    time : str, optional
        Moment of the run, UTC, ISO with Z.
    surface : str, optional
        Surface concerned.
    next_step : str, optional
        What to try, for example a command that isolates the case.

    Examples
    --------
    >>> print(NoSolutionError('no step at 2031-03-20T00:41:07Z: surface "aft blanket" jumps',
    ...                       next_step="Try: halflit point"))
    no step at 2031-03-20T00:41:07Z: surface "aft blanket" jumps.
           Try: halflit point
    """

    def __init__(
        self,
        message: str,
        *,
        time: str | None = None,
        surface: str | None = None,
        next_step: str | None = None,
    ) -> None:
        super().__init__(message)
        self.message = message
        self.time = time
        self.surface = surface
        self.next_step = next_step

    def __str__(self) -> str:
        message = printable(self.message, _LONGEST)
        first = message if message.endswith(".") else f"{message}."
        if self.next_step is None:
            return first
        return f"{first}{_INDENT}{printable(self.next_step, _LONGEST)}"


@dataclass(frozen=True, slots=True)
class Problem:
    """One fault of a document, before file and line are known.

    Attributes
    ----------
    key : tuple of str and int
        Way to the value, relative to the table that found the fault.
    message : str
        What is wrong, to follow ``key = value``, or a whole sentence if ``sentence``.
    value : object
        What stood there.
    missing : bool
        The key is absent; `value` means nothing.
    sentence : bool
        `message` needs no ``key = value`` before it.
    allowed, nearest, next_step : str, optional
        As in :class:`InputError`.
    """

    key: KeyPath
    message: str
    value: object = None
    missing: bool = False
    sentence: bool = False
    allowed: str | None = None
    nearest: str | None = None
    next_step: str | None = None


class ProblemsFound(ValueError):  # noqa: N818 - carries faults to the reader, never shown itself
    """Raised inside a table's validation; the reader adds file and line to each problem."""

    def __init__(self, problems: Sequence[Problem]) -> None:
        super().__init__(*problems)
        self.problems = tuple(problems)

    def __str__(self) -> str:
        return "; ".join(
            problem.message
            if problem.sentence
            else f"{'.'.join(map(str, problem.key))} {problem.message}"
            for problem in self.problems
        )


def printable(text: str, limit: int = 120) -> str:
    r"""Return `text` on one line: control characters escaped, long text cut.

    Examples
    --------
    >>> printable("two\nlines")
    'two\\nlines'
    """
    shown = "".join(
        character if character.isprintable() else character.encode("unicode_escape").decode("ascii")
        for character in text[: limit + 1]
    )
    return shown if len(text) <= limit else f"{shown[:limit]}…"
