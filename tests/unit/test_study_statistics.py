"""Statistics of studies: intervals, Sobol indices and the search, against known answers."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from numpy.typing import NDArray
from SALib.analyze import sobol as salib_sobol
from SALib.sample import sobol as salib_sample
from scipy.stats import qmc, spearmanr

from charging.study.indices import sobol_indices
from charging.study.intervals import (
    half_width,
    probability,
    rank_correlation,
)
from charging.study.ranking import _drivers
from charging.study.worst_case import compass_search

Array = NDArray[np.float64]
Function = Callable[[Array], Array]
A, B = 7.0, 0.1


def ishigami(places: Array) -> Array:
    """Ishigami & Homma (1990): sin x1 + a sin² x2 + b x3⁴ sin x1 on -π…π."""
    x = np.pi * (2.0 * places - 1.0)
    result: Array = np.sin(x[:, 0]) * (1.0 + B * x[:, 2] ** 4) + A * np.sin(x[:, 1]) ** 2
    return result


def ishigami_exact() -> tuple[list[float], list[float]]:
    """First-order and total indices, integrated by hand."""
    first = [0.5 * (1.0 + B * np.pi**4 / 5.0) ** 2, A**2 / 8.0, 0.0]
    both = B**2 * np.pi**8 * (1.0 / 18.0 - 1.0 / 50.0)
    variance = sum(first) + both
    total = [first[0] + both, first[1], both]
    return [v / variance for v in first], [v / variance for v in total]


def test_indices_of_the_ishigami_function() -> None:
    names = ["x1", "x2", "x3"]
    found = {
        one.factor: one
        for one in sobol_indices(ishigami, names, base=16384, seed=3, confidence=0.99)
    }
    first, total = ishigami_exact()
    for name, s, t in zip(names, first, total, strict=True):
        one = found[name]
        assert one.first == pytest.approx(s, abs=0.01)
        assert one.total == pytest.approx(t, abs=0.01)
        assert one.first_half_width < 0.02
        assert one.total_half_width < 0.02


def test_intervals_of_indices_hold_the_truth_as_often_as_they_say() -> None:
    """95 % intervals of the six indices in 100 studies of 2048 points."""
    first, total = ishigami_exact()
    exact = dict(zip(["x1", "x2", "x3"], zip(first, total, strict=True), strict=True))
    hits = 0
    for seed in range(100):
        for one in sobol_indices(ishigami, list(exact), base=2048, seed=seed, confidence=0.95):
            s, t = exact[one.factor]
            hits += abs(one.first - s) <= one.first_half_width
            hits += abs(one.total - t) <= one.total_half_width
    # the six of one study hang together: three standard deviations of 100 studies
    assert hits / 600 == pytest.approx(0.95, abs=3.0 * np.sqrt(0.95 * 0.05 / 100))


def test_indices_against_salib() -> None:
    """An independent library on a function with an interaction, SALib's own samples."""

    def model(x: Array) -> Array:
        result: Array = x[:, 0] ** 2 + 0.5 * x[:, 1] + 2.0 * x[:, 0] * x[:, 2] + 0.1 * x[:, 3]
        return result

    names = ["a", "b", "c", "d"]
    problem = {"num_vars": 4, "names": names, "bounds": 4 * [[0.0, 1.0]]}
    sample = salib_sample.sample(problem, 4096, calc_second_order=False, seed=1)
    theirs = salib_sobol.analyze(problem, model(sample), calc_second_order=False, seed=1)
    ours = {
        one.factor: one for one in sobol_indices(model, names, base=4096, seed=1, confidence=0.95)
    }
    for i, name in enumerate(names):
        assert ours[name].first == pytest.approx(theirs["S1"][i], abs=0.01)
        assert ours[name].total == pytest.approx(theirs["ST"][i], abs=0.01)


def replicated(rng: np.random.Generator, replicates: int, each: int) -> tuple[Array, Array]:
    """Scrambled Sobol points in the plane and the replicate of each."""
    points = [qmc.Sobol(2, scramble=True, rng=rng).random(each) for _ in range(replicates)]
    return np.concatenate(points), np.repeat(np.arange(replicates), each)


def test_intervals_hold_the_truth_as_often_as_they_say() -> None:
    """A corner of known area, 400 studies of 16 replicates: 95 % intervals hold it in 95 %."""
    rng = np.random.default_rng(5)
    truth, hits, widths = 0.125 * np.pi, 0, []
    studies = 400
    for _ in range(studies):
        points, replicate = replicated(rng, 16, 16)
        inside = (points[:, 0] ** 2 + points[:, 1] ** 2 < 0.5).astype(bool)
        found = probability(inside, replicate.astype(np.intp), 0.95)
        hits += found.low <= truth <= found.high
        widths.append(found.high - found.low)
    # 0.95 within three standard deviations of a count of 400
    assert hits / studies == pytest.approx(0.95, abs=3.0 * np.sqrt(0.95 * 0.05 / studies))
    # points of one replicate depend on each other: a binomial interval would be too wide
    assert np.mean(widths) < 0.6 * 2.0 * 1.96 * np.sqrt(truth * (1.0 - truth) / 256)


@pytest.mark.parametrize("count", [16, 300, 5000])
def test_no_exceedance_is_no_probability_zero(count: int) -> None:
    replicate = np.arange(count) % 16
    none = probability(np.zeros(count, bool), replicate, 0.95)
    assert (none.value, none.low, none.high) == (0.0, 0.0, 3.0 / count)
    every = probability(np.ones(count, bool), replicate, 0.95)
    assert (every.value, every.low, every.high) == (1.0, 1.0 - 3.0 / count, 1.0)
    # the exact one-sided limit of a binomial count of zero at 95 %: 1 - 0.05^(1/N)
    assert none.high >= 1.0 - 0.05 ** (1.0 / count)


def test_half_width_is_students() -> None:
    values = np.repeat([0.1, 0.2, 0.4, 0.5], 3)
    # means 0.1, 0.2, 0.4, 0.5: s = 0.18257; t(3, 97.5 %) = 3.18245 (table)
    assert half_width(values, np.repeat(np.arange(4), 3), 0.95) == pytest.approx(
        3.18245 * 0.182574 / 2.0, rel=1e-4
    )


def test_rank_correlation_against_scipy() -> None:
    rng = np.random.default_rng(0)
    a = rng.integers(0, 20, 200).astype(float)
    b = a**3 + rng.normal(0.0, 2000.0, 200)
    assert rank_correlation(a, b) == pytest.approx(spearmanr(a, b).statistic, rel=1e-12)


def test_drivers_by_chance() -> None:
    """Idle factors of few scrambled points in many dimensions are named in 5 % of studies."""
    names = [f"x{i}" for i in range(40)]
    named, told = 0, 0
    for seed in range(60):
        rng = np.random.default_rng(seed)
        points = np.concatenate(
            [qmc.Sobol(40, scramble=True, rng=rng).random(8) for _ in range(16)]
        )
        severity = points[:, 0] ** 3 + 0.2 * rng.random(128)
        found = [n for n, _ in _drivers(points, severity, names, np.repeat(np.arange(16), 8), 0.95)]
        told += found[:1] == ["x0"]
        named += found != ["x0"]
    assert told == 60
    assert named <= 60 * 0.05 + 3.0 * np.sqrt(60 * 0.05 * 0.95)


def rippled(places: Array) -> Array:
    """Rastrigin's function turned over: one highest hill among 11² others, at (0.6, 0.35)."""
    x = 10.24 * (places - np.array([0.6, 0.35]))
    result: Array = -(x**2 - 10.0 * np.cos(2.0 * np.pi * x) + 10.0).sum(axis=1)
    return result


def ridge(places: Array) -> Array:
    """A curved ridge (Rosenbrock's valley turned over), highest at (0.75, 0.75)."""
    x = 4.0 * places - 2.0
    result: Array = -((1.0 - x[:, 0]) ** 2) - 5.0 * (x[:, 1] - x[:, 0] ** 2) ** 2
    return result


def edge(places: Array) -> Array:
    """Highest at a corner that no start names: low, high, low, high."""
    result: Array = (np.array([-1.0, 2.0, -3.0, 1.0]) * places).sum(axis=1)
    return result


@pytest.mark.parametrize(
    ("function", "dimensions", "top", "within"),
    [(rippled, 2, 0.0, 1.1), (ridge, 2, 0.0, 0.02), (edge, 4, 3.0, 1e-12)],
    ids=["ripples", "ridge", "corner"],
)
def test_search_finds_known_maxima(
    function: Function, dimensions: int, top: float, within: float
) -> None:
    asked: list[int] = []

    def counted(places: Array) -> Array:
        asked.append(len(places))
        assert places.min() >= 0.0
        assert places.max() <= 1.0
        return function(places)

    found = compass_search(counted, dimensions, starts=16, evaluations=1500, seed=4)
    assert top - within <= found.value <= top
    assert found.evaluations == sum(asked) <= 1500
    # as good as ten thousand random samples, or better
    sample = np.random.default_rng(2).random((10_000, dimensions))
    assert found.value >= function(sample).max() - within


def test_search_says_when_it_was_stopped() -> None:
    found = compass_search(ridge, 2, starts=16, evaluations=40, seed=4)
    assert not found.converged
    assert found.evaluations <= 40


def test_a_place_without_solution_is_passed_over() -> None:
    found = compass_search(
        lambda x: np.where(x[:, 0] > 0.5, np.nan, x[:, 0]), 1, starts=8, evaluations=300, seed=0
    )
    assert found.value == pytest.approx(0.5, abs=0.01)
