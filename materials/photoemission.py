"""Photoelectrons: yield, saturation current, and escape at positive potential.

Each photon of energy hv frees electrons of 0 to W = hv - threshold. Summed
over the spectrum this gives the retarding curve of the surface, so that no
temperature of photoelectrons has to be assumed. The energies of the electrons
of one photon stand in `materials.photoelectron_energies`.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.optimize import brentq

from materials.errors import finite_array
from materials.fitted_escape import (
    GEOMETRIES,
    EscapeGeometry,
    is_planar,
    maxwellian_escape,
    two_exponential_escape,
)
from materials.photo_laws import incidence_factor
from materials.photoelectron_energies import (
    DIRECT_MEAN,
    LowEnergyPeak,
    collided_share,
    direct_escape,
    direct_escape_slope,
    peak_escape,
    peak_escape_slope,
    peak_mean,
)
from materials.photoyield import (
    emission_spectrum,
    escaping_weights,
    photo_current_density,
    yield_per_photon,
)
from materials.record import Material

__all__ = [
    "GEOMETRIES",
    "EscapeGeometry",
    "LowEnergyPeak",
    "collided_share",
    "emission_spectrum",
    "escape_fraction",
    "escape_slope",
    "escaping_weights",
    "incidence_factor",
    "low_energy_peak",
    "maxwellian_escape",
    "mean_photoelectron_energy",
    "photo_current_density",
    "potential_at_escape",
    "two_exponential_escape",
    "yield_per_photon",
]


def low_energy_peak(material: Material) -> LowEnergyPeak:
    """Energies of the photoelectrons of a material that collided before they left.

    They are secondaries, and take the law that the record gives for those: Chung &
    Everhart (1974) with the work function for a conductor, a Maxwellian of
    ``secondary_energy_eV`` for others. That secondaries made by photons and by electrons
    have one shape: Henke, Smith & Attwood (1977), J. Appl. Phys. 48, 1852 (memory). A
    curve carried over from another surface (`PhotoYield.peak`) keeps the energies of that.

    Parameters
    ----------
    material : Material
        One that emits.

    Returns
    -------
    LowEnergyPeak

    Raises
    ------
    MaterialError
        The material holds no such record.

    Examples
    --------
    >>> from materials import load_material
    >>> low_energy_peak(load_material("gold"))
    LowEnergyPeak(law='chung_everhart_1974', scale_eV=5.1)
    """
    curve = material.photoyield
    if curve is not None and curve.peak is not None:
        return curve.peak
    if material.kind == "conductor":
        return LowEnergyPeak("chung_everhart_1974", material.value("work_function_eV"))
    return LowEnergyPeak("maxwellian", material.value("secondary_energy_eV"))


def escape_fraction(
    potential_V: ArrayLike,
    photon_energy_eV: ArrayLike,
    emitted_weight: ArrayLike,
    threshold_eV: float,
    *,
    geometry: EscapeGeometry = "planar",
    peak: LowEnergyPeak | None = None,
) -> NDArray[np.float64]:
    r"""Share of photoelectrons that leave a surface at potential V.

    A photon gives energies between 0 and W = hv - threshold: those of electrons
    that come out as excited, :math:`p(E) \propto E (W-E)^n` with the maximum at 0.3 W,
    and the low-energy peak of those that collided, with the share of
    `collided_share`. Emission follows the cosine law. For the first part, v = V/W:

    - planar, the normal energy must exceed V: :math:`(1-v)^{n+2}`;
    - point source, the whole energy must: :math:`(1-v)^{n+1}[1+(n+1)v]`.

    Parameters
    ----------
    potential_V : array_like, any shape
        Surface above the highest point on the way out [V].
    photon_energy_eV, emitted_weight : array_like, (bin,)
        Photon energies [eV] and electrons emitted by each bin (any unit,
        >= 0), see `escaping_weights`. Bins up to the threshold need weight 0.
    threshold_eV : float
        Photoelectric threshold [eV].
    geometry : {"planar", "point source"}, optional
        Planar when the surface is larger than the Debye length of its
        photoelectrons, point source when it is much smaller.
    peak : LowEnergyPeak, optional
        Energies of the electrons that collided, see `low_energy_peak`; by default
        Chung & Everhart (1974) with the threshold for the work function.

    Returns
    -------
    ndarray
        0 to 1, the shape of `potential_V`; 1 for V <= 0, 0 from the largest W on. Where
        all weights are 0 the fraction is undefined and refused.

    Raises
    ------
    ValueError
        Unknown geometry; all weights 0; weight below the threshold; an
        argument that is not finite or out of its range.

    References
    ----------
    Maximum at 0.2 to 0.4 W below 15 eV, second maximum below 2 to 3 eV from about 20 eV:
    Feuerbacher & Fitton (1972), J. Appl. Phys. 43, 1563; Grard (1973), J. Geophys. Res.
    78, 2885 (memory). Retarding curves of the two geometries: Grard (1973).

    Examples
    --------
    >>> escape_fraction([-1.0, 0.0, 2.0, 4.0], [9.0], [1.0], 5.0).round(4).tolist()
    [1.0, 1.0, 0.0605, 0.0]
    """
    bins = _checked(potential_V, photon_energy_eV, emitted_weight, threshold_eV, peak)
    planar = is_planar(geometry)
    # beyond W a bin gives nothing: most of the work on a wide grid of potentials is left out
    active = bins.held < bins.excess
    held = bins.held[active]
    excess, weight, share = (
        np.broadcast_to(row, active.shape)[active]
        for row in (bins.excess, bins.weight, bins.collided)
    )
    direct = direct_escape(held / excess, planar)
    collided = peak_escape(held, excess, bins.peak, planar)
    escaping = np.zeros(active.shape)
    escaping[active] = weight * (direct + share * (collided - direct))
    return np.asarray(np.where(bins.potential_V > 0.0, escaping.sum(-1), 1.0))


def escape_slope(
    potential_V: ArrayLike,
    photon_energy_eV: ArrayLike,
    emitted_weight: ArrayLike,
    threshold_eV: float,
    *,
    geometry: EscapeGeometry = "planar",
    peak: LowEnergyPeak | None = None,
) -> NDArray[np.float64]:
    """Derivative of `escape_fraction` with respect to the potential.

    Parameters
    ----------
    potential_V, photon_energy_eV, emitted_weight, threshold_eV, geometry, peak
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
    >>> bool(escape_slope(2.0, [9.0], [1.0], 5.0) < 0.0)
    True
    """
    bins = _checked(potential_V, photon_energy_eV, emitted_weight, threshold_eV, peak)
    planar = is_planar(geometry)
    direct = direct_escape_slope(bins.held / bins.excess, planar) / bins.excess
    collided = peak_escape_slope(bins.held, bins.excess, bins.peak, planar)
    slope = bins.weight * (direct + bins.collided * (collided - direct))
    # a bin whose W lies below V has stopped
    total = np.where(bins.held < bins.excess, slope, 0.0).sum(-1)
    return np.asarray(np.where(bins.potential_V > 0.0, total, 0.0))


def mean_photoelectron_energy(
    photon_energy_eV: ArrayLike,
    emitted_weight: ArrayLike,
    threshold_eV: float,
    *,
    peak: LowEnergyPeak | None = None,
) -> float:
    """Mean kinetic energy of the emitted photoelectrons.

    Parameters
    ----------
    photon_energy_eV, emitted_weight, threshold_eV, peak
        As in `escape_fraction`.

    Returns
    -------
    float
        Mean energy [eV]: the area under the point-source curve, half of it under the
        planar one.

    Raises
    ------
    ValueError
        As `escape_fraction`.

    Notes
    -----
    Published "mean energies" of 1.0 to 2.5 eV (Feuerbacher & Fitton 1972; Grard 1973;
    Whipple 1981; memory) and 2.1 +- 0.5 eV in orbit (Nakagawa et al. 2000, Earth Planets
    Space 52, 283, abstract) are lower than ours: 2.7 eV for the aged state
    and 2.9 eV for gold at an F10.7 of 90, 3.0 and 3.2 eV at 150.
    Whether they are means or the V_0 of a retarding curve :math:`e^{-V/V_0}`, whose mean
    energy seen as planar escape is 2 V_0, the publications do not say: these two lie above
    the ranges as a mean and below that of Nakagawa et al. as a V_0.

    Examples
    --------
    >>> round(mean_photoelectron_energy([10.2], [1.0], 5.2), 2)
    1.96
    """
    bins = _checked(0.0, photon_energy_eV, emitted_weight, threshold_eV, peak)
    collided = peak_mean(bins.excess, bins.peak)
    direct = DIRECT_MEAN * bins.excess
    return float((bins.weight * (direct + bins.collided * (collided - direct))).sum(-1))


def potential_at_escape(
    fraction: float,
    photon_energy_eV: ArrayLike,
    emitted_weight: ArrayLike,
    threshold_eV: float,
    *,
    geometry: EscapeGeometry = "planar",
    peak: LowEnergyPeak | None = None,
) -> float:
    """Potential at which a given share of the photoelectrons still escapes.

    Parameters
    ----------
    fraction : float
        Share, above 0 and below 1, for instance 0.01.
    photon_energy_eV, emitted_weight, threshold_eV, geometry, peak
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
    >>> v = potential_at_escape(0.1, [9.0], [1.0], 5.0)
    >>> round(float(escape_fraction(v, [9.0], [1.0], 5.0)), 6)
    0.1
    """
    if not 0.0 < fraction < 1.0:
        raise ValueError("fraction must be above 0 and below 1")

    def excess(v: float) -> float:
        share = escape_fraction(
            v, photon_energy_eV, emitted_weight, threshold_eV, geometry=geometry, peak=peak
        )
        return float(share) - fraction

    high = 1.0
    while excess(high) > 0.0:  # ends: nothing escapes above the largest W
        high *= 2.0
    return float(brentq(excess, 0.0, high, xtol=1e-9, rtol=1e-13))


class _Checked(NamedTuple):
    """Checked arguments of an escape: the bins that emit, weights summing to 1.

    `held` is the potential [..., bin] kept within 0 and the excess of the bin.
    """

    potential_V: NDArray[np.float64]
    held: NDArray[np.float64]
    excess: NDArray[np.float64]
    weight: NDArray[np.float64]
    collided: NDArray[np.float64]
    peak: LowEnergyPeak


def _checked(
    potential_V: ArrayLike,
    photon_energy_eV: ArrayLike,
    emitted_weight: ArrayLike,
    threshold_eV: float,
    peak: LowEnergyPeak | None,
) -> _Checked:
    v = finite_array("potential_V", potential_V)
    photon = finite_array("photon_energy_eV", photon_energy_eV, at_least=0.0)
    weight = finite_array("emitted_weight", emitted_weight, at_least=0.0)
    photon, weight = np.broadcast_arrays(photon, weight)
    threshold = float(finite_array("threshold_eV", threshold_eV, above=0.0))
    if peak is None:
        peak = LowEnergyPeak("chung_everhart_1974", threshold)
    finite_array("peak.scale_eV", peak.scale_eV, above=0.0)
    if photon.ndim != 1:
        raise ValueError("photon_energy_eV and emitted_weight must have one axis, the bins")
    used = weight > 0.0
    if not np.any(used):
        raise ValueError("emitted_weight is 0 in every bin: nothing is emitted")
    excess = photon[used] - threshold
    if np.any(excess <= 0.0):
        raise ValueError("emitted_weight must be 0 up to the threshold")
    share = collided_share(photon[used], threshold)
    held = np.minimum(np.maximum(v, 0.0)[..., np.newaxis], excess)
    return _Checked(v, held, excess, weight[used] / weight[used].sum(), share, peak)
