"""Angles between surfaces and a direction: of sunlight, or of a flow past the spacecraft."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from charging.case_tables import Surface
from charging.schedule import Leg

Array = NDArray[np.float64]


def components(surfaces: Sequence[Surface], vector: Array, sun: Array, leg: Leg) -> Array:
    """Components [S, N] of body vectors [3, N] along outward normals, the Sun at `sun` [3, N]."""
    front = _wing_normal(sun, leg)
    rows = []
    for surface in surfaces:
        if surface.tracks_sun:
            own = front if surface.side == "front" else -front
        elif surface.normal is None:  # looks several ways: as a flank
            own = np.zeros((3, 1))
        else:
            own = np.array(surface.normal)[:, None]
        rows.append((own * vector).sum(axis=0))
    return np.array(rows)


def _wing_normal(sun: Array, leg: Leg) -> Array:
    """Normal [3, N] of the front of a wing that turns about body y, or stands parked."""
    if leg.parked and leg.parked_normal is not None:
        return np.broadcast_to(np.array(leg.parked_normal)[:, None], sun.shape)
    reach = np.hypot(sun[0], sun[2])
    x, z = np.where(reach > 0.0, sun[::2] / np.where(reach > 0.0, reach, 1.0), [[0.0], [1.0]])
    if leg.parked:
        turn = np.radians(leg.parked_angle_deg)
        x, z = x * np.cos(turn) + z * np.sin(turn), z * np.cos(turn) - x * np.sin(turn)
    return np.stack((x, np.zeros_like(x), z))


def cosines(surfaces: Sequence[Surface], sun_body: Array, leg: Leg) -> Array:
    """Signed cosine of incidence [S, N]; a wing's back is the negative of its front."""
    if not leg.parked:
        front = np.hypot(sun_body[0], sun_body[2])  # the wing turns about body y
    elif leg.parked_normal is not None:
        front = (np.array(leg.parked_normal)[:, None] * sun_body).sum(axis=0)
    else:
        front = np.hypot(sun_body[0], sun_body[2]) * np.cos(np.radians(leg.parked_angle_deg))
    rows = []
    for surface in surfaces:
        if surface.tracks_sun:
            rows.append(front if surface.side == "front" else -front)
        elif surface.normal is None:  # looks several ways: see `charging.shape.views`
            rows.append(np.zeros(sun_body.shape[1]))
        else:
            rows.append((np.array(surface.normal)[:, None] * sun_body).sum(axis=0))
    return np.array(rows)
