"""What surrounds the spacecraft along its orbit: light, temperature, plasma, position.

Geometry is evaluated once per case on knots dense enough that linear interpolation
errs by less than 1e-5 in an incidence cosine or an illumination; a march then only
interpolates.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from charging.case_tables import Case, Mode, OrbitFixed, OrbitKepler, SunlitEclipse, Surface
from charging.currents.surface import Setting
from environments.attitude import nadir_axes, to_body, tracking_cosine
from environments.eclipse import Eclipse, find_eclipses
from environments.orbit import EARTH_RADIUS_M, KeplerOrbit, period_s, position_velocity
from environments.sun import distance_au, illumination, sun_path, sun_position_m

Array = NDArray[np.float64]

LARGEST_TURN_RAD = np.radians(0.25)  # between knots: cosines err by 0.25²/8 (rad) = 2.4e-6
LONGEST_KNOT_S = 60.0
PENUMBRA_KNOTS = 240  # illumination errs by 1e-5
FINE_STEP_S, FINE_MARGIN_S, FINE_LONGEST_S = 1.0, 60.0, 900.0
FIRST_OUTPUT_S = 1e-3


class Snapshot(NamedTuple):
    """Geometry at N times for S surfaces.

    position_m, sun_direction : ndarray [3, N], inertial (a fixed case: zeros, body axes);
    illumination [N]; signed_cosine [S, N] of the incidence, negative on the dark side.
    """

    position_m: Array
    sun_direction: Array
    illumination: Array
    signed_cosine: Array

    @property
    def incidence_cosine(self) -> Array:
        """Cosine of incidence 0…1 [S, N], 0 on the dark side."""
        return np.maximum(self.signed_cosine, 0.0)


class Episode(NamedTuple):
    """One plasma event [s after the start] and the index of its plasma."""

    onset_s: float
    rise_s: float
    hold_s: float
    decay_s: float
    plasma: int


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
    breaks_s : tuple of float
        Kinks: contacts of eclipses, edges of events, terminator crossings of surfaces.
    eclipses : tuple of Eclipse
        Times in seconds after the start.
    """

    knots_s: Array
    table: Array
    episodes: tuple[Episode, ...]
    plasma_count: int
    breaks_s: tuple[float, ...]
    eclipses: tuple[Eclipse, ...]

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
        setting = Setting(self.strength(time_s), both[..., :surfaces], both[..., -1:])
        return setting, both[..., surfaces:-1]

    def strength(self, time_s: Array) -> Array:
        """Share of each plasma [m, P] at times [m], adding to 1.

        An event mixes distributions, f = (1-s) f_base + s f_event: s rises linearly, is 1
        for the hold, and decays as exp(-t/decay). A later event acts on what it finds.
        """
        share = np.zeros((*time_s.shape, self.plasma_count))
        share[..., 0] = 1.0
        for event in self.episodes:
            s = event_strength(time_s, event)
            share *= 1.0 - s[..., None]
            share[..., event.plasma] += s
        return share


def event_strength(time_s: Array, event: Episode) -> Array:
    """Strength 0…1 of an event at times [m] after the start."""
    since = time_s - event.onset_s
    rise = np.where(since >= event.rise_s, 1.0, since / event.rise_s if event.rise_s else 0.0)
    late = np.maximum(since - event.rise_s - event.hold_s, 0.0)
    return np.where(since < 0.0, 0.0, rise * np.exp(-late / event.decay_s))


@dataclass(frozen=True, slots=True)
class Path:
    """The way of the spacecraft, evaluated at any time [s] after the start."""

    case: Case
    illumination: float
    sun_direction: tuple[float, float, float]

    def snapshot(self, time_s: Array) -> Snapshot:
        """Geometry at times [N]."""
        orbit = self.case.orbit
        if isinstance(orbit, OrbitFixed):
            count = (len(time_s),)
            sun = np.broadcast_to(np.array(self.sun_direction)[:, None], (3, *count))
            return Snapshot(
                np.zeros((3, *count)),
                sun,
                np.full(count, self.illumination),
                _cosines(self.case.surface, sun),
            )
        position, velocity = position_velocity(kepler(orbit), time_s)
        sun = sun_position_m(epoch64(self.case) + seconds64(time_s))
        toward = sun - position
        toward = toward / np.sqrt((toward**2).sum(axis=0))
        body = to_body(nadir_axes(position, velocity), toward)
        shade = EARTH_RADIUS_M + 1e3 * self.case.sun.absorbing_height_km
        return Snapshot(
            position,
            toward,
            illumination(position, sun, shade),
            _cosines(self.case.surface, body),
        )


def path(case: Case, mode: Mode | None = None) -> Path:
    """Return the way flown in a mode of a case."""
    light, direction = 1.0, (1.0, 0.0, 0.0)
    if isinstance(case.orbit, OrbitFixed):
        light, direction = case.orbit.illumination, case.orbit.sun_direction
    if mode is not None and mode.illumination is not None:
        light = mode.illumination
    if mode is not None and mode.sun_direction is not None:
        direction = mode.sun_direction
    return Path(case, light, direction)


def kepler(orbit: OrbitKepler) -> KeplerOrbit:
    """Translate the table of a case file."""
    return KeplerOrbit(
        epoch=np.datetime64(orbit.epoch.replace(tzinfo=None), "ns"),
        semi_major_axis_km=orbit.semi_major_axis_km,
        eccentricity=orbit.eccentricity,
        inclination_deg=orbit.inclination_deg,
        raan_deg=orbit.raan_deg,
        argument_of_perigee_deg=orbit.argument_of_perigee_deg,
        mean_anomaly_deg=orbit.mean_anomaly_deg,
    )


def epoch64(case: Case) -> np.datetime64:
    """Start of a case in numpy's time."""
    return np.datetime64(case.epoch.replace(tzinfo=None), "ns")


def seconds64(time_s: Array) -> NDArray[np.timedelta64]:
    """Seconds as numpy time differences, rounded to the nanosecond."""
    return np.rint(np.asarray(time_s) * 1e9).astype("timedelta64[ns]")


def sun_distance_au(case: Case) -> float:
    """Distance from the Sun [AU] at the middle of the run; it moves by < 3e-4 a day."""
    if isinstance(case.orbit, OrbitFixed):
        return 1.0 if case.sun.distance_au is None else case.sun.distance_au
    middle = epoch64(case) + seconds64(np.array([case.duration_s / 2.0]))
    return float(distance_au(sun_position_m(middle))[0])


def _cosines(surfaces: Sequence[Surface], sun_body: Array) -> Array:
    """Signed incidence cosines [S, N]; a tracker's dark side has -1."""
    rows = []
    for surface in surfaces:
        if surface.tracks_sun:
            front = tracking_cosine(sun_body)
            rows.append(front if surface.side == "front" else -front)
        else:
            rows.append((np.array(surface.normal)[:, None] * sun_body).sum(axis=0))
    return np.array(rows)


def surroundings(case: Case, mode: Mode | None, episodes: Sequence[Episode]) -> Surroundings:
    """Tabulate the surroundings of one mode of a case.

    Parameters
    ----------
    case : Case
    mode : Mode or None
        None: the case as it stands.
    episodes : sequence of Episode
        Plasma events; plasma 0 is the base.
    """
    way = path(case, mode)
    end = case.duration_s
    eclipses: tuple[Eclipse, ...] = ()
    knots = np.array([0.0, end])
    if isinstance(case.orbit, OrbitKepler):
        eclipses = eclipses_of(case)
        e = case.orbit.eccentricity
        at_perigee = (1.0 + e) ** 2 / (1.0 - e**2) ** 1.5  # over the mean motion
        slowest = period_s(kepler(case.orbit)) / at_perigee
        step = min(LONGEST_KNOT_S, LARGEST_TURN_RAD / (2.0 * np.pi) * slowest)
        knots = np.linspace(0.0, end, int(np.ceil(end / step)) + 1)
        for first, last in _penumbrae(eclipses):
            knots = np.union1d(knots, np.clip(np.linspace(first, last, PENUMBRA_KNOTS), 0.0, end))
    shot = way.snapshot(knots)
    crossings = _sign_changes(knots, shot.signed_cosine)
    if crossings.size:
        knots = np.union1d(knots, crossings)
        shot = way.snapshot(knots)
    light = (shot.illumination * shot.incidence_cosine).T
    breaks = {t for e in eclipses for t in _contacts(e)}
    breaks |= set(crossings.tolist())
    for event in episodes:
        rise_end = event.onset_s + event.rise_s
        breaks |= {event.onset_s, rise_end, rise_end + event.hold_s}
    return Surroundings(
        knots_s=knots,
        table=np.hstack(
            [
                light,
                _temperatures(case.surface, knots, shot.illumination),
                shot.illumination[:, None],
            ]
        ),
        episodes=tuple(episodes),
        plasma_count=1 + max((event.plasma for event in episodes), default=0),
        breaks_s=tuple(sorted(t for t in breaks if 0.0 < t < end)),
        eclipses=eclipses,
    )


def output_times(case: Case, around: Surroundings) -> Array:
    """Output grid [s]: start + k·step and the end, 1 s steps around eclipse contacts.

    After an uncharged start the first step is refined from a millisecond on, twenty times
    a decade: it holds the charging of structure.
    """
    end, step = case.duration_s, case.time.output_step_s
    grid = np.append(np.arange(case.output_times - 1) * step, end)
    if case.time.start == "uncharged" and step > FIRST_OUTPUT_S:
        decades = np.log10(step / FIRST_OUTPUT_S)
        grid = np.union1d(grid, np.geomspace(FIRST_OUTPUT_S, step, round(20 * decades) + 1))
    fine = [
        np.arange(np.ceil(first - FINE_MARGIN_S), last + FINE_MARGIN_S, FINE_STEP_S)
        for first, last in _penumbrae(around.eclipses)
        if last - first <= FINE_LONGEST_S and step > FINE_STEP_S
    ]
    times = np.union1d(grid, np.concatenate(fine)) if fine else grid
    return times[(times >= 0.0) & (times <= end)]


def eclipses_of(case: Case) -> tuple[Eclipse, ...]:
    """Eclipses within a case [s after the start]; none for a fixed case."""
    if not isinstance(case.orbit, OrbitKepler):
        return ()
    orbit = kepler(case.orbit)
    return find_eclipses(
        lambda t: position_velocity(orbit, t)[0],
        sun_path(orbit.epoch),
        0.0,
        case.duration_s,
        body_radius_m=EARTH_RADIUS_M + 1e3 * case.sun.absorbing_height_km,
    )


def _contacts(eclipse: Eclipse) -> list[float]:
    contacts = (
        eclipse.penumbra_start,
        eclipse.umbra_start,
        eclipse.umbra_end,
        eclipse.penumbra_end,
    )
    return [t for t in contacts if t is not None]


def _penumbrae(eclipses: Sequence[Eclipse]) -> list[tuple[float, float]]:
    spans = []
    for eclipse in eclipses:
        times = _contacts(eclipse)
        if eclipse.umbra_start is None or eclipse.umbra_end is None:
            spans.append((times[0], times[-1]))
            continue
        if eclipse.penumbra_start is not None:
            spans.append((eclipse.penumbra_start, eclipse.umbra_start))
        if eclipse.penumbra_end is not None:
            spans.append((eclipse.umbra_end, eclipse.penumbra_end))
    return spans


def _sign_changes(time_s: Array, values: Array) -> Array:
    """Times [any] at which a row of `values` [S, N] passes zero, by linear interpolation."""
    row, k = np.nonzero(values[:, :-1] * values[:, 1:] < 0.0)
    before, after = values[row, k], values[row, k + 1]
    return np.unique(time_s[k] + (time_s[k + 1] - time_s[k]) * before / (before - after))


def _temperatures(surfaces: Sequence[Surface], knots: Array, light: Array) -> Array:
    """Temperature [K, S] on the knots; conductors without one get the reference 298.15 K.

    A sun/eclipse pair relaxes towards a target that is linear in the illumination; the
    relaxation is exact for a target constant over a knot interval.
    """
    columns = []
    for surface in surfaces:
        given = surface.temperature_K
        if isinstance(given, SunlitEclipse):
            target = given.eclipse_K + light * (given.sunlit_K - given.eclipse_K)
            keep = np.exp(-np.diff(knots) / (60.0 * given.time_constant_min))
            value = target[0]
            column = [value]
            for k, share in enumerate(keep):
                middle = 0.5 * (target[k] + target[k + 1])
                value = middle + (value - middle) * share
                column.append(value)
            columns.append(np.array(column))
        else:
            # a bonded conductor has no film whose conduction could depend on it
            columns.append(np.full(len(knots), 298.15 if given is None else given))
    return np.stack(columns, axis=1)
