"""The plasmas that come with the package, and the reader of plasma files."""

import re
import tomllib
import unicodedata
from collections.abc import Mapping
from functools import cache
from importlib.resources import files
from pathlib import Path
from types import MappingProxyType
from typing import Final

from scipy.constants import atomic_mass

from environments.auroral import FlatAndMaxwellian, Fontheim
from environments.distributions import DISTRIBUTIONS, Tabulated
from environments.errors import EnvironmentDataError, nearest_name
from environments.isotropic import Distribution
from environments.plasma import BASES, LAWS, SPECIES, Plasma, Population, Species, population_of
from environments.spectrum_file import read_spectrum

NAME_PATTERN: Final = re.compile(r"[A-Za-z0-9]([A-Za-z0-9 ,()._+-]{0,62}[A-Za-z0-9)+])?")
"""Names of library entries; never used as paths."""

PLASMA_KEYS: Final = ("name", "title", "source", "basis", "clause", "note", "population")
"""Keys of a plasma document."""

COMMON_KEYS: Final = ("species", "mass_u", "charge_number", "law")
"""Keys of every ``[[population]]``; the others belong to its law."""

PITCH_ANGLE_LAWS: Final = (Fontheim.law, FlatAndMaxwellian.law)
"""Laws of field-aligned beams, whose files must say ``pitch_angle = "isotropic"``."""

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


def read_plasma(document: Mapping[str, object], folder: Path | None = None) -> Plasma:
    """Plasma from a parsed document.

    Parameters
    ----------
    document : mapping
        ``title``, ``source`` (texts), ``population`` (array of tables); optional ``name``
        (default: the title), ``basis`` (default "assumed": an author who says nothing has
        not said that it was measured), ``clause``, ``note``. A population holds ``species``
        ("electron", "H+", "He+", "O+") or ``mass_u`` [u] with ``charge_number``; ``law``
        (default "maxwellian") and the figures of that law, which are the fields of its class
        in `environments.distributions.DISTRIBUTIONS`: ``density_m3`` [m-3], > 0;
        ``temperature_eV`` [eV], > 0; ``kappa``; ... A tabulated spectrum is given as
        ``energy_eV`` with ``flux_m2_s_sr_eV``, or as ``spectrum_file`` (CSV or NetCDF).
        Auroral laws say ``pitch_angle = "isotropic"``.
    folder : Path, optional
        Where a ``spectrum_file`` is looked for; without it such a file is refused.

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
            populations.append(_read_population(row, folder))
        except EnvironmentDataError as error:
            raise error.below("population", number) from None
    return Plasma(name, title, source, basis, clause, note, tuple(populations))


def _read_population(row: object, folder: Path | None) -> Population:
    if not isinstance(row, Mapping):
        raise EnvironmentDataError("is not a table", value=row, allowed="a table of keys")
    law = _choice(row, "law", LAWS) if "law" in row else "maxwellian"
    kind = DISTRIBUTIONS[law]
    _refuse_keys_of_other_laws(row, law)
    species = _read_species(row)
    if law in PITCH_ANGLE_LAWS:
        _choice(row, "pitch_angle", ("isotropic",))
    if "spectrum_file" in row:
        return population_of(species, _spectrum_of_file(row, folder))
    figures: dict[str, object] = {
        key: _number(row, key, low, high) for key, (low, high) in kind.numbers.items()
    }
    for key, (low, high) in kind.arrays.items():
        figures[key] = _numbers(row, key, low, high)
    return population_of(species, _made(kind, figures))


def _made(kind: type[Distribution], figures: Mapping[str, object]) -> Distribution:
    return kind(**figures)


def _spectrum_of_file(row: Mapping[str, object], folder: Path | None) -> Tabulated:
    for key in Tabulated.arrays:
        if key in row:
            raise EnvironmentDataError(
                "says again what spectrum_file already says", key=(key,), value=row[key]
            )
    name = _text(row, "spectrum_file")
    if folder is None:
        raise EnvironmentDataError(
            "cannot be looked for: the plasma has no folder",
            key=("spectrum_file",),
            value=name,
            allowed="energy_eV and flux_m2_s_sr_eV in the plasma itself",
        )
    try:
        return read_spectrum(name, folder)
    except EnvironmentDataError as error:
        raise EnvironmentDataError(
            f"cannot be used: {error}", key=("spectrum_file",), value=name
        ) from None


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
    allowed = 'an integer from 1 to 100; electrons are species = "electron"'
    if isinstance(charge, bool) or not isinstance(charge, int) or not 0 < abs(charge) <= 100:
        raise EnvironmentDataError(
            "is not a charge in units of e", key=("charge_number",), value=charge, allowed=allowed
        )
    if charge < 0:
        raise EnvironmentDataError(
            "stands for negative ions, which are not modelled",
            key=("charge_number",),
            value=charge,
            allowed=allowed,
        )
    return Species(f"{mass_u:g} u, charge {charge:+d}", mass_u * atomic_mass, charge)


def _keys_of(law: str) -> tuple[str, ...]:
    """Keys of a ``[[population]]`` with a law besides `COMMON_KEYS`."""
    kind = DISTRIBUTIONS[law]
    own = (*kind.numbers, *kind.arrays)
    if law in PITCH_ANGLE_LAWS:
        return (*own, "pitch_angle")
    return (*own, "spectrum_file") if law == Tabulated.law else own


def _refuse_keys_of_other_laws(row: Mapping[str, object], law: str) -> None:
    """Refuse unknown keys; the hint looks at the keys of every law and says whose they are."""
    own = (*COMMON_KEYS, *_keys_of(law))
    for key in row:
        if key in own:
            continue
        # an exact or near key of this law comes before those of others
        near = nearest_name(key, own)
        every = [k for other in LAWS for k in _keys_of(other)]
        if near is None or nearest_name(key, (near, *every)) != near:
            near = nearest_name(key, every) or near
        others = [other for other in LAWS if near in _keys_of(other)]
        problem = "is not a key known here"
        if near is not None and near not in own:
            problem = f'is not a key of law = "{law}"; {near} belongs to ' + " and ".join(
                f'"{other}"' for other in others
            )
        raise EnvironmentDataError(
            problem,
            key=(str(key),),
            allowed=", ".join(own),
            nearest=None if near == key else near,
        )


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
    if any(unicodedata.category(c) == "Cc" and c not in "\n\t" for c in value):
        raise EnvironmentDataError("holds a control character", key=(key,), value=value)
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


def _numbers(table: Mapping[str, object], key: str, low: float, high: float) -> tuple[float, ...]:
    if key not in table:
        raise EnvironmentDataError("is missing", key=(key,), allowed="a list of numbers")
    values = table[key]
    if not isinstance(values, list | tuple):
        raise EnvironmentDataError(
            "must be a list", key=(key,), value=values, allowed="a list of numbers"
        )
    for value in values:
        _number({key: value}, key, low, high)
    return tuple(float(value) for value in values)


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
