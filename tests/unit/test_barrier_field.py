"""Weights of caps on a sphere and the barriers that follow from them."""

import numpy as np
import pytest
from numpy.polynomial.legendre import leggauss
from numpy.typing import NDArray

from charging.currents.barrier_field import (
    COORDINATE,
    DISTANCES,
    FARTHEST,
    JOIN_V,
    NEAREST,
    BarrierField,
    barrier_field,
)
from charging.currents.cap_weights import Patch, cap_weight, sphere_weights

Array = NDArray[np.float64]

RADIUS = 1.6


def area(half_angle_deg: float) -> float:
    return float(2.0 * np.pi * RADIUS**2 * (1.0 - np.cos(np.radians(half_angle_deg))))


def field_of(patches: list[Patch], nodes: int) -> BarrierField:
    weights = np.zeros((len(patches), len(DISTANCES), nodes))
    weights[:, 1:-1] = sphere_weights(patches, RADIUS, nodes, 1.0 + DISTANCES[1:-1])
    for i, patch in enumerate(patches):
        weights[i, 0, patch.node] = 1.0
    node = np.array([patch.node for patch in patches])
    return barrier_field(np.arange(len(patches)), node, weights)


# a box with two surfaces on three of its sides; node 0 has patches on two sides
CRAFT = [
    Patch((0.0, 0.0, 1.0), 3.0, 1),
    Patch((0.0, 0.0, 1.0), 2.5, 2),
    Patch((0.0, 0.0, -1.0), 3.4, 3),
    Patch((0.0, 0.0, -1.0), 0.9, 0),
    Patch((0.0, -1.0, 0.0), 3.2, 4),
    Patch((0.0, 1.0, 0.0), 3.2, 5),
    Patch((1.0, 0.0, 0.0), 3.0, 0),
    Patch((-1.0, 0.0, 0.0), 0.05, 6),
    Patch((-1.0, 0.0, 0.0), 0.04, 7),
    Patch((-0.6, 0.5, 0.7), 1.2, 8),
]
NODE = np.array([patch.node for patch in CRAFT])


def states(count: int) -> Array:
    """Random node potentials: volts beside kilovolts, all signs."""
    random = np.random.default_rng(2)
    v = random.normal(size=(count, 9)) * 10.0 ** random.uniform(-1.0, 4.0, (count, 1))
    v *= random.choice([1.0, 0.01], (count, 9))
    lowest = np.abs(v).max(axis=1, keepdims=True)
    return np.asarray(v - lowest * random.choice([0.0, 0.0, 0.5, 1.0], (count, 1)))


def dense(patches: list[Patch], nodes: int, count: int) -> Array:
    """Weights [P, count, n] at close distances, without the splines."""
    u = np.linspace(COORDINATE[0], COORDINATE[-1], count)[1:-1]
    t = (np.exp(u) * (1.0 + FARTHEST) - NEAREST) / (1.0 + np.exp(u))
    return sphere_weights(patches, RADIUS, nodes, 1.0 / (1.0 - t))


@pytest.mark.parametrize(
    ("half_angle", "faced"), [(10.0, 624.0), (30.0, 366.0), (60.0, 185.0), (90.0, 90.0)]
)
def test_cap_at_zero_on_a_sphere_at_minus_a_kilovolt(half_angle: float, faced: float) -> None:
    # closed form of the cap's axis, evaluated by hand beforehand: within a per cent
    field = field_of([Patch((0.0, 0.0, 1.0), area(half_angle), 1)], 2)
    height = field.heights(np.array([[-1000.0, 0.0]]), np.array([[0.0]]))
    assert float(height[0, 0]) == pytest.approx(faced, rel=0.01)
    # here: the same potential by a Legendre series, summed where it converges
    x = np.linspace(1.05, 8.0, 4000)
    degree = np.arange(0, 600)
    polynomial = np.polynomial.legendre.legvander(np.cos(np.radians([half_angle])), 601)[0]
    step = np.concatenate([[1.0 - polynomial[1]], polynomial[:599] - polynomial[2:601]]) / 2.0
    cap = (step * x[:, None] ** -(degree + 1.0)).sum(axis=1)
    exact = -float((-1000.0 * (1.0 / x - cap)).min())
    assert float(height[0, 0]) == pytest.approx(exact, abs=0.1)


def test_weights_against_a_direct_integral_of_poisson() -> None:
    apart = [CRAFT[4], CRAFT[7], CRAFT[9]]  # caps that do not overlap
    x = 1.0 + DISTANCES[[1, 12, 24, 36, 47]]
    weights = sphere_weights(apart, RADIUS, 9, x)
    g, w = leggauss(80)
    azimuth = 2.0 * np.pi * np.arange(160) / 160
    for i, seen in enumerate(apart):
        axis = np.array(seen.normal) / np.linalg.norm(seen.normal)
        for other in apart[:i] + apart[i + 1 :]:
            center = np.array(other.normal) / np.linalg.norm(other.normal)
            half = np.arccos(1.0 - other.area_m2 / (2.0 * np.pi * RADIUS**2))
            theta = half * (1.0 + g) / 2.0
            e1 = np.cross(center, [0.3, 0.5, -0.8])
            e1 /= np.linalg.norm(e1)
            around = np.cos(azimuth)[:, None] * e1
            around = around + np.sin(azimuth)[:, None] * np.cross(center, e1)
            points = np.cos(theta)[:, None, None] * center
            points = points + np.sin(theta)[:, None, None] * around
            for k, r in enumerate(x):
                kernel = (r**2 - 1.0) / np.linalg.norm(r * axis - points, axis=-1) ** 3
                total = (kernel.mean(axis=1) * np.sin(theta) * w).sum() * half / 4.0
                assert weights[i, k, other.node] == pytest.approx(float(total), abs=1e-8)


def test_weights_add_to_the_uniform_sphere_and_are_never_negative() -> None:
    x = 1.0 + DISTANCES[1:-1]
    for patches in (CRAFT, [Patch((0.0, 0.0, 1.0), 40.0, 1), Patch((0.0, 0.1, 1.0), 30.0, 2)]):
        weights = sphere_weights(patches, RADIUS, 9, x)
        assert weights.min() >= 0.0
        assert weights.sum(axis=-1) * x == pytest.approx(1.0, abs=1e-12)


def test_order_of_the_surfaces_changes_nothing() -> None:
    order = np.random.default_rng(1).permutation(len(CRAFT))
    x = 1.0 + DISTANCES[1:-1:6]
    plain = sphere_weights(CRAFT, RADIUS, 9, x)
    mixed = sphere_weights([CRAFT[k] for k in order], RADIUS, 9, x)
    assert mixed == pytest.approx(plain[order], abs=1e-13)


def test_split_in_two_of_one_node_changes_nothing() -> None:
    whole = [Patch((0.0, 0.0, 1.0), 3.0, 1), Patch((1.0, 0.0, 0.0), 2.0, 2)]
    halves = [whole[0], Patch((1.0, 0.0, 0.0), 1.2, 2), Patch((1.0, 0.0, 0.0), 0.8, 2)]
    x = 1.0 + DISTANCES[1:-1:6]
    plain, split = (sphere_weights(p, RADIUS, 3, x) for p in (whole, halves))
    assert split[:2] == pytest.approx(plain, abs=1e-5)
    assert split[2] == pytest.approx(plain[1], abs=1e-5)


def test_a_node_with_patches_on_several_sides_counts_with_all_of_them() -> None:
    patches = [Patch((0.0, 0.0, 1.0), area(20.0), 0), Patch((0.0, 0.0, -1.0), area(150.0), 1)]
    x = np.array([1.01, 1.3, 4.0])
    weights = sphere_weights(patches, RADIUS, 2, x)
    # structure: the cap and the ring that nothing covers, here up to 30 degrees
    assert weights[0, :, 0] == pytest.approx(cap_weight(x, np.radians(30.0)), rel=1e-9)


def test_heights_against_close_sampling() -> None:
    field, v = field_of(CRAFT, 9), states(4000)
    surface = v[:, NODE]
    found = field.heights(v, surface)
    weights = dense(CRAFT, 9, 1500)
    lowest = np.stack([(weights @ row).min(axis=1) for row in v])
    exact = surface - np.minimum(lowest, np.minimum(surface, 0.0))
    error = np.abs(found - exact)
    assert error.max() < 0.1
    assert (exact > np.maximum(surface, 0.0) + 1.0).mean() > 0.15  # barriers are among them


def test_volts_under_kilovolts() -> None:
    # a patch a little above the kilovolts around it: onset within a volt
    half = 60.0
    field = field_of([Patch((0.0, 0.0, 1.0), area(half), 1)], 2)
    x = 1.0 + np.geomspace(1e-5, 300.0, 200_001)
    cap = cap_weight(x, np.radians(half))
    sphere = -5000.0
    for above in np.linspace(4100.0, 4500.0, 81):
        v = sphere + above
        exact = v - min(float((sphere * (1.0 / x - cap) + v * cap).min()), v, 0.0)
        found = float(field.heights(np.array([[sphere, v]]), np.array([[v]]))[0, 0])
        assert found == pytest.approx(max(exact, 0.0), abs=0.1)


def test_cosine_case_is_exact() -> None:
    # monopole and dipole: onset D = |K|/2, height (2D - |K|)²/(4D), a third at D = 3|K|/2
    s = 1.0 / (1.0 + DISTANCES)
    weights = np.stack([s, s**2], axis=-1)[None]
    field = barrier_field(np.array([0]), np.array([0]), weights)
    for dipole in (300.0, 500.0, 505.0, 1000.0, 1500.0, 8000.0):
        v = np.array([[-1000.0, dipole]])
        on_surface = np.array([[dipole - 1000.0]])
        height = float(field.heights(v, on_surface)[0, 0])
        onset = max(2.0 * dipole - 1000.0, 0.0) ** 2 / (4.0 * dipole)
        assert height == pytest.approx(onset, abs=0.02), dipole


def test_derivatives_at_random_states_onset_and_zero() -> None:
    field, v = field_of(CRAFT, 9), states(1000)
    v[::7, 4] = np.linspace(-2.0 * JOIN_V, 2.0 * JOIN_V, len(v[::7]))  # the edge at 0 V
    v[::11] -= v[::11, 3:4] * 0.999  # near equal potentials: onsets
    surface = v[:, NODE]
    found = field.heights_and_slopes(v, surface)
    assert np.array_equal(found.height_V, field.heights(v, surface))
    ours = np.zeros((len(v), len(CRAFT), 9))
    ours[:, np.arange(len(CRAFT)), NODE] += found.own
    ours[found.member, found.surface] += found.rows
    off = []
    for j in range(9):

        def at(shift: float, j: int = j) -> Array:
            moved = v.copy()
            moved[:, j] += shift
            return field.heights(moved, moved[:, NODE])

        h = 2e-4
        numeric = (8.0 * (at(h) - at(-h)) - at(2.0 * h) + at(-2.0 * h)) / (12.0 * h)
        off.append(np.abs(numeric - ours[..., j]))
    worst = np.sort(np.stack(off).ravel())
    # where a difference steps over the join of two polynomials or over two minima, it errs
    assert worst[-20] < 1e-3
    assert worst[-200] < 2e-5


def test_a_member_alone_equals_itself_in_a_block() -> None:
    field, v = field_of(CRAFT, 9), states(200)
    whole = field.heights_and_slopes(v, v[:, NODE])
    for m in range(0, 200, 7):
        alone = field.heights_and_slopes(v[m : m + 1], v[m : m + 1, NODE])
        mine = whole.member == m
        assert np.array_equal(alone.height_V[0], whole.height_V[m])
        assert np.array_equal(alone.own[0], whole.own[m])
        assert np.array_equal(alone.rows[np.argsort(alone.surface)],
                              whole.rows[mine][np.argsort(whole.surface[mine])])  # fmt: skip


def test_the_join_is_smooth_and_narrow() -> None:
    field = field_of([Patch((0.0, 0.0, 1.0), area(40.0), 1)], 2)
    volts = np.linspace(-0.4, 0.4, 8001)  # of the patch, where its barrier meets max(V, 0)
    around = np.full_like(volts, -0.5)
    v = np.stack([around, volts], axis=-1)
    height = field.heights(v, volts[:, None])[:, 0]
    slope = np.diff(height) / np.diff(volts)
    assert np.abs(np.diff(slope)).max() < 0.02  # no jump of the derivative
    assert JOIN_V <= 0.1
