"""Printing: aligned tables, JSON with null for what is not a number, and times."""

from __future__ import annotations

import json
from collections.abc import Sequence

from charging.clock import iso_time
from charging.errors import printable

__all__ = ["iso_time", "one_line", "print_json", "print_table", "volts"]


def print_json(value: object) -> None:
    """Print indented JSON; refuses nan and inf, which are null by then."""
    print(json.dumps(value, indent=2, ensure_ascii=False, allow_nan=False))


def one_line(text: str) -> str:
    r"""Free text of a file on one line: it cannot pass for a line of ours.

    Examples
    --------
    >>> print(one_line("Two\nVerdict: within"))
    Two\nVerdict: within
    """
    return printable(text, 200)


def print_table(rows: Sequence[Sequence[str]], head: Sequence[str], right: str) -> None:
    """Print an aligned table.

    Parameters
    ----------
    rows : sequence of rows of text
    head : sequence of str
        Column titles; a line break starts a second title line.
    right : str
        One letter per column: "r" right-aligned, "l" left-aligned.
    """
    titles = [title.split("\n") for title in head]
    depth = max(len(title) for title in titles)
    lines = [
        [title[level] if level < len(title) else "" for title in titles] for level in range(depth)
    ]
    widths = [max(len(cell) for cell in column) for column in zip(*lines, *rows, strict=True)]
    for line in (*lines, ["-" * width for width in widths], *rows):
        cells = [
            cell.rjust(width) if side == "r" else cell.ljust(width)
            for cell, width, side in zip(line, widths, right, strict=True)
        ]
        print("  ".join(cells).rstrip())


def volts(value: float) -> str:
    """Volts with a sign and three significant digits or whole volts.

    Examples
    --------
    >>> volts(-1234.56), volts(3.14159), volts(0.0)
    ('-1235', '+3.14', '0')
    """
    if value == 0.0:
        return "0"
    return f"{value:+.0f}" if abs(value) >= 100.0 else f"{value:+.3g}"
