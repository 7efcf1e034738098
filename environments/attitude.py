"""Where the faces of a spacecraft look, and how the Sun falls on them."""

from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.vectors import as_vectors, direction, length


def nadir_axes(position_m: ArrayLike, velocity_m_s: ArrayLike) -> NDArray[np.float64]:
    """Body axes of a spacecraft that keeps one side to the Earth.

    +z points to nadir, +x along the velocity within the orbit plane, and +y = z × x
    against the orbit normal: south for a prograde equatorial orbit.

    Parameters
    ----------
    position_m, velocity_m_s : array_like, shape (3, N)
        Inertial position [m] and velocity [m s-1].

    Returns
    -------
    ndarray, shape (3, 3, N)
        Row i holds body axis i (x, y, z) in the inertial frame; orthonormal.

    Raises
    ------
    ValueError
        Wrong shapes, or a velocity along the position (no orbit plane).

    Examples
    --------
    >>> axes = nadir_axes([[7e6], [0.0], [0.0]], [[0.0], [7.5e3], [0.0]])
    >>> (axes[1, :, 0] + 0.0).tolist()  # +y: south
    [0.0, 0.0, -1.0]
    """
    position = as_vectors(position_m, "position_m")
    velocity = as_vectors(velocity_m_s, "velocity_m_s")
    if position.shape != velocity.shape:
        raise ValueError("position_m and velocity_m_s must have the same shape")
    normal = np.cross(position, velocity, axis=0)
    radius = length(position)
    size = length(normal)
    if not bool((size > 1e-9 * radius * length(velocity)).all()):
        raise ValueError("velocity_m_s along position_m: no orbit plane, no nadir axes")
    z = -position / radius
    y = -normal / size
    return np.stack((np.cross(y, z, axis=0), y, z))


def to_body(axes: NDArray[np.float64], vector: ArrayLike) -> NDArray[np.float64]:
    """Components of inertial vectors along body axes.

    Parameters
    ----------
    axes : ndarray, shape (3, 3, N)
        From `nadir_axes`.
    vector : array_like, shape (3, N) or (3, 1)
        Inertial components, any unit.

    Returns
    -------
    ndarray, shape (3, N)
        Body components, same unit.

    Examples
    --------
    >>> axes = nadir_axes([[7e6], [0.0], [0.0]], [[0.0], [7.5e3], [0.0]])
    >>> to_body(axes, [[1.0], [0.0], [0.0]])[:, 0].tolist()  # away from the Earth
    [0.0, 0.0, -1.0]
    """
    return np.asarray(np.sum(axes * as_vectors(vector, "vector"), axis=1) + 0.0, dtype=np.float64)


def incidence_cosine(sun_direction_body: ArrayLike, normals: ArrayLike) -> NDArray[np.float64]:
    """Cosine of the angle at which the Sun falls on faces fixed to the body.

    Parameters
    ----------
    sun_direction_body : array_like, shape (3, N)
        Unit vector to the Sun in body axes.
    normals : array_like, shape (S, 3)
        Outward normals; their length does not matter.

    Returns
    -------
    ndarray, shape (S, N)
        max(0, n·s), 0 where the Sun is behind the face. Shadows that one part throws on
        another are not in it.

    Raises
    ------
    ValueError
        Wrong shapes, not finite, or a normal of length zero.

    Examples
    --------
    >>> incidence_cosine([[0.6], [0.0], [0.8]], [[1, 0, 0], [0, 0, -1]])[:, 0].tolist()
    [0.6, 0.0]
    """
    sun = as_vectors(sun_direction_body, "sun_direction_body")
    faces = np.asarray(normals, dtype=np.float64)
    if faces.ndim != 2 or faces.shape[1] != 3:
        raise ValueError("normals must have the shape (S, 3)")
    n = direction(faces.T)
    return np.asarray(np.maximum(0.0, np.sum(n[:, :, None] * sun[:, None, :], axis=0)))


def tracking_cosine(
    sun_direction_body: ArrayLike, side: Literal["front", "back"] = "front"
) -> NDArray[np.float64]:
    """Cosine of incidence on a wing that turns about the body's y axis after the Sun.

    Parameters
    ----------
    sun_direction_body : array_like, shape (3, N)
        Unit vector to the Sun in body axes.
    side : {"front", "back"}, optional
        Face of the wing.

    Returns
    -------
    ndarray, shape (N,)
        sqrt(1 - s_y^2) for the front, 0 for the back.

    Raises
    ------
    ValueError
        Unknown side, wrong shape.

    Examples
    --------
    >>> tracking_cosine([[0.6], [0.8], [0.0]]).round(12).tolist()
    [0.6]
    """
    sun = as_vectors(sun_direction_body, "sun_direction_body")
    if side == "front":
        # hypot instead of sqrt(1 - y^2): exact near the axis
        return np.asarray(np.hypot(sun[0], sun[2]), dtype=np.float64)
    if side == "back":
        return np.zeros(sun.shape[1])
    raise ValueError(f'side = "{side}" is unknown; allowed: "front", "back"')
