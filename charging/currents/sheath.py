"""Sheath weight of members whose plasmas, radius and collection may differ."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.constants import e, epsilon_0

from charging.currents.collection import SheathWeight
from charging.currents.surface import SurfaceModel

Array = NDArray[np.float64]
Index = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Sheath:
    """Electrons of P plasmas, radius and collection of U models.

    Attributes
    ----------
    density_m3, stiffness : ndarray [U, P]
        Electrons at full strength: sum of n and of n/T (see `electron_sheath`).
    radius_m2 : ndarray [U]
        Radius of the body, squared.
    fixed : ndarray [U]
        Weight that a collection keyword fixes; where `blended`, of no meaning.
    blended : ndarray of bool [U]
        Collection "auto".
    some_fixed : bool
        Whether any model is not.
    """

    density_m3: Array
    stiffness: Array
    radius_m2: Array
    fixed: Array
    blended: NDArray[np.bool_]
    some_fixed: bool

    def squares(self, which: Index, strength: Array) -> tuple[Array, Array]:
        """Squared Debye length and squared Child length at 1 V [m2, m, 1] of models [m].

        A Child sheath grows as the potential to 3/4, see `sheath_weight`.
        """
        stiffness = (self.stiffness[which] * strength).sum(axis=-1)[:, None]
        density = (self.density_m3[which] * strength).sum(axis=-1)[:, None]
        debye = epsilon_0 / (e * stiffness)
        return debye, debye * (2.0 / 9.0) * (2.0 * stiffness / density) ** 1.5

    def share(self, which: Index, potential_V: Array, debye_m2: Array, child_m2: Array) -> Array:
        """Weight of `weight` alone."""
        size = np.abs(potential_V)
        s2 = np.maximum(child_m2 * (size * np.sqrt(size)), debye_m2)
        weight: Array = s2 / (s2 + self.radius_m2[which][:, None])
        if self.some_fixed:
            weight = np.where(self.blended[which][:, None], weight, self.fixed[which][:, None])
        return weight

    def weight(
        self, which: Index, potential_V: Array, debye_m2: Array, child_m2: Array
    ) -> SheathWeight:
        """Sheath weight [m, S] of models [m] at potentials [m, S]; lengths from `squares`.

        The formulas of `sheath_weight` in fewer operations.
        """
        size = np.abs(potential_V)
        child = child_m2 * (size * np.sqrt(size))
        grows = child > debye_m2
        s2 = np.maximum(child, debye_m2)
        weight = s2 / (s2 + self.radius_m2[which][:, None])
        slope = 1.5 * weight * (1.0 - weight) * grows / np.where(grows, potential_V, 1.0)
        if self.some_fixed:
            blended = self.blended[which][:, None]
            weight = np.where(blended, weight, self.fixed[which][:, None])
            slope = np.where(blended, slope, 0.0)
        return SheathWeight(np.sqrt(s2), weight, slope)


def sheath_of(models: Sequence[SurfaceModel]) -> Sheath:
    """Gather the sheaths of several models."""
    plasmas = 1 + max(int(model.electrons.plasma.max()) for model in models)
    density, stiffness = np.zeros((2, len(models), plasmas))
    for u, model in enumerate(models):
        own = model.electrons
        np.add.at(density[u], own.plasma, own.density_m3)
        np.add.at(stiffness[u], own.plasma, own.density_m3 / own.debye_temperature_eV)
    return Sheath(
        density,
        stiffness,
        np.array([model.radius_m for model in models]) ** 2,
        np.array([0.0 if model.collection == "plane" else 1.0 for model in models]),
        np.array([model.collection == "auto" for model in models]),
        any(model.collection != "auto" for model in models),
    )
