"""Work functions of the elements, for records and laws of bare metals."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Final

from materials.errors import MaterialError

SOURCE: Final = (
    "Michaelson 1977, J. Appl. Phys. 48, 4729, preferred polycrystalline values, +-0.15 eV"
)
BASIS: Final = "memory"

_MICHAELSON_1977: Final[Mapping[str, float]] = MappingProxyType(
    {
        "Ag": 4.26,
        "Al": 4.28,
        "Au": 5.10,
        "Be": 4.98,
        "C": 5.00,
        "Cd": 4.22,
        "Co": 5.00,
        "Cr": 4.50,
        "Cu": 4.65,
        "Fe": 4.50,
        "In": 4.12,
        "Mg": 3.66,
        "Mo": 4.60,
        "Nb": 4.30,
        "Ni": 5.15,
        "Pb": 4.25,
        "Pt": 5.65,
        "Si": 4.85,
        "Sn": 4.42,
        "Ta": 4.25,
        "Ti": 4.33,
        "W": 4.55,
        "Zn": 4.33,
        "Zr": 4.05,
    }
)


def element_work_function_eV(symbol: str) -> float:
    """Work function of a clean polycrystalline element.

    Parameters
    ----------
    symbol : str
        Chemical symbol, one of `elements`.

    Returns
    -------
    float
        [eV]; see `SOURCE` and `BASIS`.

    Raises
    ------
    MaterialError
        No value for this element.

    Examples
    --------
    >>> element_work_function_eV("W")
    4.55
    """
    if symbol not in _MICHAELSON_1977:
        raise MaterialError(
            ("element",), symbol, "has no work function here", allowed=", ".join(_MICHAELSON_1977)
        )
    return _MICHAELSON_1977[symbol]


def elements() -> tuple[str, ...]:
    """Symbols of the elements with a work function.

    Examples
    --------
    >>> len(elements())
    24
    """
    return tuple(_MICHAELSON_1977)
