"""The potential an emitted electron must climb to leave a surface.

A surface above the plasma holds back its own photo- and secondary electrons.
The height is max(V, 0); its corner at 0 V is rounded, because a volts-wide
exponential behind a corner stops an implicit integrator in penumbra. Barriers that
neighbouring surfaces raise come on top, see `barrier_field`.
"""

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

ROUNDING_V = 0.05
"""Half-width of the rounded corner [V]; the largest error of the height is a quarter of it."""


def escape_height(potential_V: Array) -> tuple[Array, Array]:
    """Height [V] that emitted electrons must overcome, and its derivative.

    Exactly max(V, 0) outside ±`ROUNDING_V`; inside, the parabola that joins with
    equal slopes, at most 0.0125 V above.

    Examples
    --------
    >>> escape_height(np.array([-1.0, 0.0, 2.0]))
    (array([0.    , 0.0125, 2.    ]), array([0. , 0.5, 1. ]))
    """
    height = np.maximum(potential_V, 0.0)
    slope = np.asarray(potential_V > 0.0, dtype=np.float64)
    inside = np.abs(potential_V) < ROUNDING_V
    if inside.any():
        rise = (potential_V + ROUNDING_V) / (2.0 * ROUNDING_V)
        height = np.where(inside, rise**2 * ROUNDING_V, height)
        slope = np.where(inside, rise, slope)
    return height, slope
