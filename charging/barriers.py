"""Barriers of a case: which surfaces stand on the sphere, and the weights between them."""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from charging.case_tables import Case
from charging.currents.barrier_field import DISTANCES, BarrierField, Barriers, barrier_field
from charging.currents.cap_weights import Patch, sphere_weights
from charging.currents.populations import Populations

Array = NDArray[np.float64]
Index = NDArray[np.intp]


def barriers(cases: Sequence[Case], surface_node: Index, nodes: int) -> Barriers | None:
    """Barriers of the members of a block; None where the case wants none or nothing has one.

    Parameters
    ----------
    cases : sequence of Case
        One per member; equal geometries are worked out once.
    surface_node : ndarray of int [S]
    nodes : int
    """
    if not cases[0].body.barrier:
        return None
    keys: dict[object, int] = {}
    fields: list[BarrierField] = []
    which = np.zeros(len(cases), dtype=np.intp)
    for i, case in enumerate(cases):
        key = (
            case.shape,
            case.body.radius_m,
            tuple((s.normal, s.area_m2) for s in case.surface),
            _caps(case, surface_node),
        )
        if key not in keys:
            found = _field(case, surface_node, nodes)
            if found is None:
                return None
            keys[key] = len(fields)
            fields.append(found)
        which[i] = keys[key]
    return Barriers(tuple(fields), which)


def without_barrier(case: Case) -> tuple[str, ...]:
    """Surfaces in front of which no barrier is worked out, where the others have one."""
    if case.shape or not case.body.barrier:
        return ()
    return tuple(s.name for s in case.surface if s.normal is None)


def _field(case: Case, surface_node: Index, nodes: int) -> BarrierField | None:
    if case.shape:
        from charging.shape.solution import shape_barrier  # solved only for cases with shapes
        from charging.shape.views import craft_of

        return shape_barrier(craft_of(case), surface_node, nodes)
    # a case without films and isolated conductors has one potential and no barrier
    if nodes < 2:
        return None
    on_sphere = [(i, s.normal) for i, s in enumerate(case.surface) if s.normal is not None]
    if not on_sphere:
        return None
    return barrier_field(*_on_sphere(case, on_sphere, surface_node, nodes))


def _caps(case: Case, surface_node: Index) -> tuple[int, ...]:
    """Cap of every surface, by the number of the first surface of that cap.

    What looks the same way and is one conductor, or films alike, is one cap however it is
    divided.
    """
    known: dict[object, int] = {}
    found = []
    for i, surface in enumerate(case.surface):
        film = (surface.material, surface.thickness_m, surface.attached_to, surface.surface_state)
        alike: object = int(surface_node[i]) if surface.thickness_m is None else film
        found.append(known.setdefault((surface.normal, alike), i))
    return tuple(found)


def _on_sphere(
    case: Case,
    on_sphere: Sequence[tuple[int, tuple[float, float, float]]],
    surface_node: Index,
    nodes: int,
) -> tuple[Index, Index, Array]:
    """Surfaces, their nodes and weights [S, K, n] of surfaces that stand on the sphere.

    Seen from its own axis a cap is at the potential of its surface; seen from others its
    parts count by area.
    """
    cap_of = _caps(case, surface_node)
    surfaces = np.array([i for i, _ in on_sphere], dtype=np.intp)
    caps = list(dict.fromkeys(cap_of[i] for i in surfaces))
    share = np.zeros((len(caps) + 1, nodes))
    share[-1, 0] = 1.0  # what no cap covers is structure
    for i in surfaces:
        share[caps.index(cap_of[i]), surface_node[i]] += case.surface[i].area_m2
    area = share[:-1].sum(axis=1)
    share[:-1] /= area[:, None]
    normal = dict(on_sphere)
    patches = [Patch(normal[c], float(area[k]), k) for k, c in enumerate(caps)]
    along = sphere_weights(
        patches, case.body.radius_m, len(caps) + 1, 1.0 + DISTANCES[1:-1], structure=len(caps)
    )
    weights = np.zeros((len(surfaces), len(DISTANCES), nodes))
    for row, i in enumerate(surfaces):
        k = caps.index(cap_of[i])
        seen = share.copy()
        seen[k] = 0.0
        seen[k, surface_node[i]] = 1.0
        weights[row, 0, surface_node[i]] = 1.0
        weights[row, 1:-1] = along[k] @ seen
    return surfaces, surface_node[surfaces], weights


class Overcount(NamedTuple):
    """Largest share of arriving electrons that a barrier would have turned back, and where."""

    share: float
    surface: int


def overcount(
    electrons: Populations, strength: Array, surface_V: Array, height_V: Array
) -> Overcount:
    r"""Size of what is left out: barriers do not hold back electrons that arrive.

    An electron must reach the saddle to arrive, which lies h − max(V, 0) below patch and
    plasma: of a Maxwellian a share :math:`1-e^{-(h-\max(V,0))/T}` does not.

    Parameters
    ----------
    electrons : Populations
    strength : ndarray [m, P]
    surface_V, height_V : ndarray [m, S]
    """
    below = np.maximum(height_V - np.maximum(surface_V, 0.0), 0.0)
    current = np.abs(electrons.thermal_current_A_m2) * strength[:, electrons.plasma]
    lost = -np.expm1(-below[..., None] / electrons.debye_temperature_eV)
    share = (lost * current[:, None, :]).sum(axis=-1) / current.sum(axis=-1)[:, None]
    where = np.unravel_index(int(np.argmax(share)), share.shape)
    return Overcount(float(share[where]), int(where[1]))
