"""The way of a spacecraft: where it is, how it points, what sunlight reaches its faces."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from charging.case_files import NO_FILES, CaseFiles
from charging.case_modes import Mode
from charging.case_orbit import Attitude as AttitudeTable
from charging.case_orbit import OrbitKepler
from charging.case_tables import Case
from charging.errors import InputError
from charging.incidence import components, cosines
from charging.schedule import Leg, legs
from environments.attitude import to_body
from environments.eclipse import Eclipse, find_eclipses
from environments.moon import MOON_RADIUS_M, find_moon_eclipses, moon_path
from environments.orbit import KeplerOrbit
from environments.pointing import (
    Attitude,
    InertialPointing,
    NadirPointing,
    Spin,
    SunPointing,
    YawSteering,
    spin_averaged_cosine,
)
from environments.sun import distance_au, earth_shadow_radii_m, illumination, sun_path
from environments.timescales import utc_at
from environments.trajectory import Geometry, KeplerTrajectory, Trajectory, geometry

Array = NDArray[np.float64]

SPIN_PHASES = 360
"""Directions of the Sun over which a mean of a turn is taken, where no closed form exists."""
ECLIPSE_WINDOW_S = 20.0 * 86400.0
"""Eclipses of long runs are searched window by window, so that memory stays bounded."""


class Snapshot(NamedTuple):
    """Geometry at N times for S surfaces.

    position_m, sun_direction : ndarray [3, N], inertial (a fixed case: zeros, body axes);
    illumination [N]; signed_cosine [S, N] of the incidence, negative on the dark side;
    lit_share [S, N], share of each surface that other parts do not shade.
    """

    position_m: Array
    sun_direction: Array
    illumination: Array
    signed_cosine: Array
    lit_share: Array

    @property
    def incidence_cosine(self) -> Array:
        """Cosine of incidence 0…1 [S, N], 0 on the dark side."""
        return np.maximum(self.signed_cosine, 0.0)

    @property
    def light(self) -> Array:
        """Sunlight on each surface [S, N], 1 at normal incidence in full sun."""
        return np.asarray(self.illumination * self.incidence_cosine * self.lit_share)


@dataclass(frozen=True, slots=True)
class Path:
    """The way of the spacecraft, evaluated at any time [s] after the start.

    Attributes
    ----------
    case : Case
    files : CaseFiles
    trajectory : Trajectory or None
        Counted from the start; None for a fixed case.
    legs : tuple of Leg
    """

    case: Case
    files: CaseFiles
    trajectory: Trajectory | None
    legs: tuple[Leg, ...]

    def snapshot(self, time_s: Array) -> Snapshot:
        """Geometry at times [N]; at the edge of a mode, what holds after it."""
        if len(self.legs) == 1:
            return self.in_leg(0, time_s)
        inner = [leg.start_s for leg in self.legs[1:]]
        which = np.searchsorted(inner, time_s, side="right")
        surfaces, count = len(self.case.surface), len(time_s)
        whole = Snapshot(
            np.empty((3, count)),
            np.empty((3, count)),
            np.empty(count),
            np.empty((surfaces, count)),
            np.empty((surfaces, count)),
        )
        for k in np.unique(which):
            here = which == k
            for target, part in zip(whole, self.in_leg(int(k), time_s[here]), strict=True):
                target[..., here] = part
        return whole

    def velocity(self, time_s: Array) -> Array:
        """Velocity at times [m s-1, 3, N], inertial; zeros for a fixed case."""
        if self.trajectory is None:
            return np.zeros((3, len(time_s)))
        return self.trajectory.position_velocity(time_s)[1]

    def in_body(self, number: int, time_s: Array, vector: Array) -> Array:
        """Inertial vectors [3, N] in body axes, in one leg; those of a fixed case are already.

        Raises
        ------
        InputError
            The body spins and its turns are not followed.
        """
        if self.trajectory is None:
            return vector
        shot = geometry(self.trajectory, time_s)
        axes = self._followed_axes(
            self.legs[number], shot, "strings that move through a field",
            "strings without negative_end_m and positive_end_m",
        )  # fmt: skip
        return to_body(axes, vector)

    def along_normals(self, number: int, time_s: Array, vector: Array) -> Array:
        """Components [S, N] of inertial vectors [3, N] along the outward normals, in one leg.

        Vectors of a fixed case are in body axes.

        Raises
        ------
        InputError
            The body spins and its turns are not followed.
        """
        leg = self.legs[number]
        if self.trajectory is None:
            sun = np.broadcast_to(np.array(leg.sun_direction)[:, None], vector.shape)
            return components(self.case.surface, vector, sun, leg)
        shot = geometry(self.trajectory, time_s)
        axes = self._followed_axes(
            leg, shot, "ions that stream past", "a plasma without streaming ions"
        )
        sun = to_body(axes, shot.sun_direction)
        return components(self.case.surface, to_body(axes, vector), sun, leg)

    def _followed_axes(self, leg: Leg, shot: Geometry, what: str, instead: str) -> Array:
        """Body axes of a leg; an error that says what needs them where its turns are not kept."""
        if leg.attitude.law == "spin" and not leg.attitude.resolved:
            raise InputError(
                f"attitude.resolved: {what} need every turn of the spin",
                key=("attitude", "resolved"),
                value=leg.attitude.resolved,
                allowed=f"true, or {instead}",
            )
        return self._law(leg.attitude).axes(
            shot.seconds, shot.position_m, shot.velocity_m_s, shot.sun_direction
        )

    def lowest_m(self) -> float:
        """Least distance from the Earth's centre along the run [m]; inf for a fixed case."""
        if self.trajectory is None:
            return float("inf")
        time = np.linspace(0.0, self.case.duration_s, 5001)
        place = self.trajectory.position_velocity(time)[0]
        return float(np.sqrt((place**2).sum(axis=0)).min())

    def in_leg(self, number: int, time_s: Array) -> Snapshot:
        """Geometry at times [N] as one leg has it, at its edges too."""
        leg = self.legs[number]
        if self.trajectory is None:
            sun = np.broadcast_to(np.array(leg.sun_direction)[:, None], (3, len(time_s)))
            cosine, lit = self._faces(leg, sun)
            light = np.full(len(time_s), leg.illumination)
            return Snapshot(np.zeros((3, len(time_s))), sun, light, cosine, lit)
        height = 1e3 * self.case.sun.absorbing_height_km
        shot = geometry(self.trajectory, time_s, absorbing_height_m=height)
        light = shot.illumination
        if self.case.sun.moon:
            epoch = self.trajectory.epoch
            moon = moon_path(epoch)(shot.seconds)
            sun_m = sun_path(epoch)(shot.seconds)
            light = light * illumination(shot.position_m - moon, sun_m - moon, MOON_RADIUS_M)
        law = self._law(leg.attitude)
        axes = law.axes(shot.seconds, shot.position_m, shot.velocity_m_s, shot.sun_direction)
        body = to_body(axes, shot.sun_direction)
        if leg.attitude.law == "spin" and not leg.attitude.resolved:
            cosine, lit = self._averaged(leg, body)
        else:
            cosine, lit = self._faces(leg, body)
        return Snapshot(shot.position_m, shot.sun_direction, light, cosine, lit)

    def sun_in_body(self, time_s: float) -> tuple[Array, float, Leg]:
        """Direction of the Sun in body axes [3], illumination, and the leg at a time."""
        inner = [leg.start_s for leg in self.legs[1:]]
        number = int(np.searchsorted(inner, time_s, side="right"))
        leg, shot = self.legs[number], self.in_leg(number, np.array([time_s]))
        if self.trajectory is None:
            return shot.sun_direction[:, 0], float(shot.illumination[0]), leg
        seen = geometry(self.trajectory, np.array([time_s]))
        axes = self._law(leg.attitude).axes(
            seen.seconds, seen.position_m, seen.velocity_m_s, seen.sun_direction
        )
        return to_body(axes, seen.sun_direction)[:, 0], float(shot.illumination[0]), leg

    def _law(self, table: AttitudeTable) -> Attitude:
        match table.law:
            case "nadir":
                return NadirPointing()
            case "yaw steering":
                return YawSteering()
            case "sun":
                default = SunPointing()
                return SunPointing(
                    table.toward_sun or default.toward_sun,
                    table.toward_north or default.toward_north,
                )
            case "inertial":
                assert table.x_axis is not None
                assert table.y_axis is not None
                return InertialPointing(table.x_axis, table.y_axis)
            case "spin":
                assert table.axis is not None
                assert table.period_s is not None
                return Spin(table.axis, table.period_s, table.phase_deg or 0.0)
            case "quaternions":
                assert table.file is not None
                return self.files.attitudes[table.file]

    def _faces(self, leg: Leg, sun_body: Array) -> tuple[Array, Array]:
        """Signed cosines and lit shares [S, N] with the Sun in body directions [3, N]."""
        cosine = cosines(self.case.surface, sun_body, leg)
        lit = np.ones(cosine.shape)
        if self.case.shape:
            from charging.shape.views import shaped_light  # costs time only with shapes

            cosine, lit = shaped_light(self.case, sun_body, leg, cosine)
        for i, surface in enumerate(self.case.surface):
            name = surface.shadow or self.case.body.shadow
            if name is not None and surface.name in self.files.shadows[name].surfaces:
                lit[i] = self.files.shadows[name].lit_share(surface.name, sun_body)
        return cosine, lit

    def _averaged(self, leg: Leg, sun_body: Array) -> tuple[Array, Array]:
        """Mean cosines and lit shares [S, N] over a turn about body z."""
        total, shaded = np.zeros((2, len(self.case.surface), sun_body.shape[1]))
        for turn in 2.0 * np.pi * np.arange(SPIN_PHASES) / SPIN_PHASES:
            cos, sin = np.cos(turn), np.sin(turn)
            x, y, z = sun_body
            turned = np.stack((cos * x - sin * y, sin * x + cos * y, z))
            signed, lit = self._faces(leg, turned)
            front = np.maximum(signed, 0.0) / SPIN_PHASES
            total += front
            shaded += front * lit
        lit = np.where(total > 0.0, shaded / np.where(total > 0.0, total, 1.0), 1.0)
        bodily = [i for i, s in enumerate(self.case.surface) if s.normal is not None]
        if bodily:
            normals = np.array([self.case.surface[i].normal for i in bodily])
            total[bodily] = spin_averaged_cosine(sun_body, normals)
        return total, lit


def path(case: Case, mode: Mode | None = None, files: CaseFiles = NO_FILES) -> Path:
    """Return the way flown in a mode of a case; `files` as loaded with it."""
    return Path(case, files, trajectory_of(case, files), legs(case, mode))


def trajectory_of(case: Case, files: CaseFiles = NO_FILES) -> Trajectory | None:
    """Trajectory of a case, counted from its start; None for a fixed case."""
    if isinstance(case.orbit, OrbitKepler):
        return KeplerTrajectory(kepler(case.orbit))
    return files.trajectory


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


def angular_speed_rad_s(trajectory: Trajectory, time_s: Array) -> Array:
    """Turn of the direction to the Earth at times [N], |r × v|/r²."""
    position, velocity = trajectory.position_velocity(time_s)
    moment = np.cross(position, velocity, axis=0)
    return np.asarray(np.sqrt((moment**2).sum(axis=0)) / (position**2).sum(axis=0))


def revolution_s(trajectory: Trajectory, end_s: float) -> float:
    """Time of one revolution [s]: Kepler's, or 360° over the mean turn within the run.

    The mean of a run that holds no whole number of turns of an eccentric orbit is off by as
    much as the turn is uneven.
    """
    if isinstance(trajectory, KeplerTrajectory):
        from environments.orbit import period_s

        return period_s(trajectory.orbit)
    time = np.linspace(0.0, end_s, min(20_001, max(101, int(end_s / 60.0))))
    turn = angular_speed_rad_s(trajectory, time)
    mean = float(np.sum(0.5 * (turn[1:] + turn[:-1]) * np.diff(time)) / end_s)
    return 2.0 * np.pi / mean


def sun_distance_au(case: Case) -> float:
    """Distance from the Sun [AU] at the middle of the run; it moves by < 3e-4 a day."""
    if case.orbit.kind == "fixed":
        return 1.0 if case.sun.distance_au is None else case.sun.distance_au
    middle = sun_path(epoch64(case))(np.array([0.5 * case.duration_s]))
    return float(distance_au(middle)[0])


def eclipses_of(case: Case, files: CaseFiles = NO_FILES) -> tuple[Eclipse, ...]:
    """Eclipses within a case [s after the start], by the order of their begin.

    None for a fixed case. Those by the Moon only when the case asks for them.
    """
    trajectory = trajectory_of(case, files)
    if trajectory is None:
        return ()
    equatorial, polar = earth_shadow_radii_m(1e3 * case.sun.absorbing_height_km)
    windows = max(1, int(np.ceil(case.duration_s / ECLIPSE_WINDOW_S)))
    edges = np.linspace(0.0, case.duration_s, windows + 1)
    sun = sun_path(trajectory.epoch)

    def place(time: Array) -> Array:
        return trajectory.position_velocity(time)[0]

    by_earth: list[Eclipse] = []
    by_moon: list[Eclipse] = []
    for first, last in zip(edges[:-1].tolist(), edges[1:].tolist(), strict=True):
        _append(
            by_earth,
            find_eclipses(
                place,
                sun,
                first,
                last,
                body_radius_m=equatorial,
                polar_radius_m=polar,
                speed_limit_m_s=trajectory.speed_limit_m_s,
            ),
        )
        if case.sun.moon:
            speed = trajectory.speed_limit_m_s
            _append(
                by_moon,
                find_moon_eclipses(place, trajectory.epoch, first, last, speed_limit_m_s=speed),
            )
    return tuple(sorted((*by_earth, *by_moon), key=lambda e: contacts(e)[0] if contacts(e) else 0))


def _append(found: list[Eclipse], further: Sequence[Eclipse]) -> None:
    """Add the eclipses of the next window; one under way at its edge is joined."""
    rest = list(further)
    if found and rest and found[-1].penumbra_end is None and rest[0].penumbra_start is None:
        one, two = found.pop(), rest.pop(0)
        has_one, has_two = one.umbra_s > 0.0, two.umbra_s > 0.0
        found.append(
            Eclipse(
                one.body,
                one.penumbra_start,
                one.umbra_start if has_one else two.umbra_start,
                two.umbra_end if has_two else one.umbra_end,
                two.penumbra_end,
                one.umbra_s + two.umbra_s,
            )
        )
    found += rest


def contacts(eclipse: Eclipse) -> list[float]:
    """Contacts that lie within the run, in order [s]."""
    four = (
        eclipse.penumbra_start,
        eclipse.umbra_start,
        eclipse.umbra_end,
        eclipse.penumbra_end,
    )
    return [t for t in four if t is not None]


def moments(case: Case, time_s: Array) -> NDArray[np.datetime64]:
    """UTC of times after the start, leap seconds counted; see `environments.timescales`."""
    return utc_at(epoch64(case), time_s)
