"""Potentials along regions of space beside the ranges that were observed.

Ranges are published; each message shows both. Where a range does not hold the test says what
was found and why.
"""

import math
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from charging.case import load_case_text
from charging.currents.emission import SECONDARY_LAWS
from charging.orbit_run import solve_mode, surroundings_of
from charging.point import floating_point
from environments.plasma import ELECTRON, Plasma, Population
from environments.species import HYDROGEN_ION
from materials.library import load_material

CASES = Path(__file__).parents[2] / "cases"

BODY = """
[body]
radius_m = 1.0
[emission]
secondary_law = "sanders_inouye_1979"
[[surface]]
name = "skin"
material = "{material}"
area_m2 = 3.0
normal = [0.0, 0.0, 1.0]
[[surface]]
name = "shaded skin"
material = "{material}"
area_m2 = 9.0
normal = [0.0, 0.0, -1.0]
"""

KEPLER = """
title = "a conducting body"
[orbit]
kind = "kepler"
epoch = 2031-03-20T00:00:00Z
semi_major_axis_km = {a}
eccentricity = {e}
inclination_deg = {i}
raan_deg = {raan}
argument_of_perigee_deg = {arg}
mean_anomaly_deg = {mean}
[time]
duration_h = {hours}
output_step_s = 60.0
start = "equilibrium"
[attitude]
law = "sun"
[plasma]
model = "regions"
kp = 2.0
"""

FIXED = """
title = "a conducting body"
[orbit]
kind = "fixed"
illumination = {light}
epoch = 2031-03-30T00:00:00Z
sun_direction = [0.0, 0.0, 1.0]
duration_h = 0.05
[time]
output_step_s = 60.0
start = "equilibrium"
[sun]
{sun}
[plasma]
model = "regions"
{plasma}
"""


def structure_V(text: str) -> tuple[float, str]:
    """Last potential of structure and the region it stands in."""
    loaded = load_case_text(text)
    around = surroundings_of(loaded)
    mode = solve_mode(loaded, around=around)
    end = float(mode.trajectories[0].y_end[-1, 0])
    return end, mode.plasma_at(loaded.case.duration_s)


def kepler(elements: dict[str, float]) -> str:
    return KEPLER.format(**elements) + BODY.format(material="oxidised aluminium")


def fixed(light: float, sun: str, plasma: str, material: str = "oxidised aluminium") -> str:
    return FIXED.format(light=light, sun=sun, plasma=plasma) + BODY.format(material=material)


LOBE = {"a": 83000.0, "e": 0.6, "i": 90.0, "raan": 0.0, "arg": 60.0, "mean": 180.0, "hours": 0.1}
LOW = {"a": 6778.0, "e": 0.0, "i": 51.6, "raan": 40.0, "arg": 0.0, "mean": 0.0, "hours": 0.05}

# region, case, range [V], allowance [V], source. The reference list allows 3 V or 50 % for
# positive potentials and a factor 3 below -100 V.
RANGES = [
    ("solar wind", fixed(1.0, "", 'around = "sun"'), (2.0, 10.0), 3.0,
     "Pedersen 1995; Whipple 1981, Rep. Prog. Phys. 44, 1197 (from memory)"),
    ("lobe", kepler(LOBE), (20.0, 60.0), 10.0,
     "Pedersen et al. 2008, J. Geophys. Res. 113, A07S33 (from memory)"),
    ("solar wind", fixed(1.0, "", 'around = "moon"\nsolar_zenith_angle_deg = 30.0'), (5.0, 20.0),
     3.0, "dayside of the Moon: Halekas et al. 2008, doi 10.1029/2008JA013194 (abstract)"),
    ("ionosphere", kepler(LOW), (-2.0, -0.2), 0.0,
     "bare body in O+, a few times the electron temperature: planar or OML balance (derived)"),
]  # fmt: skip


@pytest.mark.parametrize(
    ("region", "text", "published", "allowance", "source"), RANGES,
    ids=["solar wind", "lobe", "Moon day", "low orbit"],
)  # fmt: skip
def test_published_range(
    region: str, text: str, published: tuple[float, float], allowance: float, source: str
) -> None:
    ours, where = structure_V(text)
    assert where == region
    low, high = published[0] - allowance, published[1] + allowance
    message = f"{region}: {ours:.2f} V; published {published[0]} to {published[1]} V, {source}"
    print(message)
    assert low <= ours <= high, message


def test_nearer_to_the_sun_currents_grow_as_published() -> None:
    """Electron current r^-2.25 and sunlight r^-2, so the potential hardly moves.

    2.87 against 0.604 uA m-2 at 0.5 and 1 AU: table of the reference, from n r^-2 and T r^-0.5
    (exponents Pilipp et al. 1990, Stverak et al. 2015).
    """
    current, light, volts = [], [], []
    for distance in (0.5, 1.0):
        loaded = load_case_text(fixed(1.0, f"distance_au = {distance}", 'around = "sun"'))
        around = surroundings_of(loaded)
        mode = solve_mode(loaded, around=around)
        along = around.along
        assert along is not None
        density, temperature = along.moments(np.array([0.0]))
        core = [one.label for one in along.sampled.populations].index("solar wind core electrons")
        current.append(float(density[core, 0] * math.sqrt(temperature[core, 0])))
        light.append(float(mode.balance.models[0].photo_saturation_A_m2[0]))
        volts.append(float(mode.trajectories[0].y_end[-1, 0]))
    assert current[0] / current[1] == pytest.approx(2.87 / 0.604, rel=2e-3)
    assert light[0] / light[1] == pytest.approx(4.0, rel=1e-6)
    assert volts[0] == pytest.approx(volts[1], abs=1.5), volts


def test_night_of_the_moon_and_what_it_lacks() -> None:
    """Dark regolith in the wake: the published tens of volts are those of the wake itself.

    Published: -35 V on average between the night side and a spacecraft above (Halekas et al.
    2002, Geophys. Res. Lett. 29 (10), 77, abstract). Ours is counted against the plasma at the
    place, which stands T_e ln(n0/n) below the solar wind; the surface itself stays within a few
    volts of it, because electrons of 10 to 100 eV release more than they bring from a material
    of peak yield 1.8. A rougher surface of a lower yield would go further down.
    """
    text = fixed(
        0.0, "", 'around = "moon"\nsolar_zenith_angle_deg = 110.0', material="oxidised aluminium"
    )
    day = fixed(1.0, "", 'around = "moon"\nsolar_zenith_angle_deg = 30.0')
    found = []
    for case in (text, day):
        along = surroundings_of(load_case_text(case)).along
        assert along is not None
        density, temperature = along.moments(np.array([0.0]))
        core = [one.label for one in along.sampled.populations].index("solar wind core electrons")
        found.append((float(density[core, 0]), float(temperature[core, 0])))
    (night_n, night_T), (day_n, _) = found
    wake = -night_T * math.log(day_n / night_n)
    local, where = structure_V(text)
    assert where == "lunar wake"
    total = wake + local
    message = f"{local:.1f} V in a wake at {wake:.1f} V: {total:.1f} V; published -35 V"
    print(message)
    assert -35.0 * 3.0 < total < -35.0 / 3.0, message
    assert abs(local) < 10.0, message


def _moon_night(density_m3: float, electrons_eV: float, ions_eV: float) -> Plasma:
    """Tail plasma at the Moon as `tail_lobe` and `plasma_sheet` have it at 60 RE."""
    parts = (
        Population(ELECTRON, "maxwellian", density_m3, electrons_eV),
        Population(HYDROGEN_ION, "maxwellian", density_m3, ions_eV),
    )
    return Plasma("tail at the Moon", "", "this test", "memory", None, "", parts)


@pytest.mark.parametrize(
    ("place", "plasma", "published"),
    [
        ("lobe", _moon_night(2e4, 80.0, 300.0), (-100.0, -100.0)),
        ("plasma sheet", _moon_night(2e5, 300.0, 2000.0), (-200.0, -1000.0)),
    ],
    ids=["lobe", "plasma sheet"],
)
def test_night_of_the_moon_in_the_tail_hangs_on_the_yield_of_the_ground(
    place: str, plasma: Plasma, published: tuple[float, float]
) -> None:
    """Not reproduced with the laboratory yield of the record, reproduced with a third of it.

    Published: -100 V in the lobe, -200 to -1000 V in the plasma sheet (Halekas et al. 2008,
    J. Geophys. Res., doi 10.1029/2008JA013194, abstract); factor 3 as in the reference list. From
    memory Halekas et al. 2009 infer a third of the laboratory yield for the ground as it lies;
    that is the low end of the record's spread, and its value stays that of the laboratory.
    """
    recorded = load_material("lunar regolith")
    peak = recorded.values["secondary_yield_peak"]
    third = replace(peak, value=peak.value / 3.0)
    inferred = replace(recorded, values={**recorded.values, "secondary_yield_peak": third})
    for law in SECONDARY_LAWS:
        ours, lower = (
            floating_point(m, plasma, law=law, collection="plane").reached_V
            for m in (recorded, inferred)
        )
        print(
            f"night side of the Moon, {place}, {law}: {ours:+.1f} V with a peak yield of "
            f"{peak.value}, {lower:+.0f} V with {third.value:.1f}; published {published} V"
        )
        assert 0.0 < ours < 10.0
        assert 3.0 * published[1] < lower < published[0] / 3.0
