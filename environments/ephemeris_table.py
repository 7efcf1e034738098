"""Ephemerides in our own tables: CSV and NetCDF, with units, frame and time scale stated."""

import contextlib
import os
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any, Final, cast

import numpy as np
from numpy.typing import NDArray

from environments.ephemeris import (
    DEFAULT_DEGREE,
    DEFAULT_METHOD,
    SampledTrajectory,
    Segment,
    check_times,
    require_rows,
    sampled_trajectory,
    to_inertial,
)
from environments.errors import EnvironmentDataError
from environments.interpolation import Method
from environments.magnetosphere import magnetic_place
from environments.netcdf_sizes import refuse_hollow
from environments.text_table import FARTHEST, TextTable, coordinate, read_table
from environments.timescales import TIME_SCALES, read_tai, tai_from_utc, utc_at
from environments.trajectory import Geometry, Trajectory

Array = NDArray[np.float64]

_NOTES: Final = ("frame", "center", "time_scale", "interpolation", "degree")
_METHODS: Final = ("hermite", "lagrange", "linear")
_UNITS: Final = {"m": 1.0, "km": 1e3}
_SPEED_UNITS: Final = {
    "m/s": 1.0, "m s-1": 1.0, "m s^-1": 1.0, "km/s": 1e3, "km s-1": 1e3, "km s^-1": 1e3,
}  # fmt: skip
_DAY: Final = 86400.0
_TIME_UNITS: Final = {"seconds": 1.0, "minutes": 60.0, "hours": 3600.0, "days": _DAY}


def read_ephemeris_csv(path: str | Path, **stated: str) -> SampledTrajectory:
    """Read an ephemeris of comma-separated columns.

    Parameters
    ----------
    path : str or Path
        Columns ``time``, ``x_km``, ``y_km``, ``z_km`` and, if known, ``vx_km_s``, ``vy_km_s``,
        ``vz_km_s``, or all of them in ``_m`` and ``_m_s``; above them notes such as
        ``# frame = GCRF``: frame, center (earth), time_scale (a time in UTC ends in Z), and
        optionally interpolation (hermite, lagrange or linear) and degree.
    **stated : str, optional
        Notes that the file does not give itself.

    Returns
    -------
    SampledTrajectory
        Without a note of interpolation: Hermite of degree 7, or Lagrange of degree 7 where
        there are no velocities.

    Raises
    ------
    EnvironmentDataError
        With file and line: note missing or contradicted, unknown column or unit, a row not
        complete, not a number, times not increasing, gap; and what `sampled_trajectory`
        refuses.
    """
    table = read_table(path, _NOTES)
    notes = _notes({key: value for key, (value, _) in table.notes.items()}, stated, table.file)
    columns, scale, has_velocity = _columns(table)
    tai, values, lines = [], [], []
    zone = "required" if notes["time_scale"] == "UTC" else "forbidden"
    for line, cells in table.rows:
        try:
            tai.append(read_tai(cells[columns[0]], notes["time_scale"], zone=zone))
        except EnvironmentDataError as error:
            raise table.error(str(error), line) from error
        values.append([coordinate(cells[k], line, table.file) for k in columns[1:]])
        lines.append(line)
    stamps = np.array(tai, "datetime64[ns]")
    states = np.array(values) * scale
    check_times(stamps, lines, table.file)
    velocity = states[:, 3:] if has_velocity else None
    return _trajectory(stamps, states[:, :3], velocity, notes, table.file, "CSV")


def read_ephemeris_netcdf(path: str | Path, **stated: str) -> SampledTrajectory:
    """Read an ephemeris from NetCDF, such as one that `write_orbit_netcdf` wrote.

    Parameters
    ----------
    path : str or Path
        Variables ``time`` (CF units, UTC without leap seconds), ``position`` with a dimension
        of length 3 and units m or km, optionally ``velocity``; global attributes ``frame``,
        ``center``, ``time_scale``, optionally ``interpolation`` and ``degree``.
    **stated : str, optional
        Attributes that the file does not give itself.

    Returns
    -------
    SampledTrajectory
        See `read_ephemeris_csv`. The whole table is held in memory, 56 bytes a row.

    Raises
    ------
    EnvironmentDataError
        With file and row: as `read_ephemeris_csv`.
    """
    import netCDF4  # loads slowly, only this function needs it

    file = str(path)
    if not Path(path).is_file():
        raise EnvironmentDataError("cannot be read: no such file", file=file)
    try:
        dataset = netCDF4.Dataset(file)
    except (OSError, UnicodeError) as error:
        raise EnvironmentDataError("is no NetCDF file, or truncated", file=file) from error
    with dataset:
        present = dataset.ncattrs()
        given = {str(k): str(dataset.getncattr(k)) for k in _NOTES if k in present}
        notes = _notes(given, stated, file)
        if notes["time_scale"] != "UTC":
            raise EnvironmentDataError(
                "cannot be used", key=("time_scale",), value=notes["time_scale"],
                allowed="UTC in NetCDF", file=file,
            )  # fmt: skip
        for name in ("time", "position"):
            if name not in dataset.variables:
                raise EnvironmentDataError(f"has no variable {name}", file=file)
        utc = _netcdf_times(dataset.variables["time"], file)
        position = _vectors(dataset.variables["position"], utc.size, _UNITS, file)
        velocity = None
        if "velocity" in dataset.variables:
            velocity = _vectors(dataset.variables["velocity"], utc.size, _SPEED_UNITS, file)
    tai = tai_from_utc(utc)
    if tai.size < 2:
        raise EnvironmentDataError("has fewer than two rows", file=file)
    check_times(tai, None, file)
    return _trajectory(tai, position, velocity, notes, file, "NetCDF")


def write_orbit_netcdf(
    path: str | Path,
    trajectory: Trajectory,
    blocks: Iterable[Geometry],
    attributes: Mapping[str, str] | None = None,
    *,
    magnetic: bool = False,
) -> int:
    """Write geometry to NetCDF as it comes, block by block.

    Parameters
    ----------
    path : str or Path
        Written under a temporary name beside it, then renamed.
    trajectory : Trajectory
        For epoch and source.
    blocks : iterable of Geometry
        From `environments.trajectory.geometry_blocks`.
    attributes : mapping, optional
        Further global attributes.
    magnetic : bool, optional
        Also dipole latitude, L and magnetic local time, see
        `environments.magnetosphere.magnetic_place`; only for times within its years.

    Returns
    -------
    int
        Times written. Memory holds one block.

    Notes
    -----
    Times are UTC without leap seconds, as CF asks; of the times within a leap second only
    those to the last nanosecond before midnight can be told apart, so the reader refuses
    a table with steps inside one.
    """
    import netCDF4  # loads slowly, only this function needs it

    target = Path(path)
    temporary = target.with_name(f".{target.name}.{os.getpid()}.part")
    count = 0
    try:
        with netCDF4.Dataset(str(temporary), "w") as dataset:
            _define(dataset, trajectory, attributes or {}, magnetic)
            for shot in blocks:
                here = slice(count, count + shot.seconds.size)
                utc = utc_at(trajectory.epoch, shot.seconds)
                labels = (utc - trajectory.epoch).astype("timedelta64[ns]").astype(np.int64)
                dataset.variables["time"][here] = labels * 1e-9
                dataset.variables["position"][:, here] = shot.position_m
                dataset.variables["velocity"][:, here] = shot.velocity_m_s
                dataset.variables["sun_direction"][:, here] = shot.sun_direction
                dataset.variables["illumination"][here] = shot.illumination
                dataset.variables["beta_angle"][here] = shot.beta_angle_deg
                dataset.variables["sun_distance"][here] = shot.sun_distance_m
                if magnetic:
                    sun = shot.position_m + shot.sun_distance_m * shot.sun_direction
                    place = magnetic_place(shot.position_m, sun, utc)
                    for name, values in zip(_MAGNETIC, place, strict=True):
                        dataset.variables[name][here] = values
                dataset.sync()
                count += shot.seconds.size
        with temporary.open("rb+") as written:
            os.fsync(written.fileno())
        temporary.replace(target)
    finally:
        with contextlib.suppress(FileNotFoundError):
            temporary.unlink()
    return count


_MAGNETIC: Final = {
    "dipole_latitude": ("degree", "latitude about the axis of the Earth's centred dipole"),
    "l_shell": ("1", "McIlwain L of the centred dipole, in units of 6371.2 km"),
    "magnetic_local_time": ("hour", "magnetic local time, 12 under the Sun"),
}


def _define(
    dataset: Any, trajectory: Trajectory, attributes: Mapping[str, str], magnetic: bool
) -> None:
    dataset.createDimension("axis", 3)
    dataset.createDimension("time", None)
    fixed = {
        "Conventions": "CF-1.11",
        "title": "Orbit of a spacecraft and its sunlight",
        "frame": "GCRF",
        "center": "earth",
        "time_scale": "UTC",
        "interpolation": DEFAULT_METHOD,
        "degree": str(DEFAULT_DEGREE),
        "source": trajectory.source,
    }
    for key, value in {**fixed, **attributes}.items():
        dataset.setncattr(key, value)
    epoch = np.datetime_as_string(trajectory.epoch, unit="ns").replace("T", " ")
    axis = dataset.createVariable("axis_name", str, ("axis",))
    axis.setncattr("long_name", "name of the axis")
    axis[:] = np.array(["x", "y", "z"], dtype=object)
    along, everywhere = ("time",), ("axis", "time")
    for name, shape, units, meaning in (
        ("time", along, f"seconds since {epoch}", "time, UTC"),
        ("position", everywhere, "m", "position from the Earth's centre, inertial"),
        ("velocity", everywhere, "m s-1", "velocity, inertial"),
        ("sun_direction", everywhere, "1", "unit vector from the spacecraft to the Sun, inertial"),
        ("sun_distance", along, "m", "distance of the spacecraft from the Sun"),
        ("illumination", along, "1", "share of the Sun's disc in view"),
        ("beta_angle", along, "degree", "Sun above the orbit plane"),
        *((name, along, *rest) for name, rest in (_MAGNETIC.items() if magnetic else ())),
    ):
        chunks = (3, 8192) if shape is everywhere else (8192,)
        variable = dataset.createVariable(
            name, "f8", shape, chunksizes=chunks, fill_value=None if name == "time" else np.nan
        )
        variable.set_var_chunk_cache(size=1 << 20)  # the default, 64 MB each, would fill up
        variable.setncatts({"units": units, "long_name": meaning})
        if shape is everywhere:
            variable.setncattr("coordinates", "axis_name")
        if name == "time":
            variable.setncatts(
                {
                    "standard_name": "time",
                    "axis": "T",
                    "calendar": "standard",
                    "units_metadata": "leap_seconds: none",
                }
            )


def _notes(given: Mapping[str, str], stated: Mapping[str, str], file: str) -> dict[str, str]:
    for key, value in stated.items():
        if key not in _NOTES:
            raise TypeError(f"{key} is no note of an ephemeris; allowed: {', '.join(_NOTES)}")
        if key in given and given[key].upper() != value.upper():
            raise EnvironmentDataError(
                f"contradicts {key} = {value}", key=(key,), value=given[key], file=file
            )
    notes = {**stated, **given}
    for key in ("frame", "center", "time_scale"):
        if key not in notes:
            raise EnvironmentDataError(f"does not say its {key}", file=file)
    if notes["center"].lower() != "earth":
        raise EnvironmentDataError(
            "cannot be used", key=("center",), value=notes["center"], allowed="earth", file=file
        )
    notes["time_scale"] = notes["time_scale"].upper()
    if notes["time_scale"] not in TIME_SCALES:
        raise EnvironmentDataError(
            "cannot be used", key=("time_scale",), value=notes["time_scale"],
            allowed=", ".join(TIME_SCALES), file=file,
        )  # fmt: skip
    return notes


def _columns(table: TextTable) -> tuple[list[int], Array, bool]:
    """Positions of time, place and velocity columns, their factors to SI, velocity given."""
    for unit, factor in _UNITS.items():
        place = [f"{axis}_{unit}" for axis in "xyz"]
        speed = [f"v{axis}_{unit}_s" for axis in "xyz"]
        for names in (["time", *place, *speed], ["time", *place]):
            if set(table.columns) == set(names):
                order = [table.columns.index(name) for name in names]
                return order, np.full(len(names) - 1, factor), len(names) == 7
    raise table.error(
        f"names the columns {', '.join(table.columns)}",
        table.columns_line,
        allowed="time, x_km, y_km, z_km, with or without vx_km_s, vy_km_s, vz_km_s; "
        "or all in m and m_s",
    )


def _trajectory(
    tai: NDArray[np.datetime64],
    position: Array,
    velocity: Array | None,
    notes: Mapping[str, str],
    file: str,
    kind: str,
) -> SampledTrajectory:
    default = DEFAULT_METHOD if velocity is not None else "lagrange"
    word = notes.get("interpolation", default).lower()
    degree = notes.get("degree", "1" if word == "linear" else str(DEFAULT_DEGREE))
    try:
        if word not in _METHODS:
            raise EnvironmentDataError(
                "cannot be used", key=("interpolation",), value=word, allowed=", ".join(_METHODS)
            )
        if word == "hermite" and velocity is None:
            raise EnvironmentDataError("asks for hermite interpolation without velocities")
        if not (degree.isascii() and degree.isdigit()):
            raise EnvironmentDataError("is no whole number", key=("degree",), value=degree)
        method = cast(Method, word)
        require_rows(tai.size, method, int(degree))
        position, velocity = to_inertial(tai, position, velocity, notes["frame"])
    except EnvironmentDataError as error:
        raise EnvironmentDataError(
            error.problem, key=error.key, value=error.value, allowed=error.allowed, file=file
        ) from error
    segment = Segment(tai, position, velocity, method, int(degree))
    what = f"{kind} {Path(file).name}, {word} interpolation of degree {degree}"
    what += f", frame {notes['frame']}, {notes['time_scale']}"
    return sampled_trajectory([segment], what, file=file)


def _netcdf_times(variable: Any, file: str) -> NDArray[np.datetime64]:
    units = str(getattr(variable, "units", ""))
    word, since, origin = units.partition(" since ")
    calendar = str(getattr(variable, "calendar", "standard"))
    if word not in _TIME_UNITS or not since or variable.ndim != 1:
        raise EnvironmentDataError(
            "has no usable units of time", value=units, file=file,
            allowed="seconds since YYYY-MM-DD hh:mm:ss, also minutes, hours, days",
        )  # fmt: skip
    if calendar not in ("standard", "gregorian", "proleptic_gregorian"):
        raise EnvironmentDataError("is no usable calendar", value=calendar, file=file)
    values = _finite(variable, file)
    text = origin.strip().removesuffix("Z").removesuffix(" UTC").replace(" ", "T")
    try:
        # numpy would read an offset such as +02:00, with a warning: only UTC is meant here
        if len(text) > 10 and any(sign in text[10:] for sign in "+-"):
            raise ValueError(text)
        start = np.datetime64(text, "ns")
    except ValueError as error:
        raise EnvironmentDataError("is no time", value=origin, file=file) from error
    whole = np.floor(values)
    unit_ns = int(_TIME_UNITS[word] * 1e9)
    part = np.rint((values - whole) * unit_ns).astype(np.int64)
    steps = whole.astype(np.int64) * unit_ns + part
    return np.asarray(start + steps.astype("timedelta64[ns]"))


def _vectors(variable: Any, count: int, units: Mapping[str, float], file: str) -> Array:
    unit = str(getattr(variable, "units", ""))
    if unit not in units:
        raise EnvironmentDataError(
            "has no usable unit", key=(str(variable.name), "units"), value=unit,
            allowed=", ".join(units), file=file,
        )  # fmt: skip
    values = _finite(variable, file)
    if values.shape == (3, count) and variable.dimensions[-1] == "time":
        values = values.T
    if values.shape != (count, 3):
        raise EnvironmentDataError(
            f"{variable.name} must have the dimensions axis (of length 3) and time", file=file
        )
    return np.ascontiguousarray(values) * units[unit]


def _finite(variable: Any, file: str) -> Array:
    refuse_hollow(8 * int(variable.size), file)
    values = np.ma.filled(np.ma.asarray(variable[...], dtype=np.float64), np.nan)
    values[np.abs(values) > FARTHEST] = np.nan
    if not bool(np.isfinite(values).all()):
        # the index along time: vectors may stand as (axis, time) or (time, axis)
        along = list(variable.dimensions).index("time") if "time" in variable.dimensions else 0
        at = int(np.argwhere(~np.isfinite(values))[:, along].min())
        raise EnvironmentDataError(
            f"{variable.name} is missing or not finite, first at index {at}", file=file
        )
    return np.asarray(values, dtype=np.float64)
