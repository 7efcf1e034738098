"""The orbit of a case without its charging: eclipses, beta angle, light along the way."""

from __future__ import annotations

import json
import tempfile
from collections.abc import Iterator, Sequence
from dataclasses import asdict, dataclass
from datetime import datetime
from pathlib import Path

import numpy as np
import xarray as xr

from charging import __version__
from charging.case import LoadedCase
from charging.clock import iso_time
from charging.errors import InputError
from charging.flight import eclipses_of, revolution_s, trajectory_of
from charging.orbit_regions import Stay, add_regions, region_finder, stays
from charging.written_file import written_file
from environments.eclipse import Eclipse
from environments.ephemeris_table import write_orbit_netcdf
from environments.moon import MOON_RADIUS_M, moon_path
from environments.sun import illumination
from environments.timescales import utc_at
from environments.trajectory import Geometry, Trajectory, geometry, geometry_blocks

MOST_ECLIPSES_KEPT = 5000
"""More are found and printed, and not kept in the attributes of the file."""
_DIPOLE_YEARS = ("1995-01-01", "2040-01-01")


def eclipse_rows(epoch: datetime, eclipses: Sequence[Eclipse]) -> list[dict[str, object]]:
    """Eclipses with UTC times for JSON, null for a contact that does not exist."""

    def when(seconds: float | None) -> str | None:
        return None if seconds is None else iso_time(epoch, seconds)

    return [
        {
            "body": eclipse.body,
            "penumbra_start": when(eclipse.penumbra_start),
            "umbra_start": when(eclipse.umbra_start),
            "umbra_end": when(eclipse.umbra_end),
            "penumbra_end": when(eclipse.penumbra_end),
            "umbra_s": eclipse.umbra_s,
        }
        for eclipse in eclipses
    ]


@dataclass(frozen=True, slots=True)
class OrbitReport:
    """What the orbit of a case brings.

    Attributes
    ----------
    title : str
    epoch : datetime
        Start, UTC.
    duration_s : float
    kind : str
        "kepler", "oem", "tle", "table" or "fixed".
    source : str
        One line: what the orbit rests on.
    period_s : float or None
        Time of one revolution [s]; for orbits from files, of the mean turn within the run. None
        for a fixed case.
    eclipses : tuple of Eclipse
        Contacts in seconds after the start, None where the run does not hold them.
    moon : bool
        Whether eclipses by the Moon were looked for.
    beta_angle_deg, beta_angle_end_deg : float or None
        Sun above the orbit plane [deg] at start and end, positive on the side of r × v; None
        for a fixed case.
    regions : tuple of Stay
        Stays in regions of space; empty where the plasma of the case is not theirs.
    """

    title: str
    epoch: datetime
    duration_s: float
    kind: str
    source: str
    period_s: float | None
    eclipses: tuple[Eclipse, ...]
    moon: bool
    beta_angle_deg: float | None
    beta_angle_end_deg: float | None
    regions: tuple[Stay, ...] = ()


def orbit_report(loaded: LoadedCase) -> OrbitReport:
    """Find the eclipses and the beta angle of a case.

    Parameters
    ----------
    loaded : LoadedCase
        From `charging.case.load_case`.

    Returns
    -------
    OrbitReport
        A fixed case has no eclipses and no beta angle.
    """
    case = loaded.case
    trajectory = trajectory_of(case, loaded.files)
    if trajectory is None:
        return OrbitReport(
            case.title,
            case.epoch,
            case.duration_s,
            case.orbit.kind,
            "fixed light",
            None,
            (),
            False,
            None,
            None,
        )
    ends = geometry(trajectory, np.array([0.0, case.duration_s])).beta_angle_deg
    return OrbitReport(
        title=case.title,
        epoch=case.epoch,
        duration_s=case.duration_s,
        kind=case.orbit.kind,
        source=trajectory.source,
        period_s=revolution_s(trajectory, case.duration_s),
        eclipses=eclipses_of(case, loaded.files),
        moon=case.sun.moon,
        beta_angle_deg=float(ends[0]),
        beta_angle_end_deg=float(ends[1]),
        regions=stays(loaded),
    )


def orbit_dataset(loaded: LoadedCase) -> xr.Dataset:
    """Evaluate the orbit of a case on its output steps, in memory.

    Parameters
    ----------
    loaded : LoadedCase
        A case with an orbit.

    Returns
    -------
    xarray.Dataset
        What `write_orbit` writes: position, velocity, sun_direction, sun_distance, illumination,
        beta_angle, the place in the Earth's dipole field within its years, and the region of
        space where the case takes its plasma from regions; CF-1.11.

    Raises
    ------
    InputError
        The case is fixed: it has no orbit.
    """
    with tempfile.TemporaryDirectory(prefix="halflit-") as folder:
        file = Path(folder) / "orbit.nc"
        write_orbit(loaded, file)
        with xr.open_dataset(file, engine="netcdf4") as dataset:
            return dataset.load()


def write_orbit(loaded: LoadedCase, target: Path, *, option: str = "file") -> OrbitReport:
    """Write the orbit of a case as NetCDF-4, whole or not at all.

    Parameters
    ----------
    loaded : LoadedCase
        A case with an orbit.
    target : Path
        File ending in .nc.
    option : str, optional
        What the person called it, for messages.

    Returns
    -------
    OrbitReport
        Written block by block, so memory does not grow with the run. ``kind = "table"`` reads
        it back.

    Raises
    ------
    InputError
        The name does not end in .nc, the place cannot be written, or the case is fixed.
    """
    case = loaded.case
    if target.suffix != ".nc":
        raise InputError(
            f"{option} {target}: is no NetCDF name", value=target, allowed="a file ending in .nc"
        )
    trajectory = trajectory_of(case, loaded.files)
    if trajectory is None:
        raise InputError(
            'orbit.kind = "fixed": there is no orbit to write',
            file=str(loaded.path),
            key=("orbit", "kind"),
            value="fixed",
            allowed='a case with kind = "kepler", "oem", "tle" or "table"',
        )
    report = orbit_report(loaded)
    with written_file(target, option=option) as scratch:
        write_orbit_netcdf(
            scratch,
            trajectory,
            _blocks(loaded, trajectory),
            _attributes(loaded, trajectory, report),
            magnetic=_dipole_known(trajectory, case.duration_s),
        )
        find = region_finder(loaded)
        if find is not None:
            add_regions(scratch, find)
    return report


def _blocks(loaded: LoadedCase, trajectory: Trajectory) -> Iterator[Geometry]:
    case = loaded.case
    for shot in geometry_blocks(
        trajectory,
        case.duration_s,
        case.time.output_step_s,
        absorbing_height_m=1e3 * case.sun.absorbing_height_km,
    ):
        if not case.sun.moon:
            yield shot
            continue
        moon = moon_path(trajectory.epoch)(shot.seconds)
        sun = shot.position_m + shot.sun_distance_m * shot.sun_direction
        free = illumination(shot.position_m - moon, sun - moon, MOON_RADIUS_M)
        yield shot._replace(illumination=shot.illumination * free)


def _dipole_known(trajectory: Trajectory, end_s: float) -> bool:
    first, last = utc_at(trajectory.epoch, [0.0, end_s])
    return bool(np.datetime64(_DIPOLE_YEARS[0]) <= first and last < np.datetime64(_DIPOLE_YEARS[1]))


def _attributes(loaded: LoadedCase, trajectory: Trajectory, report: OrbitReport) -> dict[str, str]:
    eclipses = [asdict(eclipse) for eclipse in report.eclipses]
    kept = len(eclipses) <= MOST_ECLIPSES_KEPT
    return {
        "title": f"Orbit of: {loaded.case.title}",
        "source": f"halflit {__version__}: {trajectory.source}; Sun by a shortened series, within "
        "0.001 deg; flattened Earth" + ("; Moon within 20 arcsec" if report.moon else ""),
        # without a date: the same case gives the same file
        "history": f"computed by halflit {__version__} from {loaded.path.name}",
        "institution": "not stated",
        "references": "see the docstrings of halflit's modules in `environments`",
        "comment": "sunlight behind the Earth and the Moon where asked for; light scattered by the "
        "Earth is not modelled",
        "halflit_version": __version__,
        "case_file": loaded.path.name,
        "case_text": loaded.text,
        "case_sha256": loaded.sha256,
        "file_sha256": json.dumps(dict(loaded.files.sha256), sort_keys=True),
        "eclipses": json.dumps(eclipses) if kept else "not kept: too many",
        "eclipses_comment": "contacts in seconds after the first time",
    }
