"""Laplace's field around panels at given potentials: charge, capacitance, potential anywhere."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.constants import epsilon_0
from scipy.linalg import lu_factor, lu_solve

from charging.shape.integrals import panel_integrals
from charging.shape.panels import Panels

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Field:
    """Field around closed panels by unit potentials of their P patches.

    Attributes
    ----------
    panels : Panels
    surface_field_1_m : ndarray [N, P]
        Field away from every panel [V m-1] per volt on each patch. It grows without bound
        towards an edge: there a figure of this mesh, an estimate, no limit of finer ones.
    capacitance_F : ndarray [P, P]
        Maxwell's matrix to the undisturbed plasma, symmetric; the mutual capacitance of
        patches that touch grows with the logarithm of the finest panel at their border.
    asymmetry : float
        Largest difference of C_ij and C_ji before they were averaged, over the largest C_ii.
    """

    panels: Panels
    surface_field_1_m: Array
    capacitance_F: Array
    asymmetry: float

    def potential(self, points_m: Array) -> Array:
        """Potential at points outside [Q, 3] per volt on each patch, [Q, P]."""
        inverse_r, angle = panel_integrals(points_m, self.panels)
        held = by_patch(angle, self.panels.patch, self.capacitance_F.shape[0])
        return np.asarray((held + inverse_r @ self.surface_field_1_m) / (4.0 * np.pi))

    @property
    def total_capacitance_F(self) -> float:
        """Capacitance of the whole body, all patches at one potential."""
        return float(self.capacitance_F.sum())

    def energy_J(self, potential_V: Array) -> float:
        """Energy of the field outside with patches at potentials [P]."""
        return float(0.5 * potential_V @ self.capacitance_F @ potential_V)


def solve_field(panels: Panels, patches: int) -> Field:
    r"""Solve Laplace's equation outside closed bodies by panels of constant charge.

    Green's third identity on the surface, potential u and outward slope :math:`\partial_n u`
    constant on every panel, met at the centroids:

    .. math::
        \sum_j \partial_n u_j \int_j \frac{dA}{4\pi r}
        = \sum_j u_j \frac{\Omega_{ij}}{4\pi} - \tfrac12 u_i .

    Parameters
    ----------
    panels : Panels
        Of one or more closed bodies, outward normals.
    patches : int
        How many patches; every one at a potential of its own.

    Returns
    -------
    Field

    Raises
    ------
    ValueError
        Panels that enclose no volume.

    Notes
    -----
    The slope belongs to the outside alone. Charges on both sides of a sheet would also hold
    the field inside, and a thin plate with sides at two potentials would become a capacitor
    filled with vacuum. The matrix of solid angles is exact, so a body at one potential has no
    field inside, whatever the mesh. Averages of C_ij and C_ji: the energy is then one function
    of the potentials, and the error of both is of the order of their difference.

    References
    ----------
    Brebbia & Dominguez (1992), Boundary Elements, ch. 2 (direct formulation, from memory).
    """
    if panels.volume_m3 <= 0.0:
        raise ValueError("the panels enclose no volume: their corners run the wrong way round")
    inverse_r, angle = panel_integrals(panels.centre_m, panels)
    np.fill_diagonal(angle, 0.0)  # principal value: a flat panel does not see itself
    own = by_patch(np.eye(len(panels)), panels.patch, patches)
    right = by_patch(angle, panels.patch, patches) - 2.0 * np.pi * own
    slope = lu_solve(lu_factor(inverse_r, overwrite_a=True, check_finite=False), right)
    field = -slope
    charge = epsilon_0 * (field * panels.area_m2[:, None])
    raw = by_patch(charge.T, panels.patch, patches).T
    capacitance = 0.5 * (raw + raw.T)
    asymmetry = float(np.abs(raw - raw.T).max() / np.abs(np.diagonal(raw)).max())
    return Field(panels, field, capacitance, asymmetry)


def by_patch(columns: Array, patch: NDArray[np.intp], patches: int) -> Array:
    """Sums of columns [..., N] over the panels of each patch [..., P]."""
    total = np.zeros((*columns.shape[:-1], patches))
    for k in range(patches):
        of = patch == k
        if of.any():
            total[..., k] = columns[..., of].sum(axis=-1)
    return total
