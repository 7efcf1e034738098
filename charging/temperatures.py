"""Temperatures of surfaces along the run: constant, sunlit and eclipse value, or a table."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from charging.case_tables import SunlitEclipse, Surface
from environments.errors import EnvironmentDataError
from environments.text_table import number, read_table
from environments.timescales import elapsed_s, read_tai, utc_from_tai

Array = NDArray[np.float64]

REFERENCE_K = 298.15
"""Of a bonded conductor without one: no film whose conduction could depend on it."""
COLDEST_K, HOTTEST_K = 50.0, 2000.0
"""Bounds of a surface; below the first the conduction law is refused."""


@dataclass(frozen=True, slots=True)
class TemperatureTable:
    """Temperatures at times, linear between them.

    times_s : ndarray [K], after the start of the run; kelvin : ndarray [K].
    """

    times_s: Array
    kelvin: Array


def read_temperature_csv(path: str | Path, epoch: np.datetime64) -> TemperatureTable:
    """Read the temperature of a surface from comma-separated columns.

    Parameters
    ----------
    path : str or Path
        Columns ``time`` (UTC with Z) or ``time_h`` (hours from the start of the run), and ``K``.
    epoch : numpy.datetime64
        Start of the run, UTC.

    Returns
    -------
    TemperatureTable

    Raises
    ------
    EnvironmentDataError
        With file and line: unknown column, no time or number, times that do not increase,
        temperatures outside 50 to 2000 K, fewer than two rows.
    """
    table = read_table(path, ())
    if set(table.columns) not in ({"time", "K"}, {"time_h", "K"}):
        raise table.error(
            f"names the columns {', '.join(table.columns)}",
            table.columns_line,
            allowed="time, K (UTC with Z, kelvin), or time_h, K",
        )
    at = table.columns.index("K")
    in_hours = table.columns[1 - at] == "time_h"
    times: list[float] = []
    kelvin: list[float] = []
    for line, cells in table.rows:
        if in_hours:
            time = 3600.0 * number(cells[1 - at], line, table.file)
        else:
            try:
                tai = read_tai(cells[1 - at], "UTC", zone="required")
            except EnvironmentDataError as error:
                raise table.error(str(error), line) from error
            time = float(elapsed_s(epoch, utc_from_tai(tai)[()]))
        value = number(cells[at], line, table.file)
        if times and time <= times[-1]:
            raise table.error("has a time that is not after the one before", line)
        if not COLDEST_K <= value <= HOTTEST_K:
            raise table.error(
                f"K = {value:g} is out of range", line, allowed=f"{COLDEST_K:g} to {HOTTEST_K:g}"
            )
        times.append(time)
        kelvin.append(value)
    if len(times) < 2:
        raise table.error("holds fewer than two rows", table.rows[-1][0])
    return TemperatureTable(np.array(times), np.array(kelvin))


def surface_temperatures(
    surfaces: Sequence[Surface],
    tables: Mapping[str, TemperatureTable],
    knots: Array,
    light: Array,
) -> Array:
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
        elif isinstance(given, str):
            table = tables[given]
            columns.append(np.interp(knots, table.times_s, table.kelvin))
        else:
            columns.append(np.full(len(knots), REFERENCE_K if given is None else given))
    return np.stack(columns, axis=1)
