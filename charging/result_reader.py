"""A result file opened with care: small enough, whole, and of a version that can be read."""

from __future__ import annotations

import json
from collections.abc import Iterable
from pathlib import Path

import xarray as xr

from charging import __version__
from charging.errors import InputError, printable
from environments.errors import EnvironmentDataError
from environments.netcdf_sizes import refuse_hollow_file

KEPT_AS_JSON = (
    "material_texts", "material_sha256", "plasma_texts", "plasma_sha256", "file_texts",
    "file_sha256", "photoyield", "mode_spans", "plasma_regions", "branch_jumps", "limits",
)  # fmt: skip
"""Attributes that hold JSON, where they are present."""


def opened_result(path: Path) -> xr.Dataset:
    """Return everything in a NetCDF file, in memory.

    Raises
    ------
    InputError
        No NetCDF, truncated, or declaring far more than it holds.
    """
    try:
        refuse_hollow_file(path)
        with xr.open_dataset(path, engine="netcdf4") as dataset:
            dataset.load()
    except EnvironmentDataError as error:
        raise InputError(error.problem, file=str(path)) from None
    except (OSError, ValueError, RuntimeError) as error:
        raise InputError(
            f"cannot be read as NetCDF ({printable(str(error))})", file=str(path)
        ) from error
    return dataset


def refuse_incomplete(dataset: xr.Dataset, path: Path, variables: Iterable[str]) -> None:
    """Refuse what is no result, a result of another version that lacks something, broken JSON.

    Raises
    ------
    InputError
        With the version that wrote the file and what it lacks.
    """
    attributes = dataset.attrs
    lacking = [name for name in variables if name not in dataset.variables]
    what = f"variable {lacking[0]}" if lacking else "attribute case_text"
    absent = lacking or not isinstance(attributes.get("case_text"), str)
    if absent and "halflit_version" not in attributes:
        raise InputError(f"has no {what}, so it is no result of halflit", file=str(path))
    if absent:
        writer = printable(str(attributes["halflit_version"]), 20)
        again = "Run its case again: halflit run CASE"
        if isinstance(attributes.get("case_text"), str):
            again += "; the case is kept in the file as its attribute case_text"
        raise InputError(
            f"was written by halflit {writer} and has no {what}, which halflit {__version__} needs",
            file=str(path),
            next_step=f"{again}.",
        )
    for name in KEPT_AS_JSON:
        try:
            kept = json.loads(str(attributes.get(name, "{}")))
        except (ValueError, RecursionError):
            raise InputError(f"attribute {name} is no JSON", file=str(path)) from None
        texts = name.endswith(("_texts", "_sha256"))
        if texts and not (
            isinstance(kept, dict) and all(isinstance(text, str) for text in kept.values())
        ):
            raise InputError(f"attribute {name} holds no texts by name", file=str(path))
