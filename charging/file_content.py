"""The bytes of a file that a person named, never more than asked for and never without end."""

from __future__ import annotations

import stat
from pathlib import Path

from charging.errors import InputError


def bytes_of(path: Path, file: str, most: int, *, absent: str | None = None) -> bytes:
    """Return the content of an ordinary file.

    Parameters
    ----------
    path : Path
        Where it is.
    file : str
        How messages call it.
    most : int
        Bytes allowed.
    absent : str, optional
        What to do where there is no such file.

    Raises
    ------
    InputError
        Missing, a folder, a pipe or device, unreadable, too large.
    """
    try:
        mode = path.stat().st_mode
        if stat.S_ISDIR(mode):
            raise InputError("this is a folder, not a file", file=file)
        if not stat.S_ISREG(mode):  # a pipe or device might never end
            raise InputError("this is no ordinary file", file=file)
        with path.open("rb") as stream:
            content = stream.read(most + 1)
    except FileNotFoundError:
        raise InputError("there is no such file", file=file, next_step=absent) from None
    except (OSError, ValueError, RuntimeError) as error:
        reason = getattr(error, "strerror", None) or "not a usable path"
        raise InputError(f"cannot be read: {reason.lower()}", file=file) from None
    if len(content) > most:
        raise InputError(
            "the file is too large", file=file, allowed=f"up to {most // 1_000_000} MB"
        )
    return content
