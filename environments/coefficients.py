"""Numbers of a region model with where they come from, and how many rest on what."""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Final

from environments.errors import EnvironmentDataError, nearest_name

# as in environments.plasma, which must stay free of this module; best first
_BASES: Final = ("measured", "handbook", "derived", "memory", "assumed")


@dataclass(frozen=True, slots=True)
class Coefficient:
    """One number, or one row of a table, of a model.

    Attributes
    ----------
    name : str
        What it is, in words.
    value : tuple of float
        The figures.
    unit : str
        "1" for pure numbers.
    basis : str
        "measured", "handbook", "derived", "memory" or "assumed".
    source : str
        Publication, or what an assumption follows.

    Raises
    ------
    EnvironmentDataError
        Unknown basis, no figure or no source.

    Examples
    --------
    >>> Coefficient("standoff ratio", (1.3,), "1", "memory", "Fairfield 1971").first
    1.3
    """

    name: str
    value: tuple[float, ...]
    unit: str
    basis: str
    source: str

    def __post_init__(self) -> None:
        if self.basis not in _BASES:
            raise EnvironmentDataError(
                "is not a basis", key=("basis",), value=self.basis, allowed=", ".join(_BASES),
                nearest=nearest_name(self.basis, _BASES),
            )  # fmt: skip
        if not self.value or not self.source:
            raise EnvironmentDataError("needs a figure and a source", key=(self.name,))

    @property
    def first(self) -> float:
        """The first figure, of a coefficient that holds only one."""
        return self.value[0]


def share_by_basis(coefficients: Iterable[Coefficient]) -> Mapping[str, float]:
    """Share of the figures that rest on each basis.

    Parameters
    ----------
    coefficients : iterable of Coefficient
        Every figure counts once.

    Returns
    -------
    mapping of str to float
        Only bases that occur; the shares add to 1. Empty without coefficients.

    Examples
    --------
    >>> a = Coefficient("a", (1.0, 2.0, 3.0), "1", "memory", "x")
    >>> b = Coefficient("b", (1.0,), "1", "assumed", "y")
    >>> dict(share_by_basis([a, b]))
    {'memory': 0.75, 'assumed': 0.25}
    """
    counts = dict.fromkeys(_BASES, 0)
    for one in coefficients:
        counts[one.basis] += len(one.value)
    total = sum(counts.values())
    return {basis: count / total for basis, count in counts.items() if count}
