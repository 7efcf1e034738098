"""The plasmas that come with the package, and the reader of plasma files."""

import re
import tomllib
from collections.abc import Mapping
from functools import cache
from importlib.resources import files
from types import MappingProxyType
from typing import Final

from scipy.constants import atomic_mass

from environments.errors import EnvironmentDataError, nearest_name
from environments.plasma import BASES, LAWS, SPECIES, Plasma, Population, Species

NAME_PATTERN: Final = re.compile(r"[A-Za-z0-9]([A-Za-z0-9 ,()._+-]{0,62}[A-Za-z0-9)+])?")
"""Names of library entries; never used as paths."""

PLASMA_KEYS: Final = ("name", "title", "source", "basis", "clause", "note", "population")
"""Keys of a plasma document."""

POPULATION_KEYS: Final = (
    "species",
    "mass_u",
    "charge_number",
    "law",
    "density_m3",
    "temperature_eV",
)
"""Keys of one ``[[population]]``."""

# Ranges outside which a figure is refused as a slip of units; assumed, far beyond any
# plasma that a spacecraft meets (lobe 1e4 m-3, ionosphere 1e12 m-3; 0.02 eV ... 100 keV).
DENSITY_RANGE_M3: Final = (1.0, 1e16)
TEMPERATURE_RANGE_EV: Final = (1e-3, 1e6)
MASS_RANGE_U: Final = (1e-4, 500.0)


def plasma_names() -> tuple[str, ...]:
    """Names of all plasmas in the package, sorted.

    Examples
    --------
    >>> "quiet geostationary" in plasma_names()
    True
    """
    return tuple(sorted(_texts(), key=str.lower))


def library_text(name: str) -> str:
    """Text of the file that defines a plasma of the package, exactly as stored.

    Parameters
    ----------
    name : str
        One of `plasma_names`.

    Raises
    ------
    EnvironmentDataError
        Unknown name; the error carries the nearest one.

    Examples
    --------
    >>> library_text("quiet geostationary").startswith("name = ")
    True
    """
    texts = _texts()
    if name not in texts:
        raise EnvironmentDataError(
            "is not a plasma known here",
            key=("plasma",),
            value=name,
            allowed="a name of the catalogue",
            nearest=nearest_name(name, texts),
        )
    return texts[name]


@cache
def load_plasma(name: str) -> Plasma:
    """Plasma of the package by name.

    Parameters
    ----------
    name : str
        One of `plasma_names`.

    Returns
    -------
    Plasma
        Frozen; the same object on every call.

    Raises
    ------
    EnvironmentDataError
        Unknown name; the error carries the nearest one.

    Examples
    --------
    >>> load_plasma("ECSS geostationary worst case").basis
    'memory'
    >>> load_plasma("quiet geostationry")
    Traceback (most recent call last):
    ...
    environments.errors.EnvironmentDataError: plasma = "quiet geostationry" is not ...
    """
    return read_plasma(tomllib.loads(library_text(name)))


def read_plasma(document: Mapping[str, object]) -> Plasma:
    """Plasma from a parsed document.

    Parameters
    ----------
    document : mapping
        ``title``, ``source`` (texts), ``population`` (array of tables); optional ``name``
        (default: the title), ``basis`` (default "assumed": an author who says nothing has
        not said that it was measured), ``clause``, ``note``. A population holds ``species``
        ("electron", "H+", "He+", "O+") or ``mass_u`` [u] with ``charge_number``; ``law``
        (default "maxwellian"); ``density_m3`` [m-3], > 0; ``temperature_eV`` [eV], > 0.

    Returns
    -------
    Plasma
        Populations in the order of the document.

    Raises
    ------
    EnvironmentDataError
        Unknown or absent key, wrong type (booleans, quoted numbers, nan and inf are no
        numbers), or a figure outside its range; carries the key path.

    Examples
    --------
    >>> plasma = read_plasma({"title": "one", "source": "example", "population": [
    ...     {"species": "electron", "density_m3": 1e6, "temperature_eV": 10.0}]})
    >>> plasma.populations[0].law, plasma.basis
    ('maxwellian', 'assumed')
    """
    if not isinstance(document, Mapping):
        raise EnvironmentDataError("is not a table", value=document, allowed="a table of keys")
    _refuse_unknown_keys(document, PLASMA_KEYS)
    title = _text(document, "title")
    source = _text(document, "source")
    name = _text(document, "name") if "name" in document else title
    if "name" in document and NAME_PATTERN.fullmatch(name) is None:
        raise EnvironmentDataError(
            "cannot be a name",
            key=("name",),
            value=name,
            allowed="letters, digits, blanks and ,()._+- (64 at most)",
        )
    basis = _choice(document, "basis", BASES) if "basis" in document else "assumed"
    clause = _text(document, "clause") if "clause" in document else None
    note = _text(document, "note") if "note" in document else ""
    if "population" not in document:
        raise EnvironmentDataError(
            "is missing", key=("population",), allowed="one [[population]] or more"
        )
    rows = document["population"]
    if not isinstance(rows, list | tuple) or not rows:
        raise EnvironmentDataError(
            "must be an array of tables",
            key=("population",),
            value=rows,
            allowed="one [[population]] or more",
        )
    populations = []
    for number, row in enumerate(rows):
        try:
            populations.append(_read_population(row))
        except EnvironmentDataError as error:
            raise error.below("population", number) from None
    return Plasma(name, title, source, basis, clause, note, tuple(populations))


def _read_population(row: object) -> Population:
    if not isinstance(row, Mapping):
        raise EnvironmentDataError("is not a table", value=row, allowed="a table of keys")
    _refuse_unknown_keys(row, POPULATION_KEYS)
    law = _choice(row, "law", LAWS) if "law" in row else "maxwellian"
    return Population(
        species=_read_species(row),
        law=law,
        density_m3=_number(row, "density_m3", *DENSITY_RANGE_M3),
        temperature_eV=_number(row, "temperature_eV", *TEMPERATURE_RANGE_EV),
    )


def _read_species(row: Mapping[str, object]) -> Species:
    own = [key for key in ("mass_u", "charge_number") if key in row]
    if "species" in row:
        if own:
            raise EnvironmentDataError(
                "says again what species already says",
                key=(own[0],),
                value=row[own[0]],
                allowed="species, or mass_u with charge_number",
            )
        return SPECIES[_choice(row, "species", tuple(SPECIES))]
    if not own:
        raise EnvironmentDataError(
            "is missing",
            key=("species",),
            allowed=", ".join(f'"{name}"' for name in SPECIES) + ", or mass_u with charge_number",
        )
    mass_u = _number(row, "mass_u", *MASS_RANGE_U)
    if "charge_number" not in row:
        raise EnvironmentDataError("is missing", key=("charge_number",), allowed="an integer")
    charge = row["charge_number"]
    if isinstance(charge, bool) or not isinstance(charge, int) or not 0 < abs(charge) <= 100:
        raise EnvironmentDataError(
            "is not a charge in units of e",
            key=("charge_number",),
            value=charge,
            allowed="an integer from -100 to 100, not 0",
        )
    return Species(f"{mass_u:g} u, charge {charge:+d}", mass_u * atomic_mass, charge)


def _refuse_unknown_keys(table: Mapping[str, object], known: tuple[str, ...]) -> None:
    for key in table:
        if key not in known:
            raise EnvironmentDataError(
                "is not a key known here",
                key=(str(key),),
                allowed=", ".join(known),
                nearest=nearest_name(key, known),
            )


def _text(table: Mapping[str, object], key: str) -> str:
    if key not in table:
        raise EnvironmentDataError("is missing", key=(key,), allowed="a text")
    value = table[key]
    if not isinstance(value, str) or not value.strip():
        raise EnvironmentDataError(
            "must be a text", key=(key,), value=value, allowed="a text that is not empty"
        )
    return value


def _choice(table: Mapping[str, object], key: str, choices: tuple[str, ...]) -> str:
    value = _text(table, key)
    if value not in choices:
        raise EnvironmentDataError(
            "is not known here",
            key=(key,),
            value=value,
            allowed=", ".join(f'"{choice}"' for choice in choices),
            nearest=nearest_name(value, choices),
        )
    return value


def _number(table: Mapping[str, object], key: str, low: float, high: float) -> float:
    allowed = f"a number from {low:g} to {high:g}"
    if key not in table:
        raise EnvironmentDataError("is missing", key=(key,), allowed=allowed)
    value = table[key]
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise EnvironmentDataError("must be a number", key=(key,), value=value, allowed=allowed)
    if not low <= value <= high:  # refuses nan and inf as well
        raise EnvironmentDataError("is out of range", key=(key,), value=value, allowed=allowed)
    return float(value)


@cache
def _texts() -> Mapping[str, str]:
    texts: dict[str, str] = {}
    for entry in files("environments").joinpath("data").iterdir():
        if entry.name.startswith("plasma_") and entry.name.endswith(".toml"):
            text = entry.read_text(encoding="utf-8")
            name = tomllib.loads(text)["name"]
            if name in texts:
                raise EnvironmentDataError("is defined twice", key=("name",), value=name)
            texts[name] = text
    return MappingProxyType(texts)
