"""Escape of photoelectrons by fitted curves, instead of from photon energies."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from materials.errors import finite_array

EscapeGeometry = Literal["planar", "point source"]
GEOMETRIES: tuple[EscapeGeometry, ...] = ("planar", "point source")
FITTED_LAWS = ("maxwellian", "two exponentials")


@dataclass(frozen=True, slots=True)
class FittedEnergies:
    """Energies of photoelectrons that a record prescribes, instead of those from photons.

    Attributes
    ----------
    law : str
        One of `FITTED_LAWS`.
    source, basis : str
    temperature_eV : float
        T of the Maxwellian [eV].
    current_uA_m2, scale_V : tuple of float
        Terms of the exponentials [uA m-2], [V]; only the ratios of the currents count.
    """

    law: str
    source: str
    basis: str
    temperature_eV: float = 0.0
    current_uA_m2: tuple[float, ...] = ()
    scale_V: tuple[float, ...] = ()

    @property
    def mean_energy_eV(self) -> float:
        """Mean energy [eV]: 2 T; of exponentials as planar escape, twice their mean scale.

        Examples
        --------
        >>> FittedEnergies("maxwellian", "own", "assumed", temperature_eV=1.5).mean_energy_eV
        3.0
        """
        if self.law == "maxwellian":
            return 2.0 * self.temperature_eV
        return float(2.0 * np.average(self.scale_V, weights=self.current_uA_m2))

    def escape(self, potential_V: ArrayLike, geometry: EscapeGeometry) -> NDArray[np.float64]:
        """Share that escapes at V; a fit of exponentials holds for the body it was fitted to."""
        if self.law == "maxwellian":
            return maxwellian_escape(
                potential_V, temperature_eV=self.temperature_eV, geometry=geometry
            )
        return two_exponential_escape(
            potential_V, current_A_m2=self.current_uA_m2, scale_V=self.scale_V
        )


def maxwellian_escape(
    potential_V: ArrayLike, *, temperature_eV: float, geometry: EscapeGeometry = "planar"
) -> NDArray[np.float64]:
    r"""Escape of photoelectrons of one temperature, :math:`e^{-V/T}` from a plane.

    From a point source :math:`(1+V/T)e^{-V/T}`; 1 for V <= 0.

    Parameters
    ----------
    potential_V : array_like
        [V].
    temperature_eV : float
        T [eV], > 0; the mean energy is 2 T.
    geometry : {"planar", "point source"}, optional

    Returns
    -------
    ndarray
        0 to 1, same shape.

    Raises
    ------
    ValueError
        Unknown geometry, T not above 0, not finite.

    References
    ----------
    Grard (1973), J. Geophys. Res. 78, 2885; Medved (1965) (memory).

    Examples
    --------
    >>> maxwellian_escape([0.0, 2.0], temperature_eV=2.0, geometry="point source").round(4).tolist()
    [1.0, 0.7358]
    """
    held = np.maximum(finite_array("potential_V", potential_V), 0.0)
    x = held / finite_array("temperature_eV", temperature_eV, above=0.0)
    return np.asarray(np.exp(-x) if is_planar(geometry) else (1.0 + x) * np.exp(-x))


def two_exponential_escape(
    potential_V: ArrayLike, *, current_A_m2: ArrayLike, scale_V: ArrayLike
) -> NDArray[np.float64]:
    r"""Escape as a sum of exponentials fitted to spacecraft potentials.

    :math:`\sum_i J_i e^{-V/V_i}/\sum_i J_i`; 1 for V <= 0.

    Parameters
    ----------
    potential_V : array_like
        [V].
    current_A_m2, scale_V : array_like, (term,)
        J_i [A m-2], >= 0, and V_i [V], > 0; usually two terms.

    Returns
    -------
    ndarray
        0 to 1, the shape of `potential_V`.

    Raises
    ------
    ValueError
        Different numbers of terms, all J_i 0, out of range, not finite.

    Notes
    -----
    Published for conducting satellites beyond the oxygen atmosphere: 80 and 3 uA m-2 with
    2.0 and 7.5 V (Pedersen 1995, Ann. Geophys. 13, 118; memory), up to 40 V.

    Examples
    --------
    >>> two_exponential_escape([0.0, 10.0], current_A_m2=[80e-6, 3e-6],
    ...                        scale_V=[2.0, 7.5]).round(4).tolist()
    [1.0, 0.016]
    """
    held = np.maximum(finite_array("potential_V", potential_V), 0.0)[..., np.newaxis]
    current = np.atleast_1d(finite_array("current_A_m2", current_A_m2, at_least=0.0))
    scale = np.atleast_1d(finite_array("scale_V", scale_V, above=0.0))
    if current.shape != scale.shape or current.ndim != 1:
        raise ValueError("current_A_m2 and scale_V must have one axis of equal length")
    if not np.any(current > 0.0):
        raise ValueError("current_A_m2 is 0 in every term: nothing is emitted")
    return np.asarray((current / current.sum() * np.exp(-held / scale)).sum(-1))


def is_planar(geometry: str) -> bool:
    """Whether the geometry is planar; ValueError if it is unknown."""
    if geometry not in GEOMETRIES:
        raise ValueError(f"geometry {geometry!r} is unknown; allowed: {', '.join(GEOMETRIES)}")
    return geometry == "planar"
