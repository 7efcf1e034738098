"""Field vector of the Earth's eccentric dipole, and the motional field in it."""

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.earth_axes import earth_fixed_to_j2000
from environments.magnetosphere import MEAN_RADIUS_M, dipole, dipole_axis
from environments.vectors import as_vectors, length

Array = NDArray[np.float64]

# Schmidt coefficients g20, g21, h21, g22, h22 [nT] of epoch 2025 (from memory, 50 nT): the
# quadrupole sets where the dipole's centre lies; held for all years, 0.5 % of the field.
_QUADRUPOLE_NT: Final = (-2556.0, 2951.0, -3134.0, 1649.0, -815.0)
_DIPOLE_NT: Final = (-29350.0, -1410.0, 4546.0)


def centre_offset_m() -> Array:
    r"""Centre of the eccentric dipole in Earth-fixed axes.

    Returns
    -------
    ndarray, shape (3,)
        From the Earth's centre [m], epoch 2025: some 600 km towards the western Pacific.

    References
    ----------
    Fraser-Smith (1987), Rev. Geophys. 25, 1, eqs. 16 to 22 (from memory; the published 2015
    offset of 577 km towards 22.6 N 137.6 E checks it, test).

    Examples
    --------
    >>> round(float(np.linalg.norm(centre_offset_m())) / 1e3, -2)
    600.0
    """
    g10, g11, h11 = _DIPOLE_NT
    g20, g21, h21, g22, h22 = _QUADRUPOLE_NT
    root3 = np.sqrt(3.0)
    L0 = 2.0 * g10 * g20 + root3 * (g11 * g21 + h11 * h21)
    L1 = -g11 * g20 + root3 * (g10 * g21 + g11 * g22 + h11 * h22)
    L2 = -h11 * g20 + root3 * (g10 * h21 - h11 * g22 + g11 * h22)
    B2 = g10**2 + g11**2 + h11**2
    E = (L0 * g10 + L1 * g11 + L2 * h11) / (4.0 * B2)
    offset = np.array([L1 - g11 * E, L2 - h11 * E, L0 - g10 * E]) / (3.0 * B2)
    return np.asarray(MEAN_RADIUS_M * offset)


def field_T(position_m: ArrayLike, times: ArrayLike) -> Array:
    r"""Field of the eccentric dipole.

    :math:`\mathbf B = (B_0 R^3/r^3)[3(\hat m\cdot\hat r)\hat r - \hat m]`, m pointing to the
    south.

    Parameters
    ----------
    position_m : array_like, shape (3, N)
        From the Earth's centre [m], GCRS-like.
    times : array_like of datetime64, shape (N,)
        UTC.

    Returns
    -------
    ndarray, shape (3, N)
        [T], GCRS-like axes.

    Raises
    ------
    ValueError
        Shapes that do not fit, years outside 1995 to 2040.

    Notes
    -----
    Within 20 % and 10 deg of the full field in low orbit, 30 % over the South Atlantic and
    Siberia (from memory); currents outside the Earth are left out, so that it does not hold
    beyond some 6 Earth radii.

    References
    ----------
    Fraser-Smith (1987), Rev. Geophys. 25, 1.

    Examples
    --------
    >>> noon = np.array(["2031-03-20T12:00:00"], "datetime64[ns]")
    >>> B = field_T([[6.778e6], [0.0], [0.0]], noon)
    >>> bool(B[2, 0] > 2e-5)  # northward over the equator
    True
    """
    position = as_vectors(position_m, "position_m")
    stamps = np.asarray(times).astype("datetime64[ns]")
    if stamps.shape != position.shape[1:]:
        raise ValueError("position_m and times must hold the same number of times")
    if not stamps.size:
        return np.empty((3, 0))
    offset = np.repeat(centre_offset_m()[:, None], stamps.size, axis=1)
    r = position - earth_fixed_to_j2000(offset, stamps)
    size = length(r)
    middle = stamps.min() + (stamps.max() - stamps.min()) / 2
    days = (middle - np.datetime64("2000-01-01", "ns")) / np.timedelta64(86400, "s")
    strength = dipole(2000.0 + float(days) / 365.25).equatorial_field_T
    north = dipole_axis(stamps)
    along = np.sum(north * r, axis=0) / size
    scale = strength * (MEAN_RADIUS_M / size) ** 3
    return np.asarray(scale * (north - 3.0 * along * r / size))


def motional_field_V_m(velocity_m_s: ArrayLike, magnetic_field_T: ArrayLike) -> Array:
    """Electric field v x B seen aboard a craft.

    Parameters
    ----------
    velocity_m_s : array_like, shape (3, N)
        Of the craft through the plasma [m s-1].
    magnetic_field_T : array_like, shape (3, N)
        [T], same axes.

    Returns
    -------
    ndarray, shape (3, N)
        [V m-1].

    Examples
    --------
    >>> motional_field_V_m([[7660.0], [0.0], [0.0]], [[0.0], [3e-5], [0.0]])[2, 0].round(4)
    np.float64(0.2298)
    """
    v = as_vectors(velocity_m_s, "velocity_m_s")
    return np.asarray(np.cross(v, as_vectors(magnetic_field_T, "magnetic_field_T"), axis=0))


def motional_potential_V(motional_V_m: ArrayLike, offset_m: ArrayLike) -> Array:
    """Potential against the plasma at the end of a conductor, beyond that at its reference.

    Parameters
    ----------
    motional_V_m : array_like, shape (3, N)
        v x B [V m-1].
    offset_m : array_like, shape (3,) or (3, N)
        From the conductor's reference point to the place [m], same axes.

    Returns
    -------
    ndarray, shape (N,)
        v x B . L [V]. Inside a conductor the field in its own frame vanishes, so that against
        the plasma passing by its potential changes by + v x B . L.

    Notes
    -----
    Sign: the plasma's frame holds no field; the craft's frame sees E = v x B, whose potential
    in the plasma falls by v x B . L along L, while the conductor stays level. Hence the
    conductor stands v x B . L above the local plasma.

    Examples
    --------
    >>> float(motional_potential_V([[0.0], [0.0], [0.23]], [0.0, 0.0, 100.0])[0])
    23.0
    """
    field = as_vectors(motional_V_m, "motional_V_m")
    offset = np.asarray(offset_m, dtype=np.float64)
    if offset.shape not in ((3,), field.shape):
        raise ValueError("offset_m must have the shape (3,) or that of motional_V_m")
    return np.asarray(np.sum(field * offset.reshape(3, -1), axis=0))
