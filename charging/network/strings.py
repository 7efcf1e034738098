r"""Strings of solar cells: what their exposed conductors collect, integrated along the string.

Between its two ends the potential of a string rises linearly, from V to W, and every place of
equal length has the same share of the exposed area A:

.. math:: I = \frac{A}{W - V}\int_V^W J(\phi)\,d\phi

J has its scale of tenths of a volt near 0 V and of hundreds of volts elsewhere. So the integral
is taken on each side of 0 V by Gauss-Legendre points in t, phi = a sinh t: fixed in number, and
smooth in both ends.
"""

from dataclasses import dataclass
from functools import cache
from typing import NamedTuple

import numpy as np
from numpy.polynomial.legendre import leggauss
from numpy.typing import NDArray

from charging.currents.focus_table import FocusPlace
from charging.currents.lookup import NetCurrents
from charging.currents.streams import Stream
from charging.currents.surface import Kept, Setting, SurfaceModel, surface_currents

Array = NDArray[np.float64]
Index = NDArray[np.intp]

POINTS = 12
"""Of the march on each side of 0 V; the direct path takes `DIRECT_POINTS`."""
DIRECT_POINTS = 40
SCALE_V = 0.1
"""The a of phi = a sinh t."""
LEAST_SPAN_V = 0.1
"""Between the ends of a string, so that a dark one is no special case."""
FULL_LIGHT = 0.05
"""Light (illumination times incidence cosine) above which a string has its full voltage (ours,
assumed); below, a cubic down to none in the dark."""


class Ends(NamedTuple):
    """Ends of strings at some moments, and what surrounds their conductors.

    low_V, high_V : ndarray [m, E], the lower and the higher end's potential above structure's;
    setting : Setting of the table's surfaces, rows of a member together [m·2·POINTS, ...].
    """

    low_V: Array
    high_V: Array
    setting: Setting


@dataclass(frozen=True, slots=True)
class Strings:
    """E strings on structure, with one member axis where members differ.

    Attributes
    ----------
    names : tuple of str
    surface : ndarray of int [E]
        Surface of the spacecraft beside whose light and ram the conductors stand.
    area_m2 : ndarray [E] or [M, E]
        Of exposed conductor on the whole string.
    voltage_V : ndarray [E] or [M, E]
        Of the lit string, positive.
    grounded : ndarray [E]
        0 with the negative end on structure, 1 with the positive end.
    table : NetCurrents
        Of E conductors, for the march.
    models : tuple of SurfaceModel
        One per member, for the direct path; empty with coarse tables.
    """

    names: tuple[str, ...]
    surface: Index
    area_m2: Array
    voltage_V: Array
    grounded: Array
    table: NetCurrents
    models: tuple[SurfaceModel, ...] = ()

    def of(self, member: int) -> "Strings":
        """Strings of one member alone, as member 0."""
        own = slice(member, member + 1)
        table = NetCurrents(
            self.table.table[own], self.table.grids, self.table.coefficients, self.table.escape,
            self.table.photo_saturation_A_m2, self.table.sheath, self.table.angle_growth,
            self.table.streams,
        )  # fmt: skip
        return Strings(
            self.names,
            self.surface,
            self.area_m2 if self.area_m2.ndim == 1 else self.area_m2[member],
            self.voltage_V if self.voltage_V.ndim == 1 else self.voltage_V[member],
            self.grounded,
            table,
            self.models[own],
        )

    def ends(
        self, member: Index, setting: Setting, motional_V: Array | None
    ) -> tuple[Array, Array]:
        """Potentials of the lower and the higher end above structure's [V, m, E].

        `motional_V` [m, 2E] is what the motion adds to negative and to positive ends.
        """
        x = np.minimum(np.maximum(setting.light[..., self.surface] / FULL_LIGHT, 0.0), 1.0)
        voltage = self.voltage_V if self.voltage_V.ndim == 1 else self.voltage_V[member]
        span = np.hypot(LEAST_SPAN_V, voltage * x * x * (3.0 - 2.0 * x))
        negative, positive = -self.grounded * span, (1.0 - self.grounded) * span
        if motional_V is None:
            return negative, positive
        negative = negative + motional_V[..., : len(self.names)]
        positive = positive + motional_V[..., len(self.names) :]
        low = np.minimum(negative, positive)
        return low, np.maximum(np.maximum(negative, positive), low + LEAST_SPAN_V)

    def moment(self, member: Index, setting: Setting, motional_V: Array | None = None) -> Ends:
        """What strings of members [m] meet, from the setting of the spacecraft's surfaces."""
        low, high = self.ends(member, setting, motional_V)
        beside = self.beside(setting)
        own = self.table.prepared(member, beside)
        return Ends(low, high, _repeated(own, 2 * POINTS))

    def beside(self, setting: Setting) -> Setting:
        """Setting of the conductors, from that of the surfaces."""
        stream = setting.stream
        if stream is not None:
            stream = stream._replace(ram_m_s=stream.ram_m_s[..., self.surface, :])
        return setting._replace(light=setting.light[..., self.surface], stream=stream, kept=None)

    def current_A(self, member: Index, ends: Ends, structure_V: Array) -> Array:
        """Current of the strings onto structure [A, m, E]; arguments as in `arriving`."""
        low, high = structure_V[:, None] + ends.low_V, structure_V[:, None] + ends.high_V
        points = along(low, high, POINTS)
        shape = points.potential_V.shape
        current = self.table.current(
            np.repeat(member, 2 * POINTS), points.potential_V.reshape(-1, shape[-1]), ends.setting
        )
        area = self.area_m2 if self.area_m2.ndim == 1 else self.area_m2[member]
        return area / (high - low) * _summed(points.weight_V * current.reshape(shape))

    def arriving(self, member: Index, ends: Ends, structure_V: Array) -> tuple[Array, Array]:
        """Current of the strings onto structure [A, m, E] and its slope by its potential [A/V].

        Parameters
        ----------
        member : ndarray of int [m]
        ends : Ends
            Of these members.
        structure_V : ndarray [m]
            Against the plasma.
        """
        low, high = structure_V[:, None] + ends.low_V, structure_V[:, None] + ends.high_V
        points = along(low, high, POINTS)
        many = np.repeat(member, 2 * POINTS)
        shape = points.potential_V.shape  # [m, 2·POINTS, E]
        current, slope = self.table.current_and_slope(
            many, points.potential_V.reshape(-1, shape[-1]), ends.setting
        )
        current, slope = current.reshape(shape), slope.reshape(shape)
        area = self.area_m2 if self.area_m2.ndim == 1 else self.area_m2[member]
        scale = area / (high - low)
        total = _summed(points.weight_V * current)
        rise = points.d_weight * current + points.weight_V * slope * points.d_potential
        return scale * total, scale * _summed(rise)

    def direct(
        self, member: int, setting: Setting, motional_V: Array | None, structure_V: Array
    ) -> Array:
        """Currents [A] of one member by the direct path, on more points: [2, m, E].

        Onto structure, then all that crosses the string's surface either way.
        """
        which = np.full(len(structure_V), member)
        low, high = self.ends(which, setting, motional_V)
        points = along(structure_V[:, None] + low, structure_V[:, None] + high, DIRECT_POINTS)
        beside = _repeated(self.beside(setting), 2 * DIRECT_POINTS)
        shape = points.potential_V.shape
        found = surface_currents(
            self.models[member], points.potential_V.reshape(-1, shape[-1]), beside
        )
        area = self.area_m2 if self.area_m2.ndim == 1 else self.area_m2[member]
        both = (found.by_mechanism.sum(axis=-1), np.abs(found.by_mechanism).sum(axis=-1))
        return np.stack(
            [area / (high - low) * _summed(points.weight_V * j.reshape(shape)) for j in both]
        )


class Points(NamedTuple):
    """Points along strings, each [m, 2N, E], with slopes as both ends rise together.

    potential_V and d_potential; weight_V, of the integral over the potential, and d_weight.
    """

    potential_V: Array
    d_potential: Array
    weight_V: Array
    d_weight: Array


def along(low_V: Array, high_V: Array, count: int) -> Points:
    """Points and weights of the integral from `low_V` to `high_V` [m, E].

    Examples
    --------
    >>> points = along(np.array([[-100.0]]), np.array([[60.0]]), 16)
    >>> float((points.weight_V * points.potential_V**2).sum().round(3))  # (100^3 + 60^3)/3
    405333.333
    """
    x, w = _rule(count)
    parts = []
    for pick in (np.minimum, np.maximum):
        a, b = np.arcsinh(pick(low_V, 0.0) / SCALE_V), np.arcsinh(pick(high_V, 0.0) / SCALE_V)
        # beyond 0 V an end stays there; an end at 0 V moves with the upper part alone
        upper = pick is np.maximum
        d_a, d_b = (
            np.where((end >= 0.0) == upper, 1.0 / np.hypot(end, SCALE_V), 0.0)
            for end in (low_V, high_V)
        )
        a, b, d_a, d_b = (v[:, None, :] for v in (a, b, d_a, d_b))
        t, d_t = a + x * (b - a), d_a + x * (d_b - d_a)
        sinh, cosh = SCALE_V * np.sinh(t), SCALE_V * np.cosh(t)
        parts.append(
            Points(
                sinh,
                cosh * d_t,
                w * (b - a) * cosh,
                w * ((d_b - d_a) * cosh + (b - a) * sinh * d_t),
            )
        )
    return Points(*(np.concatenate(both, axis=1) for both in zip(*parts, strict=True)))


@cache
def _rule(count: int) -> tuple[Array, Array]:
    """Gauss-Legendre points and weights of the unit interval, each [count, 1]."""
    x, w = leggauss(count)
    return 0.5 * (x + 1.0)[:, None], 0.5 * w[:, None]


def _summed(terms: Array) -> Array:
    """Sum [m, E] over the points of [m, N, E]; along the last axis, the same for any m."""
    return np.asarray(np.ascontiguousarray(terms.swapaxes(1, 2)).sum(axis=-1))


def _repeated(setting: Setting, times: int) -> Setting:
    """Setting with every row [m, ...] repeated."""

    def many(value: Array) -> Array:
        return np.repeat(value, times, axis=0)

    stream, kept, lit = setting.stream, setting.kept, setting.illumination
    return setting._replace(
        strength=many(setting.strength),
        light=many(setting.light),
        illumination=many(lit) if isinstance(lit, np.ndarray) else lit,
        stream=None if stream is None else Stream(*(many(part) for part in stream)),
        kept=None
        if kept is None
        else Kept(
            many(kept.sheath_m2),
            many(kept.child_m2),
            many(kept.photo_A_m2),
            None
            if kept.focus is None
            else FocusPlace(np.repeat(kept.focus.first, times, axis=0), many(kept.focus.weight)),
        ),
    )
