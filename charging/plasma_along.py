"""The plasma along a run: regions of space or a file of measured moments, ready for a march.

Everything is evaluated once, on knots dense enough that the straight line between two of them
errs by less than `LARGEST_ERROR` in the random currents and the pressure; a march interpolates.
Where the attitude changes at once, two knots stand at one time.
"""

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.constants import e

from charging.case_tables import Case
from charging.currents.flow import wake_assessable
from charging.currents.streams import Stream, Streams, focus_of
from charging.errors import InputError
from charging.flight import Path
from charging.temperature_basis import Basis, basis_of
from environments.plasma import Plasma
from environments.population_series import PopulationSeries, smoothstep

Array = NDArray[np.float64]
IntArray = NDArray[np.int64]

LARGEST_ERROR = 2e-3
SHORTEST_S = 0.05  # between knots: 400 m of a low orbit, far below the width of any boundary
ROUNDS = 10
MOST_KNOTS = 300_000
NOTICED = 1e-3
"""Share at which a region counts as met, for the steps of the march."""
DIRECTED = (0.5, 2.0)
"""Energy of the drift over the temperature, between which ions pass from isotropic to directed."""


class Arc(NamedTuple):
    """Electrons of one distribution on top of all else: plasma, and its share 0…1 at K times."""

    plasma: Plasma
    share: Array


class Sampled(NamedTuple):
    """Plasma at K times.

    populations : tuple of PopulationSeries; region : ndarray of int [K]; blend : ndarray [R, K],
    shares of the regions, R = 0 without regions; cautions : tuple of str; bases : mapping, share
    of the figures by basis; arc : Arc or None.
    """

    populations: tuple[PopulationSeries, ...]
    region: IntArray
    blend: Array
    cautions: tuple[str, ...]
    bases: Mapping[str, float]
    arc: Arc | None = None


Sampler = Callable[[Array], Sampled]
"""Plasma at times [s after the start]."""


@dataclass(frozen=True, slots=True)
class PlasmaAlong:
    """Plasma that changes along a run.

    Attributes
    ----------
    name : str
        "regions" or the name of the file.
    knots_s : ndarray [K]
    basis : tuple of Plasma, length B
        Fixed Maxwellians that carry everything isotropic.
    table : ndarray [K, B + Q (3 + S)]
        Densities of the basis; of directed ions their densities, pressures, speeds, and the
        speeds along the outward normals of S surfaces, positive into the ram.
    streams : Streams or None
        Kinds of the Q directed ions.
    sampled : Sampled
        At the knots.
    regions : tuple of str
        Names of the regions, empty for a file.
    breaks_s : tuple of float
        Where a region begins, ends, or becomes the largest.
    motional_V_m : float
        Largest field |v x B| aboard within 6 Earth radii [V m-1].
    """

    name: str
    knots_s: Array
    basis: tuple[Plasma, ...]
    table: Array
    streams: Streams | None
    sampled: Sampled
    regions: tuple[str, ...]
    breaks_s: tuple[float, ...]
    motional_V_m: float = 0.0

    @property
    def assumed(self) -> bool:
        """Whether any figure behind the plasma is assumed."""
        weakest = any(one.basis == "assumed" for one in self.sampled.populations)
        arc = self.sampled.arc
        weakest = weakest or (arc is not None and arc.plasma.basis == "assumed")
        return weakest or self.sampled.bases.get("assumed", 0.0) > 0.0

    def at(self, time_s: Array) -> tuple[Array, Stream | None]:
        """Densities of the basis [m, B] and directed ions at times [m]."""
        row = _between(self.knots_s, self.table, time_s)
        parts = len(self.basis)
        if self.streams is None:
            return row, None
        return row[..., :parts], self.streams.stream(row[..., parts:])

    def region_at(self, time_s: Array) -> IntArray:
        """Index of the region with the largest share at times [m]."""
        blend = _between(self.knots_s, self.sampled.blend.T, time_s)
        return np.asarray(blend.argmax(axis=-1), dtype=np.int64)

    def mean_of_regions(
        self, time_s: Array, values: Mapping[str, float], otherwise: Array
    ) -> Array:
        """Values by name of a region, weighted with the regions' shares at times [m].

        Regions without a value count `otherwise` [m].
        """
        if not self.regions:
            return otherwise
        blend = _between(self.knots_s, self.sampled.blend.T, time_s)
        by_region = [
            share * values[name] if name in values else share * otherwise
            for name, share in zip(self.regions, np.moveaxis(blend, -1, 0), strict=True)
        ]
        return np.asarray(np.sum(by_region, axis=0))

    def name_at(self, time_s: float) -> str:
        """What a report calls the plasma at a time: the region, or the file."""
        if not self.regions:
            return self.name
        return self.regions[int(self.region_at(np.array([time_s]))[0])]

    def unfed_wakes(self) -> NDArray[np.bool_]:
        """Whether surfaces [S] stand at some time in a wake that no light ions fill."""
        return np.asarray(self.unfed_at(self.knots_s).any(axis=0))

    def unfed_at(self, time_s: Array) -> NDArray[np.bool_]:
        """Whether surfaces [m, S] stand at times [m] in a wake that no light ions fill."""
        stream = self.at(time_s)[1]
        if stream is None or self.streams is None:
            return np.zeros((len(time_s), 0), dtype=bool)
        mass = np.array([one.mass_kg for one in self.streams.species])
        thermal = np.sqrt(2.0 * e * stream.temperature_eV / mass)
        speed = np.where(stream.speed_m_s > 0.0, stream.speed_m_s, 1.0)
        fed = wake_assessable(
            stream.density_m3[:, None, :],
            mass,
            (stream.speed_m_s / thermal)[:, None, :],
            stream.ram_m_s / speed[:, None, :],
        )
        # where half of the ions or more stream
        electrons = np.interp(time_s, self.knots_s, self._electrons())
        streaming = stream.density_m3.sum(axis=-1) > 0.5 * electrons
        return np.asarray(~fed & streaming[:, None])

    def _electrons(self) -> Array:
        """Density of the electrons at the knots [m-3]."""
        own = [p.density_m3 for p in self.sampled.populations if p.species.charge_number < 0]
        return np.asarray(sum(own, start=np.zeros(len(self.knots_s))))

    def moments(self, time_s: Array) -> tuple[Array, Array]:
        """Density [m-3] and temperature [eV] of the populations at times, each [N, m]."""
        density = np.stack([one.density_m3 for one in self.sampled.populations], axis=-1)
        kelvin = np.stack([one.temperature_eV for one in self.sampled.populations], axis=-1)
        n = _between(self.knots_s, density, time_s)
        pressure = _between(self.knots_s, density * kelvin, time_s)
        absent = _between(self.knots_s, kelvin, time_s)
        return n.T, np.where(n > 0.0, pressure / np.where(n > 0.0, n, 1.0), absent).T


def _between(knots: Array, table: Array, time_s: Array) -> Array:
    """Rows of a table [K, C] at times [m], linear between knots; after a double knot's second."""
    k = np.searchsorted(knots, time_s, side="right") - 1
    k = np.minimum(np.maximum(k, 0), len(knots) - 2)
    left = knots[k]
    share = (time_s - left) / (knots[k + 1] - left)
    below = table[k]
    return np.asarray(below + share[..., None] * (table[k + 1] - below))


def plasma_on_way(
    case: Case, way: Path, sample: Sampler, knots_s: Array, jumps_s: Sequence[float],
    name: str, regions: Sequence[str],
) -> PlasmaAlong:  # fmt: skip
    """Tabulate the plasma along a way.

    Parameters
    ----------
    case : Case
    way : Path
    sample : Sampler
    knots_s : ndarray [K]
        Knots of the motion, from start to end of the run.
    jumps_s : sequence of float
        Times at which something jumps, such as Kp.
    name : str
    regions : sequence of str

    Raises
    ------
    InputError
        No electrons or no ions somewhere along the way; directed ions on a spin that is not
        followed.
    """
    knots = _refined(sample, _with_jumps(knots_s, jumps_s))
    times = []
    for leg in way.legs:
        inside = knots[(knots > leg.start_s) & (knots < leg.end_s)]
        times.append(np.concatenate([[leg.start_s], inside, [leg.end_s]]))
    counts = [len(own) for own in times]
    time = np.concatenate(times)
    found = sample(time)
    _refuse_one_sided(case, found.populations, time)
    at_rest, directed = _parted(found.populations, way, time)
    basis: Basis = basis_of(at_rest, name)
    table, streams, plasmas = basis.weights, None, basis.plasmas
    if found.arc is not None:
        table = np.hstack([table, found.arc.share[:, None]])
        plasmas = (*plasmas, found.arc.plasma)
    if directed:
        table, streams = _with_streams(table, directed, way, time, counts)
    edges = _edges(time, found.blend)
    return PlasmaAlong(
        name, time, plasmas, np.ascontiguousarray(table), streams, found, tuple(regions),
        tuple(sorted({*edges, *(t for t in jumps_s if 0.0 < t < time[-1])})),
    )  # fmt: skip


def _with_jumps(knots: Array, jumps: Sequence[float]) -> Array:
    """Knots half a shortest step on either side of every jump too."""
    beside = [t + d for t in jumps for d in (-0.5 * SHORTEST_S, 0.5 * SHORTEST_S)]
    inside = [t for t in beside if knots[0] < t < knots[-1]]
    return np.union1d(knots, inside) if inside else knots


def _scalars(found: Sampled) -> Array:
    """Random electron and ion currents and the electrons' pressure, [3, K], in plain units."""
    shape = found.region.shape
    total = np.zeros((3, *shape))
    for one in found.populations:
        electron = one.species.charge_number < 0
        flux = one.density_m3 * np.sqrt(one.temperature_eV / one.species.mass_kg)
        total[0 if electron else 1] += flux
        if electron:
            total[2] += one.density_m3 * one.temperature_eV
    if found.arc is not None:
        for p in found.arc.plasma.populations:
            density = p.density_m3 * found.arc.share
            total[0] += density * np.sqrt(p.temperature_eV / p.species.mass_kg)
            total[2] += density * p.temperature_eV
    return total


def _refined(sample: Sampler, knots: Array) -> Array:
    """Knots with more of them where straight lines err by more than `LARGEST_ERROR`."""
    values = _scalars(sample(knots))
    open_ = np.arange(knots.size - 1)
    for _ in range(ROUNDS):
        wide = knots[open_ + 1] - knots[open_] > 2.0 * SHORTEST_S
        open_ = open_[wide]
        if not open_.size or knots.size > MOST_KNOTS:
            break
        middle = 0.5 * (knots[open_] + knots[open_ + 1])
        between = _scalars(sample(middle))
        straight = 0.5 * (values[:, open_] + values[:, open_ + 1])
        size = np.maximum(between, straight)
        error = np.abs(between - straight) > LARGEST_ERROR * size
        coarse = error.any(axis=0)
        if not coarse.any():
            break
        at = open_[coarse] + 1
        knots = np.insert(knots, at, middle[coarse])
        values = np.insert(values, at, between[:, coarse], axis=1)
        left = at - 1 + np.arange(at.size)
        open_ = np.sort(np.concatenate([left, left + 1]))
    return knots


def _refuse_one_sided(case: Case, populations: Sequence[PopulationSeries], time: Array) -> None:
    from charging.clock import iso_time

    for sign, word in ((-1, "electrons"), (1, "positive ions")):
        density = sum(
            (p.density_m3 for p in populations if p.species.charge_number * sign > 0),
            start=np.zeros(len(time)),
        )
        empty = np.flatnonzero(density <= 0.0)
        if empty.size:
            raise InputError(
                f"the plasma holds no {word} at {iso_time(case.epoch, float(time[empty[0]]))}",
                key=("plasma",), value=case.plasma.base,
                allowed="electrons and positive ions at every time of the run",
            )  # fmt: skip


def _parted(
    populations: Sequence[PopulationSeries], way: Path, time: Array
) -> tuple[list[PopulationSeries], list[tuple[PopulationSeries, Array]]]:
    """Populations at rest, and directed ions with their velocity past the spacecraft [3, K].

    Electrons, far faster than any spacecraft, are at rest. Ions pass from one to the other as
    the energy of their drift passes their temperature.
    """
    own = way.velocity(time)
    rest: list[PopulationSeries] = []
    directed: list[tuple[PopulationSeries, Array]] = []
    for one in populations:
        if one.velocity_m_s is None or one.species.charge_number < 0:
            rest.append(one)
            continue
        past = one.velocity_m_s - own
        energy = 0.5 * one.species.mass_kg / e * (past**2).sum(axis=0)
        share = smoothstep(energy / one.temperature_eV, *DIRECTED)
        share = np.where(one.density_m3 > 0.0, share, 0.0)
        if bool(np.any(share > 0.0)):
            directed.append((_scaled(one, share), past))
        if bool(np.any((share < 1.0) & (one.density_m3 > 0.0))):
            rest.append(_scaled(one, 1.0 - share))
    return rest, directed


def _scaled(one: PopulationSeries, share: Array) -> PopulationSeries:
    return replace(one, density_m3=one.density_m3 * share)


def _with_streams(
    weights: Array, directed: Sequence[tuple[PopulationSeries, Array]], way: Path, time: Array,
    counts: Sequence[int],
) -> tuple[Array, Streams]:  # fmt: skip
    """Table with the columns of directed ions, and their kinds."""
    density = np.stack([one.density_m3 for one, _ in directed], axis=-1)
    temperature = np.stack([one.temperature_eV for one, _ in directed], axis=-1)
    speed = np.stack([np.sqrt((past**2).sum(axis=0)) for _, past in directed], axis=-1)
    ends = np.cumsum(counts)
    normal = np.concatenate(
        [
            np.stack(
                [-way.along_normals(k, time[a:b], past[:, a:b]) for _, past in directed], axis=-1
            )
            for k, (a, b) in enumerate(zip(ends - counts, ends, strict=True))
        ],
        axis=1,
    )  # [S, K, Q]
    surfaces = normal.shape[0]
    flat = normal.transpose(1, 0, 2).reshape(len(time), -1)
    species = tuple(one.species for one, _ in directed)
    kinds = Streams(species, surfaces, focus_of(species, density, temperature, speed))
    return np.hstack([weights, density, density * temperature, speed, flat]), kinds


def _edges(time: Array, blend: Array) -> set[float]:
    """Times at which a region begins, ends or becomes the largest, by straight lines."""
    if not blend.size:
        return set()
    found: set[float] = set()
    rows = [row - NOTICED for row in blend if bool(np.any(row > 0.0))]
    largest = blend.argmax(axis=0)
    for k in np.flatnonzero(largest[1:] != largest[:-1]):
        rows.append(np.zeros(len(time)))
        rows[-1][: k + 1], rows[-1][k + 1 :] = -1.0, 1.0
    for row in rows:
        at = np.flatnonzero((row[1:] * row[:-1] < 0.0) & (time[1:] > time[:-1]))
        step = (time[at + 1] - time[at]) / (row[at + 1] - row[at])
        found |= set((time[at] - row[at] * step).tolist())
    return found
