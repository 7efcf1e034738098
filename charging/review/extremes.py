"""Worst values of one member along its run, quantity by quantity."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.constants import epsilon_0

from charging.case import Case, Surface
from charging.network.march import Trajectory
from charging.network.nodes import Network
from charging.review.criteria import Kind
from charging.review.limits import Requirement

Array = NDArray[np.float64]
Index = NDArray[np.intp]

STRUCTURE = "structure"
BEHIND = "conductor behind"


@dataclass(frozen=True, slots=True)
class Quantity:
    """What a limit speaks of: a kind, a surface ("" for structure), and what it is against."""

    kind: Kind
    surface: str
    against: str


@dataclass(frozen=True, slots=True)
class Extremes:
    """Worst values of M members.

    value : ndarray [M, Q], with sign; time_s : ndarray [M, Q] after the start.
    """

    value: Array
    time_s: Array


def neighbours(case: Case) -> tuple[tuple[str, str], ...]:
    """Declared neighbours, each pair once, in the order of the file; a declaration holds both ways.

    Examples
    --------
    >>> from types import SimpleNamespace as Table
    >>> faces = (Table(name="a", neighbours=("b",)), Table(name="b", neighbours=("a",)))
    >>> neighbours(Table(surface=faces))
    (('a', 'b'),)
    """
    pairs: dict[frozenset[str], tuple[str, str]] = {}
    for surface in case.surface:
        for other in surface.neighbours:
            pairs.setdefault(frozenset((surface.name, other)), (surface.name, other))
    return tuple(pairs.values())


def node_of(case: Case, name: str) -> str:
    """Isolated conductor, dielectric or structure that a surface is part of."""
    surfaces = {surface.name: surface for surface in case.surface}
    while name != STRUCTURE and not _floats(surfaces[name]):
        name = surfaces[name].attached_to
    return name


def _floats(surface: Surface) -> bool:
    return surface.floating or surface.thickness_m is not None


def bonded(case: Case, quantity: Quantity) -> bool:
    """Whether a quantity is that of a surface without a node of its own, so always zero."""
    return quantity.surface != "" and node_of(case, quantity.surface) == STRUCTURE


def quantities(case: Case, requirement: Requirement) -> Iterator[Quantity]:
    """Return what a requirement concerns in a case.

    A dielectric beside a conductor that is bonded to structure stands against structure:
    its pair has no row of its own.
    """
    kind = requirement.kind
    surfaces = {surface.name: surface for surface in case.surface}
    if kind == "structure":
        yield Quantity(kind, "", "plasma")
    elif kind in ("neighbour", "neighbour normal", "neighbour inverted"):
        for a, b in neighbours(case):
            ends = node_of(case, a), node_of(case, b)
            if ends[0] == ends[1] or STRUCTURE in ends:
                continue
            films = [surfaces[name].thickness_m is not None for name in (a, b)]
            if kind == "neighbour":
                if requirement.covers(a) or requirement.covers(b):
                    yield Quantity(kind, a, b)
            elif films[0] != films[1]:
                film, conductor = (a, b) if films[0] else (b, a)
                if requirement.covers(film):
                    yield Quantity(kind, film, conductor)
    else:
        for surface in case.surface:
            if not requirement.covers(surface.name):
                continue
            if kind == "field" and surface.thickness_m is None:
                continue
            if kind == "energy" and not _floats(surface):
                continue
            against = BEHIND if kind in ("field", "energy") else STRUCTURE
            yield Quantity(kind, surface.name, against)


def judged(case: Case, limits: Sequence[Requirement]) -> list[tuple[Requirement, Quantity]]:
    """Every requirement with everything it concerns."""
    return [(limit, quantity) for limit in limits for quantity in quantities(case, limit)]


def informative(case: Case) -> list[Quantity]:
    """Quantities that a report shows whether or not a limit speaks of them."""
    found = [Quantity("structure", "", "plasma")]
    for surface in case.surface:
        if _floats(surface):
            found += [
                Quantity("normal", surface.name, STRUCTURE),
                Quantity("inverted", surface.name, STRUCTURE),
                Quantity("energy", surface.name, BEHIND),
            ]
            if surface.thickness_m is not None:
                found.append(Quantity("field", surface.name, BEHIND))
    for a, b in neighbours(case):
        if node_of(case, a) != node_of(case, b):
            found.append(Quantity("neighbour", a, b))
    return found


def extremes(
    case: Case,
    net: Network,
    trajectory: Trajectory,
    wanted: Sequence[Quantity],
    *,
    parts: int = 10,
) -> tuple[Array, Array]:
    """Worst values [Q] and their times [s, Q] of one member.

    Parameters
    ----------
    case : Case
        Of the member: thicknesses are its own.
    net : Network
        Of the member, without member axis.
    trajectory : Trajectory
    wanted : sequence of Quantity
    parts : int
        Points looked at in every step of the march: its ends and between them.
    """
    share = np.arange(parts + 1) / parts
    k = np.repeat(np.arange(len(trajectory.step_s)), parts + 1)
    theta = np.tile(share, len(trajectory.step_s))
    times = trajectory.start_s[k] + theta * trajectory.step_s[k]
    y = trajectory.inside(k, theta)
    v = net.potentials(y)
    value, time = np.zeros(len(wanted)), np.zeros(len(wanted))
    for q, one in enumerate(wanted):
        course = _course(case, net, y, v, one)
        if one.kind in ("normal", "neighbour normal"):
            at = int(np.argmin(course))
        elif one.kind in ("inverted", "neighbour inverted"):
            at = int(np.argmax(course))
        else:
            at = int(np.argmax(np.abs(course)))
        value[q], time[q] = course[at], times[at]
    return value, time


def _course(case: Case, net: Network, y: Array, v: Array, one: Quantity) -> Array:
    """Values of a quantity along the run [T]."""
    if one.kind == "structure":
        return v[:, 0]
    index = case.names.index(one.surface)
    node = net.surface_node[index]
    if one.kind in ("normal", "inverted"):
        return np.asarray(v[:, node] - v[:, 0])
    if one.kind in ("field", "energy"):
        surface = case.surface[index]
        across = y[:, node]
        if one.kind == "field":
            if surface.thickness_m is None:  # a changed design has no film there
                return np.zeros(len(y))
            return np.asarray(across / surface.thickness_m)
        return 0.5 * film_capacitance_F(net, index, surface) * across**2
    other = net.surface_node[case.names.index(one.against)]
    return np.asarray(v[:, node] - v[:, other])


def film_capacitance_F(net: Network, index: int, surface: Surface) -> float:
    """Capacitance between a surface and what it is attached to; 0 when bonded."""
    if surface.floating:
        return surface.capacitance_F or 0.0
    if surface.thickness_m is None:
        return 0.0
    film = int(np.flatnonzero(net.film_surface == index)[0])
    permittivity = float(net.film_permittivity[film])
    return epsilon_0 * permittivity * surface.area_m2 / surface.thickness_m
