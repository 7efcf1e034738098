"""One surface in one plasma: what is asked, what is answered, what is refused."""

import math

import numpy as np
import pytest
from scipy.constants import e, epsilon_0

from charging.errors import InputError
from charging.photo_table import photoyield_table, retarding_curves
from charging.point import floating_point
from environments.plasma import ELECTRON, HYDROGEN_ION, Plasma, Population
from materials.library import library_text, material_names

ECSS = "ECSS geostationary worst case"
QUIET = "quiet geostationary"


def plasma_of(*populations):
    return Plasma("mine", "mine", "test", "assumed", None, "", populations)


def test_currents_balance_at_the_reached_potential():
    for sunlit in (False, True):
        found = floating_point("oxidised aluminium", QUIET, sunlit=sunlit)
        total = sum(found.current_density_A_m2.values())
        largest = max(abs(j) for j in found.current_density_A_m2.values())
        assert abs(total) < 1e-7 * largest
        assert (found.current_density_A_m2["photoemission"] > 0.0) is sunlit


def test_roots_ascend_and_stability_is_the_slope_of_the_net_current():
    found = floating_point("gold", ECSS)
    potentials = [root.potential_V for root in found.roots]
    assert potentials == sorted(potentials)
    assert found.reached_V in potentials
    x = found.curve.potential_V
    net = np.sum(list(found.curve.current_density_A_m2.values()), axis=0)
    assert np.all(np.diff(x) > 0.0)
    for root in found.roots:
        k = int(np.searchsorted(x, root.potential_V))
        assert bool(net[k - 2] > 0.0 > net[k + 1]) is root.stable


def three_root_plasma():
    # cold electrons drive emission up, hot ones pull the surface down: a triple root
    return plasma_of(
        Population(ELECTRON, "maxwellian", 8.0e6, 400.0),
        Population(ELECTRON, "maxwellian", 1.2e6, 24800.0),
        Population(HYDROGEN_ION, "maxwellian", 1.0e6, 1000.0),
    )


def test_several_stable_roots_are_all_reported_with_an_unstable_one_between():
    found = floating_point("oxidised aluminium", three_root_plasma())
    assert [root.stable for root in found.roots] == [True, False, True]
    assert any("history" in note for note in found.notes)
    # at 0 V more electrons leave than arrive: the surface ends at the upper one
    assert found.reached_V == found.roots[2].potential_V > 0.0


def test_debye_length_and_sheath_by_hand():
    found = floating_point("bare collector", ECSS, radius_m=500.0)
    debye = (e / epsilon_0 * (0.2e6 / 400.0 + 1.2e6 / 27500.0)) ** -0.5
    assert found.electron_debye_length_m == pytest.approx(debye, rel=1e-12)
    temperature = 1.4e6 / (0.2e6 / 400.0 + 1.2e6 / 27500.0)
    child = math.sqrt(2.0) / 3.0 * (2.0 * abs(found.reached_V) / temperature) ** 0.75
    length = debye * max(1.0, child)
    assert found.sheath.length_m == pytest.approx(length, rel=1e-12)
    assert found.sheath.weight == pytest.approx(length**2 / (length**2 + 500.0**2), rel=1e-12)


def test_auto_lies_between_plane_and_sphere():
    sphere, auto, plane = (
        floating_point("bare collector", ECSS, collection=c, radius_m=1000.0).reached_V
        for c in ("sphere", "auto", "plane")
    )
    assert plane < auto < sphere < 0.0


def test_dark_ignores_the_cosine_and_cosine_zero_is_dark():
    dark = floating_point("gold", QUIET, incidence_cosine=0.3)
    assert dark.light == 0.0
    grazing = floating_point("gold", QUIET, sunlit=True, incidence_cosine=0.0)
    assert grazing.reached_V == dark.reached_V


def test_less_light_never_raises_the_potential():
    found = [
        floating_point("gold", QUIET, sunlit=True, incidence_cosine=c).reached_V
        for c in (0.1, 0.3, 1.0)
    ]
    far = floating_point("gold", QUIET, sunlit=True, distance_au=3.0).reached_V
    assert found == sorted(found)
    assert far < found[-1]


@pytest.mark.parametrize("material", material_names())
@pytest.mark.parametrize("plasma", [ECSS, QUIET, "tail lobe"])
def test_every_material_has_an_answer(material, plasma):
    for sunlit in (False, True):
        found = floating_point(material, plasma, sunlit=sunlit)
        assert found.roots
        assert math.isfinite(found.reached_V)
        assert found.notes


def test_the_other_law_is_reported_and_is_that_law():
    one = floating_point("polyimide film", ECSS)
    other = floating_point("polyimide film", ECSS, law="lin_joy_2005")
    assert one.other_laws_reached_V == {"lin_joy_2005": other.reached_V}
    assert other.other_laws_reached_V == {"sanders_inouye_1979": one.reached_V}


def test_notes_name_what_is_assumed():
    notes = " ".join(floating_point("gold", QUIET, sunlit=True).notes)
    assert "ion_yield_peak" in notes
    assert f'plasma "{QUIET}": its figures are assumed' in notes
    assert "set from the published saturation current" in notes
    assert "photoyield" not in " ".join(floating_point("gold", QUIET).notes)


@pytest.mark.parametrize(
    ("key", "value"),
    [
        ("incidence_cosine", 1.001),
        ("incidence_cosine", -0.1),
        ("incidence_cosine", math.nan),
        ("radius_m", 0.0),
        ("radius_m", -1.0),
        ("radius_m", 1001.0),
        ("radius_m", math.inf),
        ("radius_m", True),
        ("distance_au", 0.0),
        ("distance_au", math.nan),
        ("f107", 10.0),
        ("f107", -math.inf),
        ("law", "sanders_inouye"),
        ("collection", "sfere"),
        ("material", "polyimid"),
        ("plasma", "ECS geostationary worst case"),
    ],
)
def test_refused_arguments_name_key_value_and_what_is_allowed(key, value):
    arguments = {"material": "gold", "plasma": QUIET, "sunlit": True} | {key: value}
    with pytest.raises(InputError) as caught:
        floating_point(**arguments)
    error = caught.value
    assert error.key == (key,)
    assert key in str(error)
    assert error.allowed is not None or error.nearest is not None


def test_nearest_names():
    for key, value, nearest in [
        ("material", "polyimid", "polyimide film"),
        ("plasma", "quiet geostationry", QUIET),
        ("law", "lin_joy", "lin_joy_2005"),
        ("collection", "sfere", "sphere"),
    ]:
        with pytest.raises(InputError) as caught:
            floating_point(**({"material": "gold", "plasma": QUIET} | {key: value}))
        assert caught.value.nearest == nearest


def test_plasmas_without_electrons_or_ions_are_refused():
    electrons = Population(ELECTRON, "maxwellian", 1e6, 100.0)
    ions = Population(HYDROGEN_ION, "maxwellian", 1e6, 100.0)
    for lonely, words in ((electrons, "positive ions"), (ions, "electrons")):
        with pytest.raises(InputError, match=words):
            floating_point("gold", plasma_of(lonely))


@pytest.mark.parametrize(
    ("temperature_eV", "collection"),
    [(1e-3, "auto"), (1e-3, "sphere"), (1e-3, "cylinder"), (5e4, "auto"), (5e4, "plane")],
)
def test_extreme_temperatures_need_no_warnings(temperature_eV, collection):
    plasma = plasma_of(
        Population(ELECTRON, "maxwellian", 1e6, temperature_eV),
        Population(HYDROGEN_ION, "maxwellian", 1e6, temperature_eV),
    )
    found = floating_point("bare collector", plasma, collection=collection)
    assert -4.0 < found.reached_V / temperature_eV < -2.0


def test_material_and_plasma_files(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "mine.toml").write_text(library_text("gold"), encoding="utf-8")
    (tmp_path / "hot.toml").write_text(
        'title = "hot"\nsource = "test"\n'
        '[[population]]\nspecies = "electron"\ndensity = "1 cm-3"\ntemperature = "1 keV"\n'
        '[[population]]\nspecies = "H+"\ndensity_m3 = 1e6\ntemperature_eV = 1000.0\n',
        encoding="utf-8",
    )
    found = floating_point("mine.toml", "./hot.toml")
    again = floating_point(
        "gold",
        plasma_of(
            Population(ELECTRON, "maxwellian", 1e6, 1000.0),
            Population(HYDROGEN_ION, "maxwellian", 1e6, 1000.0),
        ),
    )
    assert found.reached_V == again.reached_V


# photoyield ---------------------------------------------------------------------------------------


def test_photo_current_follows_distance_and_cosine():
    near, far, oblique = (
        photoyield_table(["gold"], **options)[0].saturation_current_A_m2
        for options in ({}, {"distance_au": 2.0}, {"incidence_cosine": 0.25})
    )
    assert far == pytest.approx(near / 4.0, rel=1e-12)
    assert oblique == pytest.approx(near / 4.0, rel=1e-12)


def test_row_agrees_with_its_own_retarding_curve():
    row = photoyield_table(["polyimide film"])[0]
    potential = np.array([0.0, row.potential_at_1_percent_V, row.potential_at_0p1_percent_V])
    curve = retarding_curves(["polyimide film"], potential)[0]
    assert curve / row.saturation_current_A_m2 == pytest.approx([1.0, 1e-2, 1e-3], rel=1e-6)
    # 1239.84 eV nm (CODATA h c / e)
    assert row.threshold_nm * row.threshold_eV == pytest.approx(1239.84, rel=1e-5)


def test_a_body_that_emits_nothing_has_empty_cells():
    row = photoyield_table(["bare collector"])[0]
    assert row.saturation_current_A_m2 == 0.0
    assert row.threshold_eV is row.potential_at_1_percent_V is row.mean_energy_eV is None
    assert retarding_curves(["bare collector"], np.zeros(1)) == (None,)


def test_order_of_rows_is_the_order_asked():
    names = ["ITO coating", "gold", "ITO coating"]
    assert [row.material for row in photoyield_table(names)] == names
