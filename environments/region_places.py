"""Where a place lies among the regions around the Earth, as shares that add to 1."""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from environments.activity import ActivityAt
from environments.auroral_oval import poleward_edge_deg
from environments.coefficients import Coefficient
from environments.magnetopause import bow_shock_radius, magnetopause_radius, wind_velocity_m_s
from environments.magnetosphere import MEAN_RADIUS_M, dipole_axis, magnetic_place
from environments.plasma_sheet import sheet_share
from environments.plasmasphere import ColdPlasma, cold_plasma
from environments.population_series import smoothstep
from environments.tail_lobe import closed_share
from environments.vectors import direction, length

Array = NDArray[np.float64]

COEFFICIENTS: Final = (
    Coefficient("half width of the magnetopause", (0.5,), "RE", "assumed",
                "boundary layer of some 0.5 RE on either side, wider at the flanks"),
    Coefficient("half width of the bow shock", (0.1,), "RE", "assumed",
                "its foot and ramp, and its motion within minutes"),
    Coefficient("polar cap to lobe", (6.0, 12.0), "RE", "assumed",
                "cold plasma of the cap is as thin as the lobe at 12 RE"),
)  # fmt: skip
"""Figures of this module."""


class EarthShares(NamedTuple):
    """Shares and magnetic coordinates at T times, arrays of shape (T,).

    Attributes
    ----------
    solar_wind, magnetosheath, lobe, polar_cap, plasma_sheet, cold_only : ndarray
        Shares, adding to 1; `cold_only` is plasmasphere and trough inside of the sheet.
    radius_re, angle_rad : ndarray
        Distance from the centre in Earth radii; angle from where the wind comes from.
    l_shell, local_time_h, latitude_deg : ndarray
        Of the centred dipole.
    tailward : ndarray
        0 on the day side to 1 at midnight.
    cold : ColdPlasma
        Cold electrons there.
    wind_m_s : ndarray, shape (3, T)
        Velocity of the wind against the Earth.
    """

    solar_wind: Array
    magnetosheath: Array
    lobe: Array
    polar_cap: Array
    plasma_sheet: Array
    cold_only: Array
    radius_re: Array
    angle_rad: Array
    l_shell: Array
    local_time_h: Array
    latitude_deg: Array
    tailward: Array
    cold: ColdPlasma
    wind_m_s: Array


def earth_shares(
    stamps: NDArray[np.datetime64], position_m: Array, sun_m: Array, now: ActivityAt
) -> EarthShares:
    """Shares of the regions around the Earth.

    Parameters
    ----------
    stamps : ndarray of datetime64[ns], shape (T,)
        UTC.
    position_m, sun_m : ndarray, shape (3, T)
        From the Earth's centre [m], GCRS-like.
    now : ActivityAt
        Activity.

    Returns
    -------
    EarthShares
    """
    radius = length(position_m) / MEAN_RADIUS_M
    wind = wind_velocity_m_s(sun_m, now.speed_m_s)
    upstream = -direction(wind)
    cosine = np.clip(np.sum(upstream * direction(position_m), axis=0), -1.0, 1.0)
    pause = magnetopause_radius(cosine, now.bz_nT, now.pressure_nPa)
    shock = bow_shock_radius(cosine, now.bz_nT, now.pressure_nPa)
    wide, narrow = COEFFICIENTS[0].first, COEFFICIENTS[1].first
    outside = smoothstep(radius, pause - wide, pause + wide)
    beyond = smoothstep(radius, shock - narrow, shock + narrow)
    place = magnetic_place(position_m, sun_m, stamps)
    shell, hour = np.minimum(place.l_shell, 1e6), place.magnetic_local_time_h
    gsm, tilt = _magnetospheric(position_m, upstream, stamps)
    closed = closed_share(
        gsm / MEAN_RADIUS_M, tilt, place.dipole_latitude_deg, shell, poleward_edge_deg(hour, now.kp)
    )
    inside = 1.0 - outside
    far = smoothstep(radius, *COEFFICIENTS[2].value)
    # far down the tail the dipole's L is that of the place, not of the stretched field line
    sheet = sheet_share(np.maximum(shell, radius), now.kp)
    days = (stamps - stamps.astype("datetime64[Y]")).astype("timedelta64[s]").astype(np.float64)
    cold = cold_plasma(shell, hour, radius, days / 86400.0 + 1.0, now.kp_max_24h, now.f107)
    tailward = smoothstep(-np.cos(np.radians(15.0 * (hour - 12.0))), 0.0, 1.0)
    return EarthShares(
        outside * beyond, outside * (1.0 - beyond),
        inside * (1.0 - closed) * far, inside * (1.0 - closed) * (1.0 - far),
        inside * closed * sheet, inside * closed * (1.0 - sheet),
        radius, np.arccos(cosine), shell, hour, place.dipole_latitude_deg, tailward, cold, wind,
    )  # fmt: skip


def without(places: EarthShares, taken: Array) -> EarthShares:
    """The same places with every share lessened by what others have taken.

    Parameters
    ----------
    places : EarthShares
        Shares adding to 1.
    taken : ndarray, shape (T,)
        0 to 1.

    Returns
    -------
    EarthShares
        Shares adding to 1 - taken.
    """
    left = 1.0 - taken
    return places._replace(
        solar_wind=left * places.solar_wind,
        magnetosheath=left * places.magnetosheath,
        lobe=left * places.lobe,
        polar_cap=left * places.polar_cap,
        plasma_sheet=left * places.plasma_sheet,
        cold_only=left * places.cold_only,
    )


def _magnetospheric(
    position: Array, upstream: Array, stamps: NDArray[np.datetime64]
) -> tuple[Array, Array]:
    """Position in axes x upstream, y dusk, z north with the dipole in xz; tilt [rad]."""
    if not stamps.size:
        return position, np.empty(0)
    axis = dipole_axis(stamps)
    dusk = direction(np.cross(axis, upstream, axis=0))
    north = np.cross(upstream, dusk, axis=0)
    place = np.stack([np.sum(a * position, axis=0) for a in (upstream, dusk, north)])
    return place, np.arcsin(np.clip(np.sum(axis * upstream, axis=0), -1.0, 1.0))
