"""Errors of the materials room, and the check of numbers at its public edge."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray


class MaterialError(ValueError):
    """A material, or one entry of its record, cannot be used.

    Parameters
    ----------
    key : tuple of str or int
        Path of the entry within the record, for instance
        ``("work_function_eV", "spread", "low")``.
    value : object
        What stands there; None where nothing does.
    problem : str
        What is wrong, as the end of a sentence that starts with key and value.
    allowed : str, optional
        What may stand there.
    nearest : str, optional
        The known name that is most like the given one.

    Notes
    -----
    A caller that knows the file adds its name and line.

    Examples
    --------
    >>> print(MaterialError(("kind",), "metal", "is no kind of material", allowed="conductor"))
    kind = 'metal' is no kind of material; allowed: conductor
    """

    def __init__(
        self,
        key: tuple[str | int, ...],
        value: object,
        problem: str,
        allowed: str | None = None,
        nearest: str | None = None,
    ) -> None:
        super().__init__(key, value, problem, allowed, nearest)
        self.key = key
        self.value = value
        self.problem = problem
        self.allowed = allowed
        self.nearest = nearest

    def __str__(self) -> str:
        where = ".".join(str(part) for part in self.key)
        what = "" if self.value is None else f" = {self.value!r}"
        text = f"{where}{what} {self.problem}"
        if self.allowed is not None:
            text += f"; allowed: {self.allowed}"
        if self.nearest is not None:
            text += f'; nearest: "{self.nearest}"'
        line = " ".join(text.split())
        # without what a terminal would obey, whatever a record held
        return "".join(c if c.isprintable() else c.encode("unicode_escape").decode() for c in line)


def finite_array(
    name: str,
    values: ArrayLike,
    *,
    at_least: float = -np.inf,
    above: float = -np.inf,
    at_most: float = np.inf,
) -> NDArray[np.float64]:
    """Return `values` as float array, or say what is wrong with them.

    Parameters
    ----------
    name : str
        Name of the argument, for the message.
    values : array_like
        Any shape.
    at_least, above, at_most : float, optional
        Inclusive lower, exclusive lower and inclusive upper bound.

    Returns
    -------
    ndarray
        Same shape, float64.

    Raises
    ------
    ValueError
        A value is not finite or out of bounds.

    Examples
    --------
    >>> finite_array("energy_eV", [1, 2], at_least=0)
    array([1., 2.])
    """
    array = np.asarray(values, dtype=np.float64)
    if not np.all(np.isfinite(array)):
        raise ValueError(f"{name} must be finite")
    if np.any(array < at_least) or np.any(array <= above) or np.any(array > at_most):
        bounds = [
            f"{sign} {bound:g}"
            for sign, bound in ((">=", at_least), (">", above), ("<=", at_most))
            if np.isfinite(bound)
        ]
        raise ValueError(f"{name} must be {' and '.join(bounds)}")
    return array
