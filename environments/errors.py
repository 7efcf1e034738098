"""The error raised for bad environment data."""

import difflib
from collections.abc import Iterable


class EnvironmentDataError(ValueError):
    """A record of an environment (plasma, orbit, spectrum) that cannot be used.

    Parameters
    ----------
    problem : str
        What is wrong, as a short clause ("is unknown", "must be a number").
    key : tuple of str or int, optional
        Path of the key in the document, such as ``("population", 0, "law")``.
    value : object, optional
        The refused value; None when the key is absent.
    allowed : str, optional
        What would be accepted.
    nearest : str, optional
        The nearest accepted name.
    file, line : str and int, optional
        Where it stands, when a reader of files knows; lines count from 1.

    Attributes
    ----------
    key, value, problem, allowed, nearest, file, line
        As given. ``str()`` is one line; a caller that knows file and line adds them.

    Examples
    --------
    >>> print(EnvironmentDataError("is unknown", key=("population", 0, "law"), value="kapa"))
    population[0].law = "kapa" is unknown
    >>> print(EnvironmentDataError("ends early", file="a.oem", line=12))
    a.oem:12: ends early
    """

    def __init__(
        self,
        problem: str,
        *,
        key: tuple[str | int, ...] = (),
        value: object = None,
        allowed: str | None = None,
        nearest: str | None = None,
        file: str | None = None,
        line: int | None = None,
    ) -> None:
        self.key = key
        self.value = value
        self.problem = problem
        self.allowed = allowed
        self.nearest = nearest
        self.file = file
        self.line = line
        super().__init__(self._line())

    def _line(self) -> str:
        parts = [_path_text(self.key)] if self.key else []
        if self.value is not None:
            parts += ["=", _value_text(self.value)] if self.key else [_value_text(self.value)]
        parts.append(self.problem)
        line = " ".join(parts)
        if self.allowed is not None:
            line += f"; allowed: {self.allowed}"
        if self.nearest:
            line += f"; nearest: {_value_text(self.nearest)}"
        line = _on_one_line(line)
        if self.file is None and self.line is None:
            return line
        place = f"line {self.line}" if self.file is None else _on_one_line(self.file)
        if self.file is not None and self.line is not None:
            place += f":{self.line}"
        return f"{place}: {line}"

    def below(self, *prefix: str | int) -> "EnvironmentDataError":
        """Return the same error with its key placed below `prefix`."""
        return EnvironmentDataError(
            self.problem,
            key=(*prefix, *self.key),
            value=self.value,
            allowed=self.allowed,
            nearest=self.nearest,
            file=self.file,
            line=self.line,
        )


def nearest_name(name: object, names: Iterable[str]) -> str | None:
    """Return the accepted name that looks most like `name`, or None.

    Examples
    --------
    >>> nearest_name("maxwelian", ["maxwellian", "kappa"])
    'maxwellian'
    """
    by_lower = {known.lower(): known for known in names}
    found = difflib.get_close_matches(str(name).lower(), list(by_lower), n=1, cutoff=0.5)
    return by_lower[found[0]] if found else None


def _path_text(key: tuple[str | int, ...]) -> str:
    text = ""
    for part in key:
        text += f"[{part}]" if isinstance(part, int) else f".{part}" if text else part
    return text


def _on_one_line(text: str) -> str:
    """Text without what a terminal would obey, whatever a file held."""
    shown = "".join(
        c if c.isprintable() else c.encode("unicode_escape").decode() for c in text[:1500]
    )
    return shown if len(text) <= 1500 else f"{shown}…"


def _value_text(value: object) -> str:
    if isinstance(value, bool):
        return str(value).lower()
    try:
        text = value if isinstance(value, str) else repr(value)
    except ValueError:  # an integer too long to print
        text = type(value).__name__
    # one line, whatever the file held
    text = "".join(ch if ch.isprintable() else ch.encode("unicode_escape").decode() for ch in text)
    if len(text) > 80:
        text = text[:77] + "..."
    return f'"{text}"' if isinstance(value, str) else text
