"""Photoelectrons: yield, saturation current, and escape at positive potential.

Each photon of energy hv frees electrons of 0 to W = hv - threshold. Summed
over the spectrum this gives the retarding curve of the surface, so that no
temperature of photoelectrons has to be assumed.
"""

from __future__ import annotations

from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.optimize import brentq

from materials.errors import finite_array
from materials.photoyield import emission_spectrum, photo_current_density, yield_per_photon

__all__ = [
    "GEOMETRIES",
    "LOW_ENERGY_TEMPERATURE_EV",
    "EscapeGeometry",
    "default_low_energy_share",
    "emission_spectrum",
    "escape_fraction",
    "escape_slope",
    "mean_photoelectron_energy",
    "photo_current_density",
    "potential_at_escape",
    "yield_per_photon",
]

EscapeGeometry = Literal["planar", "point source"]
GEOMETRIES: tuple[EscapeGeometry, ...] = ("planar", "point source")

LOW_ENERGY_TEMPERATURE_EV = 1.0
"""T of the low-energy peak E exp(-E/T)/T^2 under photons above 20 eV (assumed:
"below 2-3 eV" is what is remembered of Feuerbacher & Fitton 1972)."""


def default_low_energy_share(photon_energy_eV: ArrayLike) -> NDArray[np.float64]:
    """Share of photoelectrons in the low-energy peak.

    0 up to 20 eV, rising linearly to 0.6 at 40 eV, 0.6 above.

    Parameters
    ----------
    photon_energy_eV : array_like
        Photon energy [eV].

    Returns
    -------
    ndarray
        0 to 0.6, same shape.

    Raises
    ------
    ValueError
        Energy negative or not finite.

    Notes
    -----
    That a peak of secondaries appears above about 20 eV is remembered from
    Feuerbacher & Fitton (1972), J. Appl. Phys. 43, 1563; the share is assumed.

    Examples
    --------
    >>> default_low_energy_share([10.2, 30.0, 90.0]).round(3).tolist()
    [0.0, 0.3, 0.6]
    """
    energy = finite_array("photon_energy_eV", photon_energy_eV, at_least=0.0)
    return np.asarray(0.6 * np.clip((energy - 20.0) / 20.0, 0.0, 1.0))


def escape_fraction(
    potential_V: ArrayLike,
    photon_energy_eV: ArrayLike,
    emitted_weight: ArrayLike,
    threshold_eV: float,
    *,
    geometry: EscapeGeometry = "planar",
    low_energy_share: ArrayLike | None = None,
    low_energy_temperature_eV: float = LOW_ENERGY_TEMPERATURE_EV,
) -> NDArray[np.float64]:
    r"""Share of photoelectrons that leave a surface at potential V.

    A photon gives energies :math:`p(E) = 12\,E\,(W-E)^2/W^4` between 0 and
    W = hv - threshold. Emission follows the cosine law. With v = V/W:

    - planar, the normal energy must exceed V: :math:`(1-v)^4`;
    - point source, the whole energy must: :math:`(1-v)^3(1+3v)`.

    A share of the electrons of photons above 20 eV sits in a peak
    :math:`(E/T^2)\,e^{-E/T}`, which gives :math:`e^{-V/T}` and
    :math:`(1+V/T)\,e^{-V/T}`.

    Parameters
    ----------
    potential_V : array_like, any shape
        Surface above the highest point on the way out [V].
    photon_energy_eV, emitted_weight : array_like, (bin,)
        Photon energies [eV] and electrons emitted by each bin (any unit,
        >= 0), see `emission_spectrum`. Bins up to the threshold need weight 0.
    threshold_eV : float
        Photoelectric threshold [eV].
    geometry : {"planar", "point source"}, optional
        Planar when the surface is larger than the Debye length of its
        photoelectrons, point source when it is much smaller.
    low_energy_share : array_like, (bin,), optional
        Share in the low-energy peak; `default_low_energy_share` by default.
    low_energy_temperature_eV : float, optional
        T of that peak [eV], > 0.

    Returns
    -------
    ndarray
        0 to 1, the shape of `potential_V`; 1 for V <= 0. Where all weights
        are 0 the fraction is undefined and refused.

    Raises
    ------
    ValueError
        Unknown geometry; all weights 0; weight below the threshold; an
        argument that is not finite or out of its range.

    References
    ----------
    Shape (maximum at W/3, between 0.2 and 0.4 W): Feuerbacher & Fitton (1972),
    J. Appl. Phys. 43, 1563; Grard (1973), J. Geophys. Res. 78, 2885 (memory).
    Retarding curves of the two geometries for a Maxwellian: Grard (1973).

    Examples
    --------
    >>> escape_fraction([-1.0, 0.0, 2.0], [9.0], [1.0], 5.0).tolist()
    [1.0, 1.0, 0.0625]
    >>> float(escape_fraction(2.0, [9.0], [1.0], 5.0, geometry="point source"))
    0.3125
    """
    v, energy, weight, share, t = _escape_arguments(
        potential_V,
        photon_energy_eV,
        emitted_weight,
        threshold_eV,
        low_energy_share,
        low_energy_temperature_eV,
    )
    held = np.maximum(v, 0.0)[..., np.newaxis]
    rest = np.clip(1.0 - held / energy, 0.0, None)
    if _is_planar(geometry):
        primary, peak = rest**4, np.exp(-held / t)
    else:
        primary = rest**3 * (1.0 + 3.0 * (1.0 - rest))
        peak = (1.0 + held / t) * np.exp(-held / t)
    return np.asarray((weight * (primary + share * (peak - primary))).sum(-1))


def escape_slope(
    potential_V: ArrayLike,
    photon_energy_eV: ArrayLike,
    emitted_weight: ArrayLike,
    threshold_eV: float,
    *,
    geometry: EscapeGeometry = "planar",
    low_energy_share: ArrayLike | None = None,
    low_energy_temperature_eV: float = LOW_ENERGY_TEMPERATURE_EV,
) -> NDArray[np.float64]:
    """Derivative of `escape_fraction` with respect to the potential.

    Parameters
    ----------
    potential_V, photon_energy_eV, emitted_weight, threshold_eV
        As in `escape_fraction`.
    geometry, low_energy_share, low_energy_temperature_eV
        As in `escape_fraction`.

    Returns
    -------
    ndarray
        [V-1], <= 0, the shape of `potential_V`; 0 for V <= 0 (the kink of
        the planar curve at 0 belongs to that side).

    Raises
    ------
    ValueError
        As `escape_fraction`.

    Examples
    --------
    >>> float(escape_slope(2.0, [9.0], [1.0], 5.0))  # -4 (1 - v)^3/W
    -0.125
    """
    v, energy, weight, share, t = _escape_arguments(
        potential_V,
        photon_energy_eV,
        emitted_weight,
        threshold_eV,
        low_energy_share,
        low_energy_temperature_eV,
    )
    held = np.maximum(v, 0.0)[..., np.newaxis]
    rest = np.clip(1.0 - held / energy, 0.0, None)
    if _is_planar(geometry):
        primary, peak = -4.0 * rest**3 / energy, -np.exp(-held / t) / t
    else:
        # d/dv (1-v)^3 (1+3v) = -12 v (1-v)^2
        primary = -12.0 * (1.0 - rest) * rest**2 / energy
        peak = -(held / t**2) * np.exp(-held / t)
    slope = (weight * (primary + share * (peak - primary))).sum(-1)
    return np.asarray(np.where(v > 0.0, slope, 0.0))


def mean_photoelectron_energy(
    photon_energy_eV: ArrayLike,
    emitted_weight: ArrayLike,
    threshold_eV: float,
    *,
    low_energy_share: ArrayLike | None = None,
    low_energy_temperature_eV: float = LOW_ENERGY_TEMPERATURE_EV,
) -> float:
    """Mean kinetic energy of the emitted photoelectrons.

    A photon gives 0.4 W on average, the low-energy peak 2 T.

    Parameters
    ----------
    photon_energy_eV, emitted_weight, threshold_eV
        As in `escape_fraction`.
    low_energy_share, low_energy_temperature_eV
        As in `escape_fraction`.

    Returns
    -------
    float
        Mean energy [eV].

    Raises
    ------
    ValueError
        As `escape_fraction`.

    Notes
    -----
    Under the whole solar spectrum the shape used here gives 2.4 to 4 eV for
    metals and carbons. Published means are lower: 1.0 to 2.5 eV (Feuerbacher
    & Fitton 1972; Grard 1973; Whipple 1981; memory) and 2.1 +- 0.5 eV in orbit
    (Nakagawa et al. 2000, Earth Planets Space 52, 283, abstract). The excess
    comes from photons above 12 eV; positive potentials may come out high.

    Examples
    --------
    >>> round(mean_photoelectron_energy([10.2], [1.0], 5.2), 6)
    2.0
    """
    _, energy, weight, share, t = _escape_arguments(
        0.0,
        photon_energy_eV,
        emitted_weight,
        threshold_eV,
        low_energy_share,
        low_energy_temperature_eV,
    )
    return float((weight * ((1.0 - share) * 0.4 * energy + share * 2.0 * t)).sum(-1))


def potential_at_escape(
    fraction: float,
    photon_energy_eV: ArrayLike,
    emitted_weight: ArrayLike,
    threshold_eV: float,
    *,
    geometry: EscapeGeometry = "planar",
    low_energy_share: ArrayLike | None = None,
    low_energy_temperature_eV: float = LOW_ENERGY_TEMPERATURE_EV,
) -> float:
    """Potential at which a given share of the photoelectrons still escapes.

    Parameters
    ----------
    fraction : float
        Share, above 0 and below 1, for instance 0.01.
    photon_energy_eV, emitted_weight, threshold_eV
        As in `escape_fraction`.
    geometry, low_energy_share, low_energy_temperature_eV
        As in `escape_fraction`.

    Returns
    -------
    float
        Potential [V], > 0, to 1e-9 V.

    Raises
    ------
    ValueError
        Fraction outside (0, 1), or as `escape_fraction`.

    Examples
    --------
    >>> round(potential_at_escape(0.0625, [9.0], [1.0], 5.0), 6)
    2.0
    """
    if not 0.0 < fraction < 1.0:
        raise ValueError("fraction must be above 0 and below 1")

    def excess(v: float) -> float:
        share = escape_fraction(
            v,
            photon_energy_eV,
            emitted_weight,
            threshold_eV,
            geometry=geometry,
            low_energy_share=low_energy_share,
            low_energy_temperature_eV=low_energy_temperature_eV,
        )
        return float(share) - fraction

    high = 1.0
    while excess(high) > 0.0:  # ends: the curve falls to 0
        high *= 2.0
    return float(brentq(excess, 0.0, high, xtol=1e-9, rtol=1e-13))


def _is_planar(geometry: str) -> bool:
    if geometry not in GEOMETRIES:
        raise ValueError(f"geometry {geometry!r} is unknown; allowed: {', '.join(GEOMETRIES)}")
    return geometry == "planar"


def _escape_arguments(
    potential_V: ArrayLike,
    photon_energy_eV: ArrayLike,
    emitted_weight: ArrayLike,
    threshold_eV: float,
    low_energy_share: ArrayLike | None,
    low_energy_temperature_eV: float,
) -> tuple[
    NDArray[np.float64], NDArray[np.float64], NDArray[np.float64], NDArray[np.float64], float
]:
    """Check the arguments; keep the bins that emit, weights summing to 1."""
    v = finite_array("potential_V", potential_V)
    photon = finite_array("photon_energy_eV", photon_energy_eV, at_least=0.0)
    weight = finite_array("emitted_weight", emitted_weight, at_least=0.0)
    share = (
        default_low_energy_share(photon)
        if low_energy_share is None
        else np.asarray(low_energy_share, np.float64)
    )
    share = finite_array("low_energy_share", share, at_least=0.0, at_most=1.0)
    photon, weight, share = np.broadcast_arrays(photon, weight, share)
    threshold = finite_array("threshold_eV", threshold_eV, at_least=0.0)
    t = finite_array("low_energy_temperature_eV", low_energy_temperature_eV, above=0.0)
    if photon.ndim != 1:
        raise ValueError("photon_energy_eV and emitted_weight must have one axis, the bins")
    used = weight > 0.0
    if not np.any(used):
        raise ValueError("emitted_weight is 0 in every bin: nothing is emitted")
    excess = photon[used] - threshold
    if np.any(excess <= 0.0):
        raise ValueError("emitted_weight must be 0 up to the threshold")
    total = weight[used].sum()
    return v, excess, np.asarray(weight[used] / total), share[used], float(t)
