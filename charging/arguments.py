"""Arguments of the public questions: names, files and numbers, checked at the edge.

A material or plasma is given as an object, as a library name, or as a file when the text ends in
``.toml`` or holds a slash.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from pathlib import Path
from typing import TYPE_CHECKING

from charging.case_values import nearest_name
from charging.errors import InputError, ProblemsFound, printable

if TYPE_CHECKING:
    from environments.errors import EnvironmentDataError
    from environments.plasma import Plasma
    from materials.record import Material

_HERE = Path("case.toml")  # its folder is the working directory; nothing reads the file itself


def as_material(given: Material | str, *, key: str = "material") -> Material:
    """Return a material from an object, a library name or a file.

    Parameters
    ----------
    given : Material or str
    key : str, optional
        Name of the argument, for the message.

    Raises
    ------
    InputError
        Unknown name (with the nearest one), or a file that cannot be used (with its line).

    Examples
    --------
    >>> as_material("gold").kind
    'conductor'
    """
    from charging.case_library import Sources, find_material

    if not isinstance(given, str):
        return _levelled(given)
    try:
        return find_material(given, Sources(_HERE, allow_outside=True))[0]
    except ProblemsFound as error:
        raise _unusable(key, given, error) from None


def _levelled(given: Material) -> Material:
    from charging.photo_level import levelled
    from materials.errors import MaterialError

    try:
        return levelled(given)
    except MaterialError as error:
        raise InputError(
            f'material "{given.name}": {error}', key=error.key, value=error.value
        ) from None


def as_plasma(given: Plasma | str, *, key: str = "plasma", to_charge: bool = False) -> Plasma:
    """Return a plasma from an object, a library name or a file; errors as `as_material`.

    `to_charge` True refuses a file without electrons or without positive ions.

    Examples
    --------
    >>> as_plasma("quiet geostationary").basis
    'assumed'
    """
    from charging.case_library import Sources, find_plasma

    if not isinstance(given, str):
        return given
    try:
        sources = Sources(_HERE, allow_outside=True)
        return find_plasma(given, sources, to_charge=to_charge)[0]
    except ProblemsFound as error:
        raise _unusable(key, given, error) from None


def as_number(
    key: str,
    value: float,
    *,
    at_least: float | None = None,
    above: float | None = None,
    high: float,
) -> float:
    """Return a number within its range.

    Parameters
    ----------
    key : str
        Name of the argument.
    value : float
    at_least, above : float, optional
        Lower bound, inclusive or exclusive; give one.
    high : float
        Upper bound, inclusive.

    Raises
    ------
    InputError
        No number, nan, inf, or out of range; says what is allowed.

    Examples
    --------
    >>> as_number("radius_m", 2, above=0.0, high=1000.0)
    2.0
    """
    low = above if above is not None else at_least if at_least is not None else -math.inf
    allowed = f"{'at least' if above is None else 'above'} {low:g}, at most {high:g}"
    if isinstance(value, bool) or not isinstance(value, int | float):
        problem = "is no number"
    elif not math.isfinite(value):
        problem = "is not finite"
    elif value > high or value < low or value == above:
        problem = "is out of range"
    else:
        return float(value)
    raise InputError(f"{key} = {value!r} {problem}", key=(key,), value=value, allowed=allowed)


def in_surface_state(material: Material, state: str) -> Material:
    """Return a material in a state of its surface.

    Raises
    ------
    InputError
        Unknown state, or one that the material's record does not have.

    Examples
    --------
    >>> in_surface_state(as_material("gold"), "aged").photoyield.basis
    'assumed'
    """
    from materials.errors import MaterialError
    from materials.surface_state import in_state

    try:
        return in_state(material, state)
    except MaterialError as error:
        raise InputError(
            f'surface_state = "{printable(state)}" {error.problem}',
            key=("surface_state",),
            value=state,
            allowed=error.allowed,
            nearest=nearest_name(state, (error.allowed or "").split(", ")),
        ) from None


def as_choice(key: str, value: str, choices: Iterable[str]) -> str:
    """Return one of a few words.

    Raises
    ------
    InputError
        Another word; carries the nearest allowed one.

    Examples
    --------
    >>> as_choice("collection", "plane", ("auto", "plane"))
    'plane'
    """
    known = tuple(choices)
    if value in known:
        return value
    raise InputError(
        f'{key} = "{printable(str(value))}" is unknown',
        key=(key,),
        value=value,
        allowed=", ".join(known),
        nearest=nearest_name(str(value), known),
    )


def from_environment(error: EnvironmentDataError) -> InputError:
    """Return an error about one argument of an environment as an input error."""
    name = ".".join(str(part) for part in error.key)
    return InputError(
        f"{name} = {error.value!r} {error.problem}",
        key=error.key,
        value=error.value,
        allowed=error.allowed,
        nearest=error.nearest,
    )


def _unusable(key: str, given: str, error: ProblemsFound) -> InputError:
    problem = error.problems[0]
    return InputError(
        f'{key} = "{printable(given)}" {problem.message}',
        key=(key,),
        value=given,
        allowed=problem.allowed,
        nearest=problem.nearest,
        next_step=problem.next_step,
    )
