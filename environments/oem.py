"""Orbit ephemeris messages of the CCSDS, in keyword-value notation: reader and writer."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Final, cast

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.ephemeris import (
    DEFAULT_DEGREE,
    DEFAULT_METHOD,
    INERTIAL_FRAMES,
    SampledTrajectory,
    Segment,
    check_times,
    require_rows,
    sampled_trajectory,
    to_inertial,
)
from environments.errors import EnvironmentDataError, nearest_name
from environments.interpolation import Method
from environments.text_table import coordinate, read_lines
from environments.timescales import TIME_SCALES, read_tai, tai_from_utc, write_tai

Array = NDArray[np.float64]

_VERSIONS: Final = ("1.0", "2.0", "3.0")
_HEADER_KEYS: Final = ("CREATION_DATE", "ORIGINATOR", "CLASSIFICATION", "MESSAGE_ID")
_NEEDED: Final = (
    "OBJECT_NAME",
    "OBJECT_ID",
    "CENTER_NAME",
    "REF_FRAME",
    "TIME_SYSTEM",
    "START_TIME",
    "STOP_TIME",
)
_META_KEYS: Final = (
    *_NEEDED,
    "REF_FRAME_EPOCH",
    "USEABLE_START_TIME",
    "USEABLE_STOP_TIME",
    "INTERPOLATION",
    "INTERPOLATION_DEGREE",
)
_METHODS: Final = ("HERMITE", "LAGRANGE", "LINEAR")
_SLACK: Final = np.timedelta64(1_000_000, "ns")  # rounding of times in the header, 1 ms


@dataclass(slots=True)
class _Block:
    """Metadata and rows of one segment while it is read."""

    line: int
    meta: dict[str, tuple[str, int]] = field(default_factory=dict)
    rows: list[tuple[str, int]] = field(default_factory=list)


def read_oem(path: str | Path) -> SampledTrajectory:
    """Read an orbit ephemeris message.

    Parameters
    ----------
    path : str or Path
        File in keyword-value notation, version 1.0, 2.0 or 3.0.

    Returns
    -------
    SampledTrajectory
        Interpolated as the file asks; where it does not, by Hermite polynomials of degree
        7, and its `source` says so. Its epoch is the first usable time.

    Raises
    ------
    EnvironmentDataError
        With file and line: unknown keyword, missing keyword, truncated file (rows that do not
        reach STOP_TIME, block not closed, row not complete), times not increasing, gap, a
        frame that is not inertial, a centre other than the Earth, an unknown time system, too
        few rows; and what `sampled_trajectory` refuses.

    Notes
    -----
    TDB counts as TT (2 ms, 15 m in low orbit). GCRF, EME2000 and ICRF count as one frame
    (0.8 m in low orbit). Covariances and accelerations are skipped. HERMITE of degree
    2n - 1 takes n rows, LAGRANGE of degree n takes n + 1.

    References
    ----------
    CCSDS 502.0-B-3 (2023), Orbit Data Messages, sec. 5 (keywords from memory).
    """
    lines = read_lines(path)
    name = str(path)
    try:
        blocks = _blocks(lines)
        segments, notes = [], set()
        for block in blocks:
            segment, note = _segment(block, name)
            segments.append(segment)
            notes.add(note)
    except EnvironmentDataError as error:
        raise _placed(error, name) from error
    what = f"CCSDS OEM {Path(path).name}, {'; '.join(sorted(notes))}"
    return sampled_trajectory(segments, what, file=name)


def write_oem(
    path: str | Path,
    epoch: np.datetime64,
    seconds: ArrayLike,
    position_m: ArrayLike,
    velocity_m_s: ArrayLike,
    *,
    object_name: str,
    object_id: str,
    creation_date: np.datetime64,
    originator: str = "HALFLIT",
    method: Method = DEFAULT_METHOD,
    degree: int = DEFAULT_DEGREE,
) -> None:
    """Write states as an orbit ephemeris message, version 2.0, one segment, in UTC.

    Parameters
    ----------
    path : str or Path
        Written over.
    epoch : numpy.datetime64
        UTC at 0 s.
    seconds : array_like, shape (N,)
        True seconds after the epoch, increasing.
    position_m, velocity_m_s : array_like, shape (3, N)
        GCRS-like; written as EME2000 with 1 µm and 1 nm/s.
    object_name, object_id, originator : str
        Free text.
    creation_date : numpy.datetime64
        UTC.
    method, degree : optional
        What the file asks of its reader.

    Raises
    ------
    EnvironmentDataError
        Fewer rows than the interpolation needs, times not increasing.
    ValueError
        Shapes that do not fit, or text of more than one line.
    """
    elapsed = np.rint(np.asarray(seconds, dtype=np.float64) * 1e9).astype("timedelta64[ns]")
    tai = tai_from_utc(epoch) + elapsed
    states = np.vstack((np.asarray(position_m), np.asarray(velocity_m_s))) * 1e-3
    if states.shape != (6, tai.size) or not bool(np.isfinite(states).all()):
        raise ValueError("states must be finite and have the shape (3, N), as many as times")
    if any("\n" in text or "\r" in text for text in (object_name, object_id, originator)):
        raise ValueError("names must be one line")
    check_times(tai, None, None)
    require_rows(tai.size, method, degree)
    stamps = write_tai(tai, "UTC")
    head = [
        "CCSDS_OEM_VERS = 2.0",
        f"CREATION_DATE = {np.datetime_as_string(creation_date, unit='s')}",
        f"ORIGINATOR = {originator}",
        "",
        "META_START",
        f"OBJECT_NAME = {object_name}",
        f"OBJECT_ID = {object_id}",
        "CENTER_NAME = EARTH",
        "REF_FRAME = EME2000",
        "TIME_SYSTEM = UTC",
        f"START_TIME = {stamps[0]}",
        f"STOP_TIME = {stamps[-1]}",
        f"INTERPOLATION = {method.upper()}",
        f"INTERPOLATION_DEGREE = {degree}",
        "META_STOP",
        "",
    ]
    rows = [
        f"{stamp} " + " ".join(f"{x:.9f}" for x in row[:3]) + " "
        + " ".join(f"{x:.12f}" for x in row[3:])
        for stamp, row in zip(stamps, states.T, strict=True)
    ]  # fmt: skip
    Path(path).write_text("\n".join([*head, *rows, ""]), encoding="ascii")


def _blocks(lines: list[str]) -> list[_Block]:
    """Split a message into segments; every line must have a place."""
    blocks: list[_Block] = []
    header: dict[str, tuple[str, int]] = {}
    place = "start"
    number_of_line = 0
    for number_of_line, text in enumerate(lines, start=1):
        line = text.strip()
        if not line or line.startswith("COMMENT"):
            continue
        refuse = _refusal(number_of_line)
        if place == "start":
            if not line.startswith("CCSDS_OEM_VERS"):
                raise refuse("is no CCSDS OEM file: it must start with CCSDS_OEM_VERS")
            version = _pair(line, number_of_line)[1]
            if version not in _VERSIONS:
                raise refuse(f"is version {version}; allowed: {', '.join(_VERSIONS)}")
            place = "header"
        elif place == "covariance":
            place = "data" if line == "COVARIANCE_STOP" else place
        elif line == "META_START":
            if place == "meta":
                raise refuse("opens a block of metadata within another")
            blocks.append(_Block(number_of_line))
            place = "meta"
        elif line == "META_STOP":
            if place != "meta":
                raise refuse("closes a block of metadata that was not opened")
            place = "data"
        elif line == "COVARIANCE_START" and place == "data":
            place = "covariance"
        elif place == "data":
            blocks[-1].rows.append((line, number_of_line))
        else:
            known = _HEADER_KEYS if place == "header" else _META_KEYS
            _store(line, number_of_line, header if place == "header" else blocks[-1].meta, known)
    if place in ("meta", "covariance"):
        raise _refusal(number_of_line)(f"ends within a block of {place}: truncated")
    if not blocks:
        raise _refusal(max(number_of_line, 1))("ends before any states: truncated")
    for key in _HEADER_KEYS[:2]:
        if key not in header:
            raise _refusal(blocks[0].line)(f"is reached without {key} in the header")
    return blocks


def _segment(block: _Block, file: str) -> tuple[Segment, str]:
    for key in _NEEDED:
        if key not in block.meta:
            raise _refusal(block.line)(f"opens metadata without {key}")
    scale, at = block.meta["TIME_SYSTEM"]
    if scale not in TIME_SCALES:
        raise EnvironmentDataError(
            "cannot be used", key=("TIME_SYSTEM",), value=scale, line=at,
            allowed=", ".join(TIME_SCALES),
        )  # fmt: skip
    center, at = block.meta["CENTER_NAME"]
    if center.upper() != "EARTH":
        raise EnvironmentDataError(
            "cannot be used", key=("CENTER_NAME",), value=center, allowed="EARTH", line=at
        )
    frame, frame_line = block.meta["REF_FRAME"]
    if frame.upper() not in INERTIAL_FRAMES:
        raise EnvironmentDataError(
            "cannot be used", key=("REF_FRAME",), value=frame, line=frame_line,
            allowed=", ".join(INERTIAL_FRAMES),
        )  # fmt: skip
    method, degree, note = _interpolation(block.meta)
    tai, states, lines = _rows(block, scale)
    check_times(tai, lines, file)
    bounds = {
        key: _time(*block.meta[key], key, scale)
        for key in ("START_TIME", "STOP_TIME", "USEABLE_START_TIME", "USEABLE_STOP_TIME")
        if key in block.meta
    }
    if tai[0] > bounds["START_TIME"] + _SLACK:
        raise _refusal(lines[0])("starts later than START_TIME: rows are missing")
    if tai[-1] < bounds["STOP_TIME"] - _SLACK:
        raise _refusal(lines[-1])("is the last row, before STOP_TIME: truncated")
    start = bounds.get("USEABLE_START_TIME", bounds["START_TIME"])
    stop = bounds.get("USEABLE_STOP_TIME", bounds["STOP_TIME"])
    start, stop = max(start, tai[0]), min(stop, tai[-1])
    if not start < stop:
        raise _refusal(block.line)("opens metadata whose times are not in order")
    _placed_rows(tai.size, method, degree, block)
    position, velocity = to_inertial(tai, states[:, :3] * 1e3, states[:, 3:6] * 1e3, frame)
    note = f"{note}, frame {frame}, {scale}"
    return Segment(tai, position, velocity, method, degree, (start, stop)), note


def _interpolation(meta: Mapping[str, tuple[str, int]]) -> tuple[Method, int, str]:
    if "INTERPOLATION" not in meta:
        note = f"interpolation not stated: {DEFAULT_METHOD} of degree {DEFAULT_DEGREE}"
        return DEFAULT_METHOD, DEFAULT_DEGREE, note
    word, at = meta["INTERPOLATION"]
    if word.upper() not in _METHODS:
        raise EnvironmentDataError(
            "cannot be used", key=("INTERPOLATION",), value=word, line=at,
            allowed=", ".join(_METHODS), nearest=nearest_name(word, _METHODS),
        )  # fmt: skip
    method = cast(Method, word.lower())
    if "INTERPOLATION_DEGREE" not in meta:
        if method == "linear":
            return method, 1, "linear interpolation"
        raise _refusal(at)("asks for an interpolation without INTERPOLATION_DEGREE")
    text, at = meta["INTERPOLATION_DEGREE"]
    if not text.isascii() or not text.isdigit():
        raise _refusal(at)("gives a degree that is not a whole number")
    return method, int(text), f"{method} interpolation of degree {int(text)}"


def _rows(block: _Block, scale: str) -> tuple[NDArray[np.datetime64], Array, list[int]]:
    if not block.rows:
        raise _refusal(block.line)("opens a segment without states: truncated")
    tai, states, lines = [], [], []
    for text, line in block.rows:
        parts = text.split()
        if len(parts) not in (7, 10):
            if len(parts) > 1 and parts[1] == "=":
                raise _refusal(line)(f"gives {parts[0]} among the states")
            raise _refusal(line)(
                f"has {len(parts)} entries; a state has a time and 6 numbers, or 9 with "
                "accelerations: truncated?"
            )
        tai.append(_time(parts[0], line, "time", scale))
        states.append([coordinate(part, line) for part in parts[1:7]])
        lines.append(line)
    return np.array(tai, "datetime64[ns]"), np.array(states), lines


def _placed_rows(count: int, method: Method, degree: int, block: _Block) -> None:
    try:
        require_rows(count, method, degree)
    except EnvironmentDataError as error:
        line = block.meta.get("INTERPOLATION_DEGREE", ("", block.line))[1]
        raise _refusal(line)(str(error)) from error


def _time(text: str, line: int, key: str, scale: str) -> np.datetime64:
    try:
        return read_tai(text, scale)
    except EnvironmentDataError as error:
        raise EnvironmentDataError(
            error.problem, key=(key,), value=text, allowed=error.allowed, line=line
        ) from error


def _pair(line: str, number_of_line: int) -> tuple[str, str]:
    key, equals, value = (part.strip() for part in line.partition("="))
    if not equals or not value:
        raise _refusal(number_of_line)("is not a line such as KEYWORD = value")
    return key, value


def _store(
    line: str, number_of_line: int, into: dict[str, tuple[str, int]], known: tuple[str, ...]
) -> None:
    key, value = _pair(line, number_of_line)
    if key not in known:
        raise EnvironmentDataError(
            "is not a keyword here",
            value=key,
            nearest=nearest_name(key, known),
            line=number_of_line,
        )
    if key in into:
        raise _refusal(number_of_line)(f"gives {key} a second time")
    into[key] = (value, number_of_line)


def _refusal(line: int) -> Callable[[str], EnvironmentDataError]:
    return lambda problem: EnvironmentDataError(problem, line=line)


def _placed(error: EnvironmentDataError, file: str) -> EnvironmentDataError:
    if error.file is not None:
        return error
    return EnvironmentDataError(
        error.problem,
        key=error.key,
        value=error.value,
        allowed=error.allowed,
        nearest=error.nearest,
        file=file,
        line=error.line,
    )
