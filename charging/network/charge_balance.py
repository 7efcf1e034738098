"""The charge balance of a whole spacecraft as a stiff system for the march."""

from dataclasses import dataclass, replace
from typing import Any, NamedTuple, Protocol

import numpy as np
from numpy.typing import NDArray

from charging.currents.barrier import escape_height
from charging.currents.barrier_field import Barriers, Heights
from charging.currents.lookup import NetCurrents
from charging.currents.shielding import shielded, shielded_height, vacuum_share
from charging.currents.surface import Setting, SurfaceModel, surface_currents
from charging.currents.tables import REACH_V
from charging.network.emitters import NO_EMITTERS, Emitters
from charging.network.nodes import Network
from charging.network.strings import Ends, Strings
from materials.conduction import (
    LARGEST_FIELD_V_m,
    arrhenius_kernel,
    enhancement_scales,
    radiation_kernel,
    scaled_enhancement,
    scaled_enhancement_and_slope,
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

    def string_ends_V(self, time_s: Array) -> Array | None:
        """Return what the motion adds to negative, then positive ends of strings [V, m, 2 G]."""
        ...

    def dose_rate_rad_s(self, time_s: Array) -> Array:
        """Return the dose rate in the films [rad/s, m]; only asked of an irradiated balance."""
        ...


class Flows(NamedTuple):
    """Currents of one evaluation by the direct path, at times [m].

    surface_A_m2 : ndarray [m, S, 6], order of `surface.MECHANISMS`;
    film_A_m2 : ndarray [m, F], conduction arriving at the outer face;
    link_A : ndarray [m, L], from the first to the second end (positive lowers the first);
    emitter_A : ndarray [m, E], arriving on structure;
    string_A : ndarray [m, G], the same through strings of solar cells;
    string_gross_A : ndarray [m, G], what strings exchange with the plasma either way.
    """

    surface_A_m2: Array
    film_A_m2: Array
    link_A: Array
    emitter_A: Array
    string_A: Array
    string_gross_A: Array


class Moment(NamedTuple):
    """Surroundings of members [m] at one time each.

    setting : Setting
    film_conductivity_S_m : ndarray [m, F], without field
    release, jump : ndarray [m, F], scales of the field's effect, see `enhancement_scales`
    working : ndarray [m, E], 1 for emitters that work, or None without emitters
    induced_S_m : ndarray [m, F], conductivity by radiation, which no field enhances, or None
    ends : Ends of the strings, or None without strings
    vacuum : ndarray [m, 1], share of the barriers that stand, or None where they stand whole
    """

    setting: Setting
    film_conductivity_S_m: Array
    release: Array
    jump: Array
    working: Array | None
    induced_S_m: Array | None = None
    ends: Ends | None = None
    vacuum: Array | None = None


def _split(whole: Any, parts: int) -> list[Any]:
    """Equal parts of all arrays [parts·m, ...] inside nested named tuples."""
    if isinstance(whole, np.ndarray):
        return list(whole.reshape(parts, len(whole) // parts, *whole.shape[1:]))
    if isinstance(whole, tuple):
        columns = [_split(value, parts) for value in whole]
        return [type(whole)(*row) for row in zip(*columns, strict=True)]
    return [whole] * parts


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
    mass : ndarray [n, n] or [M, n, n]
    emitters : Emitters
    safe_V : float
        States whose variables are all smaller are admissible, see `safe_state_V`.
    barriers : Barriers or None
        In front of the surfaces; None: electrons climb to the plasma alone.
    strings : Strings or None
        Strings of solar cells on structure.
    irradiated : bool
        Whether there is a dose rate.
    """

    models: tuple[SurfaceModel, ...]
    table: NetCurrents
    net: Network
    around: Around
    mass: Array
    emitters: Emitters = NO_EMITTERS
    safe_V: float = 0.0
    barriers: Barriers | None = None
    strings: Strings | None = None
    irradiated: bool = False

    def of(self, member: int) -> "ChargeBalance":
        """Charge balance of one member alone, as member 0; not with coarse tables."""
        if not self.models:
            raise ValueError("the coarse tables of an ensemble are not taken apart")
        table = replace(self.table, table=self.table.table[member : member + 1])
        return replace(
            self,
            models=self.models[member : member + 1],
            table=table,
            net=self.net.of(member),
            mass=self.mass if self.mass.ndim == 2 else self.mass[member],
            emitters=self.emitters.of(np.intp(member)),
            barriers=None if self.barriers is None else self.barriers.of(member),
            strings=None if self.strings is None else self.strings.of(member),
        )

    def moments(self, member: Index, time_s: Array) -> list[Moment]:
        """Surroundings of members [m] at times [K, m]: one look-up for K moments."""
        whole_s, which = time_s.ravel(), np.tile(member, len(time_s))
        setting, temperature = self.around.at(whole_s)
        film = temperature[..., self.net.film_surface]
        release, jump = enhancement_scales(film, self.net.each("film_permittivity", which))
        setting = self.table.prepared(which, setting)
        whole = Moment(
            setting,
            self._conductivity(which, film),
            release,
            jump,
            self.around.emitting(whole_s) if self.emitters.names else None,
            self._induced(which, whole_s) if self.irradiated else None,
            None
            if self.strings is None
            else self.strings.moment(which, setting, self.around.string_ends_V(whole_s)),
            self.vacuum(which, setting),
        )
        return [whole] if len(time_s) == 1 else _split(whole, len(time_s))

    def rhs(self, member: Index, time_s: Array, y: Array) -> Array:
        """Charge rates [A] of the state variables [m, n]."""
        return self.rates_at(member, self.moments(member, time_s[None])[0], y)

    def rhs_and_jacobian(self, member: Index, time_s: Array, y: Array) -> tuple[Array, Array]:
        """Charge rates [A] of the state variables [m, n] and derivatives [A/V, m, n, n]."""
        return self._rate_and_jacobian(member, self.moments(member, time_s[None])[0], y)

    def start(
        self, member: Index, moment: Moment, later: Moment, y: Array
    ) -> tuple[Array, Array, Array]:
        """Charge rates [m, n], derivatives by y [m, n, n], and charge rates at a later moment."""
        rate, jacobian = self._rate_and_jacobian(member, moment, y)
        return rate, jacobian, self.rates_at(member, later, y)

    def rates_at(self, member: Index, moment: Moment, y: Array) -> Array:
        """Charge rates [A] of the state variables [m, n] at one of `moments`."""
        potential = self._surface_potential(y)
        height = None
        if self.barriers is not None:
            height = self._heights(member, moment.vacuum, y, potential)
        current = self.table.current(member, potential, moment.setting, height)
        rate = self._rates(member, current, self._film_current(member, moment, y), y)
        if moment.working is not None:
            rate[:, 0] += self._emitted(member, moment.working, y)[0].sum(axis=-1)
        if self.strings is not None and moment.ends is not None:
            rate[:, 0] += self.strings.current_A(member, moment.ends, y[:, 0]).sum(axis=-1)
        return rate

    def _rate_and_jacobian(self, member: Index, moment: Moment, y: Array) -> tuple[Array, Array]:
        net = self.net
        potential = self._surface_potential(y)
        found, by_height = None, np.zeros_like(potential)
        if self.barriers is None:
            current, slope = self.table.current_and_slope(member, potential, moment.setting)
        else:
            found = self.barriers.heights_and_slopes(member, net.potentials(y), potential)
            if moment.vacuum is not None:
                found = shielded(found, escape_height(potential), moment.vacuum)
            current, by_potential, by_height = self.table.slopes(
                member, potential, moment.setting, found.height_V
            )
            slope = by_potential + by_height * found.own
        film, film_slope = self._films(member, moment, y)
        moves, area = net.moves, net.each("area_m2", member)
        jacobian = ((moves * (area * slope)[:, None, :])[:, :, None, :] * moves).sum(axis=-1)
        jacobian[:, net.film_node, net.film_node] += film_slope * area[..., net.film_surface]
        jacobian -= net.each("link_stiffness_S", member)
        if found is not None and len(found.member):
            through = (area * by_height)[found.member, found.surface]
            self._add_rows(jacobian, found, through[:, None] * found.rows)
        rate = self._rates(member, current, film, y)
        if moment.working is not None:
            arriving, by_structure = self._emitted(member, moment.working, y)
            rate[:, 0] += arriving.sum(axis=-1)
            jacobian[:, 0, 0] += by_structure.sum(axis=-1)
        if self.strings is not None and moment.ends is not None:
            arriving, by_structure = self.strings.arriving(member, moment.ends, y[:, 0])
            rate[:, 0] += arriving.sum(axis=-1)
            jacobian[:, 0, 0] += by_structure.sum(axis=-1)
        return rate, jacobian

    def _add_rows(self, jacobian: Array, found: Heights, rows: Array) -> None:
        """Add to derivatives [m, n, n] how currents [A] of surfaces follow node potentials."""
        # one product of small arrays per barrier: nothing is summed over members
        by_state = np.matmul(rows[:, None, :], self.net.ancestry)[:, 0]
        barrier, variable = np.nonzero(self.net.moves.T[found.surface])
        np.add.at(jacobian, (found.member[barrier], variable), by_state[barrier])

    def _surface_potential(self, y: Array) -> Array:
        """Potential of every surface [m, S]."""
        v: Array = (self.net.surface_ancestry * y[..., None, :]).sum(axis=-1)
        return v

    def _emitted(self, member: Index, working: Array, y: Array) -> tuple[Array, Array]:
        """Currents of the emitters onto structure [A, m, E], and slopes by y[:, 0]."""
        return self.emitters.of(member).arriving(y[:, 0], working)

    def _rates(self, member: Index, current: Array, film: Array, y: Array) -> Array:
        """Charge rates [m, n] from current densities of surfaces [m, S] and films [m, F]."""
        net, area = self.net, self.net.each("area_m2", member)
        rate: Array = (net.moves * (area * current)[:, None, :]).sum(axis=-1)
        rate[:, net.film_node] += film * area[..., net.film_surface]
        if net.link_nodes:
            rate -= (net.link_rows * self._links(member, y)[..., None]).sum(axis=-2)
        return rate

    def _conductivity(self, member: Index, temperature_K: Array) -> Array:
        """Conductivity of the films without field [S/m, m, F]."""
        each = self.net.each
        arrhenius = arrhenius_kernel(temperature_K, each("film_activation_eV", member))
        return np.asarray(arrhenius / each("film_resistivity_ohm_m", member))

    def _induced(self, member: Index, time_s: Array) -> Array:
        """Conductivity of the films by radiation [S/m, m, F]."""
        dose = self.around.dose_rate_rad_s(time_s)[..., None]
        each = self.net.each
        return radiation_kernel(
            dose, each("film_radiation_S_m", member), each("film_radiation_exponent", member)
        )

    def _film_current(self, member: Index, moment: Moment, y: Array) -> Array:
        """Conduction through films [A m-2, m, F], positive to the outer face."""
        net = self.net
        field = y.take(net.film_node, axis=1) / net.each("film_thickness_m", member)
        factor = scaled_enhancement(np.abs(field), moment.release, moment.jump)
        current = -moment.film_conductivity_S_m * field * factor
        return current if moment.induced_S_m is None else current - moment.induced_S_m * field

    def _films(self, member: Index, moment: Moment, y: Array) -> tuple[Array, Array]:
        """Conduction through films [A m-2], positive to the outer face, and slope by y."""
        net = self.net
        thickness = net.each("film_thickness_m", member)
        field = y.take(net.film_node, axis=1) / thickness
        sigma = moment.film_conductivity_S_m
        factor, d_factor = scaled_enhancement_and_slope(field, moment.release, moment.jump)
        current, slope = -sigma * field * factor, -sigma * (factor + d_factor * field) / thickness
        if moment.induced_S_m is not None:
            current = current - moment.induced_S_m * field
            slope = slope - moment.induced_S_m / thickness
        return current, slope

    def _links(self, member: Index, y: Array) -> Array:
        across: Array = (self.net.link_rows * y[:, None, :]).sum(axis=-1)
        return across * self.net.each("link_conductance_S", member)

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
        setting, _ = self.around.at(time_s)
        if light is not None:
            setting = setting._replace(
                light=light, illumination=1.0 if illumination is None else illumination
            )
        which = np.full(len(time_s), member)
        height = self.heights(which, y, setting)
        by_mechanism = surface_currents(
            self.models[member], potential, setting, height
        ).by_mechanism
        (moment,) = self.moments(which, time_s[None])
        film = self._film_current(which, moment, y)
        emitted = np.zeros((len(time_s), 0))
        if moment.working is not None:
            emitted = self._emitted(which, moment.working, y)[0]
        strung = np.zeros((2, len(time_s), 0))
        if self.strings is not None:
            strung = self.strings.direct(
                member, setting, self.around.string_ends_V(time_s), y[:, 0]
            )
        return Flows(by_mechanism, film, self._links(which, y), emitted, *strung)

    def heights(self, member: Index, y: Array, setting: Setting) -> Array:
        """What photo- and secondary electrons must climb to leave [V, m, S]."""
        vacuum = self.vacuum(member, self.table.prepared(member, setting))
        return self._heights(member, vacuum, y, self._surface_potential(y))

    def _heights(self, member: Index, vacuum: Array | None, y: Array, potential: Array) -> Array:
        if self.barriers is None:
            return escape_height(potential)[0]
        whole = self.barriers.heights(member, self.net.potentials(y), potential)
        if vacuum is None:
            return whole
        return shielded_height(escape_height(potential)[0], whole, vacuum)

    def vacuum(self, member: Index, setting: Setting) -> Array | None:
        """Share of the barriers that stand [m, 1], of a prepared setting; None where all do."""
        if self.barriers is None or setting.kept is None:
            return None
        radius_m2 = self.table.sheath.radius_m2[self.table.table[member]][:, None]
        share = vacuum_share(setting.kept.sheath_m2, radius_m2)
        return share if bool((share < 1.0).any()) else None

    def node_currents(self, flows: Flows, member: int = 0) -> Array:
        """Net current of a member into every node [A, m, n], conduction and links included."""
        net = self.net.of(member)
        into = np.zeros((len(flows.film_A_m2), len(net.node_names)))
        arriving = flows.surface_A_m2.sum(axis=-1) * net.area_m2
        for surface, node in enumerate(net.surface_node):
            into[:, node] += arriving[:, surface]
        film = flows.film_A_m2 * net.area_m2[net.film_surface]
        for i, (face, below) in enumerate(zip(net.film_node, net.film_parent, strict=True)):
            into[:, face] += film[:, i]
            into[:, below] -= film[:, i]
        into[:, 0] += flows.emitter_A.sum(axis=-1) + flows.string_A.sum(axis=-1)
        for row, ends in enumerate(net.link_nodes):
            into[:, ends[0]] -= flows.link_A[:, row]
            into[:, ends[1]] += flows.link_A[:, row]
        return into

    def controlled(self, y: Array) -> Array:
        """Absolute and differential potentials: both must be right."""
        return np.concatenate([y, self.net.potentials(y)[..., 1:]], axis=-1)

    def admissible(self, member: Index, y: Array) -> NDArray[np.bool_]:
        """Potentials inside the tables and fields inside the conduction law."""
        if np.abs(y).max() < self.safe_V:
            return np.ones(len(y), dtype=np.bool_)
        inside = (np.abs(self.controlled(y)) < 0.5 * REACH_V).all(axis=-1)
        thickness = self.net.each("film_thickness_m", member)
        field = np.abs(y[:, self.net.film_node]) / thickness
        return np.asarray(inside & (field < LARGEST_FIELD_V_m).all(axis=-1))


def safe_state_V(net: Network) -> float:
    """Size [V] below which all state variables together surely make an admissible state."""
    depth = float(net.ancestry.sum(axis=-1).max())
    return min(0.4 * REACH_V / depth, 0.9 * LARGEST_FIELD_V_m * thinnest(net))


def thinnest(net: Network) -> float:
    """Thickness of the thinnest film of all members [m], infinite without films."""
    return float(net.film_thickness_m.min()) if net.film_thickness_m.size else np.inf
