"""At which line of a TOML text each key and each array element stands.

The standard reader of TOML forgets the lines; messages need them. The text must be valid TOML
(read it with :mod:`tomllib` first): this scanner follows its structure, it does not judge it.
"""

from __future__ import annotations

import re
from bisect import bisect_right

from charging.errors import KeyPath

_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")
_SCALAR = re.compile(r"[^,\]}#\n]*")  # numbers, dates, booleans: up to what may follow a value
_BASIC_STRING = re.compile(r'"(?:[^"\\\n]|\\.)*"')
_LITERAL_STRING = re.compile(r"'[^'\n]*'")
_LONG_BASIC_STRING = re.compile(r'"""(?:[^"\\]|\\.|"{1,2}(?!"))*+"{3,5}', re.DOTALL)
_LONG_LITERAL_STRING = re.compile(r"'''(?:[^']|'{1,2}(?!'))*+'{3,5}")
_ESCAPE = re.compile(r"\\(?:u([0-9A-Fa-f]{4})|U([0-9A-Fa-f]{8})|x([0-9A-Fa-f]{2})|(.))")
_SHORT_ESCAPES = {"b": "\b", "t": "\t", "n": "\n", "f": "\f", "r": "\r", "e": "\x1b"}


def index(text: str) -> dict[KeyPath, int]:
    r"""Return the line, from 1, of every key and array element of a TOML text.

    Parameters
    ----------
    text : str
        Valid TOML.

    Returns
    -------
    dict
        Way to the value (table names, keys, indices from 0) to line. A table stands at its
        header, or where it is first named if it has none.

    Raises
    ------
    ValueError
        The text is no TOML and cannot be followed; the message names the line.

    Examples
    --------
    >>> index('title = "x"\n[[surface]]\nnormal = [\n  0,\n  1]\n')[("surface", 0, "normal", 1)]
    5
    """
    scanner = _Scanner(text.replace("\r\n", "\n"))
    scanner.document()
    return scanner.lines


def line_of(lines: dict[KeyPath, int], key: KeyPath) -> int | None:
    """Return the line of `key`, else of the innermost table around it that has one.

    Examples
    --------
    >>> line_of({("body",): 4}, ("body", "radius_m"))
    4
    """
    for length in range(len(key), 0, -1):
        if key[:length] in lines:
            return lines[key[:length]]
    return None


class _Scanner:
    def __init__(self, text: str) -> None:
        self.text = text
        self.position = 0
        self.lines: dict[KeyPath, int] = {}
        self._tables_in_array: dict[KeyPath, int] = {}
        self._breaks = [match.start() for match in re.finditer("\n", text)]

    def document(self) -> None:
        table: KeyPath = ()
        self._skip_blank()
        while self.position < len(self.text):
            if self.text.startswith("[", self.position):
                table = self._header()
            else:
                self._pair(table)
            self._skip_blank()

    def _line(self) -> int:
        return bisect_right(self._breaks, self.position - 1) + 1

    def _fail(self) -> ValueError:
        return ValueError(f"line {self._line()}: this is no TOML")

    def _peek(self) -> str:
        return self.text[self.position : self.position + 1]

    def _take(self, wanted: str) -> None:
        if not self.text.startswith(wanted, self.position):
            raise self._fail()
        self.position += len(wanted)

    def _match(self, pattern: re.Pattern[str]) -> str:
        match = pattern.match(self.text, self.position)
        if match is None:
            raise self._fail()
        self.position = match.end()
        return match.group()

    def _skip_space(self) -> None:
        while self._peek() in (" ", "\t"):
            self.position += 1

    def _skip_blank(self) -> None:
        """Skip spaces, line ends and comments."""
        while character := self._peek():
            if character == "#":
                end = self.text.find("\n", self.position)
                self.position = len(self.text) if end < 0 else end
            elif character in " \t\n":
                self.position += 1
            else:
                return

    def _header(self) -> KeyPath:
        line = self._line()
        in_array = self.text.startswith("[[", self.position)
        self._take("[[" if in_array else "[")
        parts = self._key()
        self._take("]]" if in_array else "]")
        table: KeyPath = ()
        for part in parts[:-1]:
            table = (*table, part)
            self.lines.setdefault(table, line)
            if table in self._tables_in_array:  # a header speaks of the array's last table
                table = (*table, self._tables_in_array[table] - 1)
        table = (*table, parts[-1])
        if not in_array:
            self.lines[table] = line
            return table
        self.lines.setdefault(table, line)
        count = self._tables_in_array.get(table, 0)
        self._tables_in_array[table] = count + 1
        table = (*table, count)
        self.lines[table] = line
        return table

    def _pair(self, table: KeyPath) -> None:
        line = self._line()
        for part in self._key():
            table = (*table, part)
            self.lines.setdefault(table, line)
        self._take("=")
        self._skip_space()
        self._value(table)

    def _key(self) -> list[str]:
        parts = []
        while True:
            self._skip_space()
            parts.append(self._key_part())
            self._skip_space()
            if self._peek() != ".":
                return parts
            self.position += 1

    def _key_part(self) -> str:
        if self._peek() == '"':
            return _ESCAPE.sub(_unescaped, self._match(_BASIC_STRING)[1:-1])
        if self._peek() == "'":
            return self._match(_LITERAL_STRING)[1:-1]
        return self._match(_BARE_KEY)

    def _value(self, path: KeyPath) -> None:
        for opening, pattern in (
            ('"""', _LONG_BASIC_STRING),
            ("'''", _LONG_LITERAL_STRING),
            ('"', _BASIC_STRING),
            ("'", _LITERAL_STRING),
        ):
            if self.text.startswith(opening, self.position):
                self._match(pattern)
                return
        if self._peek() == "[":
            self._array(path)
        elif self._peek() == "{":
            self._inline_table(path)
        elif not self._match(_SCALAR).strip():
            raise self._fail()

    def _array(self, path: KeyPath) -> None:
        self._take("[")
        self._skip_blank()
        count = 0
        while self._peek() != "]":
            element = (*path, count)
            self.lines[element] = self._line()
            self._value(element)
            count += 1
            self._skip_blank()
            if self._peek() != "]":
                self._take(",")
                self._skip_blank()
        self._take("]")

    def _inline_table(self, path: KeyPath) -> None:
        self._take("{")
        self._skip_blank()
        while self._peek() != "}":
            self._pair(path)
            self._skip_blank()
            if self._peek() != "}":
                self._take(",")
                self._skip_blank()
        self._take("}")


def _unescaped(match: re.Match[str]) -> str:
    code = match.group(1) or match.group(2) or match.group(3)
    if code is not None:
        return chr(int(code, 16))
    return _SHORT_ESCAPES.get(match.group(4), match.group(4))
