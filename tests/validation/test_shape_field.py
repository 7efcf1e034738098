"""Capacitances and barriers of the panel field against closed forms and published values."""

from collections.abc import Callable
from typing import NamedTuple

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.constants import epsilon_0
from scipy.integrate import dblquad

from charging.case_shape import Shape
from charging.shape.bodies import own_panels
from charging.shape.craft import Craft
from charging.shape.field import Field, solve_field
from charging.shape.integrals import panel_integrals
from charging.shape.panels import Panels
from charging.shape.solution import shape_field

Array = NDArray[np.float64]
UNIT = 4.0 * np.pi * epsilon_0  # capacitance of a sphere of 1 m


def shape(**keys: object) -> Shape:
    return Shape.model_validate({"name": "x", **keys})


def solved(step_m: float, **keys: object) -> Field:
    panels = own_panels(shape(**keys), step_m)
    return solve_field(panels, int(panels.patch.max()) + 1)


def two_spheres(step_m: float) -> Field:
    one = own_panels(shape(kind="ball", radius_m=1.0), step_m)
    both = np.concatenate([one.corners_m, one.corners_m + np.array([0.0, 0.0, 3.0])])
    return solve_field(Panels(both, np.repeat([0, 1], len(one))), 2)


BETA = np.arccosh(1.5)
MANY = np.arange(1, 80)
C_11 = float(np.sinh(BETA) * (1.0 / np.sinh((2 * MANY - 1) * BETA)).sum())
C_12 = float(-np.sinh(BETA) * (1.0 / np.sinh(2 * MANY * BETA)).sum())


class Known(NamedTuple):
    """A capacitance over 4 pi eps0 [m], from meshes of falling step, and the fewest order."""

    quantity: str
    published: float
    source: str
    ours: Callable[[float], float]
    steps: tuple[float, ...]
    order: float


KNOWN = [
    Known(
        "sphere", 1.0, "closed form",
        lambda h: solved(h, kind="ball", radius_m=1.0).total_capacitance_F / UNIT,
        (0.4, 0.25, 0.14), 1.4,
    ),
    Known(
        "cube", 0.6606782, "Hwang & Mascagni 2004, J. Appl. Phys. 95, 3798 (from memory)",
        lambda h: solved(h, kind="block", size_m=(1.0, 1.0, 1.0)).total_capacitance_F / UNIT,
        (0.25, 0.125, 0.0625), 1.3,
    ),
    Known(
        "disc", 2.0 / np.pi, "8 eps0 a, Weber 1873; ours 2e-4 thick",
        lambda h: solved(h, kind="tube", radius_m=1.0, length_m=2e-4).total_capacitance_F / UNIT,
        (0.3, 0.2, 0.13), 0.9,
    ),
    Known(
        "square plate", 0.3667896,
        "Read 1997, J. Comput. Phys. 133, 1; Hwang & Mascagni 2004 (from memory); ours 2e-4 thick",
        lambda h: solved(
            h, kind="panel", size_m=(1.0, 1.0), thickness_m=2e-4
        ).total_capacitance_F / UNIT,
        (0.2, 0.1, 0.05), 0.7,
    ),
    Known(
        "one of two spheres 3 radii apart", C_11, "Maxwell, as in Smythe 1950, sec. 5.08 (memory)",
        lambda h: two_spheres(h).capacitance_F[0, 0] / UNIT,
        (0.4, 0.25, 0.14), 1.4,
    ),
    Known(
        "between two spheres 3 radii apart", C_12, "as before",
        lambda h: two_spheres(h).capacitance_F[0, 1] / UNIT,
        (0.4, 0.25, 0.14), 1.4,
    ),
]  # fmt: skip


@pytest.mark.parametrize("known", KNOWN, ids=lambda known: known.quantity)
def test_capacitance_within_half_a_percent_and_converging(known: Known) -> None:
    errors = [known.ours(step) / known.published - 1.0 for step in known.steps]
    assert abs(errors[-1]) < 0.005, known.source
    halvings = np.log(known.steps[0] / known.steps[-1])
    assert np.log(abs(errors[0] / errors[-1])) / halvings > known.order
    assert (np.diff(np.abs(errors)) < 0.0).all()


def test_panel_integrals_are_those_of_quadrature() -> None:
    quad = np.array([[0.0, 0.0, 0.0], [1.2, 0.1, 0.0], [1.0, 0.9, 0.0], [-0.2, 0.7, 0.0]])
    turn = np.linalg.qr(np.array([[1.0, 2.0, 0.3], [0.4, -1.0, 0.9], [0.2, 0.5, 1.0]]))[0]
    turn *= np.sign(np.linalg.det(turn))
    panels = Panels((quad @ turn.T)[None], np.array([0]))
    for point in ([0.3, 0.4, 0.2], [2.0, -1.0, -0.5], [-0.6, 1.5, 1e-3], [0.5, 0.3, -0.05]):
        x = np.array(point)

        def over(value: Callable[[float, float], float]) -> float:
            """Integral over the quadrilateral, by its bilinear map of the unit square."""

            def mapped(v: float, u: float) -> float:
                p = (
                    (1 - u) * (1 - v) * quad[0] + u * (1 - v) * quad[1]
                    + u * v * quad[2] + (1 - u) * v * quad[3]
                )  # fmt: skip
                a = (1 - v) * (quad[1] - quad[0]) + v * (quad[2] - quad[3])
                b = (1 - u) * (quad[3] - quad[0]) + u * (quad[2] - quad[1])
                return value(p[0], p[1]) * float(a[0] * b[1] - a[1] * b[0])

            return float(dblquad(mapped, 0, 1, 0, 1, epsabs=1e-10, epsrel=1e-10)[0])

        def distance(a: float, b: float, x: Array = x) -> float:
            return float(np.sqrt((a - x[0]) ** 2 + (b - x[1]) ** 2 + x[2] ** 2))

        inverse, angle = panel_integrals((x @ turn.T)[None], panels)
        assert inverse[0, 0] == pytest.approx(over(lambda a, b: 1.0 / distance(a, b)), rel=1e-8)
        height = float(x[2])
        assert angle[0, 0] == pytest.approx(
            over(lambda a, b, z=height: z / distance(a, b) ** 3), rel=1e-6, abs=1e-9
        )


@pytest.mark.parametrize("half_angle_deg", [10.0, 30.0, 60.0, 90.0])
def test_barrier_before_a_cap_on_a_sphere(half_angle_deg: float) -> None:
    ball = shape(kind="ball", radius_m=1.0, cap_half_angle_deg=half_angle_deg)
    found = shape_field(Craft((ball,), (("x.cap",), ("x.rest",)), 1400))
    along = found.weights[0] @ np.array([0.0, -1000.0, 0.0])
    x = 1.0 + np.geomspace(1e-4, 30.0, 4000)
    mu = np.cos(np.radians(half_angle_deg))
    # axis of a cap at 1 and rest at 0: Green's function of the sphere, closed form
    own = (x * x - 1.0) / (2.0 * x) * (1.0 / (x - 1.0) - 1.0 / np.sqrt(1.0 + x * x - 2.0 * x * mu))
    height = -(-1000.0 * (1.0 / x - own)).min()
    assert -along.min() == pytest.approx(height, rel=0.015)


def test_energy_is_symmetric_and_charge_falls_off() -> None:
    wing = shape(kind="panel", size_m=(2.0, 3.0), thickness_m=0.03)
    block = Shape.model_validate(
        {"name": "b", "kind": "block", "size_m": (1.0, 1.0, 1.0), "center_m": (0.0, 0.0, 0.515)}
    )
    faces = (("x.front",), ("x.back", "x.edge"), ("b.+z",), ("b.+x",))
    found = shape_field(Craft((wing, block), faces, 500))
    c = found.capacitance_F
    assert np.abs(c - c.T).max() <= 1e-10 * np.abs(c).max()
    assert found.asymmetry < 0.03  # before the mean is taken: the error of this mesh
    assert (np.linalg.eigvalsh(c) > 0.0).all()
    off = c - np.diag(np.diagonal(c))
    assert (off <= 1e-6 * c.max()).all()  # a body at 1 V draws negative charge onto the others
    assert found.weights[:, 0].sum(axis=1) == pytest.approx(1.0, abs=2e-3)
    far = found.weights[0, -3].sum() * found.distance_m[0, -3]
    assert far == pytest.approx(c.sum() / UNIT, rel=0.05)  # a charge seen from afar
    assert found.weight_error < 0.01


def test_inward_panels_are_refused() -> None:
    panels = own_panels(shape(kind="block", size_m=(1.0, 1.0, 1.0)), 0.5)
    with pytest.raises(ValueError, match="wrong way"):
        solve_field(Panels(panels.corners_m[:, ::-1], panels.patch), 6)


@pytest.mark.slow
def test_refinement_study(capsys: pytest.CaptureFixture[str]) -> None:
    import time

    with capsys.disabled():
        for known in KNOWN:
            print(f"\n{known.quantity}: {known.published:.7f}, {known.source}")
            for k in range(4):
                step = known.steps[-1] * 1.4 ** (2 - k)
                print(
                    f"  step {step:.4f}  "
                    f"relative error {known.ours(step) / known.published - 1.0:+.2e}"
                )
        panels = own_panels(shape(kind="block", size_m=(1.0, 1.0, 1.0)), 1.0 / 18.0)
        began = time.perf_counter()
        solve_field(panels, 6)
        lasted = time.perf_counter() - began
        print(f"\n{len(panels)} panels in {lasted:.2f} s")
    assert lasted < 5.0
