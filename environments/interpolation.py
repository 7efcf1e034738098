"""Interpolation of tabulated states by polynomials through neighbouring rows."""

from typing import Literal

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Method = Literal["hermite", "lagrange", "linear"]

_BLOCK = 4096  # times at once: what is worked on stays in the processor's cache


def rows_needed(method: Method, degree: int) -> int:
    """Rows through which a polynomial of a degree passes.

    A Hermite polynomial of degree 2n - 1 takes position and velocity of n rows, a Lagrange
    polynomial of degree n the positions of n + 1.

    Raises
    ------
    ValueError
        Degree below 1 or above 31, or an even one for Hermite.

    Examples
    --------
    >>> rows_needed("hermite", 7), rows_needed("lagrange", 7), rows_needed("linear", 1)
    (4, 8, 2)
    """
    if not 1 <= degree <= 31:
        raise ValueError("must be 1 to 31")
    if method == "hermite":
        if degree % 2 == 0 or degree < 3:
            raise ValueError("must be odd and at least 3: n rows give the degree 2n - 1")
        return (degree + 1) // 2
    if method == "linear" and degree != 1:
        raise ValueError("must be 1 for linear interpolation")
    return degree + 1


def interpolate(
    time_s: Array,
    position: Array,
    velocity: Array | None,
    at_s: Array,
    *,
    method: Method,
    degree: int,
) -> tuple[Array, Array]:
    """Position and velocity between the rows of a table.

    Parameters
    ----------
    time_s : ndarray, shape (K,)
        Increasing [s], at least as many as `rows_needed`.
    position, velocity : ndarray, shape (K, 3); velocity may be None unless Hermite
        Any unit of length, and per second.
    at_s : ndarray, shape (N,)
        Within the table [s].
    method, degree
        See `rows_needed`.

    Returns
    -------
    position, velocity : ndarray, shape (3, N)
        Hermite, or no velocities given: the derivative of the position; else the velocities
        interpolated on their own.

    Notes
    -----
    Newton's divided differences on time scaled to the window. The window is centred on the
    interval asked for and moved inwards at the ends of the table, where errors are larger.

    References
    ----------
    Press et al. (2007), Numerical Recipes, ch. 3, and Stoer & Bulirsch, sec. 2.1.5 (Hermite;
    sections from memory).

    Examples
    --------
    >>> t = np.array([0.0, 1.0, 2.0, 3.0])
    >>> cube = np.stack((t**3, t, 0.0 * t), axis=1)
    >>> place, speed = interpolate(t, cube, None, np.array([1.5]), method="lagrange", degree=3)
    >>> place[0].round(9).tolist(), speed[0].round(9).tolist()
    ([3.375], [6.75])
    """
    value, slope = np.empty((3, at_s.size)), np.empty((3, at_s.size))
    for first in range(0, at_s.size, _BLOCK):
        here = slice(first, first + _BLOCK)
        value[:, here], slope[:, here] = _block(
            time_s, position, velocity, at_s[here], method, degree
        )
    return value, slope


def _block(
    time_s: Array,
    position: Array,
    velocity: Array | None,
    at_s: Array,
    method: Method,
    degree: int,
) -> tuple[Array, Array]:
    n = rows_needed(method, degree)
    interval = np.clip(np.searchsorted(time_s, at_s, side="right") - 1, 0, time_s.size - 2)
    start = np.clip(interval - (n - 1) // 2, 0, time_s.size - n)
    # one polynomial for all times that share a window
    windows, which = np.unique(start, return_inverse=True)
    rows = windows[:, None] + np.arange(n)
    origin = time_s[windows]
    width = time_s[windows + n - 1] - origin
    nodes = (time_s[rows] - origin[:, None]) / width[:, None]
    x = (at_s - origin[which]) / width[which]
    place = position[rows]
    if method == "hermite":
        assert velocity is not None
        scaled = velocity[rows] * width[:, None, None]
        value, slope = _newton(nodes, place, scaled, x, which)
        return value, slope / width[which]
    value, slope = _newton(nodes, place, None, x, which)
    if velocity is None:
        return value, slope / width[which]
    return value, _newton(nodes, velocity[rows], None, x, which)[0]


def _newton(
    nodes: Array, values: Array, slopes: Array | None, x: Array, which: NDArray[np.intp]
) -> tuple[Array, Array]:
    """Value and slope, (3, N), of the polynomials of W windows; nodes (W, n), values (W, n, 3)."""
    if slopes is not None:  # every node twice
        nodes, values = np.repeat(nodes, 2, axis=1), np.repeat(values, 2, axis=1)
    count = nodes.shape[1]
    table = values.copy()
    for order in range(1, count):
        rise = table[:, 1:] - table[:, :-1]
        run = nodes[:, order:] - nodes[:, :-order]
        if slopes is not None and order == 1:
            run[:, ::2] = 1.0
            rise[:, ::2] = slopes
        # keep the top of each column, it is a coefficient
        values[:, order - 1] = table[:, 0]
        table = rise / run[:, :, None]
    values[:, count - 1] = table[:, 0]
    value = values[which, count - 1]
    slope = np.zeros_like(value)
    for order in range(count - 2, -1, -1):
        step = (x - nodes[which, order])[:, None]
        slope = slope * step + value
        value = value * step + values[which, order]
    return value.T, slope.T
