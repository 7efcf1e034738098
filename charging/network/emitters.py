"""Emitters on structure: electrons of one energy sent into the plasma."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

SHARE_ROUNDED, LEAST_ROUNDED_V = 0.05, 0.5
"""The cut-off is spread over this share of the energy, and at least over these volts (assumed)."""


@dataclass(frozen=True, slots=True)
class Emitters:
    """E emitters on structure.

    Attributes
    ----------
    names : tuple of str
    current_A : ndarray [E]
        Of electrons sent out, as positive charge arriving on structure.
    energy_eV : ndarray [E]
        Of the electrons where they leave.
    """

    names: tuple[str, ...]
    current_A: Array
    energy_eV: Array

    def arriving(self, structure_V: Array, working: Array) -> tuple[Array, Array]:
        """Current onto structure [A, m, E] and its slope by structure's potential [A/V].

        Parameters
        ----------
        structure_V : ndarray [m]
            Against the plasma.
        working : ndarray [m, E]
            1 for emitters that work, 0 for the others.
        """
        share, slope = leaving_share(structure_V[..., None], self.energy_eV)
        current = self.current_A * working
        return current * share, current * slope


NO_EMITTERS = Emitters((), np.empty(0), np.empty(0))


def leaving_share(structure_V: Array, energy_eV: Array) -> tuple[Array, Array]:
    """Share of emitted electrons that reach the plasma, and its slope [V-1].

    Parameters
    ----------
    structure_V, energy_eV : ndarray
        Structure's potential against the plasma and energy of the electrons; broadcast.

    Returns
    -------
    share, slope : ndarray
        1 up to 5 % (at least 0.5 V) below the energy, 0 from the energy on, a cubic between:
        electrons of energy E cannot climb more than E volts. The width stands for the
        spread of energies and directions of a source (assumed).

    Notes
    -----
    Space charge of the beam is left out: a dense one is turned back earlier.

    Examples
    --------
    >>> share, _ = leaving_share(np.array([-5000.0, 950.0, 975.0, 1000.0]), np.array([1000.0]))
    >>> share.tolist()
    [1.0, 1.0, 0.5, 0.0]
    """
    # never wider than the energy itself, so that an uncharged structure loses the full current
    width = np.minimum(np.maximum(SHARE_ROUNDED * energy_eV, LEAST_ROUNDED_V), energy_eV)
    x = np.clip((energy_eV - structure_V) / width, 0.0, 1.0)
    return x * x * (3.0 - 2.0 * x), -6.0 * x * (1.0 - x) / width
