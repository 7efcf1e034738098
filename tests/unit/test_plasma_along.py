"""The plasma along a run: keys of the case, files with faults, tables, events and streams."""

from pathlib import Path

import numpy as np
import pytest

from charging.case import LoadedCase, load_case, load_case_text
from charging.currents.surface import surface_currents
from charging.dataset import mode_dataset
from charging.errors import InputError
from charging.orbit_run import CaseRun, solve_mode, surroundings_of
from charging.result_plasma import PLACE_MASK, PLACE_SHIFT
from environments.regions import REGIONS

CASE = """
title = "small"
[orbit]
kind = "kepler"
epoch = 2031-03-20T00:00:00Z
semi_major_axis_km = {a}
eccentricity = {e}
inclination_deg = 20.0
raan_deg = 60.0
argument_of_perigee_deg = 0.0
mean_anomaly_deg = {mean}
[time]
duration_h = {hours}
output_step_s = 60.0
[attitude]
law = "nadir"
{plasma}
[body]
radius_m = 1.0
[emission]
secondary_law = "sanders_inouye_1979"
[[surface]]
name = "front"
material = "oxidised aluminium"
area_m2 = 2.0
normal = [1.0, 0.0, 0.0]
[[surface]]
name = "back"
material = "oxidised aluminium"
area_m2 = 2.0
normal = [-1.0, 0.0, 0.0]
"""
GEO = {"a": 42164.0, "e": 0.0, "mean": 0.0, "hours": 1.0}
TRANSFER = {"a": 24475.0, "e": 0.7273, "mean": 0.0, "hours": 4.0}
REGION = '[plasma]\nmodel = "regions"\nkp = 4.0\n'


def loaded(plasma: str, **orbit: float) -> LoadedCase:
    return load_case_text(CASE.format(plasma=plasma, **(orbit or GEO)))


def refused(plasma: str) -> InputError:
    with pytest.raises(InputError) as caught:
        loaded(plasma)
    return caught.value


@pytest.mark.parametrize(
    ("plasma", "words"),
    [
        ("[plasma]\n", "use"),
        ('[plasma]\nuse = "quiet geostationary"\nmodel = "regions"\n', "beside use"),
        ('[plasma]\nmodel = "regions"\nfile = "a.csv"\n', "beside model"),
        ('[plasma]\nuse = "quiet geostationary"\nkp = 3.0\n', 'needs model = "regions"'),
        ('[plasma]\nmodel = "regions"\nkp = 9.5\n', "kp"),
        ('[plasma]\nmodel = "region"\n', "model"),
        ('[plasma]\nmodel = "regions"\naround = "moon"\nsolar_zenith_angle_deg = 3.0\n', "fixed"),
        ('[plasma]\nmodel = "regions"\narc = "no such arc"\n', "is unknown"),
    ],
)
def test_faults_of_the_table(plasma: str, words: str) -> None:
    assert words in str(refused(plasma))


def timeline(folder: Path, rows: str, columns: str = "") -> Path:
    columns = columns or (
        "time,electron_density_cm3,electron_temperature_eV,H+_density_cm3,H+_temperature_eV"
    )
    (folder / "m.csv").write_text(f"# source = a test\n{columns}\n{rows}", encoding="utf-8")
    case = folder / "case.toml"
    case.write_text(CASE.format(plasma='[plasma]\nfile = "m.csv"\n', **GEO), encoding="utf-8")
    return case


ROW = "2031-03-20T00:{minute:02d}:00Z,{n},1000,1.0,5000\n"
GOOD = "".join(ROW.format(minute=m, n=1.0 + 0.01 * m) for m in range(0, 60, 10))
LAST = "2031-03-20T01:00:00Z,2.0,1000,1.0,5000\n"


@pytest.mark.parametrize(
    ("rows", "columns", "words"),
    [
        (ROW.format(minute=0, n="nan") + GOOD[len(ROW.format(minute=0, n=1.0)) :], "", "m.csv:3"),
        (GOOD + "2031-03-20T01:00:00Z,-2.0,1000,1.0,5000\n", "", "m.csv:9"),
        (ROW.format(minute=0, n=1.0) + LAST, "", "m.csv:4"),
        (GOOD + LAST, "time,electron_density_cm3,electron_temp_eV,H+_density_cm3,"
         "H+_temperature_eV", "m.csv:2"),
        (GOOD, "", "does not cover"),
    ],
    ids=["nan", "negative", "gap", "column", "short"],
)  # fmt: skip
def test_faults_of_a_timeline(tmp_path: Path, rows: str, columns: str, words: str) -> None:
    with pytest.raises(InputError) as caught:
        load_case(timeline(tmp_path, rows, columns))
    assert words in str(caught.value)


def test_a_timeline_is_followed(tmp_path: Path) -> None:
    case = load_case(timeline(tmp_path, GOOD + LAST))
    around = surroundings_of(case)
    assert around.along is not None
    density, temperature = around.along.moments(np.array([0.0, 300.0, 3600.0]))
    np.testing.assert_allclose(density[0], [1e6, 1.05e6, 2e6], rtol=1e-9)
    np.testing.assert_allclose(temperature[0], 1000.0, rtol=1e-9)
    again = load_case_text(case.text, file_texts=case.files.texts)
    assert surroundings_of(again).along is not None


def test_transfer_orbit_keeps_the_moments_of_its_regions() -> None:
    """The basis adds up to the densities and pressures of the model at times between knots."""
    case = loaded(REGION, **TRANSFER)
    along = surroundings_of(case).along
    assert along is not None
    time = np.sort(np.random.default_rng(1).uniform(0.0, 4.0 * 3600.0, 300))
    weight, stream = along.at(time)
    hot = np.array([p.populations[0].species.charge_number < 0 for p in along.basis])
    grid = np.array([p.populations[0].temperature_eV for p in along.basis])
    density, temperature = along.moments(time)
    electron = np.array([p.species.charge_number < 0 for p in along.sampled.populations])
    np.testing.assert_allclose(weight[:, hot].sum(axis=-1), density[electron].sum(axis=0), 5e-4)
    pressure = (density * temperature)[electron].sum(axis=0)
    np.testing.assert_allclose((weight * grid)[:, hot].sum(axis=-1), pressure, 1e-3)
    assert stream is not None
    assert (stream.density_m3 >= 0.0).all()
    # every region met has an edge at which the march stops
    met = np.unique(along.region_at(time))
    assert met.size > 1
    assert len(along.breaks_s) >= met.size - 1


def test_moments_change_across_every_boundary() -> None:
    along = surroundings_of(loaded(REGION, **TRANSFER)).along
    assert along is not None
    region = along.sampled.region
    edges = np.flatnonzero(region[1:] != region[:-1])
    assert edges.size
    for k in edges:
        before, after = along.knots_s[k] - 300.0, along.knots_s[k] + 300.0
        n, T = along.moments(np.array([before, after]))
        total = (n * T).sum(axis=0)
        assert abs(np.log(total[1] / total[0])) > 0.01


@pytest.mark.slow
@pytest.mark.parametrize(
    "name", ["polar_aurora_night", "meo_navigation_day", "gto_transfer", "inclined_eccentric"]
)
def test_moments_change_across_every_boundary_of_a_demonstration(name: str) -> None:
    case = load_case(Path(__file__).parents[2] / "cases" / f"{name}.toml")
    along = surroundings_of(case).along
    assert along is not None
    region = along.sampled.region
    edges = np.flatnonzero(region[1:] != region[:-1])
    assert edges.size >= 6
    for k in edges:
        around = along.knots_s[k] + np.array([-300.0, 300.0])
        n, T = along.moments(np.clip(around, 0.0, case.case.duration_s))
        before, after = (n * T).sum(axis=0)
        assert abs(np.log(after / before)) > 1e-3


def test_tables_of_the_march_are_the_direct_path() -> None:
    """Net current with streaming ions, both ways, at random potentials and times."""
    case = loaded(REGION, **TRANSFER)
    around = surroundings_of(case)
    mode = solve_mode(case, around=around)
    random = np.random.default_rng(3)
    time = random.uniform(0.0, 2000.0, 200)
    setting, _ = around.at(time)
    assert setting.stream is not None
    phi = 10.0 ** random.uniform(-2.0, 3.0, (200, 2)) * random.choice([-1.0, 1.0], (200, 2))
    table, which = mode.balance.table, np.zeros(200, dtype=np.intp)
    ours, slope = table.current_and_slope(which, phi, setting)
    direct = surface_currents(mode.balance.models[0], phi, setting)
    gross = np.abs(direct.by_mechanism).sum(axis=-1)
    assert (np.abs(ours - direct.by_mechanism.sum(axis=-1)) < 1e-7 * gross).all()
    step = 1e-4 * np.abs(phi)
    up, down = (table.current(which, phi + s * step, setting) for s in (1.0, -1.0))
    by_steps = (up - down) / (2.0 * step)
    floor = 1e-6 * gross / step
    assert (np.abs(by_steps - slope) < 2e-3 * np.abs(slope) + floor).all()


def test_ram_and_wake_faces_get_what_streams_in() -> None:
    """Cold oxygen at orbital speed: ram current e n u, nothing behind (whole thin sheath)."""
    low = {"a": 6778.0, "e": 0.0, "mean": 0.0, "hours": 0.05}
    around = surroundings_of(loaded(REGION, **low))
    setting, _ = around.at(np.array([100.0]))
    stream = setting.stream
    assert stream is not None
    assert around.along is not None
    kinds = around.along.streams
    assert kinds is not None
    heavy = [s.name for s in kinds.species].index("O+")
    # the air of the ionosphere turns with the Earth, so that some speed is missing
    assert stream.ram_m_s[0, 0, heavy] == pytest.approx(7.67e3, rel=0.07)
    assert stream.ram_m_s[0, 1, heavy] == pytest.approx(-stream.ram_m_s[0, 0, heavy])


def test_event_and_mode_take_the_place_of_the_regions() -> None:
    plasma = REGION + (
        "[[plasma.event]]\nonset_h = 0.2\nrise_min = 1.0\nhold_min = 10.0\ndecay_min = 5.0\n"
        'use = "substorm, 3 keV class"\n[[mode]]\nname = "other"\nfrom_h = 0.8\nto_h = 0.9\n'
        'plasma = "quiet geostationary"\n'
    )
    case = loaded(plasma)
    around = surroundings_of(case)
    parts = len(around.basis)
    share = around.strength(3600.0 * np.array([0.1, 0.3, 0.85]))
    assert share.shape[1] == parts + 2
    assert (share[0, parts:] == 0.0).all()
    assert share[1, parts] == 1.0
    assert (share[1, :parts] == 0.0).all()
    assert share[2, parts + 1] > 0.9
    mode = solve_mode(case, around=around)
    assert mode.plasma_at(360.0) == "plasma sheet"
    assert mode.plasma_at(1080.0) == "substorm, 3 keV class"
    dataset = mode_dataset(CaseRun(case, (mode,)), mode)
    flags = dataset["region"]
    field = (int(flags.values[0]) & PLACE_MASK) >> PLACE_SHIFT
    assert REGIONS[field - 1] == "plasma sheet"
    assert "plasma_sheet" in flags.attrs["flag_meanings"].split()
    assert len(flags.attrs["flag_values"]) == len(flags.attrs["flag_masks"])
    density = dataset["population_density"].values
    labels = dataset["population_name"].values.tolist()
    assert any(label.startswith("regions: plasma sheet") for label in labels)
    assert any(label.startswith("substorm") for label in labels)
    assert (density >= 0.0).all()


def test_assumed_regions_carry_no_verdict() -> None:
    from charging.cautions import cautions
    from charging.summary import mode_summary

    short = {**GEO, "hours": 0.05}
    for accept, verdict in (("", "not assessable"), ('accept_assumed = "a test"\n', "within")):
        case = loaded(REGION + accept, **short)
        mode = solve_mode(case)
        found = {j.verdict for j in mode_summary(case, mode).judgements}
        assert found == {verdict}
        assert any("its figures are" in text for text in cautions(case, mode))


def test_kp_steps_of_a_file(tmp_path: Path) -> None:
    (tmp_path / "kp.csv").write_text(
        "time,kp\n2031-03-20T00:00:00Z,1\n2031-03-20T00:30:00Z,6\n", encoding="utf-8"
    )
    text = CASE.format(plasma='[plasma]\nmodel = "regions"\nactivity = "kp.csv"\n', **GEO)
    (tmp_path / "case.toml").write_text(text, encoding="utf-8")
    along = surroundings_of(load_case(tmp_path / "case.toml")).along
    assert along is not None
    assert 1800.0 in along.breaks_s
    _, temperature = along.moments(np.array([1790.0, 1810.0]))
    hot = [p.label for p in along.sampled.populations].index("plasma sheet electrons")
    assert temperature[hot, 1] > 1.3 * temperature[hot, 0]
    twice = text.replace('activity = "kp.csv"', 'activity = "kp.csv"\nkp = 2.0')
    (tmp_path / "case.toml").write_text(twice, encoding="utf-8")
    with pytest.raises(InputError, match=r"case.toml:20: .*kp = 2"):
        load_case(tmp_path / "case.toml")
    longer = text.replace("duration_h = 1.0", "duration_h = 8.0")
    (tmp_path / "case.toml").write_text(longer, encoding="utf-8")
    with pytest.raises(InputError, match="does not cover the run"):
        load_case(tmp_path / "case.toml")
