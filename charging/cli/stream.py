"""Standard output that survives a reader who has gone, and tells a terminal nothing but text."""

from __future__ import annotations

import os
import re
import unicodedata
from typing import Any, TextIO

_COLOUR = re.compile(r"\x1b\[[0-9;]*m")  # of help pages
_JOINERS = "\u200c\u200d"  # letters of some scripts


def harmless(text: str) -> str:
    r"""Text without what a terminal obeys: controls, overrides of direction, lone surrogates.

    Line ends, tabs and colours stay. The escapes are those of JSON, so that printed JSON
    keeps its meaning.

    Examples
    --------
    >>> harmless("a\u009b2Jb\n")
    'a\\u009b2Jb\n'
    """
    if text.isascii() and not _CONTROL.search(text):
        return text
    plain = (_spelt(part) for part in _COLOUR.split(text))
    colours = _COLOUR.findall(text)
    return "".join(part + colour for part, colour in zip(plain, [*colours, ""], strict=True))


_CONTROL = re.compile(r"[\x00-\x08\x0b-\x1f\x7f]")


def _spelt(text: str) -> str:
    return "".join(
        "".join(f"\\u{unit:04x}" for unit in _units(c))
        if c not in "\n\t"
        and c not in _JOINERS
        and unicodedata.category(c) in {"Cc", "Cf", "Cs", "Zl", "Zp"}
        else c
        for c in text
    )


def _units(character: str) -> list[int]:
    data = character.encode("utf-16-be", errors="surrogatepass")
    return [int.from_bytes(data[k : k + 2]) for k in range(0, len(data), 2)]


class PipeProof:
    """A text stream whose broken pipe is silent, so that the exit code stays the command's own.

    Everything but `write` and `flush` is the wrapped stream's.
    """

    def __init__(self, stream: TextIO) -> None:
        self._stream = stream

    def write(self, text: str) -> int:
        """Write; after the reader has gone, into nothing."""
        try:
            self._stream.write(harmless(text))
            return len(text)
        except BrokenPipeError:
            self._silence()
            return len(text)

    def flush(self) -> None:
        """Flush; after the reader has gone, into nothing."""
        try:
            self._stream.flush()
        except BrokenPipeError:
            self._silence()

    def _silence(self) -> None:
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, self._stream.fileno())
        os.close(nowhere)

    def __getattr__(self, name: str) -> Any:
        return getattr(self._stream, name)
