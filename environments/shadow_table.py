"""Shadows that parts of a spacecraft throw on its surfaces, tabulated by the Sun's place."""

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.errors import EnvironmentDataError, nearest_name
from environments.text_table import TextTable, number, read_table
from environments.vectors import direction

Array = NDArray[np.float64]

_COLUMNS: Final = ("surface", "sun_azimuth_deg", "sun_elevation_deg", "lit_share")


@dataclass(frozen=True, slots=True)
class ShadowTable:
    """Lit share of surfaces by the direction of the Sun in body axes.

    Attributes
    ----------
    surfaces : tuple of str
        Names.
    azimuths_deg, elevations_deg : tuple of ndarray
        Grid of each surface; azimuth atan2(s_y, s_x), closed over 360 deg, elevation
        asin(s_z) above the x-y plane, -90 to 90.
    shares : tuple of ndarray, shape (azimuths, elevations)
        0 in shadow to 1 free.
    source : str
        One line for reports.
    """

    surfaces: tuple[str, ...]
    azimuths_deg: tuple[Array, ...]
    elevations_deg: tuple[Array, ...]
    shares: tuple[Array, ...]
    source: str

    def lit_share(self, surface: str, sun_direction_body: ArrayLike) -> Array:
        """Share of a surface that other parts leave free.

        Parameters
        ----------
        surface : str
            Name.
        sun_direction_body : array_like, shape (3, N)
            Direction of the Sun in body axes.

        Returns
        -------
        ndarray, shape (N,)
            0 to 1, bilinear between the points of the table; to be multiplied with the
            cosine of incidence. At the poles of the grid, where azimuths meet, the value
            depends on the azimuth as far as the table does.

        Raises
        ------
        EnvironmentDataError
            No such surface.
        ValueError
            Wrong shape, direction of length zero.
        """
        if surface not in self.surfaces:
            raise EnvironmentDataError(
                "is not in the table of shadows", value=surface,
                nearest=nearest_name(surface, self.surfaces),
            )  # fmt: skip
        k = self.surfaces.index(surface)
        s = direction(sun_direction_body)
        azimuth = np.degrees(np.arctan2(s[1], s[0]))
        elevation = np.degrees(np.arctan2(s[2], np.hypot(s[0], s[1])))
        grid_a, grid_e, share = self.azimuths_deg[k], self.elevations_deg[k], self.shares[k]
        azimuth = grid_a[0] + (azimuth - grid_a[0]) % 360.0
        i, u = _place(grid_a, azimuth)
        j, v = _place(grid_e, elevation)
        low = (1.0 - u) * share[i, j] + u * share[i + 1, j]
        high = (1.0 - u) * share[i, j + 1] + u * share[i + 1, j + 1]
        return np.asarray((1.0 - v) * low + v * high, dtype=np.float64)


def read_shadow_csv(path: str | Path, names: Sequence[str] | None = None) -> ShadowTable:
    """Read lit shares from comma-separated columns.

    Parameters
    ----------
    path : str or Path
        Columns ``surface``, ``sun_azimuth_deg`` (-180 to 360), ``sun_elevation_deg`` (-90 to
        90), ``lit_share`` (0 to 1); for each surface a full grid of azimuths and elevations
        in any order, both poles included. Names with commas cannot be written.
    names : sequence of str, optional
        Surfaces that may occur.

    Returns
    -------
    ShadowTable

    Raises
    ------
    EnvironmentDataError
        With file and line: unknown surface or column, value out of range, direction given
        twice, grid not full, steps of azimuth above 90 deg, poles missing.
    """
    table = read_table(path, ())
    if set(table.columns) != set(_COLUMNS):
        raise table.error(
            f"names the columns {', '.join(table.columns)}", table.columns_line,
            allowed=", ".join(_COLUMNS),
        )  # fmt: skip
    order = [table.columns.index(name) for name in _COLUMNS]
    found: dict[str, dict[tuple[float, float], tuple[float, int]]] = {}
    for line, cells in table.rows:
        surface = cells[order[0]]
        if not surface or (names is not None and surface not in names):
            near = nearest_name(surface, names or ())
            raise EnvironmentDataError(
                "is no surface", value=surface, nearest=near, file=table.file, line=line
            )
        azimuth, elevation, share = (number(cells[k], line, table.file) for k in order[1:])
        for value, low, high, what in (
            (azimuth, -180.0, 360.0, "sun_azimuth_deg"),
            (elevation, -90.0, 90.0, "sun_elevation_deg"),
            (share, 0.0, 1.0, "lit_share"),
        ):
            if not low <= value <= high:
                raise table.error(f"{what} = {value:g} is outside {low:g} to {high:g}", line)
        points = found.setdefault(surface, {})
        if (azimuth, elevation) in points:
            raise table.error("gives a direction a second time", line)
        points[azimuth, elevation] = (share, line)
    grids = [_grid(name, points, table) for name, points in found.items()]
    azimuths, elevations, shares = zip(*grids, strict=True)
    return ShadowTable(tuple(found), azimuths, elevations, shares, f"shadows {Path(path).name}")


def _grid(
    name: str, points: dict[tuple[float, float], tuple[float, int]], table: TextTable
) -> tuple[Array, Array, Array]:
    last = max(line for _, line in points.values())
    azimuths = sorted({a for a, _ in points})
    elevations = sorted({e for _, e in points})
    missing = [(a, e) for a in azimuths for e in elevations if (a, e) not in points]
    if missing:
        a, e = missing[0]
        raise table.error(
            f'is the last row of "{name}", whose grid lacks azimuth {a:g}, elevation {e:g}: '
            "truncated?",
            last,
        )
    if elevations[0] != -90.0 or elevations[-1] != 90.0:
        raise table.error(f'is the last row of "{name}", whose grid lacks a pole', last)
    share = np.array([[points[a, e][0] for e in elevations] for a in azimuths])
    grid = np.array(azimuths)
    around = grid[-1] - grid[0]
    if around > 360.0:
        raise table.error(f'is the last row of "{name}": azimuths span more than a turn', last)
    if around == 360.0:
        if not np.array_equal(share[0], share[-1]):
            raise table.error(f'is the last row of "{name}": first and last azimuth differ', last)
    else:  # close the circle
        grid = np.append(grid, grid[0] + 360.0)
        share = np.vstack((share, share[:1]))
    if float(np.diff(grid).max()) > 90.0:
        raise table.error(
            f'is the last row of "{name}", whose azimuths leave more than 90 deg open', last
        )
    return grid, np.array(elevations), share


def _place(grid: Array, value: Array) -> tuple[NDArray[np.intp], Array]:
    k = np.clip(np.searchsorted(grid, value, side="right") - 1, 0, grid.size - 2)
    return k, np.clip((value - grid[k]) / (grid[k + 1] - grid[k]), 0.0, 1.0)
