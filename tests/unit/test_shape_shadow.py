"""Shadows of shapes against closed forms and a plain count of rays."""

import numpy as np
import pytest
from numpy.typing import NDArray

from charging.case_shape import Shape
from charging.shape.craft import Craft, patches
from charging.shape.shadow import exposure
from charging.shape.views import Wings, sun_views, table_error

Array = NDArray[np.float64]
STILL = np.zeros(1)


def shape(**keys: object) -> Shape:
    return Shape.model_validate(keys)


def unit(*vector: float) -> Array:
    v = np.array(vector, dtype=np.float64)
    return np.asarray((v / np.sqrt((v**2).sum())).reshape(3, 1))


def test_box_on_a_plate() -> None:
    plate = shape(name="plate", kind="panel", size_m=(10.0, 8.0), thickness_m=0.1)
    box = shape(name="box", kind="block", size_m=(1.0, 0.6, 2.0), center_m=(-1.0, 0.5, 1.05))
    craft = Craft((plate, box), (("plate.front",), ("box.+x",)), 300)
    free = 80.0 - 0.6
    assert patches(craft)[0].area_m2 == pytest.approx(free, rel=1e-12)
    for elevation_deg in (30.0, 45.0, 70.0):
        e = np.radians(elevation_deg)
        cosine, share = exposure(craft, unit(np.cos(e), 0.0, np.sin(e)), STILL)
        assert cosine[:, 0] == pytest.approx([np.sin(e), np.cos(e)])
        assert share[0, 0] == pytest.approx(1.0 - 0.6 * 2.0 / np.tan(e) / free, rel=1e-5)
        assert share[1, 0] == 1.0


def test_light_across_a_corner_of_a_box() -> None:
    """Along a diagonal the shadow is a hexagon cut by its own base: (a + b) h cot e / sqrt 2."""
    plate = shape(name="plate", kind="panel", size_m=(20.0, 20.0), thickness_m=0.1)
    box = shape(name="box", kind="block", size_m=(1.0, 0.6, 2.0), center_m=(0.0, 0.0, 1.05))
    craft = Craft((plate, box), (("plate.front",),), 300)
    e = np.radians(50.0)
    along = np.cos(e) / np.sqrt(2.0)
    share = exposure(craft, unit(along, along, np.sin(e)), STILL)[1]
    shaded = (1.0 + 0.6) * 2.0 / np.tan(e) / np.sqrt(2.0)
    assert share[0, 0] == pytest.approx(1.0 - shaded / (400.0 - 0.6), rel=1e-6)


@pytest.mark.parametrize("sun", [(0.6, -0.5, 0.7), (-0.3, -0.8, -0.5), (0.2, -0.3, -0.9)])
def test_wing_that_follows_the_sun(sun: tuple[float, float, float]) -> None:
    """The shadow of a wing across the light is a rectangle, length times rho over |s_y|."""
    bus = shape(name="bus", kind="block", size_m=(20.0, 1.0, 20.0))
    yoke = shape(
        name="yoke", kind="tube", radius_m=0.01, length_m=1.0, center_m=(0.0, -1.0, 0.0),
        axis=(0.0, 1.0, 0.0),
    )  # fmt: skip
    wing = shape(
        name="wing", kind="panel", tracks_sun=True, size_m=(1.2, 1.5), thickness_m=0.004,
        center_m=(0.0, -2.25, 0.0),
    )  # fmt: skip
    craft = Craft((bus, yoke, wing), (("bus.-y",), ("wing.front",)), 300)
    s = unit(*sun)
    cosine, share = exposure(craft, s, Wings().angles(s))
    k = float(np.hypot(s[0, 0], s[2, 0]) / abs(s[1, 0]))
    shaded = 1.2 * 1.5 * k + 0.02 * 1.0 * k  # the yoke as a ribbon
    assert 1.0 - share[0, 0] == pytest.approx(shaded / 400.0, rel=0.005)
    assert cosine[1, 0] == pytest.approx(np.hypot(s[0, 0], s[2, 0]))
    assert share[1, 0] == pytest.approx(1.0, abs=1e-6)


def test_shares_are_those_of_rays() -> None:
    """Random rays from the face, tested against each body by a formula of its own."""
    bus = shape(name="bus", kind="block", size_m=(4.0, 4.0, 1.0))
    ball = shape(name="ball", kind="ball", radius_m=0.7, center_m=(-0.9, 0.4, 1.2))
    drum = shape(name="drum", kind="tube", radius_m=0.5, length_m=1.2, center_m=(0.8, -0.6, 1.1))
    craft = Craft((bus, ball, drum), (("bus.+z",), ("ball.whole",)), 300)
    rng = np.random.default_rng(4)
    p = np.column_stack([rng.uniform(-2, 2, (40_000, 2)), np.full(40_000, 0.5)])
    free = np.hypot(p[:, 0] - 0.8, p[:, 1] + 0.6) > 0.5
    for vector in ((0.5, 0.3, 0.8), (-0.9, 0.2, 0.5), (0.1, -0.7, 0.6)):
        s = unit(*vector)
        o = p - np.array([-0.9, 0.4, 1.2])
        b = o @ s[:, 0]
        hit = (b < 0.0) & (b * b > (o * o).sum(axis=1) - 0.49)
        q = p - np.array([0.8, -0.6, 1.1])
        flat = s[:2, 0]
        a, h = flat @ flat, q[:, :2] @ flat
        inside = h * h - a * ((q[:, :2] ** 2).sum(axis=1) - 0.25)
        root = np.sqrt(np.maximum(inside, 0.0))
        first, last = (-h - root) / a, (-h + root) / a
        low, high = (-0.6 - q[:, 2]) / s[2, 0], (0.6 - q[:, 2]) / s[2, 0]
        hit |= (inside > 0.0) & (np.minimum(last, high) > np.maximum(np.maximum(first, low), 0.0))
        share = exposure(craft, s, STILL)[1]
        assert share[0, 0] == pytest.approx(1.0 - hit[free].mean(), abs=0.012)  # 0.003 is chance


def test_a_ball_alone_shows_a_quarter_of_its_area() -> None:
    ball = shape(name="ball", kind="ball", radius_m=0.7)
    craft = Craft((ball,), (("ball.whole",),), 1000)
    cosine, share = exposure(craft, unit(0.3, -0.5, 0.8), STILL)
    assert cosine[0, 0] == pytest.approx(0.25, rel=3e-3)
    assert share[0, 0] == pytest.approx(1.0)


def test_deep_dish_shades_itself_at_a_slant() -> None:
    dish = shape(name="dish", kind="paraboloid", radius_m=1.0, depth_m=0.8, thickness_m=0.02)
    craft = Craft((dish,), (("dish.front",), ("dish.back",)), 900)
    cosine, share = exposure(craft, np.hstack([unit(0, 0, 1), unit(1, 0, 0.5)]), np.zeros(2))
    aperture = np.pi / patches(craft)[0].area_m2
    assert (cosine * share)[0, 0] == pytest.approx(aperture, rel=0.01)
    # light that comes in through the aperture: all of it ends in the dish
    slant = 0.5 / np.hypot(1.0, 0.5)
    assert (cosine * share)[0, 1] == pytest.approx(aperture * slant, rel=0.05)


def test_table_states_its_error() -> None:
    bus = shape(name="bus", kind="block", size_m=(1.0, 1.0, 1.0))
    fin = shape(name="fin", kind="panel", size_m=(1.0, 1.0), thickness_m=0.02,
                axis=(0.0, 1.0, 0.0), along=(1.0, 0.0, 0.0), center_m=(0.0, 0.0, 1.0))  # fmt: skip
    craft = Craft((bus, fin), (("bus.+z",),), 300)
    largest, typical = table_error(craft, Wings())
    assert 0.0 < typical[0] < largest[0] < 0.03
    s = unit(0.4, 0.7, 0.2)
    mean, share = sun_views(craft, Wings()).at(s)
    right_cosine, right_share = exposure(craft, s, STILL)
    assert mean * share == pytest.approx(
        right_cosine * right_share, abs=2.0 * float(largest[0]) + 1e-3
    )
