"""Open field lines: tail lobes and polar caps, and where they begin."""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.coefficients import Coefficient
from environments.population_series import smoothstep

Array = NDArray[np.float64]

COEFFICIENTS: Final = (
    Coefficient("lobe density, near and at 60 RE", (0.047, 0.02), "cm-3", "handbook",
                "Svenes et al. 2008, Ann. Geophys. 26, 2845 (0.007 to 0.092); at 60 RE Halekas et "
                "al. 2011 (from memory)"),
    Coefficient("lobe electron temperature, near and at 60 RE", (100.0, 80.0), "eV", "memory",
                "Pedersen et al. 2008, J. Geophys. Res. 113, A07S33 (30 to 300)"),
    Coefficient("lobe ion temperature", (300.0,), "eV", "memory",
                "Pedersen et al. 2008 (50 to 1000)"),
    Coefficient("distances of the two", (20.0, 60.0), "RE", "assumed", "where the figures belong"),
    Coefficient("polar cap density, distance, exponent", (5.9, 3.128, -3.85),
                "cm-3, RE, 1", "memory", "Persoon, Gurnett & Shawhan 1983, J. Geophys. Res. 88, "
                "10123: the slope, through the middle of 35.2 at 2.1 RE and 0.99 at 4.66 RE"),
    Coefficient("polar cap temperature", (1.0,), "eV", "assumed", "cold outflowing plasma"),
    Coefficient("hinge, shape of the neutral sheet", (10.5, 14.0, 22.5), "RE", "memory",
                "Fairfield 1980, J. Geophys. Res. 85, 775"),
    Coefficient("half thickness of the plasma sheet, its widening", (3.0, 0.01), "RE, 1/RE",
                "assumed", "5 to 8 RE thick near 20 RE, wider at the flanks"),
)  # fmt: skip
"""Figures of this module."""


class LobeMoments(NamedTuple):
    """Moments at N places; protons and electrons are equally many.

    Attributes
    ----------
    lobe_density_m3, electron_temperature_eV, ion_temperature_eV : ndarray
        Of the lobe [m-3], [eV].
    cap_density_m3, cap_temperature_eV : ndarray
        Of cold plasma above the polar cap [m-3], [eV].
    """

    lobe_density_m3: Array
    electron_temperature_eV: Array
    ion_temperature_eV: Array
    cap_density_m3: Array
    cap_temperature_eV: Array


def lobe_plasma(radius_re: ArrayLike) -> LobeMoments:
    """Plasma on open field lines.

    Parameters
    ----------
    radius_re : array_like, shape (N,)
        Distance from the Earth's centre, in its radii.

    Returns
    -------
    LobeMoments
        The lobe's between 20 and 60 Earth radii by logarithms, held outside. Cold plasma of
        the cap falls as r^-3.85 (found from 2 to 5 Earth radii) and is as thin as the lobe
        at 12.

    Notes
    -----
    Ions that flow out of the ionosphere cold, some 0.1 cm-3 of 20 eV, hide from detectors
    behind the spacecraft's positive potential; they are not in these figures.

    References
    ----------
    See `COEFFICIENTS`.

    Examples
    --------
    >>> found = lobe_plasma([20.0, 60.0])
    >>> found.lobe_density_m3.round().tolist(), found.electron_temperature_eV.round(1).tolist()
    ([47000.0, 20000.0], [100.0, 80.0])
    """
    r = np.asarray(radius_re, dtype=np.float64)
    near, far = COEFFICIENTS[3].value
    share = np.clip(np.log(r / near) / np.log(far / near), 0.0, 1.0)
    density, electron = (
        np.exp((1.0 - share) * np.log(c.value[0]) + share * np.log(c.value[1]))
        for c in COEFFICIENTS[:2]
    )
    at, where, power = COEFFICIENTS[4].value
    constant = np.ones_like(r)
    return LobeMoments(
        1e6 * density, electron, COEFFICIENTS[2].first * constant,
        1e6 * at * (r / where) ** power, COEFFICIENTS[5].first * constant,
    )  # fmt: skip


def neutral_sheet_z(x_re: ArrayLike, y_re: ArrayLike, tilt_rad: ArrayLike) -> Array:
    """Height of the neutral sheet over the plane that holds Sun and dusk.

    Parameters
    ----------
    x_re, y_re : array_like
        Sunward and duskward position in solar magnetospheric axes, in Earth radii.
    tilt_rad : array_like
        Of the dipole towards the Sun [rad].

    Returns
    -------
    ndarray
        In Earth radii. Inside of the hinge at 10.5 the plane of the dipole's equator.

    References
    ----------
    Fairfield (1980), J. Geophys. Res. 85, 775 (from memory).

    Examples
    --------
    >>> float(neutral_sheet_z(-30.0, 0.0, np.radians(30.0)).round(2))
    5.25
    """
    hinge, depth, half_width = COEFFICIENTS[6].value
    x, y = np.asarray(x_re, dtype=np.float64), np.asarray(y_re, dtype=np.float64)
    arch = (hinge + depth) * np.sqrt(np.maximum(1.0 - (y / half_width) ** 2, 0.0)) - depth
    tilt = np.asarray(tilt_rad, dtype=np.float64)
    # the equator's plane up to the hinge
    reach = np.clip(-x / np.cos(tilt) / hinge, -1.0, 1.0)
    return np.asarray(np.sin(tilt) * arch * reach)


def closed_share(
    place_re: Array, tilt_rad: Array, latitude_deg: Array, l_shell: Array, edge_deg: Array
) -> Array:
    """Share of closed field lines, 1 in the plasma sheet, 0 in lobe and polar cap.

    Parameters
    ----------
    place_re : ndarray, shape (3, N)
        Solar magnetospheric axes, in Earth radii.
    tilt_rad, latitude_deg, l_shell, edge_deg : ndarray, shape (N,)
        Tilt of the dipole [rad], dipole latitude [deg], L, poleward edge of the oval [deg].

    Returns
    -------
    ndarray, shape (N,)
        A field line counts as closed where its foot lies equatorward of the edge (over 3 deg),
        on the night side also within the sheet's thickness around the neutral sheet, on the
        day side also below 50 to 60 deg of latitude (both assumed).
    """
    x, y, z = place_re
    foot = np.degrees(np.arccos(np.sqrt(np.clip(1.0 / l_shell, 0.0, 1.0))))
    by_foot = 1.0 - smoothstep(foot, edge_deg - 1.5, edge_deg + 1.5)
    thin, widening = COEFFICIENTS[7].value
    half = thin + widening * y**2
    away = np.abs(z - neutral_sheet_z(x, y, tilt_rad)) / half
    night = 1.0 - smoothstep(away, 0.8, 1.2)
    day = 1.0 - smoothstep(np.abs(latitude_deg), 50.0, 60.0)
    sunward = smoothstep(x, -4.0, 4.0)
    # near the Earth, where the sheet's thickness is that of the Earth, only the foot counts
    far = smoothstep(np.sqrt(x**2 + y**2 + z**2), 6.0, 9.0)
    by_place = far * (sunward * day + (1.0 - sunward) * night)
    return np.asarray(1.0 - (1.0 - by_foot) * (1.0 - by_place))
