"""What surrounds the spacecraft along its orbit: light, temperature, plasma, emitters.

Geometry is evaluated once per case on knots dense enough that linear interpolation
errs by less than 2e-5 in an incidence cosine or an illumination; a march then only
interpolates. Where a mode begins or ends, two knots stand at one time: before and after.
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from charging.case_files import NO_FILES, CaseFiles
from charging.case_modes import Mode
from charging.case_strings import NO_RADIATION, Radiation
from charging.case_tables import Case
from charging.currents.surface import Setting
from charging.flight import (
    Path,
    contacts,
    eclipses_of,
    moments,
    path,
)
from charging.motion_knots import motion_knots, penumbrae
from charging.motional import string_potentials_V
from charging.plasma_along import PlasmaAlong
from charging.plasma_sources import along
from charging.schedule import Leg, plasma_names
from charging.temperatures import surface_temperatures
from environments.eclipse import Eclipse
from environments.plasma import Plasma

Array = NDArray[np.float64]

LARGEST_LIGHT_ERROR = 1e-5
MOST_REFINED = 200_000
FINE_STEP_S, FINE_MARGIN_S, FINE_LONGEST_S = 1.0, 60.0, 900.0
MOST_FINE = 100_000
FIRST_OUTPUT_S = 1e-3
_APART_S = 1e-6  # breaks nearer to each other than this are one


class Episode(NamedTuple):
    """One plasma event [s after the start] and the index of its plasma."""

    onset_s: float
    rise_s: float
    hold_s: float
    decay_s: float
    plasma: int


class LegState(NamedTuple):
    """What a leg of the run switches: base plasma by index, plasma events, emitters."""

    plasma: int = 0
    events: bool = True
    emitting: tuple[bool, ...] = ()


@dataclass(frozen=True, slots=True)
class Surroundings:
    """Tabulated surroundings of one mode of a case.

    Attributes
    ----------
    knots_s : ndarray [K]
    table : ndarray [K, 2S+1]
        Illumination times incidence cosine of each surface, their temperatures [K], then the
        illumination.
    episodes : tuple of Episode
    plasma_count : int
        Columns of the strength: the base or its basis, one per event, those of interval modes.
    breaks_s : tuple of float
        Kinks and jumps: contacts of eclipses, edges of events, modes and emitters, terminator
        crossings of surfaces.
    eclipses : tuple of Eclipse
        Times in seconds after the start.
    edges_s : tuple of float
        Where one leg of the run ends and the next begins.
    states : tuple of LegState
        One per leg.
    along : PlasmaAlong or None
        The base where it changes along the orbit; its basis takes the first columns.
    radiation : Radiation
        Dose rate, constant or by region.
    motional_V : ndarray [K, 2E] or None
        What v x B . L adds to negative and positive ends of strings.
    """

    knots_s: Array
    table: Array
    episodes: tuple[Episode, ...]
    plasma_count: int
    breaks_s: tuple[float, ...]
    eclipses: tuple[Eclipse, ...]
    edges_s: tuple[float, ...] = ()
    states: tuple[LegState, ...] = (LegState(),)
    along: PlasmaAlong | None = None
    radiation: Radiation = NO_RADIATION
    motional_V: Array | None = None

    @property
    def basis(self) -> tuple[Plasma, ...]:
        """Plasmas that stand for the base; empty where the base is one plasma."""
        return () if self.along is None else self.along.basis

    def _blend(self, time_s: Array) -> Array:
        k = np.searchsorted(self.knots_s, time_s, side="right") - 1
        k = np.minimum(np.maximum(k, 0), len(self.knots_s) - 2)
        left = self.knots_s[k]
        share = (time_s - left) / (self.knots_s[k + 1] - left)
        below = self.table[k]
        return below + share[..., None] * (self.table[k + 1] - below)

    def at(self, time_s: Array) -> tuple[Setting, Array]:
        """Plasma shares [m, P] and light [m, S], and surface temperatures [K, m, S]."""
        both = self._blend(time_s)
        surfaces = both.shape[-1] // 2
        light, illumination = both[..., :surfaces], both[..., -1:]
        if self.along is None:
            setting = Setting(self.strength(time_s), light, illumination)
        else:
            base, stream = self.along.at(time_s)
            strength, present = self._mixed(time_s, base)
            if stream is not None:
                stream = stream._replace(density_m3=stream.density_m3 * present[..., None])
            setting = Setting(strength, light, illumination, stream=stream)
        return setting, both[..., surfaces:-1]

    def leg(self, time_s: Array) -> NDArray[np.intp]:
        """Number of the leg at times [m]; at an edge, the one that begins."""
        return np.searchsorted(self.edges_s, time_s, side="right")

    def emitting(self, time_s: Array) -> Array:
        """1 for emitters [m, E] that work, 0 for the others."""
        return np.array([state.emitting for state in self.states], dtype=np.float64)[
            self.leg(time_s)
        ]

    def string_ends_V(self, time_s: Array) -> Array | None:
        """What the motion adds to negative and positive ends of strings [V, m, 2 E], or None."""
        if self.motional_V is None:
            return None
        k = np.searchsorted(self.knots_s, time_s, side="right") - 1
        k = np.minimum(np.maximum(k, 0), len(self.knots_s) - 2)
        share = (time_s - self.knots_s[k]) / (self.knots_s[k + 1] - self.knots_s[k])
        below = self.motional_V[k]
        return np.asarray(below + share[..., None] * (self.motional_V[k + 1] - below))

    def dose_rate_rad_s(self, time_s: Array) -> Array:
        """Dose rate in the films [rad/s, m]: of the regions by their shares, else the constant."""
        constant = np.full(time_s.shape, self.radiation.dose_rate_rad_s)
        if self.along is None or not self.radiation.by_region:
            return constant
        return self.along.mean_of_regions(time_s, self.radiation.by_region, constant)

    def strength(self, time_s: Array) -> Array:
        """Share of each plasma [m, P] at times [m], adding to 1; of a basis, densities.

        An event mixes distributions, f = (1-s) f_base + s f_event: s rises linearly, is 1
        for the hold, and decays as exp(-t/decay). A later event acts on what it finds.
        """
        base = None if self.along is None else self.along.at(time_s)[0]
        return self._mixed(time_s, base)[0]

    def _mixed(self, time_s: Array, base: Array | None) -> tuple[Array, Array]:
        """Strength [m, P] with the base as one plasma or a basis [m, B]; share of the base [m]."""
        share = np.zeros((*time_s.shape, self.plasma_count))
        present = np.ones(time_s.shape)
        counts: Array | float = 1.0
        if not self.edges_s and base is None:
            share[..., self.states[0].plasma] = 1.0
            counts = float(self.states[0].events)
        else:
            leg = self.leg(time_s)
            column = np.array([state.plasma for state in self.states])[leg]
            np.put_along_axis(share, column[..., None], 1.0, axis=-1)
            counts = np.array([state.events for state in self.states], dtype=np.float64)[leg]
            if base is not None:
                present = share[..., 0].copy()
                share[..., : base.shape[-1]] = base * present[..., None]
        for event in self.episodes:
            s = event_strength(time_s, event) * counts
            share *= 1.0 - s[..., None]
            present = present * (1.0 - s)
            share[..., event.plasma] += s
        return share, present


def event_strength(time_s: Array, event: Episode) -> Array:
    """Strength 0…1 of an event at times [m] after the start."""
    since = time_s - event.onset_s
    rise = np.where(since >= event.rise_s, 1.0, since / event.rise_s if event.rise_s else 0.0)
    late = np.maximum(since - event.rise_s - event.hold_s, 0.0)
    return np.where(since < 0.0, 0.0, rise * np.exp(-late / event.decay_s))


def surroundings(
    case: Case,
    mode: Mode | None,
    episodes: Sequence[Episode],
    files: CaseFiles = NO_FILES,
    plasmas: Mapping[str, Plasma] | None = None,
) -> Surroundings:
    """Tabulate the surroundings of one mode of a case.

    Parameters
    ----------
    case : Case
    mode : Mode or None
        An alternative; None: the case as it stands.
    episodes : sequence of Episode
        Plasma events; plasma 0 is the base.
    files : CaseFiles, optional
        Data files of the case.
    plasmas : mapping of str to Plasma, optional
        Of the case, by name.

    Raises
    ------
    InputError
        A spin that is followed turn by turn takes too many knots.
    """
    way = path(case, mode, files)
    end = case.duration_s
    eclipses = eclipses_of(case, files)
    knots = motion_knots(way, eclipses, end)
    rows = [
        np.unique(files.temperatures[surface.temperature_K].times_s)
        for surface in case.surface
        if isinstance(surface.temperature_K, str)
    ]
    if rows:
        knots = np.union1d(knots, np.concatenate(rows))
        knots = knots[(knots >= 0.0) & (knots <= end)]
    breaks = {t for e in eclipses for t in contacts(e)}
    times, light, lit_body = [], [], []
    for number, leg in enumerate(way.legs):
        own = knots[(knots > leg.start_s) & (knots < leg.end_s)]
        own = np.concatenate([[leg.start_s], own, [leg.end_s]])
        own, crossings, on_faces, on_body = _tabulated(way, number, own)
        breaks |= set(crossings.tolist())
        times.append(own)
        light.append(on_faces)
        lit_body.append(on_body)
    for event in episodes:
        rise_end = event.onset_s + event.rise_s
        breaks |= {event.onset_s, rise_end, rise_end + event.hold_s}
    edges = tuple(leg.start_s for leg in way.legs[1:])
    changing = along(case, mode, files, way, knots, plasmas or {})
    further = 0 if changing is None else len(changing.basis) - 1
    episodes = tuple(event._replace(plasma=event.plasma + further) for event in episodes)
    if changing is not None:
        breaks |= set(changing.breaks_s)
    knots = np.concatenate(times)
    states = _states(case, mode, way.legs, further)
    return Surroundings(
        knots_s=knots,
        table=np.hstack(
            [
                np.concatenate(light, axis=1).T,
                surface_temperatures(
                    case.surface, files.temperatures, knots, np.concatenate(lit_body)
                ),
                np.concatenate(lit_body)[:, None],
            ]
        ),
        episodes=episodes,
        plasma_count=1
        + max(
            *(event.plasma for event in episodes),
            *(state.plasma for state in states),
            further,
            0,
        ),
        breaks_s=_breaks(breaks, edges, end),
        eclipses=eclipses,
        edges_s=edges,
        states=states,
        along=changing,
        radiation=case.radiation,
        motional_V=string_potentials_V(case, way, times) if case.string else None,
    )


def _states(
    case: Case, mode: Mode | None, legs: Sequence[Leg], further: int
) -> tuple[LegState, ...]:
    """What each leg switches; `further` columns stand between the base and the first event."""
    names = plasma_names(case, mode)
    fixed = 1 + (len(case.plasma.event) if mode is None or mode.events else 0)
    return tuple(
        LegState(
            0 if leg.plasma == names[0] else further + fixed + names[fixed:].index(leg.plasma),
            leg.events,
            leg.emitting,
        )
        for leg in legs
    )


def _tabulated(way: Path, number: int, knots: Array) -> tuple[Array, Array, Array, Array]:
    """Knots of a leg with terminator crossings and refinement, crossings, light, illumination."""
    shot = way.in_leg(number, knots)
    crossings = _sign_changes(knots, shot.signed_cosine)
    if crossings.size:
        knots = np.union1d(knots, crossings)
        shot = way.in_leg(number, knots)
    light, body = shot.light, shot.illumination
    if way.trajectory is None or knots.size > MOST_REFINED:
        return knots, crossings, light, body
    # kinks of attitude files, shadow tables, yaw steering, eclipses by the Moon
    open_ = np.arange(knots.size - 1)
    for _ in range(12):
        middle = 0.5 * (knots[open_] + knots[open_ + 1])
        between = way.in_leg(number, middle)
        error = np.abs(between.light - 0.5 * (light[:, open_] + light[:, open_ + 1])).max(axis=0)
        error = np.maximum(
            error, np.abs(between.illumination - 0.5 * (body[open_] + body[open_ + 1]))
        )
        coarse = (error > LARGEST_LIGHT_ERROR) & (knots[open_ + 1] - knots[open_] > 1e-3)
        if not coarse.any() or knots.size > MOST_REFINED:
            break
        at = open_[coarse] + 1
        knots = np.insert(knots, at, middle[coarse])
        light = np.insert(light, at, between.light[:, coarse], axis=1)
        body = np.insert(body, at, between.illumination[coarse])
        left = at - 1 + np.arange(at.size)
        open_ = np.sort(np.concatenate([left, left + 1]))
    return knots, crossings, light, body


def _breaks(found: set[float], edges: Sequence[float], end: float) -> tuple[float, ...]:
    """Breaks within the run; what lies beside the edge of a leg is that edge."""
    kept: list[float] = []
    for t in sorted(t for t in found if 0.0 < t < end):
        beside = any(abs(t - edge) < _APART_S for edge in edges)
        if not beside and not (kept and t - kept[-1] < _APART_S):
            kept.append(t)
    return tuple(sorted((*kept, *edges)))


def output_times(case: Case, around: Surroundings) -> Array:
    """Output grid [s]: start + k·step and the end, 1 s steps around eclipses and mode edges.

    After an uncharged start the first step is refined from a millisecond on, twenty times
    a decade: it holds the charging of structure. Of times within a leap second, which UTC
    cannot tell apart, only the first is kept.
    """
    end, step = case.duration_s, case.time.output_step_s
    grid = np.append(np.arange(case.output_times - 1) * step, end)
    if case.time.start == "uncharged" and step > FIRST_OUTPUT_S:
        decades = np.log10(step / FIRST_OUTPUT_S)
        grid = np.union1d(grid, np.geomspace(FIRST_OUTPUT_S, step, round(20 * decades) + 1))
    spans = [span for span in penumbrae(around.eclipses) if span[1] - span[0] <= FINE_LONGEST_S]
    spans += [(edge, edge) for edge in around.edges_s]
    fine = [
        np.arange(np.ceil(first - FINE_MARGIN_S), last + FINE_MARGIN_S, FINE_STEP_S)
        for first, last in spans
        if step > FINE_STEP_S
    ]
    if sum(part.size for part in fine) > MOST_FINE:
        fine = []
    times = np.union1d(grid, np.concatenate([*fine, around.edges_s])) if spans else grid
    times = times[(times >= 0.0) & (times <= end)]
    return named_times(case, times)


def named_times(case: Case, time_s: Array) -> Array:
    """Those of increasing times [s] that UTC tells apart: of a leap second, the first."""
    labels = moments(case, time_s)
    return np.asarray(time_s[np.append(True, labels[1:] > labels[:-1])])


def _sign_changes(time_s: Array, values: Array) -> Array:
    """Times [any] at which a row of `values` [S, N] passes zero, by linear interpolation."""
    row, k = np.nonzero(values[:, :-1] * values[:, 1:] < 0.0)
    before, after = values[row, k], values[row, k + 1]
    return np.unique(time_s[k] + (time_s[k + 1] - time_s[k]) * before / (before - after))
