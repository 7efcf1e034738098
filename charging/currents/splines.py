"""Splines as piecewise polynomials, split where a function has a kink."""

from collections.abc import Mapping, Sequence
from itertools import pairwise
from math import factorial

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import make_interp_spline

Array = NDArray[np.float64]

DEGREE = 5
FEWEST_POINTS = DEGREE + 1


def spline(knots: Array, values: Array, degree: int = DEGREE) -> Array:
    """Coefficients of the not-a-knot spline of an odd degree through values.

    Parameters
    ----------
    knots : ndarray [K], rising, K >= 6
    values : ndarray [K, ...]

    Returns
    -------
    ndarray [K-1, degree+1, ...]
        Of powers of the distance from the left knot, highest first.
    """
    found = make_interp_spline(knots, values, k=degree)
    powers = [found(knots[:-1], nu=n) / factorial(n) for n in range(degree, -1, -1)]
    return np.stack(powers, axis=1)


def segmented_spline(
    knots: Array, values: Array, breaks: Sequence[float], degree: int = DEGREE
) -> Array:
    """`spline` on each side of every break, which must be a knot."""
    inner = np.searchsorted(knots, sorted(breaks))
    ends = [0, *(int(k) for k in inner if 0 < k < len(knots) - 1), len(knots) - 1]
    parts = [
        spline(knots[a : b + 1], values[a : b + 1], degree)
        for a, b in pairwise(dict.fromkeys(ends))
    ]
    return np.concatenate(parts)


def segmented_knots(base: Array, breaks: Sequence[float]) -> Array:
    """Knots with every break among them and enough of them between two breaks.

    Parameters
    ----------
    base : ndarray, rising
    breaks : sequence of float
        Those outside the base are left out.
    """
    inside = sorted({float(b) for b in breaks if base[0] < b < base[-1]})
    room = 0.3 * np.gradient(base)
    parts = []
    for a, b in pairwise([float(base[0]), *inside, float(base[-1])]):
        # a base knot too near a break would make a cell of no width
        between = base[(base - a > room) & (b - base > room)]
        if len(between) < FEWEST_POINTS:
            between = np.linspace(a, b, FEWEST_POINTS + 2)[1:-1]
        parts.append(np.concatenate([[a], between]))
    return np.concatenate([*parts, base[-1:]])


FINEST = 0.1  # of an energy scale of 10 eV: where grading towards a break ends


def graded_knots(scale: float, spacing: float, breaks: Mapping[float, float]) -> Array:
    """Knots from 0 to the last break, dense at 0 and just below every break.

    Parameters
    ----------
    scale, spacing : float
        From 0 upwards the knots lie like scale·sinh²(k·spacing).
    breaks : mapping of float to float
        Position of each break, and the spacing with which the knots grow away from it
        downwards in the same manner.
    """
    parts, low = [], 0.0
    for place in sorted(breaks):
        width = place - low
        # the numbers of knots of both progressions add up
        left = np.geomspace(1e-9, 0.5, 1500) * width
        fine = np.concatenate([[low], low + left, place - left[-2::-1], [place]])
        down = np.sqrt(np.maximum(place - fine, 0.0) / min(scale, FINEST))
        count = np.arcsinh(np.sqrt(fine / scale)) / spacing - np.arcsinh(down) / breaks[place]
        number = max(2 * FEWEST_POINTS, int(np.ceil(count[-1] - count[0])))
        part = np.interp(np.linspace(count[0], count[-1], number + 1), count, fine)
        parts.append(part[:-1])
        low = place
    return np.concatenate([*parts, [low]])


def polynomial(c: Array, x: Array) -> Array:
    """Value of polynomials c [..., degree+1, C] at x [..., 1]."""
    value = c[..., 0, :] * x + c[..., 1, :]
    for n in range(2, c.shape[-2]):
        value = value * x + c[..., n, :]
    return value


def polynomial_and_slope(c: Array, x: Array) -> tuple[Array, Array]:
    """Value and derivative of polynomials c [..., degree+1, C] at x [..., 1]."""
    slope = c[..., 0, :]
    value = slope * x + c[..., 1, :]
    for n in range(2, c.shape[-2]):
        slope = slope * x + value
        value = value * x + c[..., n, :]
    return value, slope
