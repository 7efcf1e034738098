"""Check of the photoyield and the surface states of a material record."""

from __future__ import annotations

from itertools import pairwise

import numpy as np

from materials.entries import (
    Path,
    Table,
    choice_at,
    number_at,
    numbers_at,
    refuse_unknown,
    source_at,
    table_at,
    text_at,
)
from materials.errors import MaterialError
from materials.fitted_escape import FITTED_LAWS, FittedEnergies
from materials.photo_laws import fowler_dubridge, law_yield
from materials.record import (
    ABOVE_LAST_POINT,
    BASES,
    PHOTOYIELD_LAWS,
    PHOTOYIELD_LEVELS,
    SURFACE_STATES,
    YIELD_COUNTS,
    MeasuredCurrent,
    PhotoYield,
    Samples,
    SurfaceState,
)

WHERE = "photoyield"
LAW_SAMPLES = 60
SMALLEST_YIELD, LARGEST_YIELD = 1e-30, 10.0
LOWEST_EDGE_EV, HIGHEST_EDGE_EV = 1.0, 1e5
_TABLE_KEYS = ("photon_energy_eV", "electrons_per_photon")
_LAW_KEYS = ("threshold_eV", "electrons_per_photon_at_1_eV", "upper_photon_energy_eV")
_OWN_KEYS = {
    "table": _TABLE_KEYS,
    "fowler_dubridge": (*_LAW_KEYS, "temperature_K"),
    "power": (*_LAW_KEYS, "exponent"),
}
_COMMON_KEYS = (
    "law",
    "source",
    "basis",
    "level",
    "spread_factor",
    "near_threshold_factor",
    "near_threshold_to_eV",
    "high_energy_factor",
    "high_energy_from_eV",
    "above_last_point",
    "x_ray",
    "counts",
    "reflectance",
    "largest_angle_growth",
    "electron_energies",
    "normalised_to",
    "note",
)
_STATE_KEYS = ("curve_of", "barrier_shift_eV", "source", "basis", "note")


def photoyield_from(entry: object) -> PhotoYield:
    """Return the curve of a parsed ``[photoyield]`` table; raises MaterialError."""
    table = table_at(entry, (WHERE,))
    law = choice_at(table, (WHERE, "law"), PHOTOYIELD_LAWS) if "law" in table else "table"
    refuse_unknown(table, (*_OWN_KEYS[law], *_COMMON_KEYS), (WHERE,))
    at_1_eV, exponent, temperature = 0.0, 2.0, 0.0
    if law == "table":
        energy, emitted = _points(table)
    else:
        threshold = _within(table, "threshold_eV", LOWEST_EDGE_EV, 20.0)
        upper = _within(table, "upper_photon_energy_eV", threshold, HIGHEST_EDGE_EV, above=True)
        at_1_eV = _within(table, "electrons_per_photon_at_1_eV", SMALLEST_YIELD, LARGEST_YIELD)
        if law == "power":
            # Kane 1967: 1 to 5/2 by the way of excitation and scattering
            exponent = _within(table, "exponent", 1.0, 2.5)
        elif "temperature_K" in table:
            temperature = _within(table, "temperature_K", 0.0, 3000.0)
        step = np.linspace(0.0, 1.0, LAW_SAMPLES) ** 2
        points = threshold + (upper - threshold) * step
        points[-1] = upper
        energy = points.tolist()
        emitted = law_yield(points, threshold, at_1_eV, exponent=exponent).tolist()
        _law_within(upper, threshold, at_1_eV, exponent, temperature)
    above = (
        choice_at(table, (WHERE, "above_last_point"), ABOVE_LAST_POINT)
        if "above_last_point" in table
        else "hold"
    )
    x_ray = _samples(table, "x_ray", "mass_absorption_m2_kg", 1e-6, 1e6)
    if above == "x-ray absorption":
        if x_ray is None:
            raise MaterialError((WHERE, "x_ray"), None, 'is missing beside "x-ray absorption"')
        if x_ray.photon_energy_eV[0] > energy[-1]:
            raise MaterialError(
                (WHERE, "x_ray", "photon_energy_eV", 0),
                x_ray.photon_energy_eV[0],
                "begins above the last point of the curve",
                allowed=f"at most {energy[-1]:g}",
            )
    counts = (
        choice_at(table, (WHERE, "counts"), YIELD_COUNTS) if "counts" in table else YIELD_COUNTS[0]
    )
    reflectance = _samples(table, "reflectance", "share", 0.0, 1.0)
    if counts == "absorbed photons" and reflectance is None:
        raise MaterialError((WHERE, "reflectance"), None, 'is missing beside "absorbed photons"')
    growth = "largest_angle_growth"
    factor = _factor(table, "spread_factor")
    near, high = "near_threshold_to_eV", "high_energy_from_eV"
    return PhotoYield(
        photon_energy_eV=np.array(energy),
        electrons_per_photon=np.array(emitted),
        source=source_at(table, (WHERE, "source")),
        basis=choice_at(table, (WHERE, "basis"), BASES),
        level=choice_at(table, (WHERE, "level"), PHOTOYIELD_LEVELS),
        spread_factor=factor,
        near_threshold_factor=_factor(table, "near_threshold_factor", factor),
        near_threshold_to_eV=_edge(table, near, energy[0]),
        high_energy_factor=_factor(table, "high_energy_factor", factor),
        high_energy_from_eV=_edge(table, high, energy[-1]),
        note=text_at(table, (WHERE, "note")) if "note" in table else "",
        law=law,
        electrons_per_photon_at_1_eV=at_1_eV,
        exponent=exponent,
        temperature_K=temperature,
        above_last_point=above,
        x_ray=x_ray,
        counts=counts,
        reflectance=reflectance,
        largest_angle_growth=_within(table, growth, 1.0, 5.0) if growth in table else 1.0,
        energies=_energies(table),
        normalised_to=_measured(table),
    )


def states_from(entry: object) -> dict[str, SurfaceState]:
    """Return the states of a parsed ``[surface_state]`` table; raises MaterialError."""
    where = "surface_state"
    states = table_at(entry, (where,))
    refuse_unknown(states, SURFACE_STATES, (where,))
    found = {}
    for name, content in states.items():
        path = (where, name)
        table = table_at(content, path)
        refuse_unknown(table, _STATE_KEYS, path)
        if ("curve_of" in table) == ("barrier_shift_eV" in table):
            raise MaterialError(
                path, None, "needs one of two keys", allowed="curve_of or barrier_shift_eV"
            )
        shift = None
        if "barrier_shift_eV" in table:
            shift = number_at(table, (*path, "barrier_shift_eV"))
            if not -3.0 <= shift <= 3.0:
                raise MaterialError(
                    (*path, "barrier_shift_eV"), shift, "is out of range", allowed="-3 to 3 eV"
                )
        found[name] = SurfaceState(
            source=text_at(table, (*path, "source")),
            basis=choice_at(table, (*path, "basis"), BASES),
            curve_of=text_at(table, (*path, "curve_of")) if "curve_of" in table else None,
            barrier_shift_eV=shift,
            note=text_at(table, (*path, "note")) if "note" in table else "",
        )
    return found


def _points(table: Table) -> tuple[list[float], list[float]]:
    energy = numbers_at(table, (WHERE, "photon_energy_eV"))
    emitted = numbers_at(table, (WHERE, "electrons_per_photon"))
    _same_length(energy, emitted, (WHERE, "electrons_per_photon"))
    if len(energy) < 3:
        raise MaterialError(
            (WHERE, "photon_energy_eV"), len(energy), "is too few points", allowed="at least 3"
        )
    _rising(energy, (WHERE, "photon_energy_eV"))
    if energy[0] < LOWEST_EDGE_EV:
        raise MaterialError(
            (WHERE, "photon_energy_eV", 0),
            energy[0],
            "is too low for a threshold",
            allowed=f"at least {LOWEST_EDGE_EV:g} eV",
        )
    if emitted[0] != 0.0:
        raise MaterialError(
            (WHERE, "electrons_per_photon", 0), emitted[0], "is not 0", allowed="0 at the threshold"
        )
    for index, number in enumerate(emitted[1:], start=1):
        if not SMALLEST_YIELD <= number <= LARGEST_YIELD:
            raise MaterialError(
                (WHERE, "electrons_per_photon", index),
                number,
                "is out of range",
                allowed=f"{SMALLEST_YIELD:g} to {LARGEST_YIELD:g}",
            )
    return energy, emitted


def _samples(table: Table, key: str, quantity: str, low: float, high: float) -> Samples | None:
    if key not in table:
        return None
    path: Path = (WHERE, key)
    entry = table_at(table[key], path)
    refuse_unknown(entry, ("photon_energy_eV", quantity, "source", "basis"), path)
    energy = numbers_at(entry, (*path, "photon_energy_eV"))
    values = numbers_at(entry, (*path, quantity))
    _same_length(energy, values, (*path, quantity))
    if len(energy) < 2:
        raise MaterialError(
            (*path, "photon_energy_eV"), len(energy), "is too few points", allowed="at least 2"
        )
    _rising(energy, (*path, "photon_energy_eV"))
    for index, number in enumerate(values):
        if not low <= number <= high:
            raise MaterialError(
                (*path, quantity, index), number, "is out of range", allowed=f"{low:g} to {high:g}"
            )
    return Samples(
        tuple(energy),
        tuple(values),
        text_at(entry, (*path, "source")),
        choice_at(entry, (*path, "basis"), BASES),
    )


def _same_length(energy: list[float], values: list[float], path: Path) -> None:
    if len(energy) != len(values):
        raise MaterialError(
            path,
            len(values),
            "is a different number of points",
            allowed=f"{len(energy)}, as many as photon_energy_eV",
        )


def _rising(energy: list[float], path: Path) -> None:
    for index, (before, after) in enumerate(pairwise(energy), start=1):
        if not 0.0 < before < after:
            raise MaterialError((*path, index), after, "does not rise", allowed="above 0, rising")


def _within(table: Table, key: str, low: float, high: float, *, above: bool = False) -> float:
    number = number_at(table, (WHERE, key))
    if not low <= number <= high or (above and number == low):
        first = "above " if above else ""
        raise MaterialError(
            (WHERE, key), number, "is out of range", allowed=f"{first}{low:g} to {high:g}"
        )
    return number


def _edge(table: Table, key: str, default: float) -> float:
    return _within(table, key, LOWEST_EDGE_EV, HIGHEST_EDGE_EV) if key in table else default


def _law_within(
    upper: float, threshold: float, at_1_eV: float, exponent: float, temperature_K: float
) -> None:
    """Refuse a law that gives more than tables may hold."""
    if temperature_K > 0.0:
        largest = fowler_dubridge(
            upper,
            threshold_eV=threshold,
            electrons_per_photon_at_1_eV=at_1_eV,
            temperature_K=temperature_K,
        )
    else:
        largest = law_yield(upper, threshold, at_1_eV, exponent=exponent)
    if float(largest) > LARGEST_YIELD:
        raise MaterialError(
            (WHERE, "upper_photon_energy_eV"),
            upper,
            f"takes the law to {float(largest):.3g} electrons per photon",
            allowed=f"where the law gives at most {LARGEST_YIELD:g}",
        )


def _energies(table: Table) -> FittedEnergies | None:
    """Return the prescribed energies of the electrons; None: those from photons."""
    key = "electron_energies"
    if key not in table:
        return None
    path: Path = (WHERE, key)
    entry = table_at(table[key], path)
    law = choice_at(entry, (*path, "law"), FITTED_LAWS)
    own = ("temperature_eV",) if law == "maxwellian" else ("current_uA_m2", "scale_V")
    refuse_unknown(entry, ("law", *own, "source", "basis"), path)
    source = text_at(entry, (*path, "source"))
    basis = choice_at(entry, (*path, "basis"), BASES)
    if law == "maxwellian":
        temperature = number_at(entry, (*path, "temperature_eV"))
        _in_range(temperature, 0.05, 100.0, (*path, "temperature_eV"))
        return FittedEnergies(law, source, basis, temperature_eV=temperature)
    current = numbers_at(entry, (*path, "current_uA_m2"))
    scale = numbers_at(entry, (*path, "scale_V"))
    if len(current) != 2:
        raise MaterialError(
            (*path, "current_uA_m2"), len(current), "is no pair", allowed="two numbers"
        )
    if len(scale) != 2:
        raise MaterialError((*path, "scale_V"), len(scale), "is no pair", allowed="two numbers")
    for i in range(2):
        _in_range(current[i], 1e-6, 1e6, (*path, "current_uA_m2", i))
        _in_range(scale[i], 0.05, 100.0, (*path, "scale_V", i))
    return FittedEnergies(law, source, basis, current_uA_m2=tuple(current), scale_V=tuple(scale))


def _measured(table: Table) -> MeasuredCurrent | None:
    """Return the measured current to which the record wants its curve scaled."""
    key = "normalised_to"
    if key not in table:
        return None
    path: Path = (WHERE, key)
    entry = table_at(table[key], path)
    refuse_unknown(entry, ("saturation_current_uA_m2", "f107", "source"), path)
    current = number_at(entry, (*path, "saturation_current_uA_m2"))
    _in_range(current, 1e-6, 1e4, (*path, "saturation_current_uA_m2"))
    f107 = number_at(entry, (*path, "f107"))
    _in_range(f107, 50.0, 500.0, (*path, "f107"))
    return MeasuredCurrent(current, f107, text_at(entry, (*path, "source")))


def _in_range(number: float, low: float, high: float, path: Path) -> None:
    if not low <= number <= high:
        raise MaterialError(path, number, "is out of range", allowed=f"{low:g} to {high:g}")


def _factor(table: Table, key: str, default: float | None = None) -> float:
    if key not in table and default is not None:
        return default
    return _within(table, key, 1.0, 1000.0)
