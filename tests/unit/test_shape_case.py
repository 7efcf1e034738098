"""Shapes in a case file: what they give to the surfaces, and what is refused by name."""

import json
from pathlib import Path

import numpy as np
import pytest
from typer.testing import CliRunner

from charging.case import load_case, load_case_text
from charging.cli import app
from charging.errors import InputError
from charging.flight import path
from charging.shape.craft import craft_panels
from charging.shape.solution import shape_field
from charging.shape.views import craft_of
from charging.spacecraft import spacecraft_network

DEMO = Path(__file__).parents[2] / "cases" / "geo_substorm_day_shape.toml"

CASE = """
title = "two bodies"
[orbit]
kind = "fixed"
epoch = 2031-03-20T00:00:00Z
duration_h = 1.0
illumination = 1.0
sun_direction = [0.0, 0.6, 0.8]
[plasma]
use = "quiet geostationary"
[body]
radius_m = 1.0
panels = 200
[[shape]]
name = "bus"
kind = "block"
size_m = [1.0, 1.0, 1.0]
[[shape]]
name = "plate"
kind = "panel"
size_m = [1.0, 0.5]
thickness_m = 0.05
center_m = [0.0, 0.0, 0.525]
[[surface]]
name = "top"
material = "gold"
face = "bus.+z"
[[surface]]
name = "film"
material = "polyimide film"
face = "plate.front"
thickness_m = 25e-6
temperature_K = 290.0
[[surface]]
name = "sides"
material = "gold"
faces = ["bus.+x", "bus.-x", "bus.+y"]
"""


def refused(old: str, new: str) -> InputError:
    assert old in CASE
    with pytest.raises(InputError) as caught:
        load_case_text(CASE.replace(old, new, 1))
    assert caught.value.file == "case.toml"
    assert caught.value.line is not None
    line = CASE.replace(old, new, 1).splitlines()[caught.value.line - 1]
    assert line.strip(), caught.value
    return caught.value


def test_surfaces_take_area_normal_and_neighbours_from_their_faces() -> None:
    case = load_case_text(CASE).case
    top, film, sides = case.surface
    assert top.area_m2 == pytest.approx(1.0 - 0.5)  # the plate covers half of it
    assert film.area_m2 == pytest.approx(0.5)
    assert top.normal == (0.0, 0.0, 1.0)
    assert sides.normal is None
    assert sides.area_m2 == pytest.approx(3.0)
    assert top.neighbours == ("sides",)
    assert film.neighbours == ()  # its edge lies between


def test_capacitances_reach_the_network() -> None:
    loaded = load_case_text(CASE)
    net = spacecraft_network(loaded.case, loaded.materials)
    field = shape_field(craft_of(loaded.case))
    alone = np.ones(len(net.node_names))
    assert alone @ net.capacitance_F @ alone == pytest.approx(field.capacitance_F.sum())
    assert net.capacitance_F == pytest.approx(net.capacitance_F.T)


def test_light_and_shadow_reach_the_way_flown() -> None:
    case = load_case_text(CASE).case
    shot = path(case).snapshot(np.array([0.0]))
    assert shot.incidence_cosine[:, 0] == pytest.approx([0.8, 0.8, 0.6 / 3.0], abs=1e-3)
    # the plate's edge, 0.05 high, throws 0.05 · 0.6/0.8 over the width of 1 onto the half left
    assert shot.lit_share[0, 0] == pytest.approx(1.0 - 0.05 * 0.75 / 0.5, abs=5e-3)
    assert shot.lit_share[1, 0] == pytest.approx(1.0, abs=1e-6)


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ('face = "bus.+z"', 'face = "bus.+w"', 'Nearest: "bus.'),
        ('face = "bus.+z"', 'face = "plate.front"', 'belongs to surface "top" already'),
        ('face = "bus.+z"', "area_m2 = 1.0\nnormal = [0.0, 0.0, 1.0]", "face is missing"),
        ('face = "bus.+z"', 'face = "bus.+z"\narea_m2 = 2.0', "of which 0.5 m2 are free"),
        ('face = "bus.+z"', 'face = "bus.+z"\nnormal = [1.0, 0.0, 0.0]', "look along [0, 0, 1]"),
        ('face = "bus.+z"', 'face = "bus.+z"\nneighbours = ["film"]', "are found from the shapes"),
        ("[0.0, 0.0, 0.525]", "[0.0, 0.0, 0.5]", 'overlaps shape "bus"'),
        ("[0.0, 0.0, 0.525]", "[0.0, 0.0, 0.6]", "hangs loose, 0.075 m"),
        ("[0.0, 0.0, 0.525]", "[0.0, 0.0, 0.0]", 'overlaps shape "bus"'),
        ("size_m = [1.0, 0.5]", "size_m = [1.0, 1.0]", "has no area: other shapes cover it"),
        ("thickness_m = 0.05", "thickness_m = 0.00001", "leaves a degenerate shape"),
        ("size_m = [1.0, 0.5]", "size_m = [1.0, 0.5, 1.0]", "has 3 entries"),
        ("size_m = [1.0, 1.0, 1.0]", "size_m = [1.0, -1.0, 1.0]", "above 0"),
        ('kind = "panel"', 'kind = "pannel"', 'Nearest: "panel"'),
        ("thickness_m = 0.05", "thickness_m = 0.05\nradius_m = 1.0", "does not go with kind"),
        ('name = "plate"', 'name = "bus"', "is the name of shape 1 already"),
        ("size_m = [1.0, 0.5]", "size_m = [1.0, 0.5]\nwidth_m = 2.0", 'key "width_m" is unknown'),
    ],
)
def test_faults_are_named_at_their_line(old: str, new: str, words: str) -> None:
    assert words in str(refused(old, new))


def test_a_ring_turned_inside_out_is_refused() -> None:
    ring = 'kind = "ring plate"\nradius_m = 0.4\ninner_radius_m = 0.5'
    error = refused('kind = "panel"\nsize_m = [1.0, 0.5]', ring)
    assert "turns the ring inside out" in str(error)


def test_a_face_needs_a_shape() -> None:
    start, end = CASE.index("[[shape]]"), CASE.index("[[surface]]")
    with pytest.raises(InputError, match=r"needs a \[\[shape\]\] that has it"):
        load_case_text(CASE[:start] + CASE[end:])


def test_panels_of_the_demonstration_close_at_every_angle() -> None:
    craft = craft_of(load_case(DEMO).case)
    volume = None
    for angle in craft.angles_rad:
        panels = craft_panels(craft, angle)
        closed = (panels.normal * panels.area_m2[:, None]).sum(axis=0)
        assert np.abs(closed).max() < 1e-9
        volume = panels.volume_m3 if volume is None else volume
        assert panels.volume_m3 == pytest.approx(volume, rel=1e-9)


def test_shape_command_prints_and_draws(tmp_path: Path) -> None:
    case, picture = tmp_path / "case.toml", tmp_path / "craft.svg"
    case.write_text(CASE, encoding="utf-8")
    done = CliRunner().invoke(app, ["shape", str(case), "--plot", str(picture)])
    assert done.exit_code == 0, done.output
    assert "as a sphere of" in done.output
    assert picture.read_text(encoding="utf-8").startswith("<?xml")
    done = CliRunner().invoke(app, ["shape", str(case), "--json"])
    account = json.loads(done.stdout)
    assert [row["surface"] for row in account["surfaces"]] == ["top", "film", "sides"]
    assert account["whole"]["volume_m3"] == pytest.approx(1.0 + 0.025)


def test_shape_command_refuses_a_case_without_shapes() -> None:
    plain = DEMO.with_name("geo_substorm_day.toml")
    done = CliRunner().invoke(app, ["shape", str(plain)])
    assert isinstance(done.exception, InputError)
    assert "has no shapes" in str(done.exception)
