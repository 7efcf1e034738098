"""Whether a NetCDF file holds what it declares, before memory is asked for it."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path
from typing import Final

from environments.errors import EnvironmentDataError

LARGEST_RATIO: Final = 200.0
"""Declared over stored bytes; compression of real series stays far below."""

ALWAYS_BYTES: Final = 50_000_000
"""So much may be declared in any file."""


def refuse_hollow(declared_bytes: int, path: str | Path) -> None:
    """Refuse a file whose variables are far larger than the file.

    NetCDF stores nothing for values that nobody wrote, so a file of a kilobyte may ask for
    a terabyte.

    Parameters
    ----------
    declared_bytes : int
        Of all values to be read.
    path : str or Path
        Existing file.

    Raises
    ------
    EnvironmentDataError
        More than 50 MB and more than 200 times the size of the file.
    """
    stored = Path(path).stat().st_size
    if declared_bytes > max(ALWAYS_BYTES, LARGEST_RATIO * stored):
        raise EnvironmentDataError(
            f"declares {declared_bytes / 1e6:.0f} MB of values in a file of {stored / 1e6:.3g} MB",
            file=str(path),
        )


def refuse_hollow_file(path: str | Path, names: Iterable[str] | None = None) -> None:
    """Refuse a hollow file by what its variables declare, without reading them.

    Parameters
    ----------
    path : str or Path
        NetCDF file.
    names : iterable of str, optional
        Variables that will be read; default: all.

    Raises
    ------
    EnvironmentDataError
        See `refuse_hollow`.
    OSError
        No NetCDF file.
    """
    import netCDF4  # loads slowly

    with netCDF4.Dataset(str(path)) as dataset:
        wanted = set(dataset.variables) if names is None else set(names) & set(dataset.variables)
        sizes = [
            int(one.size) * max(getattr(one.dtype, "itemsize", 0), 8)
            for one in (dataset.variables[name] for name in wanted)
        ]
    refuse_hollow(sum(sizes), path)
