"""Nodes of the charge balance: structure, dielectric faces, isolated conductors.

The state is y = (structure potential, one difference per other node against what
it is attached to); absolute potentials are V = S y with a 0/1 matrix S. Differences
are kept as variables because kilovolts on structure would drown volts on a film.
"""

from collections.abc import Sequence
from dataclasses import dataclass, fields, replace
from math import pi
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.constants import epsilon_0

Array = NDArray[np.float64]
Index = NDArray[np.intp]

STRUCTURE = "structure"


@dataclass(frozen=True, slots=True)
class Face:
    """One outer surface as the network sees it.

    Attributes
    ----------
    name, attached_to : str
    area_m2 : float
    thickness_m, relative_permittivity, resistivity_ohm_m, activation_energy_eV : float
        Of the dielectric; thickness 0 marks a conductor. Resistivity at 298.15 K.
    isolated_capacitance_F : float
        Capacitance of an isolated conductor to what it is attached to; 0 for others.
    radiation_conductivity_S_m, radiation_exponent : float
        Conductivity that 1 rad/s adds, and the power of the dose rate.
    """

    name: str
    attached_to: str
    area_m2: float
    thickness_m: float = 0.0
    relative_permittivity: float = 1.0
    resistivity_ohm_m: float = 1.0
    activation_energy_eV: float = 0.0
    isolated_capacitance_F: float = 0.0
    radiation_conductivity_S_m: float = 0.0
    radiation_exponent: float = 1.0

    @property
    def has_node(self) -> bool:
        """A dielectric or isolated conductor floats; a bonded conductor does not."""
        return self.thickness_m > 0.0 or self.isolated_capacitance_F > 0.0


@dataclass(frozen=True, slots=True)
class Network:
    """Nodes n, surfaces S, films F, links L in arrays, of one spacecraft or of a block of them.

    In a block, arrays in which members differ have the members as a first axis; which
    nodes, films and links there are is one for all.

    Attributes
    ----------
    node_names : tuple of str
        Structure first.
    ancestry : ndarray [n, n]
        S of V = S y.
    capacitance_F : ndarray [n, n]
        Maxwell capacitance matrix by absolute potentials.
    surface_node : ndarray of int [S]
    area_m2 : ndarray [S]
    film_node, film_parent, film_surface : ndarray of int [F]
        Node (and state variable) of each dielectric film's outer face, node below it,
        and its surface.
    film_thickness_m, film_permittivity, film_resistivity_ohm_m, film_activation_eV : ndarray [F]
    film_radiation_S_m, film_radiation_exponent : ndarray [F]
        Conductivity that 1 rad/s adds, and the power of the dose rate.
    link_nodes : tuple of (int, int)
        Ends of each link.
    link_rows : ndarray [L, n]
        Voltage across each link by state variables.
    link_conductance_S : ndarray [L]
    surface_ancestry : ndarray [S, n]
        Rows of `ancestry` of the surfaces.
    moves : ndarray [n, S]
        1 where a surface moves with a state variable.
    link_stiffness_S : ndarray [n, n]
        Derivative of the charge rates by the state through the links, negative.
    """

    node_names: tuple[str, ...]
    ancestry: Array
    capacitance_F: Array
    surface_node: Index
    area_m2: Array
    film_node: Index
    film_parent: Index
    film_surface: Index
    film_thickness_m: Array
    film_permittivity: Array
    film_resistivity_ohm_m: Array
    film_activation_eV: Array
    film_radiation_S_m: Array
    film_radiation_exponent: Array
    link_nodes: tuple[tuple[int, int], ...]
    link_rows: Array
    link_conductance_S: Array
    surface_ancestry: Array
    moves: Array
    link_stiffness_S: Array

    @property
    def mass(self) -> Array:
        """Sᵀ C S [F]: the capacitance matrix seen by the state variables [(M,) n, n]."""
        if self.capacitance_F.ndim == 3:  # one by one: a product of stacks may round otherwise
            return np.stack([self.ancestry.T @ c @ self.ancestry for c in self.capacitance_F])
        return self.ancestry.T @ self.capacitance_F @ self.ancestry

    def of(self, member: int) -> "Network":
        """Network of one member, without a member axis."""
        own: dict[str, Any] = {
            name: getattr(self, name)[member]
            for name, axes in MEMBER_ARRAYS.items()
            if getattr(self, name).ndim > axes
        }
        return replace(self, **own) if own else self

    def each(self, name: str, member: Index) -> Array:
        """One of `MEMBER_ARRAYS` for members [m]: with or without a member axis."""
        values: Array = getattr(self, name)
        return values[member] if values.ndim > MEMBER_ARRAYS[name] else values

    def potentials(self, y: Array) -> Array:
        """Absolute node potentials [..., n] of states [..., n]."""
        v: Array = (self.ancestry * y[..., None, :]).sum(axis=-1)
        return v


MEMBER_ARRAYS = {
    "capacitance_F": 2,
    "area_m2": 1,
    "film_thickness_m": 1,
    "film_permittivity": 1,
    "film_resistivity_ohm_m": 1,
    "film_activation_eV": 1,
    "film_radiation_S_m": 1,
    "film_radiation_exponent": 1,
    "link_conductance_S": 1,
    "link_stiffness_S": 2,
}
"""Arrays of `Network` that may differ between members, and their axes without that of members."""


def block_network(networks: Sequence[Network]) -> Network:
    """Put networks of the same nodes and links side by side as one with a member axis.

    Raises
    ------
    ValueError
        Nodes, films or links are not the same.
    """
    first = networks[0]
    for name in (field.name for field in fields(Network)):
        if name in MEMBER_ARRAYS:
            continue
        for other in networks[1:]:
            if not np.array_equal(getattr(first, name), getattr(other, name)):
                raise ValueError(f"members of a block must have the same {name}")
    stacked: dict[str, Any] = {}
    for name in MEMBER_ARRAYS:
        own = [getattr(net, name) for net in networks]
        if any(not np.array_equal(own[0], other) for other in own[1:]):
            stacked[name] = np.stack(own)
    return replace(first, **stacked) if stacked else first


def network(
    faces: Sequence[Face],
    links: Sequence[tuple[str, str, float]],
    radius_m: float,
    free_space_capacitance_F: Array | None = None,
) -> Network:
    r"""Build nodes, capacitances and conductances.

    Parameters
    ----------
    faces : sequence of Face
    links : sequence of (name, name, resistance)
        Resistors [ohm] between nodes; a bonded conductor stands for what it is bonded to.
        An infinite one marks a link that this member of a block does not have.
    radius_m : float
        Radius of the body.
    free_space_capacitance_F : ndarray [S, S] or [S+1, S+1], optional
        Charge on each outer face by the potential of each, all against the plasma (Maxwell's
        capacitance matrix, symmetric); a further row and column are bare structure.
        Default: a sphere without coupling between faces.

    Notes
    -----
    Capacitances: a film has :math:`\varepsilon_0\varepsilon_r A/d` to what it covers; the
    body has :math:`4\pi\varepsilon_0 R` to the plasma (isolated sphere), shared among the
    outer faces by area unless a matrix is given. Without one, coupling between outer faces
    through space is left out: for a film of 127 µm it is below 1e-4 of the film's own
    capacitance.
    """
    names = [STRUCTURE, *(f.name for f in faces if f.has_node)]
    number = {name: i for i, name in enumerate(names)}
    parent = {f.name: f.attached_to for f in faces}

    def node_of(name: str) -> int:
        while name not in number:
            name = parent[name]
        return number[name]

    n = len(names)
    ancestry = np.zeros((n, n))
    capacitance = np.zeros((n, n))
    for i, name in enumerate(names):
        ancestry[i, i] = 1.0
        while name != STRUCTURE:
            name = names[node_of(parent[name])]
            ancestry[i, number[name]] = 1.0
    surface_node = np.array([node_of(f.name) for f in faces], dtype=np.intp)
    area = np.array([f.area_m2 for f in faces])
    if free_space_capacitance_F is None:
        free = 4.0 * pi * epsilon_0 * radius_m * area / area.sum()
        np.add.at(capacitance, (surface_node, surface_node), free)
    else:
        # index 0, structure, for what the matrix has beyond the faces
        bearer = np.pad(surface_node, (0, len(free_space_capacitance_F) - len(faces)))
        np.add.at(capacitance, np.ix_(bearer, bearer), free_space_capacitance_F)
    films = [(i, f) for i, f in enumerate(faces) if f.thickness_m > 0.0]
    for f in faces:
        if f.has_node:
            i, j = number[f.name], node_of(f.attached_to)
            between = (
                epsilon_0 * f.relative_permittivity * f.area_m2 / f.thickness_m
                if f.thickness_m > 0.0
                else f.isolated_capacitance_F
            )
            capacitance[i, i] += between
            capacitance[j, j] += between
            capacitance[i, j] -= between
            capacitance[j, i] -= between
    link_nodes = tuple((node_of(a), node_of(b)) for a, b, _ in links)
    link_rows = np.array([ancestry[a] - ancestry[b] for a, b in link_nodes]).reshape(-1, n)
    conductance = np.array([1.0 / r for _, _, r in links])
    return Network(
        node_names=tuple(names),
        ancestry=ancestry,
        capacitance_F=capacitance,
        surface_node=surface_node,
        area_m2=area,
        film_node=np.array([number[f.name] for _, f in films], dtype=np.intp),
        film_parent=np.array([node_of(f.attached_to) for _, f in films], dtype=np.intp),
        film_surface=np.array([i for i, _ in films], dtype=np.intp),
        film_thickness_m=np.array([f.thickness_m for _, f in films]),
        film_permittivity=np.array([f.relative_permittivity for _, f in films]),
        film_resistivity_ohm_m=np.array([f.resistivity_ohm_m for _, f in films]),
        film_activation_eV=np.array([f.activation_energy_eV for _, f in films]),
        film_radiation_S_m=np.array([f.radiation_conductivity_S_m for _, f in films]),
        film_radiation_exponent=np.array([f.radiation_exponent for _, f in films]),
        link_nodes=link_nodes,
        link_rows=link_rows,
        link_conductance_S=conductance,
        surface_ancestry=ancestry[surface_node],
        moves=np.ascontiguousarray(ancestry.T[:, surface_node]),
        link_stiffness_S=(link_rows.T * conductance) @ link_rows,
    )
