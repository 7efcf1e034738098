"""Particle spectra in files: CSV (energy, flux) and NetCDF."""

from pathlib import Path

import numpy as np

from environments.distributions import Tabulated
from environments.errors import EnvironmentDataError
from environments.netcdf_sizes import refuse_hollow_file

COLUMNS = ("energy_eV", "flux_m2_s_sr_eV")
LARGEST_FILE_BYTES = 5_000_000


def read_spectrum(name: str, folder: Path) -> Tabulated:
    """Read a directional differential number flux.

    Parameters
    ----------
    name : str
        File below `folder`, ending in .csv or .nc. A CSV has the header line
        ``energy_eV,flux_m2_s_sr_eV``, comment lines begin with #; a NetCDF file has
        one-dimensional variables of these names.
    folder : Path
        The file must lie inside.

    Returns
    -------
    Tabulated

    Raises
    ------
    EnvironmentDataError
        Outside the folder, absent, too large, not of this form, or no spectrum.
    """
    root = folder.resolve()
    try:
        path = (root / name).resolve()
        inside, there = path.is_relative_to(root), path.is_file()
    except (OSError, ValueError, RuntimeError):
        raise EnvironmentDataError("is no usable path") from None
    if not inside:
        raise EnvironmentDataError("lies outside the folder of the plasma")
    if not there:
        raise EnvironmentDataError("there is no such file")
    if path.stat().st_size > LARGEST_FILE_BYTES:
        raise EnvironmentDataError("the file is too large", allowed="up to 5 MB")
    if path.suffix.lower() == ".csv":
        energy, flux = _csv(path)
    elif path.suffix.lower() == ".nc":
        energy, flux = _netcdf(path)
    else:
        raise EnvironmentDataError("is no spectrum file", allowed="a name ending in .csv or .nc")
    return Tabulated(energy, flux)


Pair = tuple[tuple[float, ...], tuple[float, ...]]


def _csv(path: Path) -> Pair:
    try:
        lines = path.read_text(encoding="utf-8-sig").splitlines()
    except (OSError, UnicodeDecodeError):
        raise EnvironmentDataError("cannot be read as UTF-8 text") from None
    rows: list[tuple[float, float]] = []
    header = False
    for number, line in enumerate(lines, start=1):
        text = line.split("#", 1)[0].strip()
        if not text:
            continue
        cells = tuple(cell.strip() for cell in text.split(","))
        if not header:
            if cells != COLUMNS:
                raise EnvironmentDataError(f"line {number} is no header", allowed=",".join(COLUMNS))
            header = True
            continue
        try:
            energy, flux = (float(cell) for cell in cells)
        except ValueError:
            raise EnvironmentDataError(
                f"line {number} does not hold two numbers", allowed=",".join(COLUMNS)
            ) from None
        rows.append((energy, flux))
    if not rows:
        raise EnvironmentDataError("holds no channels", allowed=",".join(COLUMNS))
    energies, fluxes = zip(*rows, strict=True)
    return energies, fluxes


def _netcdf(path: Path) -> Pair:
    import xarray as xr

    try:
        refuse_hollow_file(path, COLUMNS)
        with xr.open_dataset(path, decode_cf=False, create_default_indexes=False) as dataset:
            found = [np.asarray(dataset[name].values, dtype=np.float64) for name in COLUMNS]
    except EnvironmentDataError:
        raise
    except (OSError, ValueError, KeyError, TypeError):
        raise EnvironmentDataError(
            "is no NetCDF file with the variables", allowed=", ".join(COLUMNS)
        ) from None
    if any(values.ndim != 1 for values in found):
        raise EnvironmentDataError("holds variables that are not one-dimensional")
    energy, flux = found
    return tuple(energy.tolist()), tuple(flux.tolist())
