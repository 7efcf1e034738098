"""Gauss-Legendre panels over particle energies that respect every kink of a spectrum."""

from collections.abc import Sequence

import numpy as np
from numpy.polynomial.legendre import leggauss
from numpy.typing import NDArray

Array = NDArray[np.float64]

RATIO = 1.8  # of neighbouring panel edges; ten nodes then integrate powers of E to 1e-13
NODES = 10
# e-folds behind a steep edge at which panels end; ten nodes then integrate the decay to 1e-14
E_FOLDS = (2.0, 3.6, 6.5, 11.7, 21.0, 37.8, 68.0)


def energy_nodes(
    lowest_eV: float, top_eV: float, marks_eV: Sequence[float], shift_eV: Array
) -> tuple[Array, Array]:
    """Nodes and weights of integrals over x = 0 … `top_eV`.

    Parameters
    ----------
    lowest_eV : float
        Panels are geometric from here upwards; below lies a single one [eV].
    top_eV : float
        End of the integrals [eV].
    marks_eV : sequence of float
        Energies E at which the integrand has a kink, and those at which panels must end
        because it falls steeply behind one; panels end at x = E - shift.
    shift_eV : ndarray [K]

    Returns
    -------
    ndarray, ndarray [K, Q]
        x and the weights of dx, both in eV.

    Examples
    --------
    >>> x, w = energy_nodes(1e-6, 60.0, [2.0], np.array([0.0, 1.5]))
    >>> (w * x * np.exp(-x)).sum(axis=-1).round(12).tolist()
    [1.0, 1.0]
    """
    count = int(np.ceil(np.log(top_eV / lowest_eV) / np.log(RATIO)))
    fixed = np.geomspace(lowest_eV, top_eV, count + 1)
    kinks = np.clip(np.asarray(marks_eV, dtype=np.float64) - shift_eV[:, None], 0.0, top_eV)
    edges = np.concatenate(
        [np.zeros((len(shift_eV), 1)), np.broadcast_to(fixed, (len(shift_eV), count + 1)), kinks],
        axis=1,
    )
    edges.sort(axis=1)
    x, w = leggauss(NODES)
    half = np.diff(edges, axis=1)[..., None] / 2.0
    nodes = edges[:, :-1, None] + half * (1.0 + x)
    flat = (len(shift_eV), -1)
    return nodes.reshape(flat), np.asarray((half * w).reshape(flat), dtype=np.float64)
