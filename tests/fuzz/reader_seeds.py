"""Valid files of every kind that a person gives, small, to be bent by `reader_mutations`."""

from __future__ import annotations

from pathlib import Path

ROOT = Path(__file__).parents[2]

FIXED = """\
title = "Two surfaces"
[orbit]
kind = "fixed"
illumination = 1.0
sun_direction = [0.0, 0.0, 1.0]
duration_h = 1.0
[plasma]
use = "ECSS geostationary worst case"
[body]
radius_m = 1.0
[[surface]]
name = "body"
material = "gold"
area_m2 = 4.0
normal = [0.0, 0.0, -1.0]
neighbours = ["film"]
[[surface]]
name = "film"
material = "polyimide film"
area_m2 = 1.0
thickness = "2 mil"
temperature_K = 300.0
normal = [0.0, 0.0, 1.0]
[[surface]]
name = "ring"
material = "gold"
area_m2 = 0.1
floating = true
capacitance_F = 1e-10
normal = [1.0, 0.0, 0.0]
[[link]]
between = ["ring", "structure"]
resistance_ohm = 1e6
[[emitter]]
name = "cathode"
current_A = 1e-5
energy_eV = 100.0
from_h = 0.2
to_h = 0.5
[[mode]]
name = "dark"
alternative = true
illumination = 0.0
emitters = []
[[limit]]
kind = "normal"
allowed_V = 400.0
requirement_id = "CHG-010"
source_document = "own specification"
clause = "4.2"
margin_policy = {factor = 1.25, basis = "project rule"}
reason = "example"
"""

REGIONS = """\
title = "Regions"
[orbit]
kind = "kepler"
center = "earth"
epoch = 2031-03-20T00:00:00Z
semi_major_axis_km = 24400.0
eccentricity = 0.7
inclination_deg = 7.0
raan_deg = 0.0
argument_of_perigee_deg = 178.0
mean_anomaly_deg = 0.0
[time]
duration_h = 10.0
output_step_s = 120.0
start = "equilibrium"
[sun]
f107 = 150.0
f107_81day = 140.0
absorbing_height_km = 100.0
moon = true
flare = {"X-ray" = 10.0}
[attitude]
law = "spin"
axis = [0.0, 1.0, 0.0]
period_s = 60.0
resolved = false
[plasma]
model = "regions"
kp = 5.0
accept_assumed = "example"
[[plasma.substorm]]
onset_h = 2.0
[body]
radius_m = 1.0
[[surface]]
name = "side"
material = "black polyimide film"
area_m2 = 4.0
normal = [0.0, 0.0, -1.0]
"""

MATERIAL_FILES = ("polyimide_film", "gold", "regolith", "anodised", "mgf2", "bare_collector")
PLASMA_FILES = ("ecss_auroral", "inverted_v", "solar_wind", "ats6_worst")

TABULATED = """\
title = "channels"
source = "invented"
basis = "assumed"
[[population]]
species = "electron"
law = "tabulated"
energy_eV = [10.0, 100.0, 1000.0, 1e4]
flux_m2_s_sr_eV = [1e9, 5e8, 1e7, 1e4]
[[population]]
species = "H+"
law = "kappa"
kappa = 4.0
density = "1.2 cm-3"
temperature = "9 keV"
[[population]]
mass_u = 15.995
charge_number = 1
law = "maxwellian"
density_m3 = 1e6
temperature_eV = 10.0
"""

TABLE = """\
# frame = GCRF
# center = earth
# time_scale = UTC
time,x_km,y_km,z_km,vx_km_s,vy_km_s,vz_km_s
"""

TEMPERATURE = """\
time,K
2031-03-20T00:00:00Z,300.0
2031-03-20T06:00:00Z,250.0
2031-03-20T12:00:00Z,120.5
2031-03-21T00:00:00Z,300.0
"""

ATTITUDE = """\
# frame = GCRF
# rotation = inertial to body
# time_scale = UTC
time,q_x,q_y,q_z,q_w
2031-03-20T00:00:00Z,0.0,0.0,0.0,1.0
2031-03-20T06:00:00Z,0.0,0.0,0.3826834323650898,0.9238795325112867
2031-03-20T12:00:00Z,0.0,0.0,0.7071067811865476,0.7071067811865476
"""

SHADOW = """\
surface,sun_azimuth_deg,sun_elevation_deg,lit_share
side,0.0,-90.0,1
side,90.0,-90.0,1
side,180.0,-90.0,1
side,270.0,-90.0,1
side,360.0,-90.0,1
side,0.0,0.0,0.5
side,90.0,0.0,0.75
side,180.0,0.0,0.2
side,270.0,0.0,1
side,360.0,0.0,0.5
side,0.0,90.0,0
side,90.0,90.0,0
side,180.0,90.0,0
side,270.0,90.0,0
side,360.0,90.0,0
"""

ACTIVITY = """\
time,kp,f107,bz_nT,pressure_nPa,density_cm3,speed_km_s
2031-03-20T00:00:00Z,2.333,150.0,-2.0,2.0,6.0,420.0
2031-03-20T03:00:00Z,5.667,150.0,-8.0,4.0,12.0,520.0
2031-03-20T06:00:00Z,4.0,151.0,1.0,2.0,5.0,480.0
2031-03-20T09:00:00Z,9.0,152.0,0.0,2.0,5.0,480.0
"""

MOMENTS = """\
# source = invented
# basis = assumed
# longest_gap_min = 20
# gap = 2031-03-20T00:20:00Z to 2031-03-20T02:00:00Z
# kappa = electron 4.0
time,electron_density_cm3,electron_temperature_keV,H+_density_cm3,H+_temperature_keV
2031-03-20T00:00:00Z,0.8,1.2,0.9,6.0
2031-03-20T00:10:00Z,1.1,4.5,0.9,9.0
2031-03-20T00:20:00Z,1.1,4.5,0.9,9.0
2031-03-20T02:00:00Z,1.1,4.5,0.9,9.0
"""

CHANNELS = """\
# source = invented
time,electron_100_eV,electron_300_eV,electron_1000_eV,electron_3000_eV,electron_10000_eV,H+_density_m3,H+_temperature_eV
2031-03-20T00:00:00Z,3e5,1e5,2e4,3e3,1e2,1e6,5e3
2031-03-20T00:10:00Z,2e5,1e5,3e4,4e3,2e2,1e6,5e3
"""

SPECTRUM = """\
# invented
energy_eV,flux_m2_s_sr_eV
10.0,1e9
100.0,5e8
1000.0,1e7
10000.0,1e4
"""

TLE = """\
VANGUARD 1
1 00005U 58002B   00179.78495062  .00000023  00000-0  28098-4 0  4753
2 00005  34.2682 348.7242 1859667 331.7664  19.3264 10.82419157413667
"""

STUDY = """\
title = "Two coatings"
case = "case.toml"
seed = 7
members = 16
draw = "spreads"
surfaces = ["film"]
confidence = 0.9
[[vary]]
path = "surface.film.material"
values = ["polyimide film", "PTFE"]
[[vary]]
path = "surface.film.thickness_m"
low = 2e-5
high = 2e-4
law = "log_uniform"
[[search]]
path = "body.radius_m"
low = 0.5
high = 2.0
[worst_case]
starts = 2
evaluations = 20
"""


def _library(folder: str, words: tuple[str, ...]) -> tuple[str, ...]:
    files = sorted((ROOT / folder / "data").glob("*.toml"))
    chosen = [file for file in files if any(word in file.stem for word in words)]
    return tuple(file.read_text(encoding="utf-8") for file in chosen)


def circle_rows(count: int = 12, step_s: int = 600) -> list[tuple[int, tuple[float, ...]]]:
    """Rows of a circular geostationary orbit: seconds, position [km], velocity [km/s]."""
    from math import cos, sin, sqrt

    radius, mu = 42164.17, 398600.4418
    rate = sqrt(mu / radius**3)
    rows = []
    for k in range(count):
        angle = rate * step_s * k
        x, y = radius * cos(angle), radius * sin(angle)
        rows.append((step_s * k, (x, y, 0.0, -rate * y, rate * x, 0.0)))
    return rows


def ephemeris_csv() -> str:
    """Small table of a geostationary arc."""
    lines = [
        f"2031-03-20T{s // 3600:02d}:{s // 60 % 60:02d}:00Z," + ",".join(f"{v:.9f}" for v in row)
        for s, row in circle_rows()
    ]
    return TABLE + "\n".join(lines) + "\n"


def oem() -> str:
    """Small orbit ephemeris message of a geostationary arc."""
    head = (
        "CCSDS_OEM_VERS = 2.0\nCREATION_DATE = 2031-03-19T00:00:00\nORIGINATOR = DEMO\n\n"
        "META_START\nOBJECT_NAME = SAMPLE\nOBJECT_ID = 2031-000A\nCENTER_NAME = EARTH\n"
        "REF_FRAME = EME2000\nTIME_SYSTEM = UTC\nSTART_TIME = 2031-03-20T00:00:00\n"
        "STOP_TIME = 2031-03-20T01:50:00\nINTERPOLATION = HERMITE\nINTERPOLATION_DEGREE = 7\n"
        "META_STOP\nCOMMENT invented\n"
    )
    lines = [
        f"2031-03-20T{s // 3600:02d}:{s // 60 % 60:02d}:00 " + " ".join(f"{v:.9f}" for v in row)
        for s, row in circle_rows()
    ]
    return head + "\n".join(lines) + "\n"


def seeds() -> dict[str, tuple[str, ...]]:
    """Texts by kind of reader."""
    from charging.case_template import CASE_TEMPLATE

    demos = ROOT / "cases"
    named = [demos / f"{name}.toml" for name in ("geo_static_worst_case", "inclined_eccentric")]
    halo = demos / "l1_halo.oem"
    return {
        "case": (
            CASE_TEMPLATE,
            FIXED,
            REGIONS,
            *(file.read_text(encoding="utf-8") for file in named if file.is_file()),
        ),
        "study": (STUDY,),
        "material": _library("materials", MATERIAL_FILES),
        "plasma": (TABULATED, *_library("environments", PLASMA_FILES)),
        "oem": (oem(), *((halo.read_text(encoding="utf-8"),) if halo.is_file() else ())),
        "ephemeris table": (ephemeris_csv(),),
        "tle": (TLE,),
        "plasma timeline": (MOMENTS, CHANNELS),
        "activity": (ACTIVITY,),
        "spectrum": (SPECTRUM,),
        "attitude": (ATTITUDE,),
        "temperature": (TEMPERATURE,),
        "shadow": (SHADOW,),
    }
