"""Where the plasma along a run comes from: the regions of space, or a file of moments."""

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from charging.case_files import CaseFiles
from charging.case_modes import Mode
from charging.case_tables import Case
from charging.errors import InputError
from charging.flight import Path, epoch64, moments
from charging.motional import largest_V_m
from charging.plasma_along import Arc, PlasmaAlong, Sampled, Sampler, plasma_on_way
from environments.activity import Activity
from environments.earth_axes import turning_with_earth_m_s
from environments.errors import EnvironmentDataError
from environments.magnetosphere import magnetic_place
from environments.moon import MOON_RADIUS_M, moon_position_m
from environments.orbit import EARTH_RADIUS_M
from environments.plasma import ELECTRON, Plasma
from environments.plasma_timeline import PlasmaTimeline
from environments.population_series import smoothstep
from environments.precipitation import severe_share
from environments.regions import REGIONS, RegionPlasma, plasma_along
from environments.substorm import Substorm
from environments.sun import ASTRONOMICAL_UNIT_M, sun_path, sun_position_m
from environments.timescales import elapsed_s, utc_at

Array = NDArray[np.float64]
Stamps = NDArray[np.datetime64]


def along(
    case: Case,
    mode: Mode | None,
    files: CaseFiles,
    way: Path,
    knots_s: Array,
    plasmas: Mapping[str, Plasma],
) -> PlasmaAlong | None:
    """Plasma along a run, or None where one plasma is used.

    Parameters
    ----------
    case : Case
    mode : Mode or None
        An alternative mode.
    files : CaseFiles
    way : Path
    knots_s : ndarray [K]
        Knots of the motion.
    plasmas : mapping of str to Plasma
        That of the arc, by the name in the case.

    Raises
    ------
    InputError
        A file that does not cover the run, or a plasma that cannot be used.
    """
    if not case.plasma.changes or (mode is not None and mode.plasma is not None):
        return None
    if files.timeline is not None:
        return _measured(case, way, files.timeline, knots_s)
    activity = activity_of(case, mode, files)
    knots = np.union1d(knots_s, _rows_s(case, activity.times))
    sample = _regions(case, way, activity, _arc(case, plasmas))
    steps = _kp_steps_s(case, activity)
    found = plasma_on_way(case, way, sample, knots, steps, case.plasma.base, REGIONS)
    return replace(found, motional_V_m=largest_V_m(case, way, knots_s))


def _measured(case: Case, way: Path, timeline: PlasmaTimeline, knots_s: Array) -> PlasmaAlong:
    """Plasma of a file, whose rows become knots."""

    def sample(time_s: Array) -> Sampled:
        return _carried(way, time_s, _sampled(timeline.along(moments(case, time_s))))

    knots = np.union1d(knots_s, _rows_s(case, timeline.times))
    return plasma_on_way(case, way, sample, knots, (), case.plasma.base, REGIONS)


def _carried(way: Path, time_s: Array, found: Sampled) -> Sampled:
    """Measured ions near the Earth, turning with it: a spacecraft outruns the cold ones.

    Beyond `TURNS_WITHIN_RE` of an Earth orbit, and elsewhere, they count as arriving from all
    sides: a file of moments says nothing of their motion.
    """
    if way.trajectory is None:
        return found
    position, own = way.trajectory.position_velocity(time_s)
    near = np.sqrt((position**2).sum(axis=0)) < TURNS_WITHIN_RE * EARTH_RADIUS_M
    if not near.any():
        return found
    velocity = np.where(near, turning_with_earth_m_s(position), own)
    return found._replace(
        populations=tuple(
            one
            if one.species.charge_number < 0 or one.velocity_m_s is not None
            else replace(one, velocity_m_s=velocity)
            for one in found.populations
        )
    )


def activity_of(case: Case, mode: Mode | None, files: CaseFiles) -> Activity:
    """Activity of a case: columns of its file before its keys; F10.7 from [sun]."""
    f107 = case.sun.f107 if mode is None or mode.f107 is None else mode.f107
    constants = case.plasma.constants
    if files.activity is None:
        own = Activity({"f107": f107, **constants}, source="the case")
        return replace(own, substorms=_substorms(case))
    if "f107" not in files.activity.series:
        constants = {"f107": f107, **constants}
    own = files.activity
    return Activity(constants, own.times, own.series, own.source, _substorms(case))


def _substorms(case: Case) -> tuple[Substorm, ...]:
    """Injections of a case into the plasma sheet."""
    found = []
    for one in case.plasma.substorm:
        begin = (
            3600.0 * one.onset_h
            if one.onset_h is not None
            else case.seconds_to(one.onset or case.epoch)
        )
        found.append(
            Substorm(
                utc_at(epoch64(case), [begin])[0], one.rise_min, one.hold_min, one.decay_min,
                one.local_time_h, one.electron_density_m3, one.electron_temperature_eV,
                one.ion_density_m3, one.ion_temperature_eV,
            )
        )  # fmt: skip
    return tuple(found)


TURNS_WITHIN_RE = 6.0
"""Plasma counts as turning with the Earth out to here (assumed; the plasmasphere by day)."""
HOT_EV = 100.0
"""Temperature above which electrons of an arc's plasma count as precipitating."""


SUNRISE = (float(np.cos(np.radians(95.0))), float(np.cos(np.radians(85.0))))
"""Cosines of the Sun's zenith angle between which sunlight ends arcs; assumed."""


def _arc(case: Case, plasmas: Mapping[str, Plasma]) -> Plasma | None:
    """Hot electrons of the plasma that the case names for an arc."""
    if case.plasma.arc is None:
        return None
    whole = plasmas[case.plasma.arc]
    hot = tuple(p for p in whole.populations if p.species == ELECTRON and p.temperature_eV > HOT_EV)
    if not hot:
        raise InputError(
            f"plasma.arc: {whole.name} holds no electrons above {HOT_EV:g} eV",
            key=("plasma", "arc"),
            value=case.plasma.arc,
        )
    return replace(whole, populations=hot)


def _with_arc(
    found: RegionPlasma, arc: Plasma, stamps: Stamps, position: Array, sun: Array, kp: Array
) -> Sampled:
    """The arc where a severe aurora may stand, no farther up than the oval of the regions.

    Sunlight suppresses discrete arcs, threefold for the intense ones (Newell, Meng & Lyons 1996,
    Nature 381, 766, from memory): here they end where the Sun rises at the place.
    """
    place = magnetic_place(position, sun, stamps)
    severe = severe_share(place.dipole_latitude_deg, place.magnetic_local_time_h, kp)
    share = np.minimum(severe, found.blend[REGIONS.index("auroral oval")])
    up = (position * sun).sum(axis=0)
    up = up / np.sqrt((position**2).sum(axis=0) * (sun**2).sum(axis=0))
    share = share * (1.0 - smoothstep(up, *SUNRISE))
    return _sampled(found)._replace(arc=Arc(arc, share))


def regions_sampler(case: Case, way: Path, files: CaseFiles) -> Sampler:
    """Regions along the way of a case with its own activity, without an arc."""
    return _regions(case, way, activity_of(case, None, files), None)


def _regions(case: Case, way: Path, activity: Activity, arc: Plasma | None) -> Sampler:
    def sample(time_s: Array) -> Sampled:
        stamps = moments(case, time_s)
        try:
            if way.trajectory is None:
                return _fixed(case, stamps, activity, len(time_s))
            position = way.trajectory.position_velocity(time_s)[0]
            sun = sun_path(way.trajectory.epoch)(time_s)
            found = plasma_along(stamps, position, sun, activity)
            if arc is None:
                return _sampled(found)
            return _with_arc(found, arc, stamps, position, sun, activity.at(stamps).kp)
        except EnvironmentDataError as error:
            raise InputError(
                f"plasma.activity: {error}", key=("plasma", "activity"),
                value=case.plasma.activity, allowed=error.allowed,
            ) from None  # fmt: skip

    return sample


def _sampled(found: RegionPlasma) -> Sampled:
    return Sampled(found.populations, found.region, found.blend, found.cautions, found.bases)


def _fixed(case: Case, stamps: Stamps, activity: Activity, count: int) -> Sampled:
    """Regions of a fixed case, velocities turned into body axes by the Sun's direction."""
    if case.plasma.around == "sun":
        distance = ASTRONOMICAL_UNIT_M * (case.sun.distance_au or 1.0)
        away = np.broadcast_to(np.array([[distance], [0.0], [0.0]]), (3, count))
        found = plasma_along(stamps, away, None, activity, setting="sun")
        return _in_body(case, found, np.array([-1.0, 0.0, 0.0]))
    sun = sun_position_m(stamps) - moon_position_m(stamps)
    towards = sun / np.sqrt((sun**2).sum(axis=0))
    aside = np.cross(towards, np.array([[0.0], [0.0], [1.0]]), axis=0)
    aside = aside / np.sqrt((aside**2).sum(axis=0))
    zenith = np.radians(case.plasma.solar_zenith_angle_deg or 0.0)
    place = MOON_RADIUS_M * (np.cos(zenith) * towards + np.sin(zenith) * aside)
    found = plasma_along(stamps, place, sun, activity, setting="moon")
    return _in_body(case, found, towards[:, 0])


def _in_body(case: Case, found: RegionPlasma, towards: Array) -> Sampled:
    """Turn velocities so that the Sun stands where the case says; the turn about it is free."""
    assert case.orbit.kind == "fixed"
    turn = _turning(towards, np.array(case.orbit.sun_direction))
    turned = tuple(
        one
        if one.velocity_m_s is None
        else replace(one, velocity_m_s=(turn[:, :, None] * one.velocity_m_s).sum(axis=1))
        for one in found.populations
    )
    return _sampled(replace(found, populations=turned))


def _turning(a: Array, b: Array) -> Array:
    """Shortest turn [3, 3] of the unit vector a into b."""
    axis, cosine = np.cross(a, b), float((a * b).sum())
    if cosine < -1.0 + 1e-12:  # half a turn about anything square to a
        square = np.cross(a, np.eye(3)[np.abs(a).argmin()])
        square = square / np.sqrt((square**2).sum())
        return np.asarray(2.0 * square[:, None] * square[None, :] - np.eye(3))
    x, y, z = axis
    cross = np.array([[0.0, -z, y], [z, 0.0, -x], [-y, x, 0.0]])
    square_ = (cross[:, :, None] * cross[None, :, :]).sum(axis=1)
    return np.asarray(np.eye(3) + cross + square_ / (1.0 + cosine))


def _rows_s(case: Case, rows: NDArray[np.datetime64] | None) -> Array:
    """Times of the rows of a file within the run [s]."""
    if rows is None:
        return np.zeros(0)
    time = np.asarray(elapsed_s(epoch64(case), rows), dtype=np.float64)
    return time[(time > 0.0) & (time < case.duration_s)]


def _kp_steps_s(case: Case, activity: Activity) -> Sequence[float]:
    """Times at which Kp jumps [s]."""
    if "kp" not in activity.series or activity.times is None:
        return ()
    time = np.asarray(elapsed_s(epoch64(case), activity.times), dtype=np.float64)
    jump = np.append(False, np.diff(activity.series["kp"]) != 0.0)
    return tuple(time[jump & (time > 0.0) & (time < case.duration_s)].tolist())
