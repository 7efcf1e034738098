"""Random current of a Maxwellian onto a plane."""

from math import isfinite

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import e
from scipy.constants import m_e as electron_mass


def one_sided_maxwellian_current(
    density_m3: ArrayLike,
    temperature_eV: ArrayLike,
    *,
    mass_kg: float = electron_mass,
    charge_number: int = -1,
) -> NDArray[np.float64]:
    r"""Current density a Maxwellian plasma sends onto one side of a plane.

    :math:`J = q n \sqrt{e T / 2\pi m}`: random flux at plasma potential,
    before a sheath attracts or repels the species.

    Parameters
    ----------
    density_m3, temperature_eV : array_like
        Number density [m-3], temperature [eV]; broadcast together.
    mass_kg, charge_number : optional
        Mass [kg]; signed charge in units of e. Default: electron.

    Returns
    -------
    ndarray
        Current density [A m-2]; positive = positive charge arriving,
        so electrons give a negative value.

    Raises
    ------
    ValueError
        density < 0, temperature <= 0, mass <= 0, or not finite.

    Notes
    -----
    Valid: isotropic, no drift, non-relativistic (electrons below ~50 keV).

    References
    ----------
    Lieberman & Lichtenberg (2005), Principles of Plasma Discharges,
    sec. 2.4 (section from memory).

    Examples
    --------
    >>> round(float(one_sided_maxwellian_current(1e6, 1e3)) * 1e6, 3)  # uA m-2
    -0.848
    """
    density = np.asarray(density_m3, dtype=np.float64)
    temperature = np.asarray(temperature_eV, dtype=np.float64)
    if not (np.isfinite(density).all() and (density >= 0.0).all()):
        raise ValueError("density_m3 must be finite and not negative")
    if not (np.isfinite(temperature).all() and (temperature > 0.0).all()):
        raise ValueError("temperature_eV must be finite and positive")
    if not (isfinite(mass_kg) and mass_kg > 0.0):
        raise ValueError("mass_kg must be finite and positive")
    flux = density * np.sqrt(e * temperature / (2.0 * np.pi * mass_kg))
    return np.asarray(charge_number * e * flux, dtype=np.float64)
