"""The orbit of a case without its charging: eclipses, beta angle, light along the way."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import asdict, dataclass
from datetime import datetime
from pathlib import Path

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from charging import __version__
from charging.case import LoadedCase
from charging.case_tables import OrbitKepler
from charging.errors import InputError
from charging.surroundings import (
    eclipses_of,
    epoch64,
    kepler,
    output_times,
    path,
    seconds64,
    surroundings,
)
from charging.written_file import written_file
from environments.eclipse import Eclipse
from environments.orbit import period_s, position_velocity
from environments.sun import beta_angle_deg, distance_au, sun_position_m

Array = NDArray[np.float64]


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
        "kepler" or "fixed".
    period_s : float or None
        Time of one revolution [s]; None for a fixed case.
    eclipses : tuple of Eclipse
        Contacts in seconds after the start, None where the run does not hold them.
    beta_angle_deg, beta_angle_end_deg : float or None
        Sun above the orbit plane [deg] at start and end, positive on the side of r × v; None
        for a fixed case.
    """

    title: str
    epoch: datetime
    duration_s: float
    kind: str
    period_s: float | None
    eclipses: tuple[Eclipse, ...]
    beta_angle_deg: float | None
    beta_angle_end_deg: float | None


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
    orbit = case.orbit
    if not isinstance(orbit, OrbitKepler):
        return OrbitReport(
            case.title, case.epoch, case.duration_s, orbit.kind, None, (), None, None
        )
    ends = np.array([0.0, case.duration_s])
    position, velocity = position_velocity(kepler(orbit), ends)
    sun = sun_position_m(epoch64(case) + seconds64(ends))
    first, last = (float(angle) for angle in beta_angle_deg(position, velocity, sun))
    return OrbitReport(
        title=case.title,
        epoch=case.epoch,
        duration_s=case.duration_s,
        kind=orbit.kind,
        period_s=period_s(kepler(orbit)),
        eclipses=eclipses_of(case),
        beta_angle_deg=first,
        beta_angle_end_deg=last,
    )


VARIABLES: Mapping[str, tuple[tuple[str, ...], str, str]] = {
    "position": (("axis", "time"), "m", "position from the Earth's centre, inertial"),
    "velocity": (("axis", "time"), "m s-1", "velocity, inertial"),
    "sun_direction": (("axis", "time"), "1", "unit vector to the Sun, inertial"),
    "sun_distance": (("time",), "m", "distance of the Earth from the Sun"),
    "illumination": (("time",), "1", "share of the solar disc in view"),
    "beta_angle": (("time",), "degree", "angle of the Sun above the orbit plane"),
}
"""Dimensions, unit and meaning of every variable of `orbit_dataset`."""


def orbit_dataset(loaded: LoadedCase) -> xr.Dataset:
    """Evaluate the orbit of a case on its output times.

    Parameters
    ----------
    loaded : LoadedCase
        A case with an orbit.

    Returns
    -------
    xarray.Dataset
        Variables of `VARIABLES` over time and axis, CF-1.11.

    Raises
    ------
    InputError
        The case is fixed: it has no orbit.
    """
    case = loaded.case
    if not isinstance(case.orbit, OrbitKepler):
        raise InputError(
            'orbit.kind = "fixed": there is no orbit to write',
            file=str(loaded.path),
            key=("orbit", "kind"),
            value="fixed",
            allowed='a case with kind = "kepler"',
        )
    times = output_times(case, surroundings(case, None, ()))
    position, velocity = position_velocity(kepler(case.orbit), times)
    moments = epoch64(case) + seconds64(times)
    sun = sun_position_m(moments)
    shot = path(case).snapshot(times)
    values: dict[str, Array] = {
        "position": position,
        "velocity": velocity,
        "sun_direction": shot.sun_direction,
        "sun_distance": np.sqrt((sun**2).sum(axis=0)),
        "illumination": shot.illumination,
        "beta_angle": beta_angle_deg(position, velocity, sun),
    }
    dataset = xr.Dataset(
        {
            name: (VARIABLES[name][0], value, {"units": unit, "long_name": meaning})
            for (name, value), (_, unit, meaning) in zip(
                values.items(), VARIABLES.values(), strict=True
            )
        },
        coords={"time": moments, "axis_name": ("axis", ["x", "y", "z"])},
    )
    report = orbit_report(loaded)
    dataset.attrs = {
        "Conventions": "CF-1.11",
        "title": f"Orbit of: {case.title}",
        "source": f"halflit {__version__}: mean Kepler elements with secular J2 drift; "
        "Sun by low-precision formulae; spherical Earth",
        "comment": f"mean distance from the Sun {float(distance_au(sun).mean()):.5f} AU",
        "halflit_version": __version__,
        "case_file": loaded.path.name,
        "case_text": loaded.text,
        "case_sha256": loaded.sha256,
        "eclipses": json.dumps([asdict(eclipse) for eclipse in report.eclipses]),
        "eclipses_comment": "contacts in seconds after the first time",
    }
    for name in dataset.variables:
        dataset[name].encoding = {"_FillValue": None}
    dataset["axis_name"].attrs = {"long_name": "name of the axis"}
    dataset["time"].attrs = {
        "standard_name": "time",
        "long_name": "UTC",
        "axis": "T",
        "units_metadata": "leap_seconds: none",
    }
    first = np.datetime_as_string(moments[0], unit="s").replace("T", " ")
    dataset["time"].encoding = {
        "units": f"seconds since {first}",
        "calendar": "standard",
        "dtype": "float64",
        "_FillValue": None,
    }
    return dataset


def write_orbit(dataset: xr.Dataset, target: Path, *, option: str = "file") -> None:
    """Write `orbit_dataset` as NetCDF-4, whole or not at all.

    Raises
    ------
    InputError
        The name does not end in .nc, or the place cannot be written.
    """
    if target.suffix != ".nc":
        raise InputError(
            f"{option} {target}: is no NetCDF name", value=target, allowed="a file ending in .nc"
        )
    with written_file(target, option=option) as scratch:
        dataset.to_netcdf(scratch, engine="netcdf4", format="NETCDF4")
