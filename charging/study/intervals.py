"""Probabilities with intervals from independent replicates, and ranks."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import stdtrit

Array = NDArray[np.float64]
Index = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Probability:
    """Share of draws that exceed, and its interval.

    `low`, `high`: Student's interval of the mean of the replicates, within 0…1; with no
    exceedance among N draws `high` is at least 3/N.
    """

    value: float
    low: float
    high: float


def probability(exceeds: NDArray[np.bool_], replicate: Index, confidence: float) -> Probability:
    """Exceedance probability of draws.

    Parameters
    ----------
    exceeds : ndarray of bool [N]
    replicate : ndarray of int [N]
        Replicate of each draw. Points of one replicate depend on each other: a binomial
        interval would be wrong.
    confidence : float
        Two-sided, for example 0.95.

    Examples
    --------
    >>> probability(np.zeros(300, bool), np.arange(300) % 16, 0.95)
    Probability(value=0.0, low=0.0, high=0.01)
    """
    count = len(exceeds)
    if count == 0:
        return Probability(float("nan"), 0.0, 1.0)
    value = float(np.mean(exceeds))
    half = half_width(exceeds.astype(np.float64), replicate, confidence)
    least = min(1.0, 3.0 / count)
    low, high = max(0.0, value - half), min(1.0, value + half)
    if value == 0.0:
        high = max(high, least)
    if value == 1.0:
        low = min(low, 1.0 - least)
    return Probability(value, low, high)


def half_width(values: Array, replicate: Index, confidence: float) -> float:
    """Half-width of the interval of a mean, from the means of the replicates; nan with one."""
    means = np.array([values[replicate == r].mean() for r in np.unique(replicate)])
    if len(means) < 2:
        return float("nan") if len(values) > 1 else 1.0
    student = float(stdtrit(len(means) - 1, 0.5 + 0.5 * confidence))
    return student * float(means.std(ddof=1)) / float(np.sqrt(len(means)))


def ranks(values: Array) -> Array:
    """Ranks [N] from 0, ties sharing their mean.

    Examples
    --------
    >>> ranks(np.array([3.0, 1.0, 3.0])).tolist()
    [1.5, 0.0, 1.5]
    """
    order = np.argsort(values, kind="stable")
    found = np.empty(len(values))
    found[order] = np.arange(len(values))
    _, inverse, counts = np.unique(values, return_inverse=True, return_counts=True)
    sums = np.bincount(inverse, weights=found)
    return np.asarray((sums / counts)[inverse])


def rank_correlation(a: Array, b: Array) -> float:
    """Spearman's rank correlation; 0 where one does not vary."""
    return float(rank_products(a, b).mean())


def rank_products(a: Array, b: Array) -> Array:
    """Products of standardised ranks [N], whose mean is the rank correlation."""
    x, y = ranks(a), ranks(b)
    x, y = x - x.mean(), y - y.mean()
    scale = float(np.sqrt((x**2).mean() * (y**2).mean()))
    return np.asarray(x * y / scale) if scale > 0.0 else np.zeros(len(x))
