"""A user's timeline of the plasma: measured moments or spectra in a table."""

import re
from collections.abc import Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.errors import EnvironmentDataError, nearest_name
from environments.plasma import BASES
from environments.population_series import PopulationSeries
from environments.regions import REGIONS, RegionPlasma
from environments.species import SPECIES, Species
from environments.text_table import TextTable, increasing_times, number, read_table
from environments.timescales import read_tai, utc_from_tai
from environments.two_maxwellians import spectrum_moments, two_maxwellians

Array = NDArray[np.float64]
Stamps = NDArray[np.datetime64]

_NOTES: Final = ("source", "basis", "longest_gap_min", "gap", "kappa")
DEFAULT_GAP_MIN: Final = 15.0
"""Longest time between rows that needs no word [min]."""

# of a column's name after the population: what it is, and its factor to m-3 and eV
_QUANTITIES: Final = {
    "density_cm3": ("density", 1e6), "density_m3": ("density", 1.0),
    "temperature_eV": ("temperature", 1.0), "temperature_keV": ("temperature", 1e3),
}  # fmt: skip
_ENERGY: Final = re.compile(r"(.+)_([0-9.eE+-]+)_?eV")
_FLUX_TO_SI: Final = 1e4  # cm-2 to m-2
_LARGEST: Final = {"density": 1e18, "temperature": 1e7}
_SMALLEST_TEMPERATURE_EV: Final = 1e-3


@dataclass(frozen=True, slots=True)
class PlasmaTimeline:
    """Populations at the times of a file's rows.

    Attributes
    ----------
    times : ndarray of datetime64[ns], shape (K,)
        UTC, increasing.
    populations : tuple of PopulationSeries
        At those times.
    source, basis : str
        As the file says.
    cautions : tuple of str
        Gaps bridged, spectra that no two Maxwellians describe.
    """

    times: Stamps
    populations: tuple[PopulationSeries, ...]
    source: str
    basis: str
    cautions: tuple[str, ...]

    def at(self, times: ArrayLike) -> tuple[PopulationSeries, ...]:
        """Populations at times.

        Parameters
        ----------
        times : array_like of datetime64, shape (T,)
            UTC, within the rows.

        Returns
        -------
        tuple of PopulationSeries
            Density and pressure linear between rows, so that neither lies outside of them.

        Raises
        ------
        EnvironmentDataError
            Times outside of the rows.
        """
        stamps = np.asarray(times).astype("datetime64[ns]")
        first, last = self.times[0], self.times[-1]
        if stamps.size and (stamps.min() < first or stamps.max() > last):
            raise EnvironmentDataError(
                "the plasma timeline does not cover the run", allowed=f"{first}Z to {last}Z"
            )
        at = (stamps - first).astype(np.int64).astype(np.float64)
        rows = (self.times - first).astype(np.int64).astype(np.float64)
        found = []
        for p in self.populations:
            density = np.interp(at, rows, p.density_m3)
            pressure = np.interp(at, rows, p.density_m3 * p.temperature_eV)
            plain = np.interp(at, rows, p.temperature_eV)
            held = density > 0.0
            temperature = np.where(held, pressure / np.where(held, density, 1.0), plain)
            found.append(replace(p, density_m3=density, temperature_eV=temperature))
        return tuple(found)

    def along(self, times: ArrayLike) -> RegionPlasma:
        """Plasma at times, as `environments.regions.plasma_along` gives it.

        Parameters
        ----------
        times : array_like of datetime64, shape (T,)
            UTC, within the rows.

        Returns
        -------
        RegionPlasma
            See `at`; its region is "as measured".
        """
        populations = self.at(times)
        count = np.asarray(times).size
        region = REGIONS.index("as measured")
        blend = np.zeros((len(REGIONS), count))
        blend[region] = 1.0
        flags = np.full(count, region, dtype=np.int64)
        return RegionPlasma(flags, populations, blend, self.cautions, {self.basis: 1.0})


def read_plasma_timeline(path: str | Path) -> PlasmaTimeline:
    """Read a timeline of moments or spectra.

    Parameters
    ----------
    path : str or Path
        Comma-separated. Notes above the columns: ``# source = ...`` (needed), ``# basis =
        ...`` (measured), ``# longest_gap_min = ...`` (15), ``# gap = TIME to TIME; ...`` for
        longer ones that are known, ``# kappa = electron 4.0; ...`` for populations that are no
        Maxwellians. Columns: ``time`` (UTC with Z), and for every population, named by its
        species and a number where there are several (``electron``, ``electron_2``, ``H+``):
        either ``electron_density_cm3`` and ``electron_temperature_eV`` (or ``_m3``, ``_keV``),
        or channels of a spectrum, ``electron_100_eV``, ``electron_200_eV``, ... with the
        directional differential number flux in cm-2 s-1 sr-1 eV-1.

    Returns
    -------
    PlasmaTimeline
        A spectrum becomes the two Maxwellians with its four moments.

    Raises
    ------
    EnvironmentDataError
        With file and line: nan or another word for a number, negative density or flux,
        temperature not above 0, unknown column (with the nearest), density without
        temperature, time without Z or not after the one before, gap that is not declared.
    """
    table = read_table(path, _NOTES)
    if "source" not in table.notes:
        raise table.error("needs a note # source = ... above the columns", table.columns_line)
    basis, basis_line = table.notes.get("basis", ("measured", 0))
    if basis not in BASES:
        raise table.error(
            f'basis "{basis}" is unknown', basis_line, allowed=", ".join(BASES),
            nearest=nearest_name(basis, BASES) or "",
        )  # fmt: skip
    columns = _columns(table)
    stamps = _times(table)
    cautions = _gaps(table, stamps)
    values = _values(table, columns)
    kappas = _kappas(table, tuple(dict.fromkeys(c.population for c in columns)))
    source = table.notes["source"][0]
    series: list[PopulationSeries] = []
    for name in dict.fromkeys(c.population for c in columns):
        mine = [k for k, c in enumerate(columns) if c.population == name]
        if columns[mine[0]].quantity == "flux":
            found, word = _from_spectra(name, [columns[k] for k in mine], values[:, mine],
                                        source, basis)  # fmt: skip
            series += found
            cautions += word
            continue
        moments = {columns[k].quantity: values[:, k] for k in mine}
        kappa = kappas.get(name)
        series.append(
            PopulationSeries(
                columns[mine[0]].species, "maxwellian" if kappa is None else "kappa", kappa,
                moments["density"], moments["temperature"], None, name, source, basis,
            )
        )  # fmt: skip
    return PlasmaTimeline(stamps, tuple(series), source, basis, tuple(cautions))


@dataclass(frozen=True, slots=True)
class _Column:
    name: str
    population: str
    species: Species
    quantity: str
    factor: float
    energy_eV: float = 0.0


def _columns(table: TextTable) -> list[_Column]:
    line = table.columns_line
    if table.columns[0] != "time":
        raise table.error(f'first column "{table.columns[0]}" must be time', line)
    found = [_column(table, name) for name in table.columns[1:]]
    if not found:
        raise table.error("holds no population", line)
    for population in dict.fromkeys(c.population for c in found):
        mine = [c for c in found if c.population == population]
        kinds = [c.quantity for c in mine]
        if "flux" in kinds:
            energies = [c.energy_eV for c in mine if c.quantity == "flux"]
            if set(kinds) != {"flux"} or len(energies) < 3 or sorted(set(energies)) != energies:
                raise table.error(
                    f"{population}: a spectrum is three channels or more of rising energy, "
                    "without moments", line,
                )  # fmt: skip
        elif sorted(kinds) != ["density", "temperature"]:
            raise table.error(
                f"{population}: one density and one temperature are due, found "
                + ", ".join(c.name for c in mine), line,
            )  # fmt: skip
    return found


def _column(table: TextTable, name: str) -> _Column:
    for ending, (quantity, factor) in _QUANTITIES.items():
        if name.endswith("_" + ending):
            population = name[: -len(ending) - 1]
            species = _species(population)
            if species is not None:
                return _Column(name, population, species, quantity, factor)
    match = _ENERGY.fullmatch(name)
    if match is not None and (species := _species(match[1])) is not None:
        try:
            energy = number(match[2], table.columns_line)
        except EnvironmentDataError:
            energy = 0.0
        if energy > 0.0:
            return _Column(name, match[1], species, "flux", _FLUX_TO_SI, energy)
    known = [f"{s}_{q}" for s in SPECIES for q in _QUANTITIES]
    raise table.error(
        f'column "{name}" is unknown', table.columns_line,
        allowed="time, SPECIES_density_cm3, SPECIES_temperature_eV, SPECIES_100_eV ... with "
        "SPECIES one of " + ", ".join(SPECIES) + ", numbered _2, _3 ... where there are several",
        nearest=nearest_name(name, known) or known[0],
    )  # fmt: skip


def _species(population: str) -> Species | None:
    name, _, count = population.rpartition("_")
    if name and count.isdigit() and int(count) > 0:
        return SPECIES.get(name)
    return SPECIES.get(population)


def _times(table: TextTable) -> Stamps:
    stamps = [stamp for stamp, _, _ in increasing_times(table)]
    if len(stamps) < 2:
        raise table.error("holds one row; a timeline needs two", table.rows[0][0])
    return utc_from_tai(np.array(stamps))


def _gaps(table: TextTable, stamps: Stamps) -> list[str]:
    text, line = table.notes.get("longest_gap_min", (str(DEFAULT_GAP_MIN), 0))
    longest = number(text, line, table.file)
    if longest <= 0.0:
        raise table.error(f"longest_gap_min = {text} is not above 0", line)
    declared = _declared_gaps(table)
    words = []
    minutes = np.diff(stamps).astype(np.int64) / 60e9
    for k in np.flatnonzero(minutes > longest):
        begin, end = stamps[k], stamps[k + 1]
        if not any(first <= begin and end <= last for first, last in declared):
            raise table.error(
                f"follows a gap of {minutes[k]:.6g} min", table.rows[k + 1][0],
                allowed=f"up to {longest:g} min (# longest_gap_min = ...), or declared: "
                f"# gap = {str(begin)[:19]}Z to {str(end)[:19]}Z",
            )  # fmt: skip
        words.append(
            f"plasma timeline: {minutes[k]:.6g} min without data from {str(begin)[:19]}Z, bridged "
            "by a straight line"
        )
    return words


def _declared_gaps(table: TextTable) -> list[tuple[np.datetime64, np.datetime64]]:
    text, line = table.notes.get("gap", ("", 0))
    found = []
    for part in filter(None, (p.strip() for p in text.split(";"))):
        first, _, last = part.partition(" to ")
        try:
            ends = [read_tai(end.strip(), "UTC", zone="required") for end in (first, last)]
        except EnvironmentDataError as error:
            raise table.error(
                f'gap "{part}": {error}', line, allowed="TIME to TIME; TIME to TIME"
            ) from error
        begin, end = utc_from_tai(np.array(ends))
        found.append((begin, end))
    return found


def _kappas(table: TextTable, populations: tuple[str, ...]) -> Mapping[str, float]:
    text, line = table.notes.get("kappa", ("", 0))
    found = {}
    for part in filter(None, (p.strip() for p in text.split(";"))):
        name, _, value = part.rpartition(" ")
        if name not in populations:
            raise table.error(
                f'kappa of "{name}", which no column holds', line, allowed=", ".join(populations),
                nearest=nearest_name(name, populations) or "",
            )  # fmt: skip
        kappa = number(value, line, table.file)
        if not 2.01 <= kappa <= 200.0:
            raise table.error(f"kappa = {value} is out of range", line, allowed="2.01 to 200")
        found[name] = kappa
    return found


def _values(table: TextTable, columns: list[_Column]) -> Array:
    values = np.empty((len(table.rows), len(columns)))
    for row, (line, cells) in enumerate(table.rows):
        for k, (column, cell) in enumerate(zip(columns, cells[1:], strict=True)):
            try:
                value = column.factor * number(cell, line, table.file)
            except EnvironmentDataError as error:
                raise table.error(
                    f'{column.name} = "{cell}" is not a finite number', line
                ) from error
            values[row, k] = value
            lowest = _SMALLEST_TEMPERATURE_EV if column.quantity == "temperature" else 0.0
            if not lowest <= value <= _LARGEST.get(column.quantity, 1e30):
                raise table.error(
                    f"{column.name} = {cell} is out of range", line,
                    allowed=f"{lowest / column.factor:g} to "
                    f"{_LARGEST.get(column.quantity, 1e30) / column.factor:g}",
                )  # fmt: skip
    return values


def _from_spectra(
    name: str, columns: list[_Column], flux: Array, source: str, basis: str
) -> tuple[list[PopulationSeries], list[str]]:
    species = columns[0].species
    energy = np.array([c.energy_eV for c in columns])
    found = two_maxwellians(spectrum_moments(energy, flux, species.mass_kg), species.mass_kg)
    words = []
    if bool(found.single.any()):
        words.append(
            f"plasma timeline: {int(found.single.sum())} of {found.single.size} spectra of {name} "
            "are narrower than a Maxwellian; density and pressure are kept, the flux is not"
        )
    words.append(
        f"plasma timeline: spectra of {name} count as two Maxwellians of equal density, flux, "
        "pressure and energy flux"
    )
    parts = (
        ("colder", found.cold_density_m3, found.cold_temperature_eV),
        ("hotter", found.hot_density_m3, found.hot_temperature_eV),
    )
    return [
        PopulationSeries(
            species, "maxwellian", None, density, np.maximum(T, _SMALLEST_TEMPERATURE_EV), None,
            f"{name}, {word}", source, basis,
        )
        for word, density, T in parts
    ], words  # fmt: skip
