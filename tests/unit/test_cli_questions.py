"""The small questions on the command line: contracts, options, messages, files."""

import json
import subprocess
import sys
from datetime import datetime

import netCDF4
import pytest

from charging import cli
from charging.case_template import CASE_TEMPLATE
from environments.catalogue import plasma_names
from materials.library import library_text, material_names

ECSS = "ECSS geostationary worst case"
QUIET = "quiet geostationary"
MECHANISMS = [
    "electron_collection",
    "ion_collection",
    "secondary_electron",
    "ion_induced_secondary",
    "backscatter",
    "photoemission",
]


@pytest.fixture
def halflit(monkeypatch, capsys):
    """Run the command line in this process; return exit code, stdout, stderr."""

    def run(*arguments):
        monkeypatch.setattr(sys, "argv", ["halflit", *map(str, arguments)])
        with pytest.raises(SystemExit) as caught:
            cli.main()
        out, err = capsys.readouterr()
        return caught.value.code or 0, out, err

    return run


def no_constant(text):
    raise AssertionError(f"{text} is no JSON")


def answer(halflit, *arguments):
    code, out, _ = halflit(*arguments, "--json")
    assert code == 0
    return json.loads(out, parse_constant=no_constant)


# point --------------------------------------------------------------------------------------------


def test_point_json_has_the_keys_of_the_contract(halflit):
    found = answer(halflit, "point", "--material", "gold", "--plasma", ECSS)
    assert set(found["roots"][0]) == {"potential_V", "stable"}
    assert found["reached_V"] in [root["potential_V"] for root in found["roots"]]
    assert list(found["current_density_A_m2"]) == MECHANISMS
    assert found["electron_debye_length_m"] == pytest.approx(318.8, rel=1e-3)
    assert set(found["sheath"]) == {"length_m", "weight", "collection"}
    assert found["sheath"]["collection"] == "auto"


def test_point_defaults_are_those_documented(halflit):
    base = ("point", "--material", "gold", "--plasma", QUIET)
    spelled = (
        "--dark", "--collection", "auto", "--radius-m", "1", "--incidence-cosine", "1",
        "--distance-au", "1", "--f107", "150", "--law", "sanders_inouye_1979",
    )  # fmt: skip
    assert answer(halflit, *base) == answer(halflit, *base, *spelled)
    lit = answer(halflit, *base, "--sunlit")
    assert lit == answer(halflit, *base, "--sunlit", *spelled[1:])
    assert lit["reached_V"] > 0.0


def test_point_tables_are_readable(halflit):
    code, out, err = halflit("point", "--material", "gold", "--plasma", ECSS)
    assert code == 0
    assert err == ""
    for words in ("floating potential", "reached from 0 V", "uA m-2", "backscattered electrons",
                  "Debye length", "assumed", "from memory"):  # fmt: skip
        assert words in out


@pytest.mark.parametrize(
    ("option", "value", "allowed"),
    [
        ("--incidence-cosine", "1.5", "at least 0, at most 1"),
        ("--incidence-cosine", "nan", "at least 0, at most 1"),
        ("--radius-m", "-2", "above 0, at most 1000"),
        ("--radius-m", "inf", "above 0, at most 1000"),
        ("--radius-m", "1e999", "above 0, at most 1000"),
        ("--distance-au", "0", "0.01 to 100"),
        ("--f107", "nan", "50 to 500"),
        ("--law", "none", "sanders_inouye_1979, lin_joy_2005"),
        ("--collection", "disc", "auto, sphere, cylinder, plane"),
    ],
)
def test_point_refuses_with_option_value_and_range(halflit, option, value, allowed):
    code, out, err = halflit("point", "--material", "gold", "--plasma", QUIET, option, value)
    assert (code, out) == (2, "")
    assert err.startswith(f"error: {option} ")
    assert allowed in err
    if value not in ("1e999",):
        assert value in err.splitlines()[0]


@pytest.mark.parametrize(
    ("material", "plasma", "expected"),
    [
        ("polyimid", QUIET, ('--material "polyimid" is unknown', '"polyimide film"')),
        ("gold", "quiet geostat", ('--plasma "quiet geostat" is unknown', f'"{QUIET}"')),
        ("", QUIET, ('--material "" is unknown', "halflit materials")),
        ("a\nb", QUIET, ('--material "a\\nb" is unknown', "halflit materials")),
        ("gone.toml", QUIET, ('--material "gone.toml"', "does not exist")),
        ("gold", "./", ("folder",)),
    ],
)
def test_point_names_unknown_names_and_files(halflit, material, plasma, expected):
    code, out, err = halflit("point", "--material", material, "--plasma", plasma)
    assert (code, out) == (2, "")
    for words in expected:
        assert words in err
    assert len(err.strip().splitlines()) <= 2


def test_a_fault_in_a_file_is_named_with_its_line(halflit, tmp_path):
    bad = library_text("gold").replace("value  = 5.1", "value  = nan", 1)
    line = 1 + bad.splitlines().index("value  = nan")
    file = tmp_path / "mine.toml"
    file.write_text(bad, encoding="utf-8")
    code, out, err = halflit("point", "--material", file, "--plasma", QUIET)
    assert (code, out) == (2, "")
    assert f"mine.toml:{line}: " in err


def test_no_floating_potential_exits_with_3(halflit, tmp_path):
    file = tmp_path / "hard.toml"
    file.write_text(
        'title = "hard"\nsource = "test"\n'
        '[[population]]\nspecies = "electron"\ndensity_m3 = 1e6\ntemperature_eV = 1e6\n'
        '[[population]]\nspecies = "H+"\ndensity_m3 = 1e3\ntemperature_eV = 1e6\n',
        encoding="utf-8",
    )
    code, out, err = halflit("point", "--material", "bare collector", "--plasma", file)
    assert (code, out) == (3, "")
    assert err.startswith("error: no floating potential within ±200 kV")


# pictures -----------------------------------------------------------------------------------------

PICTURES = [
    ("point", "--material", "gold", "--plasma", QUIET, "--sunlit"),
    ("photoyield", "gold", "bare collector", "PTFE"),
    ("spectrum",),
]


@pytest.mark.parametrize("command", PICTURES, ids=" ".join)
@pytest.mark.parametrize(
    ("ending", "first"), [(".png", b"\x89PNG"), (".svg", b"<?xml"), (".pdf", b"%PDF")]
)
def test_pictures_are_written_whole_and_alone(halflit, tmp_path, command, ending, first):
    picture = tmp_path / f"curve{ending}"
    code, out, err = halflit(*command, "--plot", picture)
    assert code == 0
    assert out
    assert str(picture) in err
    assert picture.read_bytes().startswith(first)
    assert list(tmp_path.iterdir()) == [picture]


def test_unwritable_pictures_are_input_errors(halflit, tmp_path):
    (tmp_path / "folder.png").mkdir()
    (tmp_path / "file").write_text("", encoding="utf-8")
    for name in ("curve.txt", "curve", "none/curve.png", "folder.png", "file/curve.png"):
        code, out, err = halflit("spectrum", "--plot", tmp_path / name)
        assert (code, out) == (2, "")
        assert err.startswith("error: --plot ")
    assert sorted(p.name for p in tmp_path.iterdir()) == ["file", "folder.png"]


def test_pictures_leave_pyplot_alone(tmp_path):
    code = (
        "import sys; from charging.point import floating_point; from pathlib import Path;"
        "from charging.curve_plots import plot_point;"
        "plot_point(floating_point('gold', 'tail lobe'), Path(sys.argv[1]));"
        "assert 'matplotlib.pyplot' not in sys.modules"
    )
    done = subprocess.run(
        [sys.executable, "-c", code, str(tmp_path / "curve.png")],
        capture_output=True,
        text=True,
        timeout=60,
        check=False,
    )
    assert done.returncode == 0, done.stderr


# photoyield and spectrum --------------------------------------------------------------------------

PHOTO_KEYS = {
    "material", "threshold_eV", "threshold_nm", "saturation_current_A_m2",
    "potential_at_1_percent_V", "potential_at_0p1_percent_V", "mean_energy_eV",
    "upper_photon_energy_eV",
}  # fmt: skip


def test_photoyield_json(halflit):
    gold, bare = answer(halflit, "photoyield", "gold", "bare collector")
    assert set(gold) >= PHOTO_KEYS
    assert (gold["material"], bare["material"]) == ("gold", "bare collector")
    # Level set from the 29 uA m-2 of Grard 1973 (memory), here at F10.7 150 instead of a mean sun
    assert 2e-5 < gold["saturation_current_A_m2"] < 4.5e-5
    assert bare["threshold_eV"] is None
    assert bare["saturation_current_A_m2"] == 0.0
    half = answer(halflit, "photoyield", "gold", "--incidence-cosine", "0.5")[0]
    assert half["saturation_current_A_m2"] == pytest.approx(gold["saturation_current_A_m2"] / 2)


def test_photoyield_of_the_whole_library(halflit):
    rows = answer(halflit, "photoyield", *material_names())
    assert [row["material"] for row in rows] == list(material_names())
    code, out, _ = halflit("photoyield", *material_names())
    assert code == 0
    assert "calibration" in out


def test_nothing_to_draw_is_refused(halflit, tmp_path):
    picture = tmp_path / "curve.png"
    code, _, err = halflit("photoyield", "bare collector", "--plot", picture)
    assert code == 2
    assert err.startswith("error: ")
    assert not picture.exists()


def test_photoyield_refuses(halflit):
    code, out, err = halflit("photoyield", "gold", "goldd")
    assert (code, out) == (2, "")
    assert 'material = "goldd" is unknown' in err
    assert 'Nearest: "gold"' in err
    assert halflit("photoyield")[0] == 2
    assert "--f107 " in halflit("photoyield", "gold", "--f107", "9")[2]


def test_spectrum_follows_distance_and_counts_lyman_alpha_once(halflit):
    near, far = (answer(halflit, "spectrum", "--distance-au", d) for d in ("1", "2"))
    for one, other in zip(near["bands"], far["bands"], strict=True):
        assert other["photon_flux_m2_s"] == pytest.approx(one["photon_flux_m2_s"] / 4)
    lines = [row for row in near["bands"] if row["band"] == "Lyman-alpha"]
    assert len(lines) == 1
    # 3.94e15 (1 + 0.00423 (150 - 80)) m-2 s-1: Woods & Rottman 2002, FUV reference
    assert lines[0]["photon_flux_m2_s"] == pytest.approx(3.94e15 * (1 + 0.00423 * 70), rel=1e-6)
    assert near["sources"]


# libraries ----------------------------------------------------------------------------------------


def test_materials_json_lists_every_material(halflit):
    rows = answer(halflit, "materials")
    assert [row["name"] for row in rows] == list(material_names())
    for row in rows:
        assert {"name", "kind", "basis"} <= set(row)
        for value in row["values"].values():
            assert value["source"]
            assert value["basis"]


def test_one_material_with_its_sources(halflit, tmp_path):
    code, out, _ = halflit("materials", "polyimide film")
    assert code == 0
    assert "bulk_resistivity_ohm_m" in out
    assert "[1]" in out
    file = tmp_path / "own.toml"
    file.write_text(library_text("gold"), encoding="utf-8")
    assert answer(halflit, "materials", file) == answer(halflit, "materials", "gold")
    code, _, err = halflit("materials", "polyimid")
    assert code == 2
    assert 'Nearest: "polyimide film"' in err


def test_plasmas_json_lists_every_plasma(halflit):
    rows = answer(halflit, "plasmas")
    assert [row["name"] for row in rows] == list(plasma_names())
    worst = next(row for row in rows if row["name"] == ECSS)
    assert worst["clause"]
    assert worst["source"].startswith("ECSS-E-ST-10-04C")
    # 0.2 cm-3 at 400 eV and 1.2 cm-3 at 27.5 keV: table 8-1 of that standard (memory)
    assert [p["density_m3"] for p in worst["populations"][:2]] == [0.2e6, 1.2e6]
    assert answer(halflit, "plasmas", ECSS) == [worst]


def test_plasma_tables(halflit):
    for arguments in (("plasmas",), ("plasmas", QUIET)):
        code, out, _ = halflit(*arguments)
        assert code == 0
        assert "assumed" in out
        assert "cm-3" in out


# orbit --------------------------------------------------------------------------------------------


@pytest.fixture
def day(tmp_path):
    file = tmp_path / "day.toml"
    file.write_text(CASE_TEMPLATE, encoding="utf-8")
    return file


def test_orbit_json(halflit, day):
    found = answer(halflit, "orbit", day)
    (eclipse,) = found["eclipses"]
    assert set(eclipse) == {
        "body", "penumbra_start", "umbra_start", "umbra_end", "penumbra_end", "umbra_s",
    }  # fmt: skip
    moments = [
        datetime.fromisoformat(eclipse[key])
        for key in ("penumbra_start", "umbra_start", "umbra_end", "penumbra_end")
    ]
    assert moments == sorted(moments)
    # 67.5 min of umbra, 71.8 min from first to last contact at equinox (shadow cones at 42164 km)
    assert eclipse["umbra_s"] / 60.0 == pytest.approx(67.5, abs=0.3)
    assert (moments[3] - moments[0]).total_seconds() / 60.0 == pytest.approx(71.8, abs=0.3)
    # the equinox of 2031 is on 20 March near 19:40 UTC: the Sun within a day's motion of the plane
    assert abs(found["beta_angle_deg"]) < 0.6


def test_orbit_file(halflit, day, tmp_path):
    target = tmp_path / "orbit.nc"
    code, out, err = halflit("orbit", day, "-o", target)
    assert code == 0
    assert "umbra" in out
    assert "orbit.nc" in err
    with netCDF4.Dataset(target) as data:
        assert data.Conventions == "CF-1.11"
        radius = (data["position"][:] ** 2).sum(axis=0) ** 0.5
        assert radius.min() == pytest.approx(42164.17e3, rel=3e-4)
        assert data["illumination"][:].min() == 0.0
        assert data["illumination"][:].max() == 1.0
        length = (data["sun_direction"][:] ** 2).sum(axis=0)
        assert abs(length - 1.0).max() < 1e-12
        # 1 AU; within 2 % by the eccentricity of the Earth's orbit
        assert abs(data["sun_distance"][:] / 1.496e11 - 1.0).max() < 0.02
        assert data["time"].units.startswith("seconds since 2031-03-20")
        for variable in data.variables.values():
            assert variable.long_name
    assert sorted(p.name for p in tmp_path.iterdir()) == ["day.toml", "orbit.nc"]


def test_orbit_refuses_other_names_and_fixed_cases(halflit, day, tmp_path):
    code, _, err = halflit("orbit", day, "-o", tmp_path / "orbit.csv")
    assert code == 2
    assert ".nc" in err
    fixed = tmp_path / "fixed.toml"
    start, end = CASE_TEMPLATE.index("[orbit]"), CASE_TEMPLATE.index("[time]")
    fixed.write_text(
        CASE_TEMPLATE[:start]
        + '[orbit]\nkind = "fixed"\nillumination = 1.0\nsun_direction = [1.0, 0.0, 0.0]\n'
        + "epoch = 2031-03-20T00:00:00Z\n"
        + CASE_TEMPLATE[end:],
        encoding="utf-8",
    )
    found = answer(halflit, "orbit", fixed)
    assert found["eclipses"] == []
    assert found["beta_angle_deg"] is None
    code, _, err = halflit("orbit", fixed, "-o", tmp_path / "orbit.nc")
    assert code == 2
    assert "fixed" in err
    assert halflit("orbit", tmp_path / "gone.toml")[0] == 2


# help ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "command", ["point", "photoyield", "spectrum", "orbit", "materials", "plasmas"]
)
def test_help_has_an_example_and_says_json(halflit, command):
    code, out, _ = halflit(command, "--help")
    assert code == 0
    assert "Example" in out
    assert "--json" in out


def test_questions_load_nothing_heavy_before_they_run():
    code = (
        "import sys; from charging.cli import app;"
        "heavy = {'numpy', 'pydantic', 'scipy', 'xarray', 'matplotlib', 'netCDF4'};"
        "sys.exit(str(heavy & set(sys.modules)) if heavy & set(sys.modules) else 0)"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, timeout=60, check=False
    )
    assert done.returncode == 0, done.stderr
