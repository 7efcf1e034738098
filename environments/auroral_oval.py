"""Edges of the auroral oval by magnetic local time and Kp."""

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.coefficients import Coefficient
from environments.population_series import smoothstep

Array = NDArray[np.float64]

_EQUATORWARD: Final = (
    "Gussenhoven, Hardy & Heinemann 1983, J. Geophys. Res. 88, 5692, as tabulated in the open "
    "library ocbpy"
)
_POLEWARD: Final = "Starkov 1994, Geomagn. Aeron. 34, 331, as tabulated in the open library ocbpy"

COEFFICIENTS: Final = (
    Coefficient("start of the sectors of one hour",
                (0, 1, 4, 5, 6, 7, 8, 9, 10, 11, 12, 15, 16, 17, 18, 19, 20, 21, 22, 23),
                "h", "handbook", _EQUATORWARD),
    Coefficient("equatorward edge at Kp 0",
                (66.1, 65.1, 67.7, 67.8, 68.2, 68.9, 69.3, 69.5, 69.6, 70.1, 69.4, 70.9, 71.6,
                 71.1, 71.2, 70.4, 69.4, 68.6, 67.9, 67.8), "deg", "handbook", _EQUATORWARD),
    Coefficient("equatorward edge by Kp",
                (-1.99, -1.55, -1.48, -1.87, -1.90, -1.91, -1.87, -1.67, -1.41, -1.25, -0.84,
                 -0.81, -1.28, -1.31, -1.74, -1.83, -1.89, -1.86, -1.78, -2.07),
                "deg", "handbook", _EQUATORWARD),
    Coefficient("AL by Kp", (18.0, -12.3, 27.2, -2.0), "nT", "handbook",
                "as used with Starkov 1994 in a public code"),
    Coefficient("poleward edge, A0", (-0.07, 24.54, -12.53, 2.15), "deg", "handbook", _POLEWARD),
    Coefficient("poleward edge, A1", (-10.06, 19.83, -9.33, 1.24), "deg", "handbook", _POLEWARD),
    Coefficient("poleward edge, a1", (-6.61, 10.17, -5.80, 1.19), "h", "handbook", _POLEWARD),
    Coefficient("poleward edge, A2", (-4.44, 7.47, -3.01, 0.25), "deg", "handbook", _POLEWARD),
    Coefficient("poleward edge, a2", (6.37, -1.10, 0.34, -0.38), "h", "handbook", _POLEWARD),
    Coefficient("poleward edge, A3", (-3.77, 7.90, -4.73, 0.91), "deg", "handbook", _POLEWARD),
    Coefficient("poleward edge, a3", (-4.48, 10.16, -5.87, 0.98), "h", "handbook", _POLEWARD),
    Coefficient("half width of an edge", (0.5,), "deg", "assumed",
                "motion of the edges within an hour"),
    Coefficient("least width of the oval", (2.0,), "deg", "assumed",
                "both edges come from different papers and meet at noon in quiet times"),
)  # fmt: skip
"""Figures of this module."""

FITTED_KP: Final = (0.0, 7.0)
"""Where the polynomial of the poleward edge is used; held beyond."""

LATITUDE_ERROR_DEG: Final = 4.0
"""Typical difference of centred-dipole and corrected geomagnetic latitude at 60 to 75 deg
(from memory: up to 8 deg over Siberia and the southern Indian Ocean). It shifts where a pass
meets the oval by up to two minutes, not what it meets."""


def equatorward_edge_deg(local_time_h: ArrayLike, kp: ArrayLike) -> Array:
    """Equatorward edge of the diffuse aurora.

    Parameters
    ----------
    local_time_h : array_like
        Magnetic local time [h].
    kp : array_like
        Planetary index, decimal, 0 to 9.

    Returns
    -------
    ndarray
        Corrected geomagnetic latitude [deg], either hemisphere, positive.

    Notes
    -----
    Each sector's law counts at its middle, linear between; the sectors 02-04 and 13-15 h have
    no entry in the paper and are bridged in the same way. Spread of the fits 1 to 3 deg (from
    memory).

    References
    ----------
    Gussenhoven, Hardy & Heinemann (1983), J. Geophys. Res. 88, 5692, table of regressions.

    Examples
    --------
    >>> equatorward_edge_deg([0.5, 12.5], 3.0).round(2).tolist()
    [60.13, 66.88]
    """
    start, base, slope = (np.asarray(c.value) for c in COEFFICIENTS[:3])
    middle = start + 0.5
    # one turn more on either side closes the circle
    hours = np.concatenate(([middle[-1] - 24.0], middle, [middle[0] + 24.0]))
    t = np.asarray(local_time_h, dtype=np.float64) % 24.0
    level, change = (
        np.interp(t, hours, np.concatenate(([v[-1]], v, [v[0]]))) for v in (base, slope)
    )
    return np.asarray(level + change * np.asarray(kp, dtype=np.float64))


def poleward_edge_deg(local_time_h: ArrayLike, kp: ArrayLike) -> Array:
    """Poleward edge of the oval.

    Parameters
    ----------
    local_time_h : array_like
        Magnetic local time [h].
    kp : array_like
        Planetary index; that of 7 is held above 7.

    Returns
    -------
    ndarray
        Corrected geomagnetic latitude [deg], either hemisphere, positive.

    References
    ----------
    Starkov (1994), Geomagn. Aeron. 34, 331: three harmonics, coefficients cubic in the
    logarithm of |AL|; AL by Kp as used with it.

    Examples
    --------
    >>> poleward_edge_deg([0.0, 6.0, 12.0, 18.0], 3.0).round(2).tolist()
    [71.89, 74.01, 75.71, 73.63]
    """
    index = np.clip(np.asarray(kp, dtype=np.float64), *FITTED_KP)
    al = np.polynomial.polynomial.polyval(index, COEFFICIENTS[3].value)
    x = np.log10(al)
    A0, A1, a1, A2, a2, A3, a3 = (
        np.polynomial.polynomial.polyval(x, c.value) for c in COEFFICIENTS[4:11]
    )
    hour = np.radians(15.0)
    t = np.asarray(local_time_h, dtype=np.float64)
    colatitude = (
        A0
        + A1 * np.cos(hour * (t + a1))
        + A2 * np.cos(hour * (2.0 * t + a2))
        + A3 * np.cos(hour * (3.0 * t + a3))
    )
    return np.asarray(90.0 - colatitude)


def oval_share(latitude_deg: ArrayLike, local_time_h: ArrayLike, kp: ArrayLike) -> Array:
    """How far a place lies within the oval.

    Parameters
    ----------
    latitude_deg : array_like
        Magnetic latitude [deg], either sign.
    local_time_h, kp : array_like
        Magnetic local time [h]; planetary index.

    Returns
    -------
    ndarray
        0 outside, 1 inside, smooth over 1 deg at either edge.

    Examples
    --------
    >>> oval_share([50.0, -66.0, 85.0], 0.0, 3.0).tolist()
    [0.0, 1.0, 0.0]
    """
    size = np.abs(np.asarray(latitude_deg, dtype=np.float64))
    low = equatorward_edge_deg(local_time_h, kp)
    half, least = COEFFICIENTS[11].first, COEFFICIENTS[12].first
    high = np.maximum(poleward_edge_deg(local_time_h, kp), low + least)
    above = smoothstep(size, low - half, low + half)
    beyond = smoothstep(size, high - half, high + half)
    return np.asarray(above * (1.0 - beyond))


def oval_cautions(kp: ArrayLike) -> tuple[str, ...]:
    """What to know of the oval at these Kp.

    Examples
    --------
    >>> len(oval_cautions(3.0)), len(oval_cautions(8.0))
    (1, 2)
    """
    found = [
        "auroral oval: latitudes are those of the centred dipole, up to "
        f"{LATITUDE_ERROR_DEG:g} deg off in most places"
    ]
    if bool(np.any(np.asarray(kp) > FITTED_KP[1])):
        found.append("auroral oval: poleward edge of Kp 7 held above it")
    return tuple(found)
