"""Attitude laws: body axes of a spacecraft along its orbit.

Each law is a frozen dataclass with one method,
``axes(seconds, position_m, velocity_m_s, sun_direction) -> (3, 3, N)``: row i holds body
axis i in inertial components, as `environments.attitude.nadir_axes` gives them.
"""

from dataclasses import dataclass
from typing import Protocol, runtime_checkable

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.attitude import nadir_axes
from environments.vectors import as_vectors, direction, length

Array = NDArray[np.float64]
Vector = tuple[float, float, float]

_NEAREST_RAD = 1e-6  # of two directions that must span a plane


@runtime_checkable
class Attitude(Protocol):
    """A law of pointing."""

    def axes(
        self, seconds: ArrayLike, position_m: ArrayLike, velocity_m_s: ArrayLike,
        sun_direction: ArrayLike,
    ) -> Array:  # fmt: skip
        """Body axes (3, 3, N) at seconds [s] after the epoch (N,).

        Position [m], velocity [m s-1] and the unit vector to the Sun have the shape (3, N).
        """
        ...


@dataclass(frozen=True, slots=True)
class NadirPointing:
    """+z to nadir, +x along the velocity; see `environments.attitude.nadir_axes`."""

    def axes(
        self, seconds: ArrayLike, position_m: ArrayLike, velocity_m_s: ArrayLike,
        sun_direction: ArrayLike,
    ) -> Array:  # fmt: skip
        """See `Attitude`."""
        return nadir_axes(position_m, velocity_m_s)


@dataclass(frozen=True, slots=True)
class YawSteering:
    """+z to nadir, turned about it so that +y stands across the Sun.

    +x holds the Sun on its side, -x never sees it, and wings that turn about y
    (`environments.attitude.tracking_cosine`) face it fully.

    Notes
    -----
    The turn is ideal: where the Sun passes zenith or nadir (beta near 0) it happens faster
    than a spacecraft turns, which takes some minutes then; the error lasts as long.

    Examples
    --------
    >>> law = YawSteering()
    >>> axes = law.axes([0.0], [[7e6], [0], [0]], [[0], [7.5e3], [0]], [[0.0], [0.6], [0.8]])
    >>> (axes[0, :, 0].round(3) + 0.0).tolist()  # +x: here straight to the Sun
    [0.0, 0.6, 0.8]
    """

    def axes(
        self, seconds: ArrayLike, position_m: ArrayLike, velocity_m_s: ArrayLike,
        sun_direction: ArrayLike,
    ) -> Array:  # fmt: skip
        """See `Attitude`; ValueError with the Sun straight at zenith or nadir."""
        nadir = -direction(position_m)
        sun = as_vectors(sun_direction, "sun_direction")
        across = np.cross(nadir, sun, axis=0)
        size = length(across)
        if not bool((size > _NEAREST_RAD * length(sun)).all()):
            raise ValueError("the Sun stands at zenith or nadir: yaw steering is undefined there")
        y = across / size
        return np.stack((np.cross(y, nadir, axis=0), y, nadir))


@dataclass(frozen=True, slots=True)
class SunPointing:
    """One body direction to the Sun, another as near as possible to celestial north.

    Attributes
    ----------
    toward_sun, toward_north : tuple of float
        Body directions, not along each other; defaults +z and +y.

    Examples
    --------
    >>> axes = SunPointing().axes([0.0], [[7e6], [0], [0]], [[0], [7.5e3], [0]],
    ...                           [[1.0], [0.0], [0.0]])
    >>> axes[2, :, 0].tolist()  # +z: to the Sun
    [1.0, 0.0, 0.0]
    """

    toward_sun: Vector = (0.0, 0.0, 1.0)
    toward_north: Vector = (0.0, 1.0, 0.0)

    def axes(
        self, seconds: ArrayLike, position_m: ArrayLike, velocity_m_s: ArrayLike,
        sun_direction: ArrayLike,
    ) -> Array:  # fmt: skip
        """See `Attitude`."""
        sun = direction(sun_direction)
        north = np.broadcast_to(np.array([[0.0], [0.0], [1.0]]), sun.shape)
        outside = _frame(sun, north)
        inside = _frame(_column(self.toward_sun), _column(self.toward_north))[:, :, 0]
        # the body's own frame is carried onto the outside one
        return np.asarray(np.einsum("ki,kjn->ijn", inside, outside))


@dataclass(frozen=True, slots=True)
class InertialPointing:
    """Body axes that stand still among the stars.

    Attributes
    ----------
    x_axis, y_axis : tuple of float
        Inertial directions of body x and y; y is made square to x.

    Examples
    --------
    >>> law = InertialPointing((0.0, 0.0, 1.0), (1.0, 0.0, 0.0))
    >>> law.axes([0.0], [[7e6], [0], [0]], [[0], [7.5e3], [0]], [[1], [0], [0]])[2, :, 0].tolist()
    [0.0, 1.0, 0.0]
    """

    x_axis: Vector = (1.0, 0.0, 0.0)
    y_axis: Vector = (0.0, 1.0, 0.0)

    def axes(
        self, seconds: ArrayLike, position_m: ArrayLike, velocity_m_s: ArrayLike,
        sun_direction: ArrayLike,
    ) -> Array:  # fmt: skip
        """See `Attitude`."""
        frame = _frame(_column(self.x_axis), _column(self.y_axis))
        return np.repeat(frame, as_vectors(position_m, "position_m").shape[1], axis=2)


@dataclass(frozen=True, slots=True)
class Spin:
    """A body that turns about its +z axis, which stands still among the stars.

    Attributes
    ----------
    axis : tuple of float
        Inertial direction of +z.
    period_s : float
        Of one turn [s]; positive turns x towards y.
    phase_deg : float
        Turn at 0 s, from the direction of x that is nearest to celestial north (of the
        equinox, if the axis points north).

    Notes
    -----
    Incidence resolved in time needs steps much shorter than the period. Where the period is
    short against charging (seconds against minutes), use `spin_averaged_cosine`.

    Examples
    --------
    >>> law = Spin((1.0, 0.0, 0.0), 4.0)
    >>> still = ([[7e6], [0], [0]], [[0], [7.5e3], [0]], [[1], [0], [0]])
    >>> law.axes([0.0], *still)[0, :, 0].round(6).tolist()
    [0.0, 0.0, 1.0]
    >>> law.axes([1.0], *still)[0, :, 0].round(6).tolist()
    [0.0, -1.0, 0.0]
    """

    axis: Vector
    period_s: float
    phase_deg: float = 0.0

    def __post_init__(self) -> None:
        if not (np.isfinite(self.period_s) and self.period_s != 0.0):
            raise ValueError("period_s must be finite and not zero")
        if not np.isfinite(self.phase_deg):
            raise ValueError("phase_deg must be finite")

    def axes(
        self, seconds: ArrayLike, position_m: ArrayLike, velocity_m_s: ArrayLike,
        sun_direction: ArrayLike,
    ) -> Array:  # fmt: skip
        """See `Attitude`."""
        z = direction(_column(self.axis))
        reference = _column((0.0, 0.0, 1.0) if abs(z[2, 0]) < 0.999 else (1.0, 0.0, 0.0))
        _, x, y = _frame(z, reference)[:, :, 0]  # z × x = y
        time = np.asarray(seconds, dtype=np.float64)
        turn = 2.0 * np.pi * ((time / self.period_s) % 1.0) + np.radians(self.phase_deg)
        cos, sin = np.cos(turn), np.sin(turn)
        return np.stack(
            (
                x[:, None] * cos + y[:, None] * sin,
                y[:, None] * cos - x[:, None] * sin,
                np.repeat(z, time.size, axis=1),
            )
        )


def spin_averaged_cosine(
    sun_direction_body: ArrayLike, normals: ArrayLike, axis: Vector = (0.0, 0.0, 1.0)
) -> Array:
    r"""Mean cosine of incidence on faces over one turn of a spinning body.

    With the Sun at an angle t and the normal at an angle c from the axis the cosine is
    :math:`A + B\cos\psi`, A = cos t cos c, B = sin t sin c; its positive part averages to
    :math:`(A\psi_0 + B\sin\psi_0)/\pi`, :math:`\cos\psi_0 = -A/B`.

    Parameters
    ----------
    sun_direction_body : array_like, shape (3, N)
        Unit vector to the Sun in body axes, at any phase of the turn.
    normals : array_like, shape (S, 3)
        Outward normals.
    axis : tuple of float, optional
        Body direction about which it turns.

    Returns
    -------
    ndarray, shape (S, N)
        0 to 1. Photocurrents follow the mean; potentials follow it only where charging is
        slow against the turn.

    Raises
    ------
    ValueError
        Wrong shapes, vectors of length zero.

    Examples
    --------
    >>> side = spin_averaged_cosine([[1.0], [0.0], [0.0]], [[1, 0, 0]])  # belt of a drum
    >>> round(float(side[0, 0] * np.pi), 12)
    1.0
    """
    sun = direction(sun_direction_body)
    faces = np.asarray(normals, dtype=np.float64)
    if faces.ndim != 2 or faces.shape[1] != 3:
        raise ValueError("normals must have the shape (S, 3)")
    n, z = direction(faces.T), direction(_column(axis))
    along = np.sum(n * z, axis=0)[:, None] * np.sum(sun * z, axis=0)[None, :]
    across = length(np.cross(n, z, axis=0))[:, None] * length(np.cross(sun, z, axis=0))[None, :]
    # arctan2 instead of arccos(-A/B): no division, right where B is 0
    psi = np.arctan2(np.sqrt(np.maximum((across - along) * (across + along), 0.0)), -along)
    partial = (along * psi + across * np.sin(psi)) / np.pi
    always, never = along >= across, along <= -across
    return np.asarray(np.where(never, 0.0, np.where(always, along, partial)), dtype=np.float64)


def _column(vector: Vector) -> Array:
    return as_vectors(np.asarray(vector, dtype=np.float64).reshape(-1, 1), "direction")


def _frame(first: Array, second: Array) -> Array:
    """Right-handed axes (3, 3, N): along `first`, near `second`, and square to both."""
    one = direction(first)
    square = np.cross(one, second, axis=0)
    size = length(square)
    if not bool((size > _NEAREST_RAD * length(np.asarray(second))).all()):
        raise ValueError("the two directions of an attitude lie along each other")
    three = square / size
    return np.stack((one, np.cross(three, one, axis=0), three))
