"""Flux of a drifting Maxwellian that a Coulomb field draws onto a point of a sphere."""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import i0e, i1e

Array = NDArray[np.float64]


class _Quadrature(NamedTuple):
    """Nodes over the speed, over each piece of the incidence; reach in units of w.

    `outer`: with the pieces beyond the reach.
    """

    speed: int
    angle: int
    reach: float
    outer: bool


_FINE: Final = _Quadrature(40, 24, 6.0, outer=True)  # exp(-36) = 2e-16
_COARSE: Final = _Quadrature(18, 10, 4.5, outer=False)
_CHUNK = 16  # elements of the quadrature at a time, so that its arrays stay in the cache


def focused_flux(
    speed_ratio: ArrayLike, cosine: ArrayLike, attraction: ArrayLike
) -> tuple[Array, Array]:
    r"""Flux of an attracted drifting Maxwellian on a point of a sphere, in units of that at rest.

    By Liouville's theorem the distribution at the surface is that of infinity at the orbit's
    velocity there. With :math:`y^2 = x^2 + u` (speeds over w), c the cosine of incidence and
    n the normal, a Kepler orbit that arrives with velocity y has had

    .. math:: \mathbf x = \frac{(x^2 + x y c)\,\mathbf y + x (u/2)\,\mathbf n}{x^2 + u/2 + x y c}

    at infinity; the integral over the azimuth of the arrival is a Bessel function, that
    over x and c is done by quadrature.

    Parameters
    ----------
    speed_ratio : array_like
        S = speed of the drift over w, 0 to 100.
    cosine : array_like
        1 ram to -1 wake.
    attraction : array_like
        u = |q phi|/T, >= 0.

    Returns
    -------
    flux, slope : ndarray
        Flux over that of the species at rest, and its derivative by u. 1 + u at S = 0. Accurate
        to 1e-8 of itself (1e-5 from S = 20) or 1e-12 of the largest over the sphere.

    Notes
    -----
    Valid in the limit of a sheath much wider than the sphere, where the field is the vacuum's,
    without absorbing other bodies. A patch more negative than its body draws less than this:
    its own field falls off within its size. Averaged over the sphere the flux is that of the
    orbit-limited theory for a drifting Maxwellian (test).

    References
    ----------
    Danby & Camm (1957), Mon. Not. R. Astron. Soc. 117, 50 (velocity at infinity of a Kepler
    orbit, from memory; derived again in the test from the conserved vectors). Kanal (1962),
    University of Michigan report, and Whipple (1981): average over the sphere (from memory).

    Examples
    --------
    >>> flux, _ = focused_flux([0.0, 5.0, 5.0], [1.0, 1.0, -1.0], [3.0, 0.0, 500.0])
    >>> flux.round(3).tolist()[:2]
    [4.0, 17.725]
    """
    return _in_pieces(speed_ratio, cosine, attraction, _FINE)


def coarse_flux(speed_ratio: ArrayLike, cosine: ArrayLike, attraction: ArrayLike) -> Array:
    """Flux of `focused_flux` for tables: a tenth of the work, 1e-4 of itself or 1e-8.

    Parameters
    ----------
    speed_ratio, cosine, attraction : array_like
        As in `focused_flux`.

    Returns
    -------
    ndarray
    """
    return _in_pieces(speed_ratio, cosine, attraction, _COARSE)[0]


def _in_pieces(
    speed_ratio: ArrayLike, cosine: ArrayLike, attraction: ArrayLike, rule: _Quadrature
) -> tuple[Array, Array]:
    """Flux and slope, a few elements at a time; the coarse rule leaves the slope at zero."""
    S, mu, u = np.broadcast_arrays(
        np.asarray(speed_ratio, dtype=np.float64),
        np.clip(np.asarray(cosine, dtype=np.float64), -1.0, 1.0),
        np.asarray(attraction, dtype=np.float64),
    )
    flux, slope = np.empty(S.size), np.zeros(S.size)
    flat = (S.ravel(), mu.ravel(), u.ravel())
    size = _CHUNK if rule.outer else 4 * _CHUNK
    for first in range(0, S.size, size):
        part = slice(first, first + size)
        flux[part], slope[part] = _focused(flat[0][part], flat[1][part], flat[2][part], rule)
    return flux.reshape(S.shape), slope.reshape(S.shape)


def _focused(S: Array, mu: Array, u: Array, rule: _Quadrature) -> tuple[Array, Array]:
    """`focused_flux` of one-dimensional arguments."""
    low = np.maximum(S - rule.reach, 0.0)
    node, weight = np.polynomial.legendre.leggauss(rule.speed)
    half = 0.5 * (S + rule.reach - low)
    x = (low + half)[:, None] + half[:, None] * node
    dx = half[:, None] * weight
    c, dc = _incidence(S, mu, u, rule)
    x, dx, c, dc = x[:, :, None], dx[:, :, None], c[:, None, :], dc[:, None, :]
    S, u = S[:, None, None], u[:, None, None]
    along, across = -S * mu[:, None, None], S * np.sqrt(1.0 - mu**2)[:, None, None]
    y = np.sqrt(x**2 + u)
    s = np.sqrt(1.0 - c**2)
    bracket = x**2 + x * y * c
    D = bracket + 0.5 * u
    normal = (0.5 * x * u - bracket * y * c) / D
    tangent = bracket * y * s / D
    z = 2.0 * tangent * across
    shape = np.exp(-((normal - along) ** 2) - (tangent - across) ** 2)
    bessel = i0e(z)
    kernel = shape * bessel * x * c * dx * dc
    flux = 4.0 * np.sum(kernel * y**2, axis=(-2, -1))
    if not rule.outer:
        return flux, np.zeros_like(flux)
    # derivative by u under the integral, x and c held: the velocity at infinity turns
    dy = 0.5 / y
    dD = x * c * dy + 0.5
    d_normal = (0.5 * x - x * c * dy * y * c - bracket * c * dy - normal * dD) / D
    d_tangent = (x * c * dy * y * s + bracket * s * dy - tangent * dD) / D
    turned = 2.0 * (along * d_normal + across * d_tangent * i1e(z) / bessel)
    slope = 4.0 * np.sum(kernel * (1.0 + y**2 * turned), axis=(-2, -1))
    return flux, slope


def _incidence(S: Array, mu: Array, u: Array, rule: _Quadrature) -> tuple[Array, Array]:
    """Cosines c of incidence [N, Q] and weights dc, dense where the cold beam arrives.

    A beam of speed S and impact parameter b, in radii, meets the sphere at the angle a from
    its origin where b^2 - b sin(a) - (u/2S^2)(1 - cos a) = 0, with sine of incidence S b/y.
    """
    node, weight = np.polynomial.legendre.leggauss(rule.angle)
    a = np.sqrt(1.0 - mu**2)
    beam = np.maximum(S, 1e-3)
    b = 0.5 * (a + np.sqrt(a**2 + 2.0 * u / beam**2 * (1.0 - mu)))
    sine = np.minimum(beam * b / np.sqrt(beam**2 + u), 1.0)
    centre = np.arcsin(sine)
    width = np.minimum(rule.reach / beam, 0.5 * np.pi)
    edges = np.stack(
        [
            np.zeros_like(S),
            np.maximum(centre - width, 0.0),
            centre,
            np.minimum(centre + width, 0.5 * np.pi),
            np.full_like(S, 0.5 * np.pi),
        ],
        axis=-1,
    )
    if not rule.outer:
        edges = edges[:, 1:-1]
    half = 0.5 * np.diff(edges, axis=-1)[..., None]
    chi = (edges[:, :-1, None] + half * (1.0 + node)).reshape(len(S), -1)
    return np.cos(chi), np.sin(chi) * (half * weight).reshape(len(S), -1)
