"""The charge balance of a whole spacecraft as a stiff system for the march."""

from dataclasses import dataclass
from typing import NamedTuple, Protocol

import numpy as np
from numpy.typing import NDArray

from charging.currents.lookup import NetCurrents
from charging.currents.surface import Setting, SurfaceModel, surface_currents
from charging.currents.tables import REACH_V
from charging.network.emitters import NO_EMITTERS, Emitters
from charging.network.nodes import Network
from materials.conduction import (
    LARGEST_FIELD_V_m,
    arrhenius_kernel,
    enhancement_factor_kernel,
    enhancement_kernel,
)

Array = NDArray[np.float64]
Index = NDArray[np.intp]


class Around(Protocol):
    """What the balance needs to know of the orbit, at any times [m]."""

    def at(self, time_s: Array) -> tuple[Setting, Array]:
        """Return plasma shares [m, P] and light [m, S], and surface temperatures [K, m, S]."""
        ...

    def emitting(self, time_s: Array) -> Array:
        """Return 1 for emitters [m, E] that work and 0 for the others."""
        ...


class Flows(NamedTuple):
    """Currents of one evaluation by the direct path, at times [m].

    surface_A_m2 : ndarray [m, S, 6], order of `surface.MECHANISMS`;
    film_A_m2 : ndarray [m, F], conduction arriving at the outer face;
    link_A : ndarray [m, L], from the first to the second end (positive lowers the first);
    emitter_A : ndarray [m, E], arriving on structure.
    """

    surface_A_m2: Array
    film_A_m2: Array
    link_A: Array
    emitter_A: Array


@dataclass(frozen=True, slots=True)
class ChargeBalance:
    """``System`` of the march for members that differ in their surface model.

    Attributes
    ----------
    models : tuple of SurfaceModel
        One per member.
    table : NetCurrents
        Built from `models`.
    net : Network
    around : Around
    mass : ndarray [n, n]
    emitters : Emitters
    """

    models: tuple[SurfaceModel, ...]
    table: NetCurrents
    net: Network
    around: Around
    mass: Array
    emitters: Emitters = NO_EMITTERS

    def rhs(self, member: Index, time_s: Array, y: Array) -> Array:
        """Charge rates [A] of the state variables [m, n]."""
        setting, temperature = self.around.at(time_s)
        potential = self.net.potentials(y)[:, self.net.surface_node]
        current = self.table.current(member, potential, setting)
        rate = self._rates(current, self._film_current(temperature, y), y)
        if self.emitters.names:
            rate[:, 0] += self._emitted(time_s, y)[0].sum(axis=-1)
        return rate

    def rhs_and_jacobian(self, member: Index, time_s: Array, y: Array) -> tuple[Array, Array]:
        """Charge rates [A] of the state variables [m, n] and derivatives [A/V, m, n, n]."""
        net = self.net
        setting, temperature = self.around.at(time_s)
        potential = net.potentials(y)[:, net.surface_node]
        current, slope = self.table.current_and_slope(member, potential, setting)
        film, film_slope = self._films(temperature, y)
        moves = net.moves
        jacobian = ((moves * (net.area_m2 * slope)[:, None, :])[:, :, None, :] * moves).sum(axis=-1)
        jacobian[:, net.film_node, net.film_node] += film_slope * net.area_m2[net.film_surface]
        jacobian -= net.link_stiffness_S
        rate = self._rates(current, film, y)
        if self.emitters.names:
            arriving, by_structure = self._emitted(time_s, y)
            rate[:, 0] += arriving.sum(axis=-1)
            jacobian[:, 0, 0] += by_structure.sum(axis=-1)
        return rate, jacobian

    def _emitted(self, time_s: Array, y: Array) -> tuple[Array, Array]:
        """Currents of the emitters onto structure [A, m, E], and slopes by y[:, 0]."""
        if not self.emitters.names:
            none = np.zeros((len(time_s), 0))
            return none, none
        return self.emitters.arriving(y[:, 0], self.around.emitting(time_s))

    def _rates(self, current: Array, film: Array, y: Array) -> Array:
        """Charge rates [m, n] from current densities of surfaces [m, S] and films [m, F]."""
        net = self.net
        rate: Array = (net.moves * (net.area_m2 * current)[:, None, :]).sum(axis=-1)
        rate[:, net.film_node] += film * net.area_m2[net.film_surface]
        if net.link_nodes:
            rate -= (net.link_rows * self._links(y)[..., None]).sum(axis=-2)
        return rate

    def _film_current(self, temperature_K: Array, y: Array) -> Array:
        """Conduction through films [A m-2, m, F], positive to the outer face."""
        net = self.net
        field = y[:, net.film_node] / net.film_thickness_m
        temperature = temperature_K[:, net.film_surface]
        sigma = arrhenius_kernel(temperature, net.film_activation_eV) / net.film_resistivity_ohm_m
        return -sigma * field * enhancement_factor_kernel(field, temperature, net.film_permittivity)

    def _films(self, temperature_K: Array, y: Array) -> tuple[Array, Array]:
        """Conduction through films [A m-2], positive to the outer face, and slope by y."""
        net = self.net
        field = y[:, net.film_node] / net.film_thickness_m
        temperature = temperature_K[:, net.film_surface]
        sigma = arrhenius_kernel(temperature, net.film_activation_eV) / net.film_resistivity_ohm_m
        factor, d_factor = enhancement_kernel(field, temperature, net.film_permittivity)
        return -sigma * factor * field, -sigma * (factor + d_factor * field) / net.film_thickness_m

    def _links(self, y: Array) -> Array:
        across: Array = (self.net.link_rows * y[:, None, :]).sum(axis=-1)
        return across * self.net.link_conductance_S

    def flows(
        self,
        member: int,
        time_s: Array,
        y: Array,
        light: Array | None = None,
        illumination: Array | None = None,
    ) -> Flows:
        """Evaluate all currents of one member by the direct path, not by the march's tables.

        `light` [m, S] and `illumination` [m, 1] replace the interpolated ones where the exact
        ones are known; give both.
        """
        potential = self.net.potentials(y)[:, self.net.surface_node]
        setting, temperature = self.around.at(time_s)
        if light is not None:
            setting = setting._replace(
                light=light, illumination=1.0 if illumination is None else illumination
            )
        by_mechanism = surface_currents(self.models[member], potential, setting).by_mechanism
        film = self._film_current(temperature, y)
        return Flows(by_mechanism, film, self._links(y), self._emitted(time_s, y)[0])

    def node_currents(self, flows: Flows) -> Array:
        """Net current into every node [A, m, n], conduction and links included."""
        net = self.net
        into = np.zeros((len(flows.film_A_m2), len(net.node_names)))
        arriving = flows.surface_A_m2.sum(axis=-1) * net.area_m2
        for surface, node in enumerate(net.surface_node):
            into[:, node] += arriving[:, surface]
        film = flows.film_A_m2 * net.area_m2[net.film_surface]
        for i, (face, below) in enumerate(zip(net.film_node, net.film_parent, strict=True)):
            into[:, face] += film[:, i]
            into[:, below] -= film[:, i]
        into[:, 0] += flows.emitter_A.sum(axis=-1)
        for row, ends in enumerate(net.link_nodes):
            into[:, ends[0]] -= flows.link_A[:, row]
            into[:, ends[1]] += flows.link_A[:, row]
        return into

    def controlled(self, y: Array) -> Array:
        """Absolute and differential potentials: both must be right."""
        return np.concatenate([y, self.net.potentials(y)[..., 1:]], axis=-1)

    def admissible(self, y: Array) -> NDArray[np.bool_]:
        """Potentials inside the tables and fields inside the conduction law."""
        inside = (np.abs(self.controlled(y)) < 0.5 * REACH_V).all(axis=-1)
        field = np.abs(y[:, self.net.film_node]) / self.net.film_thickness_m
        return np.asarray(inside & (field < LARGEST_FIELD_V_m).all(axis=-1))
