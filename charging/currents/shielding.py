"""Where the field around a body is that of a vacuum, so that barriers can stand.

Barriers are worked out for a field without space charge. A saddle in front of a patch lies a
tenth of the body's radius to one radius away. A plasma whose electron Debye length is shorter
shields neighbours before their fields meet there: then what is emitted climbs to the plasma
alone. The share between follows the Debye length, so that along an orbit it changes smoothly.
"""

from typing import Final

import numpy as np
from numpy.typing import NDArray

from charging.currents.barrier_field import Heights
from environments.population_series import smoothstep

Array = NDArray[np.float64]
Index = NDArray[np.intp]

SHIELDED, VACUUM = 0.1, 1.0
"""Debye lengths in body radii below which no barrier stands, and from which it stands whole;
ours, `assumed`, from where saddles lie."""
_LOG_SHIELDED: Final = 2.0 * float(np.log(SHIELDED))
_LOG_VACUUM: Final = 2.0 * float(np.log(VACUUM))


def vacuum_share(debye_m2: Array, radius_m2: Array) -> Array:
    """Share 0…1 of a barrier that stands, from squared Debye lengths and body radii [m2].

    Examples
    --------
    >>> vacuum_share(np.array([1e-4, 0.1, 4.0]), np.array([1.0, 1.0, 1.0])).round(3).tolist()
    [0.0, 0.5, 1.0]
    """
    return smoothstep(np.log(debye_m2 / radius_m2), _LOG_SHIELDED, _LOG_VACUUM)


def shielded_height(own_V: Array, whole_V: Array, vacuum: Array) -> Array:
    """Heights [V, m, S] between that to the plasma alone and that of the whole barrier."""
    return np.where(vacuum < 1.0, own_V + vacuum * (whole_V - own_V), whole_V)


def shielded(found: Heights, own: tuple[Array, Array], vacuum: Array) -> Heights:
    """Heights with slopes, `own` being height and slope without barriers [m, S]."""
    part = np.broadcast_to(vacuum, found.height_V.shape)
    return Heights(
        shielded_height(own[0], found.height_V, vacuum),
        shielded_height(own[1], found.own, vacuum),
        found.member,
        found.surface,
        found.rows * part[found.member, found.surface][:, None],
    )
