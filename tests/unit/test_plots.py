"""Plots of a result: what they show, from the dataset alone, and how they are written."""

import json
import struct
import subprocess
import sys
from itertools import combinations, pairwise
from pathlib import Path

import matplotlib as mpl
import numpy as np
import pytest
import xarray as xr
from hypothesis import given
from hypothesis import strategies as st
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.text import Text

from charging.dataset import ALL_MECHANISMS
from charging.errors import InputError
from charging.plot_currents import structure_patches, worst_moments
from charging.plot_page import Page, spread_out, text_width_in, voltage_ticks
from charging.plot_time import clock_ticks, course, daily_extremes
from charging.plots import (
    PLOTS,
    currents_page,
    detail_page,
    detail_window,
    differentials_page,
    limit_lines,
    plot_all,
    potentials_page,
)
from charging.result_plasma import REGION_MASKS

START = np.datetime64("2031-03-20T00:00:00", "ns")
LIMITS = [
    {"kind": "normal", "limit": 1000.0, "surfaces": None, "requirement_id": "a"},
    {"kind": "field", "limit": 1e7, "surfaces": None, "requirement_id": "b"},
    {"kind": "inverted", "limit": 100.0, "surfaces": None, "requirement_id": "c"},
]


def result(
    seconds=None,
    *,
    films=("film", "glass"),
    patches=("frame", "ring"),
    structure=None,
    differential=None,
    umbra=(),
    event=None,
    modes=(),
    emission=None,
    fixed=False,
    **attrs,
):
    """Build a small result; differential(k, t) per film, umbra as (start, end) pairs [s].

    modes: (name, start, end) [s]; one named "storm" brings the plasma of the event.
    """
    t = np.arange(0.0, 86401.0, 60.0) if seconds is None else np.asarray(seconds, dtype=float)
    base = np.full_like(t, 3.0) if structure is None else structure(t)
    own = [np.zeros_like(t) if differential is None else differential(k, t)
           for k in range(len(films))]  # fmt: skip
    away = np.array([*own, *(np.zeros_like(t) for _ in patches)])
    region = np.zeros(t.shape, dtype=np.int8)
    for start, end in umbra:
        region[(t >= start) & (t <= end)] |= REGION_MASKS["umbra"]
        near = ((t >= start - 120.0) & (t < start)) | ((t > end) & (t <= end + 120.0))
        region[near] |= REGION_MASKS["penumbra"]
    active = np.zeros(t.shape, dtype=bool)
    if event is not None:
        active = (t >= event[0]) & (t <= event[1])
        region[active] |= REGION_MASKS["plasma_event"]
    emitter = np.zeros(t.shape)
    if emission is not None:
        emitter[(t >= emission[0]) & (t < emission[1])] = 1e-4
    for name, start, end in modes:
        within = (t >= start) & (t < end)
        region[within] |= REGION_MASKS["mode_interval"]
        active |= within & (name == "storm")
    current = np.zeros((len(ALL_MECHANISMS), len(away), len(t)))
    current[ALL_MECHANISMS.index("electron_collection")] = -2e-6
    current[ALL_MECHANISMS.index("photoemission")] = 5e-6
    dataset = xr.Dataset(
        {
            "structure_potential": ("time", base),
            "potential": (("surface", "time"), base + away),
            "differential_potential": (("surface", "time"), away),
            "current_density": (("mechanism", "surface", "time"), current),
            "region": ("time", region),
            "emitter_current": ("time", emitter),
            "position": (("axis", "time"), np.full((3, len(t)), 0.0 if fixed else 4.2e7)),
            "population_density": (
                ("population", "time"), np.array([1e6 * (1.0 - active), 1.5e6 * active]),
            ),
            "surface_area": ("surface", 1.0 + np.arange(len(away), dtype=float)),
        },
        coords={
            "time": START + np.round(t * 1e9).astype("timedelta64[ns]"),
            "surface_name": ("surface", [*films, *patches]),
            "mechanism_name": ("mechanism", list(ALL_MECHANISMS)),
            "node_name": ("node", ["structure", *films]),
            "population_name": ("population", ["calm: electron 1", "storm, strong: electron 1"]),
        },
        attrs={"title": "A day of Sample-1", "mode": "base", "halflit_version": "0.1.0",
               "secondary_law": "sanders_inouye_1979", "limits": json.dumps(LIMITS),
               "mode_spans": json.dumps(
                   [{"name": n, "start_s": a, "end_s": b} for n, a, b in modes])} | attrs,
    )  # fmt: skip
    dataset["region"].attrs = {
        "flag_masks": np.array(list(REGION_MASKS.values()), dtype=np.int8),
        "flag_meanings": " ".join(REGION_MASKS),
    }
    return dataset


def storm(k, t):
    """First film: dip to -1391 V at 14:10; others: rise to +1950 V at 12:28."""
    if k == 0:
        return -1391.0 * np.exp(-(((t - 51000.0) / 3000.0) ** 2))
    return 1950.0 * np.exp(-(((t - 44880.0) / 2000.0) ** 2)) / k


def day(**changes):
    given_ = {"differential": storm, "umbra": [(40920.0, 44880.0)], "event": (42300.0, 72300.0)}
    return result(**(given_ | changes))


def texts(page):
    return [t.get_text() for t in page.figure.findobj(Text) if t.get_text().strip()]


def panel(page, label):
    return next(a for a in page.figure.axes if label in a.get_ylabel())


def has(page, part):
    return any(part in text for text in texts(page))


LONG_RUN = np.arange(0.0, 365.0 * 86400.0 + 1.0, 1800.0)
SCENES = {
    "day": day,
    "nothing happens": lambda: result(),
    "one film": lambda: day(films=("film",), patches=()),
    "one bonded plate": lambda: result(films=(), patches=("plate",)),
    "one film in the dark for ever": lambda: result(films=("film",), umbra=[(0.0, 1e9)]),
    "many films": lambda: day(films=tuple(f"film {k}" for k in range(40))),
    "many patches": lambda: day(patches=tuple(f"patch {k}" for k in range(20))),
    "long names": lambda: day(
        films=("outer half of the solar array cover glass, facing the Sun, of wing north",
               "W" * 64), patches=tuple(f"{k} {'long name ' * 5}" for k in range(4)),
    ),
    "fixed": lambda: result(np.arange(0.0, 7201.0, 1.0), fixed=True, differential=storm,
                            structure=lambda t: -9000.0 * (1.0 - np.exp(-t / 100.0))),
    "fixed and dark": lambda: result(fixed=True, umbra=[(0.0, 1e9)], mode="eclipse",
                                     structure=lambda t: np.full_like(t, -10381.0)),
    "fixed, two times": lambda: result([0.0, 60.0], fixed=True),
    "two times": lambda: result([0.0, 60.0]),
    "one second": lambda: result(np.arange(0.0, 1.01, 0.1), differential=storm),
    "orbits": lambda: day(umbra=[(5600.0 * k, 5600.0 * k + 2100.0) for k in range(15)]),
    "a year": lambda: result(
        LONG_RUN, event=(42300.0, 72300.0), differential=lambda k, t: storm(k, t) + k,
        umbra=[(86400.0 * k + 40920.0, 86400.0 * k + 44880.0) for k in range(22)],
    ),
    "modes": lambda: day(modes=[("storm", 21600.0, 25200.0), ("safe", 14400.0, 18000.0)],
                         emission=(7200.0, 10800.0)),
    "modes, fixed": lambda: result(np.arange(0.0, 7201.0, 1.0), fixed=True,
                                   modes=[("storm", 60.0, 600.0)]),
    "modes in a year": lambda: result(LONG_RUN, modes=[("storm", 8.64e5, 9e5)]),
    "odd title": lambda: day(title="100 $ of 衛星 \\alpha $x_$ " + "very long title " * 30),
    "no attributes": lambda: day().drop_attrs(deep=False),
}  # fmt: skip


@pytest.mark.parametrize("scene", SCENES)
@pytest.mark.parametrize("name", PLOTS)
def test_no_text_overlaps_another_or_leaves_the_sheet(scene, name):
    page = PLOTS[name](SCENES[scene]())
    canvas = page.figure.canvas
    assert isinstance(canvas, FigureCanvasAgg)
    canvas.draw()
    sheet = page.figure.bbox
    found = [t for t in page.figure.findobj(Text) if t.get_text().strip() and t.get_visible()]
    assert len(found) > 10
    boxes = [(t.get_text(), Text.get_window_extent(t, canvas.get_renderer())) for t in found]
    for text, box in boxes:
        assert sheet.x0 <= box.x0 < box.x1 <= sheet.x1, text
        assert sheet.y0 <= box.y0 < box.y1 <= sheet.y1, text
    for (one, a), (other, b) in combinations(boxes, 2):
        wide = min(a.x1, b.x1) - max(a.x0, b.x0)
        high = min(a.y1, b.y1) - max(a.y0, b.y0)
        assert wide <= 1.0 or high <= 3.0, (one, other)  # dots; a box has air above its letters


def test_four_pictures_and_nothing_else_are_written(tmp_path):
    folder = tmp_path / "new" / "plots"
    written = plot_all(day(), folder)
    assert [p.name for p in written] == [
        "potentials.png", "differentials.png", "detail.png", "breakdown.png",
    ]  # fmt: skip
    assert sorted(folder.iterdir()) == sorted(written)
    for file in written:
        data = file.read_bytes()
        assert data[:8] == b"\x89PNG\r\n\x1a\n"
        width, height = struct.unpack(">II", data[16:24])
        assert width == 1600
        assert height / width < 1.5  # fits a page
        assert b"tIME" not in data
        assert b"Creation" not in data


def test_file_read_back_gives_the_same_bytes(tmp_path):
    dataset = day()
    dataset.to_netcdf(tmp_path / "result.nc")
    with xr.open_dataset(tmp_path / "result.nc") as again:
        one = plot_all(dataset, tmp_path / "one")
        two = plot_all(again, tmp_path / "two")
    assert [p.read_bytes() for p in one] == [p.read_bytes() for p in two]


def test_pictures_are_replaced_as_a_whole(tmp_path, monkeypatch):
    before = [p.read_bytes() for p in plot_all(day(), tmp_path)]

    def broken(self, stream, **_):
        Path(stream).write_bytes(b"half a picture")
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(Figure, "savefig", broken)
    with pytest.raises(InputError, match="no space left"):
        plot_all(result(), tmp_path)
    files = sorted(tmp_path.iterdir())
    assert sorted(p.read_bytes() for p in files) == sorted(before)


def test_global_state_of_matplotlib_is_left_alone(tmp_path):
    before = dict(mpl.rcParams)
    plot_all(day(), tmp_path)
    assert dict(mpl.rcParams) == before
    code = "import sys, charging.plots; print('matplotlib.pyplot' in sys.modules)"
    out = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert out.stdout.strip() == "False"


def test_title_mode_and_footer():
    for draw in PLOTS.values():
        page = draw(day(mode="eclipse"))
        assert has(page, "A day of Sample-1")
        assert has(page, "mode eclipse")
        assert has(page, "halflit 0.1.0 - an estimate; standards and specialists decide")


def test_a_title_is_text_and_no_formula():
    page = potentials_page(day(title="cost $x_1$ 衛"))
    title = next(t for t in page.figure.findobj(Text) if "cost" in t.get_text())
    assert title.get_text() == "cost $x_1$ □"
    assert not title.get_parse_math()


def test_volts_and_kilovolts_are_readable_together():
    page = potentials_page(day(structure=lambda t: np.where(t < 43200.0, 5.0, -5000.0)))
    axes = panel(page, "potential")
    height = axes.get_window_extent().height

    def place(volts):
        return axes.transData.transform((0.0, volts))[1]

    assert (place(5.0) - place(0.0)) / height > 0.05
    assert (place(-1000.0) - place(-5000.0)) / height > 0.05
    assert "(V)" in axes.get_ylabel()
    assert axes.get_xlabel() == "time (UTC)"


def test_values_close_together_get_an_axis_of_their_own():
    dataset = result(structure=lambda t: -10000.0 - t / 86400.0 * 300.0)
    low, high = panel(potentials_page(dataset), "potential").get_ylim()
    assert -10400.0 < low < -10300.0
    assert -10000.0 < high < -9900.0


def test_structure_names_the_surfaces_bonded_to_it():
    page = potentials_page(day())
    assert has(page, "structure; frame; ring")
    assert not has(differentials_page(day()), "frame")


def test_lines_can_be_told_apart_without_colour():
    page = potentials_page(day(films=tuple(f"film {k}" for k in range(12))))
    lines = [n for n in panel(page, "potential").lines if len(n.get_xdata()) > 100]
    looks = {(n.get_color(), str(n._dash_pattern)) for n in lines}
    assert len(lines) == len(looks) == 13
    assert len({str(n._dash_pattern) for n in lines[1:9]}) == 8


@pytest.mark.parametrize("fixed", [False, True])
def test_worst_differentials_are_annotated_with_time_and_value(fixed):
    page = differentials_page(day(fixed=fixed))
    times = ("after 14.2 h", "after 12.5 h") if fixed else ("at 14:10:00 UTC", "at 12:28:00 UTC")
    assert has(page, f"worst normal: film −1391 V {times[0]}")
    assert has(page, f"worst inverted: glass +1950 V {times[1]}")
    axes = panel(page, "surface minus structure")
    marks = {(n.get_xdata()[0], n.get_ydata()[0]) for n in axes.lines if n.get_marker() == "o"}
    assert marks == {(51000.0, -1391.0), (44880.0, 1950.0)}


def test_differentials_below_a_millivolt_are_no_worst_case():
    noise = result(differential=lambda k, t: 1e-13 * np.sin(t))
    assert not has(differentials_page(noise), "worst")
    assert worst_moments(noise)[0][0] == "structure"


def horizontals(axes: Axes):
    return {n.get_ydata()[0] for n in axes.lines
            if len(n.get_xdata()) == 2 and n.get_ydata()[0] == n.get_ydata()[1]
            and n.get_transform() == axes.get_yaxis_transform()}  # fmt: skip


def test_limits_come_from_the_attributes():
    axes = panel(differentials_page(day()), "surface minus structure")
    assert horizontals(axes) == {0.0, -1000.0, 100.0}
    assert has(differentials_page(day()), "limit −1000 V")


def test_no_limits_are_drawn_without_the_attribute():
    dataset = day()
    del dataset.attrs["limits"]
    axes = panel(differentials_page(dataset), "surface minus structure")
    assert horizontals(axes) == {0.0}
    assert not has(differentials_page(dataset), "limit")


def test_a_limit_for_some_surfaces_says_so():
    own = [
        {"kind": "normal", "limit": 200.0, "surfaces": ["film"], "requirement_id": "x"},
        {"kind": "normal", "limit": 300.0, "surfaces": ["a", "b"], "requirement_id": "y"},
    ]
    found = limit_lines(day(limits=json.dumps(own)))
    assert [(n.value_V, n.name) for n in found] == [
        (-200.0, "limit −200 V, film"), (-300.0, "limit −300 V, 2 surfaces"),
    ]  # fmt: skip


def test_eclipse_and_event_are_found_named_and_shaded():
    along = course(day())
    assert [(s.start_s, s.end_s) for s in along.umbra] == [(40890.0, 44910.0)]
    assert [(s.start_s, s.end_s) for s in along.penumbra] == [
        (40770.0, 40890.0), (44910.0, 45030.0),
    ]  # fmt: skip
    assert [s.name for s in along.events] == ["storm, strong"]
    page = potentials_page(day())
    for word in ("umbra", "penumbra", "plasma event", "storm, strong", "umbra 11:22 to 12:29"):
        assert has(page, word)
    shaded = [c.get_paths()[0].get_extents() for c in panel(page, "potential").collections]
    assert (40890.0, 44910.0) in [(box.x0, box.x1) for box in shaded]
    quiet = potentials_page(result())
    assert has(quiet, "sunlit")
    assert not has(quiet, "umbra")
    assert not has(quiet, "event")


def test_plasma_of_a_mode_modes_and_emission_are_shown():
    hour = 3600.0
    dataset = day(
        modes=[("storm", 6.0 * hour, 7.0 * hour), ("safe", 4.0 * hour, 5.0 * hour)],
        emission=(2.0 * hour, 3.0 * hour),
    )
    along = course(dataset)
    changed = [(s.start_s, s.end_s, s.name) for s in along.switched]
    assert changed == [(6.0 * hour - 30.0, 7.0 * hour - 30.0, "storm, strong")]
    assert [s.start_s for s in along.events] == [42270.0]
    page = potentials_page(dataset)
    by_name = {t.get_text(): a for a in page.figure.axes for t in a.texts}
    assert by_name["modes"] is by_name["storm"] is by_name["safe"] is by_name["emitter"]
    drawn = [c.get_paths()[0].get_extents() for c in by_name["modes"].collections]
    assert (7170.0, 10770.0) in [(box.x0, box.x1) for box in drawn]
    assert (14400.0, 18000.0) in [(box.x0, box.x1) for box in drawn]
    plasma = [c.get_paths()[0].get_extents() for c in by_name["plasma"].collections]
    assert (21570.0, 25170.0) in [(box.x0, box.x1) for box in plasma]
    assert not has(potentials_page(day()), "modes")
    assert len(potentials_page(day()).figure.axes) == len(page.figure.axes) - 1


def test_modes_that_overlap_are_named_together():
    dataset = day(modes=[("safe", 0.0, 7200.0), ("storm", 3600.0, 7200.0)])
    assert [s.name for s in course(dataset).modes] == ["safe", "safe + storm"]
    del dataset.attrs["mode_spans"]
    assert [s.name for s in course(dataset).modes] == ["mode"]


@pytest.mark.parametrize(("step", "start"), [(0.5, 1.0), (1.0, 1.0), (60.0, 60.0)])
def test_a_run_without_orbit_has_a_logarithmic_axis_from_one_second(step, start):
    page = potentials_page(result(np.arange(0.0, 7200.1, step), fixed=True))
    axes = panel(page, "potential")
    assert axes.get_xscale() == "log"
    assert axes.get_xlim() == (start, 7200.0)
    assert axes.get_xlabel().startswith("time since the start")
    assert ("first output after 60 s" in axes.get_xlabel()) == (step == 60.0)
    assert "10 min" in [t.get_text() for t in axes.get_xticklabels()]


def test_detail_shows_the_eclipse():
    dataset = day()
    zoom = detail_window(dataset, course(dataset))
    assert zoom.shown == (40890.0 - 900.0, 45030.0 + 5400.0)
    page = detail_page(dataset)
    assert [a.get_xlim() for a in page.figure.axes] == [zoom.shown] * 4
    # the worst normal differential comes later, so the picture must not call its own the worst
    assert has(page, "worst normal of this window: film −1")
    assert not has(page, "−1391")
    assert has(page, "worst inverted: glass +1950 V")


def test_detail_shows_the_whole_run_without_eclipse_or_orbit():
    for dataset in (result(), result(fixed=True, umbra=[(0.0, 1e9)])):
        along = course(dataset)
        assert detail_window(dataset, along) == along


def test_detail_of_many_days_shows_the_worst_eclipse():
    nights = [(86400.0 * k + 40920.0, 86400.0 * k + 44880.0) for k in range(30)]
    dataset = result(
        np.arange(0.0, 30.0 * 86400.0 + 1.0, 60.0), umbra=nights,
        differential=lambda k, t: storm(k, t - 5.0 * 86400.0),
    )  # fmt: skip
    low, high = detail_window(dataset, course(dataset)).shown
    assert low == 5.0 * 86400.0 + 40890.0 - 900.0
    assert high == 5.0 * 86400.0 + 45030.0 + 5400.0


def test_breakdown_shows_microamperes_at_the_worst_moments():
    dataset = day()
    electrons = dataset["current_density"].values[0]
    electrons[0, int(51000 / 60)] = -7.25e-6  # the film at its worst normal moment
    electrons[2, int(51000 / 60)] = -3.5e-6  # a patch at the same moment
    electrons[1, int(44880 / 60)] = -1.5e-6  # the glass at its worst inverted moment
    assert worst_moments(dataset) == [("normal", 0, 850), ("inverted", 1, 748)]
    assert structure_patches(dataset) == [3, 2]  # the larger one first
    page = currents_page(dataset)
    assert has(page, "Worst normal differential: film, 1391 V below the structure, at 14:10:00")
    assert has(page, "Worst inverted differential: glass, 1950 V above the structure, at 12:28:00")
    film, patches, glass, _ = page.figure.axes
    widths = [p.get_width() for p in film.patches]
    assert widths == pytest.approx([-7.25, 5.0, -2.25])  # electrons, photoemission, sum
    assert [p.get_width() for p in glass.patches] == pytest.approx([-1.5, 5.0, 3.5])
    assert [p.get_width() for p in patches.patches] == pytest.approx(
        [-2.0, -3.5, 5.0, 5.0, 3.0, 1.5]
    )
    assert "µA m⁻²" in film.get_xlabel()


def test_long_runs_keep_every_peak():
    t = np.arange(0.0, 20.0 * 86400.0 + 1.0, 60.0)
    values = np.sin(t / 7000.0)
    values[[1234, 20001, len(t) - 1]] = [50.0, -70.0, 90.0]
    middle, least, most = daily_extremes(t, values)
    assert len(middle) == 20
    assert most[0] == 50.0
    assert least[int(20001 * 60 / 86400)] == -70.0
    assert most[-1] == 90.0
    page = potentials_page(SCENES["a year"]())
    assert has(page, "lowest and highest of each day")
    assert max(len(n.get_xdata()) for n in panel(page, "potential").lines) == 365


def test_ticks_of_months_and_of_seconds():
    start = np.datetime64("2031-03-20T11:59:30", "ns")
    assert clock_ticks(start, 0.0, 365.0 * 86400.0)[1][0] == "2031-05"
    ticks, names = clock_ticks(start, 0.0, 60.0)
    assert names[0] == "11:59:30\n2031-03-20"
    assert "12:00:00" in names
    assert ticks[names.index("12:00:00")] == 30.0


@given(
    low=st.floats(-3e4, -0.2), high=st.floats(0.2, 3e4), linear=st.sampled_from([1.0, 5.0, 50.0])
)
def test_ticks_of_volts_are_round_apart_and_hold_zero(low, high, linear):
    ticks = voltage_ticks(low, high, linear, 4.0)
    assert 0.0 in ticks
    assert all(low <= t <= high for t in ticks)
    assert all(f"{abs(t):e}"[0] in "0125" for t in ticks)
    places = np.arcsinh(np.array(ticks) / linear)
    span = np.arcsinh(high / linear) - np.arcsinh(low / linear)
    assert (np.diff(places) / span * 4.0 > 0.25).all()


@given(st.lists(st.tuples(st.floats(-1.0, 11.0), st.floats(0.1, 0.8)), min_size=1, max_size=12))
def test_labels_are_spread_without_overlap_in_their_order(pairs):
    wanted, heights = zip(*pairs, strict=True)
    places = spread_out(wanted, heights, 10.0)
    order = np.argsort(wanted, kind="stable")
    edges = [(places[i] - heights[i] / 2.0, places[i] + heights[i] / 2.0) for i in order]
    assert edges[0][0] >= -1e-9
    assert edges[-1][1] <= 10.0 + 1e-9
    assert all(b[0] >= a[1] - 1e-9 for a, b in pairwise(edges))


def test_width_of_text_is_never_underestimated():
    page = Page(3.0, "", "", "")
    canvas = page.figure.canvas
    assert isinstance(canvas, FigureCanvasAgg)
    for text in ("worst normal: anti-nadir panel −1391 V at 14:10:00 UTC", "umbra 11:22 to 12:29"):
        drawn = page.figure.text(0.1, 0.5, text, size=8.0, family="DejaVu Sans")
        assert drawn.get_window_extent(canvas.get_renderer()).width / 200.0 <= text_width_in(text)
