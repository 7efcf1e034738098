"""Our own library of materials, and the way in for a record from a file."""

from __future__ import annotations

import difflib
import re
import tomllib
from collections.abc import Mapping
from functools import cache
from importlib import resources
from types import MappingProxyType

from materials.errors import MaterialError
from materials.reader import material_from
from materials.record import PROPERTIES, Material, PhotoYield, Property, Spread, Value

__all__ = [
    "PROPERTIES",
    "Material",
    "PhotoYield",
    "Property",
    "Spread",
    "Value",
    "library_text",
    "load_material",
    "material_names",
    "read_material",
]


def material_names() -> tuple[str, ...]:
    """Return the names of the library's materials in alphabetical order.

    Examples
    --------
    >>> "polyimide film" in material_names()
    True
    """
    return _library_names()


@cache
def _library_names() -> tuple[str, ...]:
    return tuple(sorted(tomllib.loads(text)["name"] for text in _library_texts().values()))


@cache
def _library_texts() -> Mapping[str, str]:
    folder = resources.files("materials") / "data"
    return MappingProxyType(
        {
            entry.name.removesuffix(".toml"): entry.read_bytes().decode("utf-8")
            for entry in sorted(folder.iterdir(), key=lambda entry: entry.name)
            if entry.name.endswith(".toml")
        }
    )


def library_text(name: str) -> str:
    """Return the TOML text of a library material, as stored.

    Parameters
    ----------
    name : str
        A library name.

    Returns
    -------
    str
        Text to hash or to keep with a result.

    Raises
    ------
    MaterialError
        The name is unknown; carries the nearest one.

    Examples
    --------
    >>> library_text("gold").splitlines()[0]
    'name = "gold"'
    """
    if name not in _library_names():
        close = difflib.get_close_matches(name, _library_names(), n=1, cutoff=0.4)
        raise MaterialError(
            ("material",),
            name,
            "is unknown",
            allowed="a name listed by 'halflit materials'",
            nearest=close[0] if close else None,
        )
    return _library_texts()[re.sub(r"[^a-z0-9]+", "_", name.lower()).strip("_")]


@cache
def load_material(name: str) -> Material:
    """Return a material of the library.

    Parameters
    ----------
    name : str
        A library name, see `material_names`.

    Returns
    -------
    Material
        Read once, shared and read-only.

    Raises
    ------
    MaterialError
        The name is unknown; carries the nearest one.

    Examples
    --------
    >>> load_material("gold").value("work_function_eV")
    5.1
    """
    return read_material(tomllib.loads(library_text(name)))


def read_material(document: Mapping[str, object]) -> Material:
    """Check a record and return it as a material.

    Parameters
    ----------
    document : mapping
        A parsed TOML record: `name`, `kind`, optional `description` and
        `emits`, one table per property and `photoyield`.

    Returns
    -------
    Material
        Read-only.

    Raises
    ------
    MaterialError
        Unknown, missing or unusable entry; carries the path of its key.

    Examples
    --------
    >>> read_material({"name": "ideal collector", "kind": "conductor", "emits": False}).emits
    False
    """
    material = material_from(document)
    for state, record in material.surface_states.items():
        if record.curve_of is not None:
            _refuse_no_curve(("surface_state", state, "curve_of"), record.curve_of)
    return material


def _refuse_no_curve(key: tuple[str, ...], name: str) -> None:
    """Refuse a name that is none of a library material with a photoyield."""
    try:
        text = library_text(name)
    except MaterialError as error:
        raise MaterialError(
            key, name, "is unknown", allowed=error.allowed, nearest=error.nearest
        ) from None
    if "photoyield" not in tomllib.loads(text):
        raise MaterialError(
            key, name, "emits nothing", allowed="a library material with a photoyield"
        )
