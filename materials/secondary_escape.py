"""Share of the secondary electrons that leave a surface at positive potential."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from materials.errors import finite_array


def secondary_escape_fraction(
    potential_V: ArrayLike,
    *,
    kind: str,
    work_function_eV: ArrayLike | None = None,
    secondary_energy_eV: ArrayLike | None = None,
) -> NDArray[np.float64]:
    r"""Share of secondaries that leave a plane at potential V.

    Conductors: energies :math:`6W^2E/(E+W)^4` emitted by the cosine law give
    :math:`[W/(W+V)]^2`. Others: energies :math:`(E/T^2)e^{-E/T}` give
    :math:`e^{-V/T}`. 1 for V <= 0.

    Parameters
    ----------
    potential_V : array_like
        Surface above the highest point on the way out [V].
    kind : {"conductor", "dielectric", "semiconductor"}
        Chooses the law.
    work_function_eV : array_like, optional
        W [eV], > 0; needed for conductors.
    secondary_energy_eV : array_like, optional
        T [eV], > 0; needed for the others. The mean energy is 2 T.

    Returns
    -------
    ndarray
        0 to 1, broadcast shape.

    Raises
    ------
    ValueError
        Unknown kind, missing or non-positive energy, or not finite.

    References
    ----------
    Chung & Everhart (1974), J. Appl. Phys. 45, 707; the Maxwellian after
    Whipple (1981), Rep. Prog. Phys. 44, 1197 (memory).

    Examples
    --------
    >>> secondary_escape_fraction([-5.0, 0.0, 4.5], kind="conductor",
    ...                           work_function_eV=4.5).tolist()
    [1.0, 1.0, 0.25]
    """
    v = np.maximum(finite_array("potential_V", potential_V), 0.0)
    scale = _emission_scale(kind, work_function_eV, secondary_energy_eV)
    if kind == "conductor":
        return np.asarray((scale / (scale + v)) ** 2)
    return np.asarray(np.exp(-v / scale))


def secondary_escape_slope(
    potential_V: ArrayLike,
    *,
    kind: str,
    work_function_eV: ArrayLike | None = None,
    secondary_energy_eV: ArrayLike | None = None,
) -> NDArray[np.float64]:
    """Derivative of `secondary_escape_fraction` with respect to the potential.

    Parameters
    ----------
    potential_V, kind, work_function_eV, secondary_energy_eV
        As in `secondary_escape_fraction`.

    Returns
    -------
    ndarray
        [V-1], <= 0; 0 for V <= 0 (the kink at 0 belongs to that side).

    Raises
    ------
    ValueError
        As `secondary_escape_fraction`.

    Examples
    --------
    >>> float(secondary_escape_slope(2.0, kind="dielectric", secondary_energy_eV=2.0).round(4))
    -0.1839
    """
    potential = finite_array("potential_V", potential_V)
    v = np.maximum(potential, 0.0)
    scale = _emission_scale(kind, work_function_eV, secondary_energy_eV)
    if kind == "conductor":
        slope = -2.0 * scale**2 / (scale + v) ** 3
    else:
        slope = -np.exp(-v / scale) / scale
    return np.asarray(np.where(potential > 0.0, slope, 0.0))


def _emission_scale(
    kind: str, work_function_eV: ArrayLike | None, secondary_energy_eV: ArrayLike | None
) -> NDArray[np.float64]:
    if kind == "conductor":
        if work_function_eV is None:
            raise ValueError("a conductor needs work_function_eV")
        return finite_array("work_function_eV", work_function_eV, above=0.0)
    if kind not in ("dielectric", "semiconductor"):
        raise ValueError(f"kind {kind!r} is unknown; allowed: conductor, dielectric, semiconductor")
    if secondary_energy_eV is None:
        raise ValueError(f"a {kind} needs secondary_energy_eV")
    return finite_array("secondary_energy_eV", secondary_energy_eV, above=0.0)
