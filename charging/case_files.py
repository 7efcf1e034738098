"""The data files that a case names: orbits, attitudes, shadows, temperatures."""

from __future__ import annotations

import hashlib
import tempfile
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import TYPE_CHECKING, TypeVar

from charging.case_checks import too_low
from charging.case_library import Sources, located
from charging.case_mode_checks import span_s
from charging.case_orbit import EARTH_EQUATORIAL_RADIUS_KM, OrbitFile
from charging.case_plasma import activity_problems
from charging.case_tables import Case
from charging.errors import InputError, KeyPath, Problem, ProblemsFound
from charging.file_content import bytes_of

if TYPE_CHECKING:
    import numpy as np

    from charging.temperatures import TemperatureTable
    from environments.activity import Activity
    from environments.attitude_file import QuaternionAttitude
    from environments.plasma_timeline import PlasmaTimeline
    from environments.shadow_table import ShadowTable
    from environments.trajectory import Trajectory

T = TypeVar("T")
LARGEST_TEXT_BYTES, LARGEST_NETCDF_BYTES = 10_000_000, 1_000_000_000
"""Of a data file; texts are kept in a result, of NetCDF files the SHA-256 alone."""


@dataclass(frozen=True, slots=True)
class CaseFiles:
    """Contents of the data files of a case.

    Attributes
    ----------
    trajectory : Trajectory or None
        Of an orbit from a file, counted from the start of the run.
    attitudes, shadows, temperatures : mapping
        By the name the case gives; times counted from the start of the run.
    activity : Activity or None
        Of Sun and magnetosphere, from its file.
    timeline : PlasmaTimeline or None
        Measured plasma.
    texts : mapping
        Texts of the files by name, for a rerun; binary files are absent.
    sha256 : mapping
        SHA-256 of the bytes of every file, in hexadecimal.
    """

    trajectory: Trajectory | None = None
    attitudes: Mapping[str, QuaternionAttitude] = field(default_factory=dict)
    shadows: Mapping[str, ShadowTable] = field(default_factory=dict)
    temperatures: Mapping[str, TemperatureTable] = field(default_factory=dict)
    activity: Activity | None = None
    timeline: PlasmaTimeline | None = None
    texts: Mapping[str, str] = field(default_factory=dict)
    sha256: Mapping[str, str] = field(default_factory=dict)


NO_FILES = CaseFiles()


@dataclass(slots=True)
class _Reader:
    """Reads files once, keeps their texts, and turns faults into those of case or file."""

    sources: Sources
    problems: list[Problem] = field(default_factory=list)
    texts: dict[str, str] = field(default_factory=dict)
    sha256: dict[str, str] = field(default_factory=dict)

    def read(self, key: KeyPath, name: str, parse: Callable[[Path], T]) -> T | None:
        """Return what `parse` makes of a file; None with a problem noted."""
        try:
            if name in self.sources.file_texts:
                return self._kept(name, parse)
            if name in self.sources.file_sha256:
                raise ProblemsFound(
                    [
                        Problem(
                            (),
                            "is a binary file, which a result does not hold (SHA-256 "
                            f"{self.sources.file_sha256[name]})",
                            next_step="Use the case file, beside which it stands.",
                        )
                    ]
                )
            real, path = located(name, self.sources)
        except ProblemsFound as error:
            self.problems += [replace(fault, key=key, value=name) for fault in error.problems]
            return None
        most = LARGEST_NETCDF_BYTES if real.suffix == ".nc" else LARGEST_TEXT_BYTES
        data = bytes_of(real, str(path), most)
        self.sha256[name] = hashlib.sha256(data).hexdigest()
        if not name.endswith(".nc"):
            # a file that is not UTF-8 is refused by its reader
            self.texts[name] = data.decode("utf-8", errors="replace")
        return _parsed(parse, real, str(path))

    def _kept(self, name: str, parse: Callable[[Path], T]) -> T:
        text = self.sources.file_texts[name]
        self.texts[name] = text
        data = text.encode("utf-8")
        self.sha256[name] = hashlib.sha256(data).hexdigest()
        with tempfile.TemporaryDirectory(prefix="halflit-") as folder:
            scratch = Path(folder) / (Path(name).name or "kept")
            scratch.write_bytes(data)
            return _parsed(parse, scratch, f'file "{name}"')


def _parsed(parse: Callable[[Path], T], path: Path, shown: str) -> T:
    from environments.errors import EnvironmentDataError

    try:
        return parse(path)
    except EnvironmentDataError as error:
        raise _in_file(error, shown) from None


def _in_file(error: Exception, shown: str) -> InputError:
    from environments.errors import EnvironmentDataError

    assert isinstance(error, EnvironmentDataError)
    place = EnvironmentDataError(error.problem, key=error.key, value=error.value)
    return InputError(
        str(place),
        file=shown,
        line=error.line,
        value=error.value,
        allowed=error.allowed,
        nearest=error.nearest,
    )


def read_files(case: Case, sources: Sources) -> tuple[Case, CaseFiles, list[Problem]]:
    """Read every data file that a case names.

    Returns
    -------
    case : Case
        With start and length of the run filled in where the file of the orbit gives them.
    files : CaseFiles
    problems : list of Problem
        Faults of the case itself.

    Raises
    ------
    InputError
        A file was found and cannot be used, with file and line.
    ProblemsFound
        The resolved case contradicts itself.
    """
    reader = _Reader(sources)
    trajectory = None
    if isinstance(case.orbit, OrbitFile):
        trajectory = reader.read(("orbit", "file"), case.orbit.file, _orbit_reader(case.orbit))
        if trajectory is None:
            return case, NO_FILES, reader.problems
        case = _resolved(case, trajectory)
        trajectory = _counted(case, trajectory, reader.problems)
    if reader.problems:
        return case, NO_FILES, reader.problems
    epoch = _epoch64(case)

    from charging.temperatures import read_temperature_csv
    from environments.activity import read_activity
    from environments.attitude_file import read_attitude_csv
    from environments.plasma_timeline import read_plasma_timeline
    from environments.shadow_table import read_shadow_csv

    attitudes = _each(reader, _attitude_files(case), lambda path: read_attitude_csv(path, epoch))
    shadows = _each(reader, _shadow_files(case), lambda path: read_shadow_csv(path, case.names))
    temperatures = _each(
        reader,
        (
            (("surface", i, "temperature_K"), surface.temperature_K)
            for i, surface in enumerate(case.surface)
            if isinstance(surface.temperature_K, str)
        ),
        lambda path: read_temperature_csv(path, epoch),
    )
    activity = timeline = None
    if case.plasma.activity is not None:
        activity = reader.read(("plasma", "activity"), case.plasma.activity, read_activity)
    if case.plasma.file is not None:
        timeline = reader.read(("plasma", "file"), case.plasma.file, read_plasma_timeline)
    files = CaseFiles(
        trajectory,
        attitudes,
        shadows,
        temperatures,
        activity,
        timeline,
        reader.texts,
        reader.sha256,
    )
    return case, files, [*reader.problems, *_cover_problems(case, files)]


def _each(
    reader: _Reader, named: Iterator[tuple[KeyPath, str]], parse: Callable[[Path], T]
) -> dict[str, T]:
    found: dict[str, T] = {}
    for key, name in named:
        if name not in found:
            content = reader.read(key, name, parse)
            if content is not None:
                found[name] = content
    return found


def _orbit_reader(orbit: OrbitFile) -> Callable[[Path], Trajectory]:
    if orbit.kind == "oem":
        from environments.oem import read_oem

        return read_oem
    if orbit.kind == "tle":
        from environments.tle import read_tle

        start = None if orbit.start is None else _moment64(orbit.start)
        return lambda path: read_tle(path, epoch=start)
    from environments.ephemeris_table import read_ephemeris_csv, read_ephemeris_netcdf

    return read_ephemeris_netcdf if orbit.file.endswith(".nc") else read_ephemeris_csv


def _resolved(case: Case, trajectory: Trajectory) -> Case:
    """Fill in start and length of the run, and check what depends on them."""
    import numpy as np

    from charging.case_checks import check_case
    from environments.timescales import elapsed_s

    orbit = case.orbit
    assert isinstance(orbit, OrbitFile)
    start = orbit.start
    if start is None:
        # the next whole microsecond: a datetime holds no more
        ns = int(trajectory.epoch.astype("datetime64[ns]").astype(np.int64))
        start = datetime(1970, 1, 1, tzinfo=UTC) + timedelta(microseconds=-(-ns // 1000))
        case = case.model_copy(update={"orbit": orbit.model_copy(update={"start": start})})
    if case.time.duration_h is None and orbit.kind != "tle":
        end = trajectory.span_s[1] - float(elapsed_s(trajectory.epoch, _moment64(start)))
        if end > 0.0:
            time = case.time.model_copy(update={"duration_h": end / 3600.0})
            case = case.model_copy(update={"time": time})
    if case.resolved:
        check_case(case, orbit_only=True)  # the bounds of a run: see `charging.case`
    return case


def _counted(case: Case, trajectory: Trajectory, problems: list[Problem]) -> Trajectory | None:
    """Return the trajectory counted from the start of the run, if it covers the run."""
    import numpy as np

    from environments.errors import EnvironmentDataError
    from environments.timescales import utc_at
    from environments.trajectory import starting_at, within

    assert isinstance(case.orbit, OrbitFile)
    bounds = utc_at(trajectory.epoch, list(trajectory.span_s)).astype("datetime64[ms]")

    name = case.orbit.file

    def outside(key: KeyPath, value: object) -> Problem:
        message = f"leads out of the span of {name}"
        allowed = f"within {bounds[0]}Z to {bounds[1]}Z"
        return Problem(key, message, value=value, allowed=allowed)

    try:
        counted = starting_at(trajectory, _epoch64(case))
    except EnvironmentDataError:
        problems.append(outside(("orbit", "start"), case.orbit.start))
        return None
    if not case.resolved:
        problems.append(
            Problem(("time", "duration_h"), "is missing", missing=True, allowed="hours above 0")
        )
        return None
    try:
        within(counted, np.array([case.duration_s]))
    except EnvironmentDataError:
        problems.append(outside(("time", "duration_h"), case.time.duration_h))
        return None
    times = np.linspace(0.0, case.duration_s, min(20_001, 2 + int(case.duration_s / 60.0)))
    try:
        place = counted.position_velocity(times)[0]
    except EnvironmentDataError as error:  # elements whose object has come down by then
        message = f"is longer than {name} can be followed: {error.problem}"
        problems.append(Problem(("time", "duration_h"), message, value=case.time.duration_h))
        return None
    lowest_km = float(np.sqrt((place**2).sum(axis=0)).min()) / 1e3 - EARTH_EQUATORIAL_RADIUS_KM
    if lowest_km <= case.sun.absorbing_height_km:
        problems.append(too_low(case.sun.absorbing_height_km, lowest_km))
        return None
    return counted


def _attitude_files(case: Case) -> Iterator[tuple[KeyPath, str]]:
    if case.attitude.file is not None:
        yield ("attitude", "file"), case.attitude.file
    for index, mode in enumerate(case.mode):
        if mode.attitude is not None and mode.attitude.file is not None:
            yield ("mode", index, "attitude", "file"), mode.attitude.file


def _shadow_files(case: Case) -> Iterator[tuple[KeyPath, str]]:
    if case.body.shadow is not None:
        yield ("body", "shadow"), case.body.shadow
    for index, surface in enumerate(case.surface):
        if surface.shadow is not None:
            yield ("surface", index, "shadow"), surface.shadow


def _cover_problems(case: Case, files: CaseFiles) -> Iterator[Problem]:
    """Yield attitudes and temperatures that end before the run, surfaces without a shadow."""
    from environments.timescales import elapsed_s

    epoch = _epoch64(case)
    if files.activity is not None:
        for fault in activity_problems(case.plasma, files.activity, epoch, case.duration_s):
            yield replace(fault, key=("plasma", *fault.key))
    spans: list[tuple[KeyPath, str, float, float]] = []
    if case.attitude.file is not None:
        spans.append((("attitude", "file"), case.attitude.file, 0.0, case.duration_s))
    for index, mode in enumerate(case.mode):
        if mode.attitude is not None and mode.attitude.file is not None:
            start, end = (0.0, case.duration_s) if mode.alternative else span_s(case, mode)
            key: KeyPath = ("mode", index, "attitude", "file")
            spans.append((key, mode.attitude.file, start, min(end, case.duration_s)))
    for key, name, start, end in spans:
        if name in files.attitudes:
            first, last = files.attitudes[name].span_s
            yield from _span_problem(case, key, name, (first, last), (start, end))
    if files.timeline is not None and case.plasma.file is not None:
        rows = elapsed_s(epoch, files.timeline.times[[0, -1]])
        span = (float(rows[0]), float(rows[1]))
        whole = (0.0, case.duration_s)
        yield from _span_problem(case, ("plasma", "file"), case.plasma.file, span, whole)
    for index, surface in enumerate(case.surface):
        given = surface.temperature_K
        if isinstance(given, str) and given in files.temperatures:
            table = files.temperatures[given]
            span = (float(table.times_s[0]), float(table.times_s[-1]))
            key = ("surface", index, "temperature_K")
            yield from _span_problem(case, key, given, span, (0.0, case.duration_s))
        shadow = surface.shadow
        if (
            shadow is not None
            and shadow in files.shadows
            and surface.name not in files.shadows[shadow].surfaces
        ):
            yield Problem(
                ("surface", index, "shadow"),
                "holds no rows of this surface",
                value=shadow,
                allowed=", ".join(files.shadows[shadow].surfaces[:12]),
            )


def _span_problem(
    case: Case,
    key: KeyPath,
    name: str,
    span: tuple[float, float],
    wanted: Sequence[float],
) -> Iterator[Problem]:
    from charging.clock import iso_time

    if span[0] > wanted[0] + 1e-6 or span[1] < wanted[1] - 1e-6:
        asked = [iso_time(case.epoch, t) for t in wanted]
        yield Problem(
            key,
            f"does not cover {asked[0]} to {asked[1]}",
            value=name,
            allowed=f"rows over that time; it holds {iso_time(case.epoch, span[0])} to "
            f"{iso_time(case.epoch, span[1])}",
        )


def _epoch64(case: Case) -> np.datetime64:
    return _moment64(case.epoch)


def _moment64(moment: datetime) -> np.datetime64:
    import numpy as np

    return np.datetime64(moment.astimezone(UTC).replace(tzinfo=None), "ns")
