"""True secondary electrons set free by electrons, and their escape.

Every law is normalised so that its maximum is exactly the stated yield at
exactly the stated energy. No law is right to better than 10-20 percent, and
above about ten times the peak energy the choice of the law is the largest
uncertainty of a charging threshold: run one exponential and one power law.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike, NDArray

from materials.angle import exponential_angle_factor, secondary_angle_coefficient
from materials.arguments import atomic_number, impact_energy, maximum
from materials.backscatter import prokopenko_laframboise_1980
from materials.maxwellian_yield import maxwellian_isotropic_yield, maxwellian_yield
from materials.record import Material
from materials.secondary_escape import secondary_escape_fraction, secondary_escape_slope
from materials.yield_laws import (
    LAW_FACTS,
    NORMAL_SHAPES,
    YIELD_LAWS,
    YieldLaw,
    fitted_range_eV,
    lin_joy_isotropic_shape,
    printed_form,
)

__all__ = [
    "LAW_FACTS",
    "YIELD_LAWS",
    "YieldLaw",
    "draine_salpeter_1979",
    "fitted_range_eV",
    "isotropic_yield",
    "lin_joy_2005",
    "maxwellian_isotropic_yield",
    "maxwellian_yield",
    "normal_yield",
    "printed_form",
    "sanders_inouye_1979",
    "secondary_escape_fraction",
    "secondary_escape_slope",
    "sternglass_1954",
    "true_secondary_peak",
]


def sanders_inouye_1979(
    energy_eV: ArrayLike, *, peak_yield: ArrayLike, peak_energy_eV: ArrayLike
) -> NDArray[np.float64]:
    r"""Secondary yield at normal incidence, exponential tail.

    :math:`\delta = c\,[e^{-E/a} - e^{-E/b}]`, a/b = 4.3/0.367, with a and c set
    so that the maximum is `peak_yield` at `peak_energy_eV`. (As printed,
    a = 4.3 E_max and c = 1.37, the maximum is 0.996 at 0.9875 E_max.)

    Parameters
    ----------
    energy_eV : array_like
        Electron energy at the surface [eV], >= 0.
    peak_yield, peak_energy_eV : array_like
        Maximum yield of true secondaries; its energy [eV], > 0.

    Returns
    -------
    ndarray
        Electrons per incident electron, broadcast shape.

    Raises
    ------
    ValueError
        An argument is not finite or out of its range.

    Notes
    -----
    Used from about 20 eV to 10 E_max; above, it falls faster than data.

    References
    ----------
    Sanders & Inouye (1979), Spacecraft Charging Technology 1978, NASA CP-2071,
    747 (from memory).

    Examples
    --------
    >>> sanders_inouye_1979([300.0, 3000.0], peak_yield=2.5, peak_energy_eV=300.0).round(3).tolist()
    [2.5, 0.346]
    """
    x, peak = _checked(energy_eV, peak_yield, peak_energy_eV)
    return np.asarray(peak * NORMAL_SHAPES["sanders_inouye_1979"](x))


def lin_joy_2005(
    energy_eV: ArrayLike, *, peak_yield: ArrayLike, peak_energy_eV: ArrayLike
) -> NDArray[np.float64]:
    r"""Secondary yield at normal incidence, power-law tail E^-0.67.

    :math:`\delta = \delta_m\,x^{1-n}\,(1 - e^{-r x^n})/(1 - e^{-r})`,
    x = E/E_max, n = 1.67 and r the root of (1 - 1/n)(e^r - 1) = r, so that the
    maximum is `peak_yield` at `peak_energy_eV`. (As printed, with 1.28 and
    1.614, it exceeds the stated maximum by 2.5 percent.)

    Arguments, result and errors as `sanders_inouye_1979`.

    Notes
    -----
    Constant-loss model, fitted by its authors to elements between about 0.1
    and 30 keV.

    References
    ----------
    Lin & Joy (2005), Surf. Interface Anal. 37, 895 (from memory).

    Examples
    --------
    >>> lin_joy_2005([300.0, 3000.0], peak_yield=2.5, peak_energy_eV=300.0).round(3).tolist()
    [2.5, 0.667]
    """
    x, peak = _checked(energy_eV, peak_yield, peak_energy_eV)
    return np.asarray(peak * NORMAL_SHAPES["lin_joy_2005"](x))


def sternglass_1954(
    energy_eV: ArrayLike, *, peak_yield: ArrayLike, peak_energy_eV: ArrayLike
) -> NDArray[np.float64]:
    r"""Secondary yield at normal incidence, :math:`\delta_m\,x\,e^{2 - 2\sqrt x}`.

    Arguments, result and errors as `sanders_inouye_1979`. (As printed, with 7.4 for
    :math:`e^2`, the maximum is 1.0015 times the stated one.)

    References
    ----------
    Sternglass (1954), Westinghouse Research Laboratories, Scientific Paper 1772 (memory).

    Examples
    --------
    >>> sternglass_1954([300.0, 3000.0], peak_yield=2.5, peak_energy_eV=300.0).round(3).tolist()
    [2.5, 0.331]
    """
    return normal_yield(
        energy_eV, law="sternglass_1954", peak_yield=peak_yield, peak_energy_eV=peak_energy_eV
    )


def draine_salpeter_1979(
    energy_eV: ArrayLike, *, peak_yield: ArrayLike, peak_energy_eV: ArrayLike
) -> NDArray[np.float64]:
    r"""Secondary yield at normal incidence, tail E^-2.

    :math:`\tfrac{27}{4}\delta_m\,y/(1+y)^3`, y = E/2E_max, so that the maximum is
    `peak_yield` at `peak_energy_eV`. (As printed, 8x/(1+x)^3, it peaks at E_max/2 with
    1.185 times the stated maximum.) Arguments, result and errors as `sanders_inouye_1979`.

    References
    ----------
    Draine & Salpeter (1979), Astrophys. J. 231, 77 (memory).

    Examples
    --------
    >>> found = draine_salpeter_1979([300.0, 3000.0], peak_yield=2.5, peak_energy_eV=300.0)
    >>> found.round(3).tolist()
    [2.5, 0.391]
    """
    return normal_yield(
        energy_eV, law="draine_salpeter_1979", peak_yield=peak_yield, peak_energy_eV=peak_energy_eV
    )


def normal_yield(
    energy_eV: ArrayLike, *, law: YieldLaw, peak_yield: ArrayLike, peak_energy_eV: ArrayLike
) -> NDArray[np.float64]:
    """Secondary yield at normal incidence by any law of `YIELD_LAWS`.

    Arguments, result and errors as `sanders_inouye_1979`.

    Examples
    --------
    >>> float(normal_yield(300.0, law="lin_joy_2005", peak_yield=2.5, peak_energy_eV=300.0))
    2.5
    """
    x, peak = _checked(energy_eV, peak_yield, peak_energy_eV)
    return np.asarray(peak * _shape(law)(x))


def _shape(law: YieldLaw) -> Callable[[NDArray[np.float64]], NDArray[np.float64]]:
    if law not in NORMAL_SHAPES:
        raise ValueError(f"law {law!r} is unknown; allowed: {', '.join(YIELD_LAWS)}")
    return NORMAL_SHAPES[law]


def isotropic_yield(
    energy_eV: ArrayLike,
    *,
    law: YieldLaw = "sanders_inouye_1979",
    peak_yield: ArrayLike,
    peak_energy_eV: ArrayLike,
    mean_atomic_number: ArrayLike,
) -> NDArray[np.float64]:
    r"""Secondary yield averaged over an isotropic flux on a plane.

    :math:`2\int_0^1\delta(E,\theta)\,\mu\,d\mu`, :math:`\mu = \cos\theta`, with
    the angle form that belongs to the law. Its ratio to normal incidence
    goes to 1 well below the peak energy.

    Parameters
    ----------
    energy_eV : array_like
        Electron energy at the surface [eV], >= 0.
    law : str, optional
        One of `YIELD_LAWS`: the normal-incidence law and its angle form.
    peak_yield, peak_energy_eV : array_like
        As in `sanders_inouye_1979`, at normal incidence.
    mean_atomic_number : array_like
        Mean Z, 4 to 100; used by every law but "lin_joy_2005".

    Result and errors as `sanders_inouye_1979`; an unknown law is a ValueError too.

    Notes
    -----
    Three of the laws come without an angle form and share one here:
    :math:`\delta(E,\theta) = \delta(E,0)\,\{1 +
    (e^{b(1-\mu)} - 1)\,g\}`, b from `secondary_angle_coefficient`. g = (1 - exp(-E/E_max))^2
    is our onset of the angle effect (assumed): Bruining (1954, memory) found
    none below about E_max/2. "lin_joy_2005": the constant-loss model with the
    path to the surface shortened by the cosine, :math:`x^{1-n}(1 -
    e^{-r x^n\mu})/\mu`; its ratio goes to 2 far above E_max, the upper end of
    what smooth surfaces show.

    Examples
    --------
    >>> material = {"peak_yield": 2.5, "peak_energy_eV": 300.0, "mean_atomic_number": 10.6}
    >>> [round(float(isotropic_yield(3e3, law=law, **material)), 3) for law in YIELD_LAWS]
    [0.487, 1.317, 0.466, 0.55]
    """
    x, peak = _checked(energy_eV, peak_yield, peak_energy_eV)
    z = atomic_number(mean_atomic_number)
    shape = _shape(law)
    if law == "lin_joy_2005":
        return np.asarray(peak * lin_joy_isotropic_shape(x) + 0.0 * z)
    growth = exponential_angle_factor(secondary_angle_coefficient(z)) - 1.0
    onset = np.expm1(-x) ** 2
    return np.asarray(peak * shape(x) * (1.0 + growth * onset))


def true_secondary_peak(material: Material) -> float:
    """Maximum yield of true secondaries of a material, at normal incidence.

    A record that holds the total yield has the backscatter coefficient at
    the peak energy taken off, so that backscatter is not counted twice.

    Parameters
    ----------
    material : Material
        With records of yield and backscatter.

    Returns
    -------
    float
        Electrons per incident electron, never below 0.

    Raises
    ------
    MaterialError
        The material does not emit or lacks a record.

    Notes
    -----
    The maxima of total and true yield lie at slightly different energies;
    the difference of the maxima is second order in that.

    Examples
    --------
    >>> from materials import load_material
    >>> round(true_secondary_peak(load_material("polyimide film")), 2)
    1.88
    """
    peak = material.value("secondary_yield_peak")
    if material.values["secondary_yield_peak"].holds != "total":
        return peak
    eta = prokopenko_laframboise_1980(
        material.value("secondary_yield_peak_energy_eV"),
        high_energy=material.value("backscatter_high_energy"),
        low_energy_drop=material.get("backscatter_low_energy_drop", 0.0),
        drop_energy_eV=material.get("backscatter_drop_energy_eV", 4000.0),
    )
    return max(0.0, peak - float(eta))


def _checked(
    energy_eV: ArrayLike, peak_yield: ArrayLike, peak_energy_eV: ArrayLike
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    peak, peak_eV = maximum(peak_yield, peak_energy_eV)
    return impact_energy(energy_eV) / peak_eV, peak
