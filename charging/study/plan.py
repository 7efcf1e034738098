"""Study files: what a study varies, draws and searches, read and checked as a whole.

Nothing wrong leaves this module but `InputError`, with file, line, key and value.
"""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, Literal, Self, TypeAlias

from pydantic import AfterValidator, Field, ValidationError, model_validator
from pydantic_core import PydanticCustomError

from charging.case import LoadedCase, load_case
from charging.case_types import FreeText, Name, Table
from charging.case_values import nearest_name
from charging.errors import InputError, KeyPath, Problem, ProblemsFound
from charging.study.choices import Choice, choices_of
from charging.study.targets import Target, number_target, target
from charging.toml_file import TomlFile, read_toml
from charging.toml_lines import line_of

MOST_MEMBERS, MOST_HISTORIES = 200_000, 10_000
"""Members of a study, and of one that keeps histories: their results fit into 1 GB."""

MOST_CHOICES = 4096
Scalar: TypeAlias = str | float | int | bool


def _case_file(value: str) -> str:
    if not value.endswith(".toml"):
        raise PydanticCustomError("case_file", "is no case file; allowed: a name ending in .toml")
    return value


class Vary(Table):
    """One thing that varies: some values, or a range to draw from."""

    path: str | tuple[str, ...] = Field(description="what varies; several paths vary as one")
    values: tuple[Scalar, ...] | None = Field(
        default=None, min_length=1, max_length=1000, description="each is a choice"
    )
    low: float | None = Field(default=None, description="a range is drawn from, with high")
    high: float | None = None
    law: Literal["uniform", "log_uniform"] = "uniform"

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        _check_range(self.values is None, self.low, self.high, self.law)
        if self.values is not None and len(set(self.values)) < len(self.values):
            raise PydanticCustomError("values", "names a value twice")
        return self

    @property
    def paths(self) -> tuple[str, ...]:
        """Paths, one or several."""
        return (self.path,) if isinstance(self.path, str) else self.path


class Search(Table):
    """One number that the search for the worst case may choose within bounds."""

    path: str
    low: float
    high: float
    law: Literal["uniform", "log_uniform"] = "uniform"
    source: FreeText | None = Field(default=None, description="where the bounds were published")

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        _check_range(True, self.low, self.high, self.law)
        return self


class Indices(Table):
    """Sobol indices of the strongest factors."""

    factors: int = Field(default=8, ge=1, le=8, description="so many, screened from the draws")
    base: int = Field(default=64, ge=16, le=65536, description="points; members: base (factors+2)")


class WorstCase(Table):
    """Search for the worst case."""

    starts: int = Field(default=16, ge=1, le=1024, description="starting points")
    evaluations: int = Field(default=2000, ge=10, le=1_000_000, description="members at most")


class StudyFile(Table):
    """A whole study file."""

    title: FreeText
    case: Annotated[str, AfterValidator(_case_file)]
    seed: int = Field(ge=0, le=2**63 - 1)
    members: int = Field(default=1, ge=1, le=MOST_MEMBERS, description="draws per choice")
    draw: Literal["spreads"] | None = Field(
        default=None, description="spreads: every property of every material within its spread"
    )
    surfaces: tuple[Name, ...] | None = Field(
        default=None, description="limits of these alone are judged; default: all limits"
    )
    age: Literal["begin", "end"] = Field(default="begin", description="of the surfaces")
    method: Literal["sobol", "latin hypercube"] = "sobol"
    replicates: int = Field(
        default=16, ge=2, le=1024, description="independent scrambles, for the intervals"
    )
    confidence: float = Field(default=0.95, gt=0.5, lt=1.0)
    histories: bool = Field(default=False, description="keep differentials along the run")
    vary: tuple[Vary, ...] = Field(default=(), max_length=64)
    search: tuple[Search, ...] = Field(default=(), max_length=32)
    worst_case: WorstCase | None = None
    indices: Indices | None = None


@dataclass(frozen=True, slots=True)
class Range:
    """A number drawn or searched between two bounds.

    Attributes
    ----------
    target : Target
    low, high : float
    law : str
        "uniform" or "log_uniform".
    """

    target: Target
    low: float
    high: float
    law: str


@dataclass(frozen=True, slots=True)
class Plan:
    """A checked study.

    Attributes
    ----------
    file : StudyFile
    path : Path
    text, sha256 : str
        Of the study file.
    loaded : LoadedCase
        The case as it stands.
    choices : tuple of Choice
        Every combination of values, checked; one without values.
    ranges : tuple of Range
        Drawn numbers.
    searched : tuple of Range
        Numbers of the worst-case search.
    """

    file: StudyFile
    path: Path
    text: str
    sha256: str
    loaded: LoadedCase
    choices: tuple[Choice, ...]
    ranges: tuple[Range, ...]
    searched: tuple[Range, ...]

    @property
    def members(self) -> int:
        """Members of all choices."""
        return len(self.choices) * self.draws

    @property
    def draws(self) -> int:
        """Members of one choice."""
        drawn = self.file.draw is not None or bool(self.ranges)
        return self.file.members if drawn else 1


def load_study(path: str | Path, *, allow_outside: bool = False) -> Plan:
    """Read a study file, its case, and check every member before anything is solved.

    Parameters
    ----------
    path : str or Path
        Up to 1 MB of UTF-8 TOML. Its case lies in the same folder unless `allow_outside`.
    allow_outside : bool, optional

    Raises
    ------
    InputError
        Anything that cannot be used, in the study, its case or a choice.
    """
    path = Path(path)
    toml = read_toml(path)
    file = _checked(toml)
    loaded = load_case(_beside(toml, path, file, allow_outside), allow_outside=allow_outside)
    grid: list[tuple[tuple[Target, ...], tuple[Scalar, ...]]] = []
    ranges, searched = [], []
    _check_repeated(toml, "vary", [vary.paths for vary in file.vary])
    _check_repeated(toml, "search", [(wanted.path,) for wanted in file.search])
    for index, vary in enumerate(file.vary):
        key = ("vary", index, "path")
        if vary.values is not None:
            found = tuple(_at(toml, key, vary.path, target, p, loaded) for p in vary.paths)
            grid.append((found, vary.values))
        else:
            for one in vary.paths:
                found_number = _at(toml, key, vary.path, number_target, one, loaded)
                ranges.append(_range(toml, index, "vary", found_number, vary))
    for index, wanted in enumerate(file.search):
        key = ("search", index, "path")
        number = _at(toml, key, wanted.path, number_target, wanted.path, loaded)
        searched.append(_range(toml, index, "search", number, wanted))
    for index, name in enumerate(file.surfaces or ()):
        if name not in loaded.case.names:
            raise _error(
                toml, ("surfaces", index), "is no surface of the case", name,
                allowed=", ".join(loaded.case.names),
            )  # fmt: skip
    if file.worst_case is not None and not searched:
        raise _error(toml, ("worst_case",), "has nothing to search", None,
                     allowed="at least one [[search]] with path, low and high")  # fmt: skip
    count = 1
    for _, values in grid:
        count *= len(values)
    most = MOST_HISTORIES if file.histories else MOST_MEMBERS
    if count > MOST_CHOICES or count * file.members > most:
        with_histories = " with histories" if file.histories else ""
        raise _error(
            toml, ("vary",) if file.vary else ("members",),
            f"makes {count} choices of {file.members} members{with_histories}", None,
            allowed=f"{MOST_CHOICES} choices, {most} members in all{with_histories}",
        )  # fmt: skip
    return Plan(
        file=file,
        path=path,
        text=toml.text,
        sha256=hashlib.sha256(toml.text.encode("utf-8")).hexdigest(),
        loaded=loaded,
        choices=choices_of(loaded, grid, allow_outside=allow_outside),
        ranges=tuple(ranges),
        searched=tuple(searched),
    )


def _check_repeated(toml: TomlFile, table: str, paths: Sequence[tuple[str, ...]]) -> None:
    """Refuse a path that varies twice."""
    seen: set[str] = set()
    for index, row in enumerate(paths):
        for path in row:
            if path in seen:
                raise _error(toml, (table, index, "path"), "stands there twice", path,
                             allowed="every path once")  # fmt: skip
            seen.add(path)


def _check_range(needed: bool, low: float | None, high: float | None, law: str) -> None:
    given = (low is not None) + (high is not None)
    if needed and given != 2:
        raise PydanticCustomError("range", "needs values, or low and high")
    if not needed and given:
        raise PydanticCustomError("range", "has values and a range; give one of them")
    if low is None or high is None:
        return
    if not low < high:
        raise PydanticCustomError("range", "low is not below high")
    if law == "log_uniform" and low <= 0.0:
        raise PydanticCustomError("range", "a logarithmic range begins above 0")


def _checked(toml: TomlFile) -> StudyFile:
    try:
        return StudyFile.model_validate(_frozen(toml.document))
    except ValidationError as error:
        detail = error.errors(include_url=False)
        first = detail[0]
        key = tuple(first["loc"])
        known = {"extra_forbidden": "is not known here", "missing": "is missing"}
        problem = known.get(first["type"], first["msg"][:1].lower() + first["msg"][1:])
        near = None
        if first["type"] == "extra_forbidden":
            near = nearest_name(str(key[-1]), _keys_at(key))
        raise InputError(
            f"{_dotted(key)} {problem}",
            file=toml.file,
            line=line_of(toml.lines, key),
            key=key,
            value=first.get("input"),
            nearest=near,
            more=len(detail) - 1,
        ) from None


def _frozen(value: object) -> object:
    """Arrays as tuples, which strict validation asks for."""
    if isinstance(value, dict):
        return {key: _frozen(entry) for key, entry in value.items()}
    return tuple(map(_frozen, value)) if isinstance(value, list) else value


def _keys_at(key: KeyPath) -> list[str]:
    tables: Mapping[str, type[Table]] = {
        "vary": Vary, "search": Search, "indices": Indices, "worst_case": WorstCase,
    }  # fmt: skip
    table = tables.get(str(key[0]), StudyFile) if len(key) > 1 else StudyFile
    return list(table.model_fields)


def _dotted(key: KeyPath) -> str:
    parts = [f"[{part + 1}]" if isinstance(part, int) else f".{part}" for part in key]
    return "".join(parts).removeprefix(".")


def _beside(toml: TomlFile, path: Path, file: StudyFile, allow_outside: bool) -> Path:
    found = path.parent / file.case
    if not allow_outside and path.parent.resolve() not in found.resolve().parents:
        raise _error(
            toml, ("case",), "lies outside the folder of the study", file.case,
            allowed="a file in that folder, or --allow-outside",
        )  # fmt: skip
    return found


def _at(
    toml: TomlFile,
    key: KeyPath,
    value: object,
    find: Callable[[str, LoadedCase], Target],
    path: str,
    loaded: LoadedCase,
) -> Target:
    try:
        found = find(path, loaded)
    except ProblemsFound as error:
        fault: Problem = error.problems[0]
        raise InputError(
            f'{_dotted(key)} = "{path}" {fault.message}',
            file=toml.file,
            line=line_of(toml.lines, key),
            key=key,
            value=value,
            allowed=fault.allowed,
            nearest=fault.nearest,
        ) from None
    return found


def _range(toml: TomlFile, index: int, table: str, found: Target, given: Vary | Search) -> Range:
    assert given.low is not None
    assert given.high is not None
    for end, value in (("low", given.low), ("high", given.high)):
        if not found.least <= value <= found.most:
            raise _error(
                toml, (table, index, end), f"is out of the range of {found.text}", value,
                allowed=f"{found.least:g} to {found.most:g}",
            )  # fmt: skip
    return Range(found, given.low, given.high, given.law)


def _error(
    toml: TomlFile, key: KeyPath, problem: str, value: object, *, allowed: str
) -> InputError:
    shown = (
        "" if value is None else f" = {value!r}" if not isinstance(value, str) else f' = "{value}"'
    )
    return InputError(
        f"{_dotted(key)}{shown} {problem}",
        file=toml.file,
        line=line_of(toml.lines, key),
        key=key,
        value=value,
        allowed=allowed,
    )
