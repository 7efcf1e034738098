"""Emitters on structure: electrons sent into the plasma by schedule, on demand, or as a clamp."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

SHARE_ROUNDED, LEAST_ROUNDED_V = 0.05, 0.5
"""The cut-off is spread over this share of the energy, and at least over these volts (assumed)."""

CLAMP_WIDTH_V = 1.0
"""Distance from its target at which a clamp carries 76 % of its largest current (assumed)."""


@dataclass(frozen=True, slots=True)
class Emitters:
    """E emitters on structure.

    Attributes
    ----------
    names : tuple of str
    current_A : ndarray [E] or [M, E]
        Of electrons sent out, as positive charge arriving on structure.
    energy_eV : ndarray [E] or [M, E]
        Of the electrons where they leave.
    below_V : ndarray [E] or [M, E], optional
        Works while structure stands below this potential; infinite: always.
    hold_V : ndarray [E] or [M, E], optional
        Holds structure at this potential by a current of either sign; NaN: does not.
    """

    names: tuple[str, ...]
    current_A: Array
    energy_eV: Array
    below_V: Array | None = None
    hold_V: Array | None = None

    def of(self, member: NDArray[np.intp] | np.intp) -> "Emitters":
        """Emitters of some members of a block [m], or of one."""
        if self.current_A.ndim == 1:
            return self
        below, hold = (None if v is None else v[member] for v in (self.below_V, self.hold_V))
        return Emitters(self.names, self.current_A[member], self.energy_eV[member], below, hold)

    def arriving(self, structure_V: Array, working: Array) -> tuple[Array, Array]:
        """Current onto structure [A, m, E] and its slope by structure's potential [A/V].

        Parameters
        ----------
        structure_V : ndarray [m]
            Against the plasma.
        working : ndarray [m, E]
            1 for emitters that work, 0 for the others.
        """
        volts = structure_V[..., None]
        share, slope = leaving_share(volts, self.energy_eV)
        current = self.current_A * working
        if self.below_V is not None:
            on, d_on = demanded_share(volts, self.below_V)
            share, slope = share * on, share * d_on + slope * on
        if self.hold_V is not None:
            held, d_held = clamp_share(volts, self.hold_V)
            share, slope = (
                np.where(held > 0.0, share * held, held),
                np.where(held > 0.0, share * d_held + slope * held, d_held),
            )
        return current * share, current * slope


NO_EMITTERS = Emitters((), np.empty(0), np.empty(0))


def demanded_share(structure_V: Array, below_V: Array) -> tuple[Array, Array]:
    """Share 0…1 of its current that an emitter on demand sends out, and its slope [V-1].

    1 up to 5 % of the threshold (at least 0.5 V) below it, 0 from the threshold on, a cubic
    between. The switch has no memory: it opens where it closes. Infinite thresholds give 1.
    """
    always = np.isinf(below_V)
    threshold = np.where(always, 0.0, below_V)
    width = np.maximum(SHARE_ROUNDED * np.abs(threshold), LEAST_ROUNDED_V)
    x = np.minimum(np.maximum((threshold - structure_V) / width, 0.0), 1.0)
    share = np.where(always, 1.0, x * x * (3.0 - 2.0 * x))
    return share, np.where(always, 0.0, -6.0 * x * (1.0 - x) / width)


def clamp_share(structure_V: Array, hold_V: Array) -> tuple[Array, Array]:
    """Share -1…1 of its largest current that a clamp carries, and its slope [V-1].

    The hyperbolic tangent of the distance from the target in `CLAMP_WIDTH_V`. A plasma
    contactor that keeps a station near a few volts is such a clamp (common practice, no
    source); its plume is not modelled. NaN gives 1: no clamp.
    """
    none = np.isnan(hold_V)
    share = np.tanh((np.where(none, 0.0, hold_V) - structure_V) / CLAMP_WIDTH_V)
    return np.where(none, 1.0, share), np.where(none, 0.0, (share**2 - 1.0) / CLAMP_WIDTH_V)


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
