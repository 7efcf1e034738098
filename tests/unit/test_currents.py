"""Currents of a surface: closed forms, slopes, tables against mpmath, the march's tables."""

from __future__ import annotations

from dataclasses import replace
from math import pi

import numpy as np
import pytest
from mpmath import mp  # type: ignore[import-untyped]
from numpy.typing import NDArray
from scipy.constants import e, epsilon_0, m_e, m_p

from charging.currents.barrier import ROUNDING_V, escape_height
from charging.currents.collection import (
    CYLINDER,
    PLANE,
    SPHERE,
    Geometry,
    sheath_weight,
    thick_geometry,
)
from charging.currents.emission import SECONDARY_LAWS, emitter
from charging.currents.lookup import net_currents
from charging.currents.surface import (
    MECHANISMS,
    Setting,
    SurfaceModel,
    surface_currents,
    surface_model,
)
from charging.currents.tables import YieldTable, average_yields, knot_scale, knots
from environments.catalogue import load_plasma
from environments.plasma import ELECTRON, HYDROGEN_ION, Plasma, Population
from environments.spectrum import solar_spectrum
from materials import load_material
from materials.angle import secondary_angle_coefficient
from materials.record import Material
from materials.secondary import YieldLaw, maxwellian_isotropic_yield, true_secondary_peak

Array = NDArray[np.float64]
GEOMETRIES = {"plane": PLANE, "sphere": SPHERE, "cylinder": CYLINDER}
COLLECTIONS = ("auto", "sphere", "cylinder", "plane")
ECSS = "ECSS geostationary worst case"


def plasma(*rows: tuple[str, float, float]) -> Plasma:
    species = {"e": ELECTRON, "p": HYDROGEN_ION}
    parts = tuple(Population(species[s], "maxwellian", n, t) for s, n, t in rows)
    return Plasma("test", "test", "a test", "assumed", None, "", parts)


def model_of(
    *names: str,
    around: Plasma | str = ECSS,
    law: YieldLaw = "sanders_inouye_1979",
    collection: str = "auto",
    radius_m: float = 1.0,
) -> SurfaceModel:
    surroundings = load_plasma(around) if isinstance(around, str) else around
    return surface_model(
        [load_material(name) for name in names],
        [surroundings],
        solar_spectrum(),
        law=law,
        radius_m=radius_m,
        collection=collection,
    )


def evaluate(model: SurfaceModel, potential: Array, light: float = 0.0) -> tuple[Array, Array]:
    """By mechanism [N, 6] and slope [N] of the only surface."""
    n = len(potential)
    found = surface_currents(
        model, potential[:, None], Setting(np.ones((n, 1)), np.full((n, 1), light))
    )
    return found.by_mechanism[:, 0], found.slope[:, 0]


# --- collection: closed forms -------------------------------------------------------------


@pytest.mark.parametrize("name", GEOMETRIES)
@pytest.mark.parametrize("u", [0.0, 1e-9, 1e-3, 0.3, 4.0, 77.0, 1e4, 2e6])
def test_factor_is_the_average_of_the_factor_per_energy(name: str, u: float) -> None:
    """Liouville: the integral of t exp(-t) G(u/t) over reduced energies t, to 30 digits."""
    mp.dps = 30

    def per_energy(w: mp.mpf) -> mp.mpf:
        if name == "plane":
            return mp.mpf(1)
        if name == "sphere":
            return 1 + w
        return 2 / mp.pi * (mp.sqrt(w) + (1 + w) * mp.atan(1 / mp.sqrt(w))) if w else mp.mpf(1)

    edges = [0, 1e-12, 1e-9, 1e-6, 1e-4, 1e-2, 0.1, 1, 5, 20, 80]
    exact = mp.quad(lambda t: t * mp.exp(-t) * per_energy(u / t) if t else mp.mpf(0), edges)
    found = float(GEOMETRIES[name].factor(np.array([u]))[0])
    assert found == pytest.approx(float(exact), rel=1e-12)


@pytest.mark.parametrize("name", GEOMETRIES)
def test_slope_of_the_factor(name: str) -> None:
    mp.dps = 30
    for u in (1e-4, 0.2, 3.0, 150.0, 1e5):
        closed = {
            "plane": lambda x: mp.mpf(1),
            "sphere": lambda x: 1 + x,
            "cylinder": lambda x: 2 * mp.sqrt(x / mp.pi) + mp.exp(x) * mp.erfc(mp.sqrt(x)),
        }[name]
        exact = float(mp.diff(closed, mp.mpf(u)))
        assert float(GEOMETRIES[name].slope(np.array([u]))[0]) == pytest.approx(exact, rel=1e-10)


@pytest.mark.parametrize(
    ("collection", "exact"), [("plane", 1.0), ("sphere", 1.0 + 40.0 / 7.0), ("cylinder", None)]
)
def test_attracted_ions_of_a_bare_collector(collection: str, exact: float | None) -> None:
    around = plasma(("e", 1e6, 5.0), ("p", 1e6, 7.0))
    rows, _ = evaluate(model_of("bare collector", around=around, collection=collection),
                       np.array([-40.0]))  # fmt: skip
    if exact is None:
        root = np.sqrt(40.0 / 7.0)
        exact = float(2.0 / np.sqrt(pi) * root + mp.exp(root**2) * mp.erfc(root))
    ion = e * 1e6 * np.sqrt(e * 7.0 / (2.0 * pi * m_p))
    electron = -e * 1e6 * np.sqrt(e * 5.0 / (2.0 * pi * m_e)) * np.exp(-8.0)
    assert rows[0, MECHANISMS.index("ion_collection")] == pytest.approx(ion * exact, rel=1e-9)
    assert rows[0, MECHANISMS.index("electron_collection")] == pytest.approx(electron, rel=1e-9)
    assert (rows[0, 2:] == 0.0).all()


def test_repelled_species_is_boltzmann_in_every_geometry() -> None:
    around = plasma(("e", 1e6, 50.0), ("p", 1e6, 70.0))
    for collection in COLLECTIONS:
        model = model_of("bare collector", around=around, collection=collection)
        rows, _ = evaluate(model, np.array([-100.0, 140.0, 0.0]))
        assert rows[0, 0] / rows[2, 0] == pytest.approx(np.exp(-2.0), rel=1e-12)
        assert rows[1, 1] / rows[2, 1] == pytest.approx(np.exp(-2.0), rel=1e-12)


def test_sheath_blend_between_plane_and_sphere() -> None:
    """w = s²/(s²+R²), s the larger of the Debye length and the Child-Langmuir length."""
    debye = np.sqrt(epsilon_0 * 3000.0 / (e * 1.5e6))
    for potential in (-1.0, -2e3, -9e3, 4e4):
        child = np.sqrt(2.0) / 3.0 * debye * (2.0 * abs(potential) / 3000.0) ** 0.75
        length = max(debye, child)
        found = sheath_weight(
            np.array([potential]),
            debye_length_m=np.array([debye]),
            temperature_eV=np.array([3000.0]),
            radius_m=200.0,
            collection="auto",
        )
        assert found.length_m[0] == pytest.approx(length, rel=1e-12)
        assert found.weight[0] == pytest.approx(length**2 / (length**2 + 200.0**2), rel=1e-12)
    assert 0.0 < found.weight[0] < 1.0
    around = plasma(("e", 1.5e6, 3000.0), ("p", 1.2e6, 9000.0))
    potential_V = np.array([-9e3])
    ion = {
        c: evaluate(model_of("bare collector", around=around, collection=c, radius_m=200.0),
                    potential_V)[0][0, 1]
        for c in ("auto", "plane", "sphere")
    }  # fmt: skip
    child = np.sqrt(2.0) / 3.0 * debye * 6.0**0.75
    w = child**2 / (child**2 + 200.0**2)
    assert ion["sphere"] == pytest.approx(2.0 * ion["plane"], rel=1e-12)
    assert ion["auto"] == pytest.approx(ion["plane"] * (1.0 + w), rel=1e-12)


def test_escape_height_is_the_potential_with_a_rounded_corner() -> None:
    v = np.array([-9.0, -ROUNDING_V, -0.02, 0.0, 0.03, ROUNDING_V, 3.0])
    height, slope = escape_height(v)
    assert (np.abs(height - np.maximum(v, 0.0)) <= ROUNDING_V / 4.0 + 1e-15).all()
    assert height[[0, 1, 5, 6]] == pytest.approx([0.0, 0.0, ROUNDING_V, 3.0], abs=1e-15)
    assert slope[[0, 6]].tolist() == [0.0, 1.0]
    h = 1e-6
    middle = v[2:5]
    numeric = (escape_height(middle + h)[0] - escape_height(middle - h)[0]) / (2.0 * h)
    assert slope[2:5] == pytest.approx(numeric, abs=1e-8)
    assert ROUNDING_V <= 0.1


# --- slopes of every mechanism ------------------------------------------------------------


def isolated(model: SurfaceModel, mechanism: str) -> SurfaceModel:
    """The model with one mechanism left (what feeds it included)."""
    electrons, ions = model.electrons, model.ions
    answer, impact = model.electron_table, model.ion_table
    photo = model.photo_saturation_A_m2
    feeds_on_electrons = mechanism in ("electron_collection", "secondary_electron", "backscatter")
    if feeds_on_electrons or mechanism == "photoemission":
        ions = replace(ions, thermal_current_A_m2=0.0 * ions.thermal_current_A_m2)
    if not feeds_on_electrons:
        electrons = replace(electrons, thermal_current_A_m2=0.0 * electrons.thermal_current_A_m2)
    if mechanism != "photoemission":
        photo = 0.0 * photo
    columns = {"secondary_electron": [1, 1, 0, 0], "backscatter": [0, 0, 1, 1]}
    keep = np.array(columns.get(mechanism, [0, 0, 0, 0]), dtype=np.float64)
    answer = replace(answer, coefficients=answer.coefficients * keep)
    if mechanism == "ion_collection":
        impact = replace(impact, coefficients=0.0 * impact.coefficients)
    return replace(
        model,
        electrons=electrons,
        ions=ions,
        electron_table=answer,
        ion_table=impact,
        photo_saturation_A_m2=photo,
    )


def potentials_for_slopes() -> Array:
    """Both signs, 0.1 V to 1e5 V, away from the rounded corner."""
    return np.concatenate([-np.geomspace(1e5, 0.11, 41), np.geomspace(0.11, 1e5, 41)])


@pytest.mark.parametrize("law", SECONDARY_LAWS)
@pytest.mark.parametrize("collection", COLLECTIONS)
@pytest.mark.parametrize("mechanism", MECHANISMS)
def test_slope_of_each_mechanism(mechanism: str, collection: str, law: YieldLaw) -> None:
    """Richardson's difference of the current of one mechanism against the slope of the sum."""
    model = isolated(model_of("gold", law=law, collection=collection, radius_m=60.0), mechanism)
    v = potentials_for_slopes()
    column = MECHANISMS.index(mechanism)

    def wanted(potential: Array) -> Array:
        rows = evaluate(model, potential, 0.4)[0]
        # what feeds on a collected current comes with it
        return np.asarray(rows.sum(axis=-1))

    h = 2e-4 * np.abs(v)
    central = [(wanted(v + s * h) - wanted(v - s * h)) / (2.0 * s * h) for s in (1.0, 0.5)]
    numeric = (4.0 * central[1] - central[0]) / 3.0
    value, slope = wanted(v), evaluate(model, v, 0.4)[1]
    assert np.abs(evaluate(model, v, 0.4)[0][:, column]).max() > 0.0
    allowed = 1e-6 * np.maximum(np.abs(numeric), 1e-2 * np.abs(value) / np.abs(v)) + 1e-30
    wrong = np.abs(slope - numeric) > allowed
    assert wrong.sum() == 0, (v[wrong], slope[wrong], numeric[wrong])


@pytest.mark.parametrize("name", ["gold", "polyimide film", "bare collector"])
def test_slope_inside_the_rounded_corner(name: str) -> None:
    model = model_of(name)
    v = np.array([-0.04, -0.01, 0.01, 0.02, 0.045])
    h = 1e-4
    central = [
        (evaluate(model, v + s, 1.0)[0] - evaluate(model, v - s, 1.0)[0]).sum(axis=-1) / (2.0 * s)
        for s in (h, h / 2.0)
    ]
    numeric = (4.0 * central[1] - central[0]) / 3.0
    assert evaluate(model, v, 1.0)[1] == pytest.approx(numeric, rel=1e-6)


@pytest.mark.parametrize("collection", COLLECTIONS)
@pytest.mark.parametrize(
    ("mechanism", "side"),
    [("electron_collection", -1.0), ("ion_collection", 1.0)],
)
def test_slope_at_zero_is_that_of_the_repelled_side(
    mechanism: str, side: float, collection: str
) -> None:
    """At 0 V, the kink of a plane: the one-sided derivative towards repulsion."""
    model = isolated(model_of("gold", collection=collection), mechanism)
    at_zero = evaluate(model, np.array([0.0]))
    h = 1e-2
    # one-sided, third order: (-11 f0 + 18 f1 - 9 f2 + 2 f3)/6h
    f = [float(evaluate(model, np.array([side * k * h]))[0].sum()) for k in range(4)]
    numeric = side * (-11.0 * f[0] + 18.0 * f[1] - 9.0 * f[2] + 2.0 * f[3]) / (6.0 * h)
    assert float(at_zero[1][0]) == pytest.approx(numeric, rel=1e-6)


# --- yields averaged over a Maxwellian ---------------------------------------------------


@pytest.mark.parametrize("law", SECONDARY_LAWS)
def test_mean_yield_of_a_repelled_maxwellian_does_not_depend_on_the_potential(
    law: YieldLaw,
) -> None:
    around = plasma(("e", 1e6, 2500.0), ("p", 1e6, 2500.0))
    v = np.array([-20000.0, -3000.0, -50.0, -0.1])
    for collection in COLLECTIONS:
        rows, _ = evaluate(model_of("gold", around=around, law=law, collection=collection), v)
        for column in ("secondary_electron", "backscatter"):
            mean = -rows[:, MECHANISMS.index(column)] / rows[:, 0]
            assert mean == pytest.approx(np.full(4, mean[0]), rel=1e-12)


def test_mean_yield_of_a_repelled_maxwellian_is_the_closed_form() -> None:
    gold = load_material("gold")
    for temperature in (3.0, 100.0, 2500.0, 40000.0):
        around = plasma(("e", 1e6, temperature), ("p", 1e6, 100.0))
        rows, _ = evaluate(model_of("gold", around=around), np.array([-0.5 * temperature]))
        exact = maxwellian_isotropic_yield(
            temperature,
            peak_yield=true_secondary_peak(gold),
            peak_energy_eV=gold.value("secondary_yield_peak_energy_eV"),
            mean_atomic_number=gold.value("mean_atomic_number"),
        )
        assert -rows[0, 2] / rows[0, 0] == pytest.approx(float(exact), rel=1e-8)


class Reference:
    """Yields of one material written again in mpmath, with integrals over the Maxwellian."""

    def __init__(self, material: Material, law: str) -> None:
        mp.dps = 16
        self.law = law
        self.peak = mp.mpf(true_secondary_peak(material))
        self.energy = mp.mpf(material.value("secondary_yield_peak_energy_eV"))
        self.number = mp.mpf(material.value("mean_atomic_number"))
        self.high = mp.mpf(material.value("backscatter_high_energy"))
        self.drop = mp.mpf(material.get("backscatter_low_energy_drop", 0.0))
        self.drop_energy = mp.mpf(material.get("backscatter_drop_energy_eV", 1.0))
        self.ion_peak = mp.mpf(material.value("ion_yield_peak"))
        self.ion_energy = mp.mpf(material.value("ion_yield_peak_energy_eV"))
        self.r = mp.findroot(lambda r: (1 - 1 / mp.mpf("1.67")) * (mp.exp(r) - 1) - r, 1.6)
        # maximum of exp(-x/4.3) - exp(-x/0.367), by setting its derivative to zero
        a, b = mp.mpf("4.3"), mp.mpf("0.367")
        self.place = mp.findroot(lambda x: mp.exp(-x / a) / a - mp.exp(-x / b) / b, 1.0)
        self.top = mp.exp(-self.place / a) - mp.exp(-self.place / b)
        self.b = mp.mpf(float(secondary_angle_coefficient(float(self.number))))
        self.c = mp.mpf("7.37") * self.number ** mp.mpf("-0.56875")

    def secondary(self, energy: mp.mpf) -> mp.mpf:
        x = energy / self.energy
        if self.law == "sanders_inouye_1979":
            a, b = mp.mpf("4.3"), mp.mpf("0.367")
            normal = (mp.exp(-x * self.place / a) - mp.exp(-x * self.place / b)) / self.top
            factor = 2 * (mp.exp(self.b) - 1 - self.b) / self.b**2
            return self.peak * normal * (1 + (factor - 1) * (1 - mp.exp(-x)) ** 2)
        n = mp.mpf("1.67")
        z = self.r * x**n
        mean = 1 + mp.expm1(-z) / z if z > 1e-3 else z / 2 - z**2 / 6 + z**3 / 24 - z**4 / 120
        return self.peak * 2 * x ** (1 - n) / (1 - mp.exp(-self.r)) * mean

    def backscatter(self, energy: mp.mpf) -> mp.mpf:
        normal = self.high - self.drop * mp.exp(-energy / self.drop_energy)
        return normal * 2 * (mp.exp(self.c) - 1 - self.c) / self.c**2

    def ion(self, energy: mp.mpf) -> mp.mpf:
        x = energy / self.ion_energy
        return 2 * self.ion_peak * mp.sqrt(x) / (1 + x)

    def average(self, name: str, geometry: str, temperature: float, potential: float) -> mp.mpf:
        t0, v0 = mp.mpf(temperature), mp.mpf(potential)

        def inside(t: mp.mpf) -> mp.mpf:
            w = v0 / (t0 * t)
            if geometry == "plane":
                g = mp.mpf(1)
            elif geometry == "sphere":
                g = 1 + w
            elif w == 0:
                g = mp.mpf(1)
            else:
                g = 2 / mp.pi * (mp.sqrt(w) + (1 + w) * mp.atan(1 / mp.sqrt(w)))
            return t * mp.exp(-t) * g * getattr(self, name)(t0 * t + v0)

        # split where the yield, the collection factor and the Maxwellian have their scales
        scale = {"secondary": self.energy, "backscatter": self.drop_energy, "ion": self.ion_energy}
        marks = [scale[name] / t0 * f for f in (0.1, 1, 5, 20)] + [v0 / t0 * f for f in (0.03, 1)]
        marks += [mp.mpf(f) for f in (1e-9, 1e-6, 1e-4, 1e-2, 0.3, 1, 3, 8, 20, 45)]
        edges = [mp.mpf(1e-14), *sorted(m for m in marks if 1e-13 < m < 70), mp.mpf(70)]
        # in ln t: the roots of small energies become smooth
        return mp.quad(
            lambda s: mp.exp(s) * inside(mp.exp(s)), [mp.log(x) for x in edges], maxdegree=5
        )


YIELDS = ("secondary", "backscatter", "ion")
CASES = [
    (material, law, temperature, potential)
    for i, (material, law) in enumerate(
        (m, law) for m in ("gold", "polyimide film") for law in SECONDARY_LAWS
    )
    for temperature, potential in zip(
        10.0 ** np.random.default_rng(20 + i).uniform(-1.0, 5.0, 3),
        10.0 ** np.random.default_rng(40 + i).uniform(-2.0, 5.3, 3),
        strict=True,
    )
]
QUADRATURE_BOUND = 1e-8
SPLINE_BOUND = 1e-8


@pytest.mark.parametrize(("material", "law", "temperature", "potential"), CASES)
def test_tables_against_mpmath(
    material: str, law: YieldLaw, temperature: float, potential: float
) -> None:
    """Quadrature to 1e-8 of the emission, spline between its knots to 1e-8 of what arrives.

    The share of what arrives is the measure that matters in a balance: at tens of
    kilovolts an exponential law leaves 1e-30 of it, which no cubic follows in relative terms.
    """
    record = load_material(material)
    yields = emitter(record, law)
    reference = Reference(record, law)
    scale = knot_scale(temperature)
    grid = knots(scale)
    kernels = (yields.secondary, yields.backscatter, yields.ion)
    geometries: tuple[Geometry, ...] = tuple(GEOMETRIES.values())
    direct = average_yields(kernels, temperature, np.array([potential, 0.0]), geometries)
    values = average_yields(kernels, temperature, grid, geometries)  # [Y, G, K]
    table = YieldTable.fit(scale, values.reshape(9, -1).T[None])
    spline = table(np.array([[potential]]))[0].reshape(3, 3)
    worst = [0.0, 0.0]
    for i, name in enumerate(YIELDS):
        for j, geometry in enumerate(GEOMETRIES):
            exact = float(reference.average(name, geometry, temperature, potential))
            worst[0] = max(worst[0], abs(direct[i, j, 0] / exact - 1.0))
            arrives = float(GEOMETRIES[geometry].factor(np.array([potential / temperature]))[0])
            worst[1] = max(worst[1], abs(spline[i, j] - exact) / arrives)
        rest = float(reference.average(name, "plane", temperature, 0.0))
        worst[0] = max(worst[0], abs(direct[i, 0, 1] / rest - 1.0))
    print(f"worst: quadrature {worst[0]:.1e} of the emission, spline {worst[1]:.1e} of arrivals")
    assert worst[0] < QUADRATURE_BOUND
    assert worst[1] < SPLINE_BOUND


def test_table_meets_its_knots_and_keeps_its_slope() -> None:
    scale = 5.0
    grid = knots(scale)
    values = np.stack([np.sqrt(grid + 1.0), np.log1p(grid)], axis=-1)[None]
    table = YieldTable.fit(scale, values)
    value, slope = table(grid[:, None])
    assert value[:, 0] == pytest.approx(values[0], rel=1e-12)
    v = np.geomspace(1e-2, 1e5, 200)[:, None]
    value, slope = table(v)
    assert value[:, 0, 0] == pytest.approx(np.sqrt(v[:, 0] + 1.0), rel=1e-7)
    assert slope[:, 0, 1] == pytest.approx(1.0 / (1.0 + v[:, 0]), rel=1e-4)
    assert grid[0] == 0.0
    assert grid[-1] >= 4e5


@pytest.mark.parametrize("geometry", GEOMETRIES)
def test_ion_impact_has_the_yield_at_normal_incidence(geometry: str) -> None:
    around = plasma(("e", 1e6, 500.0), ("p", 1e6, 800.0))
    reference = Reference(load_material("gold"), "sanders_inouye_1979")
    ion = 1e6 * e * np.sqrt(e * 800.0 / (2.0 * pi * m_p))
    rows, _ = evaluate(model_of("gold", around=around, collection=geometry), np.array([-2e3]))
    exact = ion * float(reference.average("ion", geometry, 800.0, 2000.0))
    assert rows[0, MECHANISMS.index("ion_induced_secondary")] == pytest.approx(exact, rel=1e-6)


def test_backscattered_electrons_are_not_held_back_and_secondaries_are() -> None:
    around = plasma(("e", 1e6, 3000.0), ("p", 1e6, 3000.0))
    model = model_of("gold", around=around, collection="plane")
    rows, _ = evaluate(model, np.array([-1e-9 - ROUNDING_V, 5.1]))
    mean = rows[:, 4] / -rows[:, 0]
    assert mean[1] == pytest.approx(mean[0], rel=1e-2)
    # Chung-Everhart at one work function: a quarter escapes
    release = rows[:, 2] / -rows[:, 0]
    assert release[1] / release[0] == pytest.approx(0.25, rel=2e-2)


# --- the march's tables -------------------------------------------------------------------

# shares of the gross current (the sum of all mechanisms without their signs), and for the
# slope of gross current over potential
LOOKUP_BOUND = 1e-6  # in sunlight: the ends of weaker spectral lines
DARK_LOOKUP_BOUND = 1e-8
LOOKUP_SLOPE_BOUND = 1e-4


@pytest.mark.parametrize("law", SECONDARY_LAWS)
@pytest.mark.parametrize("collection", COLLECTIONS)
def test_lookup_path_against_direct_path(collection: str, law: YieldLaw) -> None:
    names = ("gold", "polyimide film", "cover glass", "bare collector")
    model = surface_model(
        [load_material(name) for name in names],
        [load_plasma("quiet geostationary"), load_plasma(ECSS)],
        solar_spectrum(),
        law=law,
        radius_m=30.0,
        collection=collection,
    )
    table = net_currents([model])
    random = np.random.default_rng(5)
    count = 3000
    size = 10.0 ** random.uniform(-2.0, 5.2, (count, 4))
    v = size * random.choice([-1.0, 1.0], (count, 4))
    share = random.uniform(0.0, 1.0, count)
    setting = Setting(np.stack([1.0 - share, share], axis=-1), random.uniform(0.0, 1.0, (count, 4)))
    direct = surface_currents(model, v, setting)
    net, slope = table.current_and_slope(np.zeros(count, dtype=np.intp), v, setting)
    assert np.array_equal(net, table.current(np.zeros(count, dtype=np.intp), v, setting))
    gross = np.abs(direct.by_mechanism).sum(axis=-1)
    worst = float((np.abs(net - direct.by_mechanism.sum(axis=-1)) / gross).max())
    bend = float((np.abs(slope - direct.slope) * np.abs(v) / gross).max())
    dark = Setting(setting.strength, np.zeros_like(v))
    in_dark = surface_currents(model, v, dark).by_mechanism
    found = table.current(np.zeros(count, dtype=np.intp), v, dark)
    off = np.abs(found - in_dark.sum(axis=-1)) / np.abs(in_dark).sum(axis=-1)
    print(f"worst share of the gross current: {worst:.1e}, dark {off.max():.1e}; slope {bend:.1e}")
    assert float(off.max()) < DARK_LOOKUP_BOUND
    assert worst < LOOKUP_BOUND
    assert bend < LOOKUP_SLOPE_BOUND


def test_lookup_of_several_models_keeps_them_apart() -> None:
    models = [model_of("gold", law=law) for law in SECONDARY_LAWS]
    both = net_currents(models)
    v = np.array([[-2000.0], [-2000.0]])
    setting = Setting(np.ones((2, 1)), np.zeros((2, 1)))
    net = both.current(np.array([0, 1]), v, setting)
    exact = [evaluate(model, np.array([-2000.0]))[0].sum() for model in models]
    assert net[:, 0] == pytest.approx(exact, rel=1e-5)
    assert abs(net[0, 0] / net[1, 0] - 1.0) > 0.05


def test_thick_limit_of_each_keyword() -> None:
    assert [thick_geometry(c) for c in COLLECTIONS] == [SPHERE, SPHERE, CYLINDER, SPHERE]
