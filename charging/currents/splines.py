"""Splines as piecewise polynomials, split where a function has a kink."""

from collections.abc import Callable, Sequence
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


DEEPEST = 60  # halvings of a cell at most
MOST_CELLS = 400  # that may be halved at once: more would be a function made of noise
CELL_DEGREE = 7  # of `refined_cells`


def refined_cells(
    function: Callable[[Array], tuple[Array, Array]], edges: Array, degree: int = CELL_DEGREE
) -> tuple[Array, Array]:
    """Polynomials on cells that are halved until they follow a function.

    Parameters
    ----------
    function : callable
        Of points [N], returns values [N, C] and the error allowed of each, same shape.
    edges : ndarray [K], rising
        First cells; every kink of the function must be among them.
    degree : int
        Each cell goes through the function at degree + 1 Chebyshev-Lobatto points, so
        neighbours meet; half-way between these the error is measured.

    Returns
    -------
    ndarray [M], ndarray [M-1, degree+1, C]
        Knots, and coefficients of powers of the distance from the left knot, highest first.
    """
    # every second of 2 degree + 1 points belongs to the polynomial, the others check it
    t = 0.5 - 0.5 * np.cos(np.pi * np.arange(2 * degree + 1) / (2 * degree))
    powers = np.linalg.inv(np.vander(t[::2], degree + 1))
    between = np.vander(t[1::2], degree + 1)
    left, width = edges[:-1], np.diff(edges)
    done: list[tuple[Array, Array]] = []
    for level in range(DEEPEST + 1):
        points = left[:, None] + width[:, None] * t
        points[:, -1] = left + width  # rounding must not carry a point past a kink
        values, allowed = (x.reshape(*points.shape, -1) for x in function(points.ravel()))
        c = np.einsum("ij,kjc->kic", powers, values[:, ::2])
        error = np.abs(np.einsum("ij,kjc->kic", between, c) - values[:, 1::2])
        fits = (error <= allowed[:, 1::2]).all(axis=(1, 2))
        fits |= (level == DEEPEST) | (len(left) > MOST_CELLS) | (width <= 1e-13 * (left + width))
        scale = width[:, None] ** np.arange(degree, -1, -1.0)
        done.append((left[fits], c[fits] / scale[fits][:, :, None]))
        left, width = left[~fits], 0.5 * width[~fits]
        if not len(left):
            break
        left = np.stack([left, left + width], axis=1).ravel()
        width = np.repeat(width, 2)
    knots = np.concatenate([part for part, _ in done])
    order = np.argsort(knots)
    return (
        np.concatenate([knots[order], edges[-1:]]),
        np.concatenate([part for _, part in done])[order],
    )


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
