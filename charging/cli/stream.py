"""Standard output that survives a reader who has gone."""

from __future__ import annotations

import os
from typing import Any, TextIO


class PipeProof:
    """A text stream whose broken pipe is silent, so that the exit code stays the command's own.

    Everything but `write` and `flush` is the wrapped stream's.
    """

    def __init__(self, stream: TextIO) -> None:
        self._stream = stream

    def write(self, text: str) -> int:
        """Write; after the reader has gone, into nothing."""
        try:
            return self._stream.write(text)
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
