"""Plasma of a run as its dataset holds it: regions as flags, moments by population."""

import json
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.constants import e
from scipy.special import gammaln

from charging.currents.surface import Setting
from charging.orbit_run import ModeRun
from charging.surroundings import event_strength
from environments.plasma import Plasma, population_current
from environments.population_series import PopulationSeries

Array = NDArray[np.float64]

REGION_MASKS = {"penumbra": 1, "umbra": 2, "plasma_event": 4, "mode_interval": 8}
PLACE_MASK, PLACE_SHIFT = 0x7FF0, 4
"""Bits of the flag that hold the region of space, as its index plus 1; 0 where none is known."""
EVENT_OVER = 0.01
"""Share of its strength below which an event is over."""


class Moments(NamedTuple):
    """Density [m-3], temperature [eV] and one-sided current [A m-2] of N populations, [N, T]."""

    density_m3: Array
    temperature_eV: Array
    current_A_m2: Array


def population_labels(mode: ModeRun) -> list[str]:
    """Names of all populations, those along the orbit first, then by plasma, electrons first."""
    labels: list[str] = []
    along = mode.around.along
    if along is not None:
        labels += [f"{along.name}: {one.label}" for one in along.sampled.populations]
        if along.sampled.arc is not None:
            count = len(along.sampled.arc.plasma.populations)
            labels += [f"{along.name}: arc electrons {k + 1}" for k in range(count)]
    for electrons in (True, False):
        for plasma in mode.plasmas[len(mode.around.basis) :]:
            number = 0
            for p in plasma.populations:
                if (p.species.charge_number < 0) == electrons:
                    number += 1
                    labels.append(f"{plasma.name}: {p.species.name} {number}")
    return labels


def population_moments(mode: ModeRun, times: Array, setting: Setting) -> Moments:
    """Moments of all populations at times [T], in the order of their labels.

    The current is that through a plane at rest in the plasma, at its potential.
    """
    first = len(mode.around.basis)
    rows = [
        _fixed(plasma, electrons, setting.strength[:, first + i])
        for electrons in (True, False)
        for i, plasma in enumerate(mode.plasmas[first:])
    ]
    along = mode.around.along
    if along is not None:
        density, temperature = along.moments(times)
        # what events and modes leave of the plasma along the orbit
        whole = along.at(times)[0].sum(axis=-1)
        left = setting.strength[:, :first].sum(axis=-1) / whole
        density = density * left
        per = [_current_per_root(one) for one in _series(mode)]
        current = np.array(per)[:, None] * density * np.sqrt(temperature)
        rows.insert(0, Moments(density, temperature, current))
        if along.sampled.arc is not None:
            rows.insert(1, _fixed(along.sampled.arc.plasma, True, setting.strength[:, first - 1]))
    density, temperature, current = (np.concatenate(column) for column in zip(*rows, strict=True))
    return Moments(density, temperature, current)


def _fixed(plasma: Plasma, electrons: bool, share: Array) -> Moments:
    own = [p for p in plasma.populations if (p.species.charge_number < 0) == electrons]
    constant = np.ones_like(share)

    def column(values: Sequence[float]) -> Array:
        return np.array(values, dtype=np.float64).reshape(-1, 1)

    return Moments(
        column([p.density_m3 for p in own]) * share,
        column([p.temperature_eV for p in own]) * constant,
        column([population_current(p) for p in own]) * share,
    )


def _series(mode: ModeRun) -> tuple[PopulationSeries, ...]:
    along = mode.around.along
    return () if along is None else along.sampled.populations


def _current_per_root(one: PopulationSeries) -> float:
    """One-sided current per density and root of temperature [A m eV^-1/2], signed."""
    charge = one.species.charge_number * e
    thermal = np.sqrt(e / (2.0 * np.pi * one.species.mass_kg))
    if one.kappa is None:
        return float(charge * thermal)
    k = one.kappa
    shape = np.sqrt(k - 1.5) * np.exp(gammaln(k - 1.0) - gammaln(k - 0.5))
    return float(charge * thermal * shape)


def region_flags(mode: ModeRun, times: Array, light: Array) -> NDArray[np.int16]:
    """Light, events and modes as bits, the region of space as a field of bits, [T]."""
    flags = np.zeros(light.shape, dtype=np.int16)
    flags[(light > 0.0) & (light < 1.0)] |= REGION_MASKS["penumbra"]
    flags[light <= 0.0] |= REGION_MASKS["umbra"]
    for event in mode.around.episodes:
        flags[event_strength(times, event) > EVENT_OVER] |= REGION_MASKS["plasma_event"]
    within = np.array([bool(leg.modes) for leg in mode.way.legs])
    flags[within[mode.around.leg(times)]] |= REGION_MASKS["mode_interval"]
    along = mode.around.along
    if along is not None and along.regions:
        place = (along.region_at(times) + 1) << PLACE_SHIFT
        states = np.array([state.plasma for state in mode.around.states])
        own = states[mode.around.leg(times)] == 0
        flags |= np.where(own, place, 0).astype(np.int16)
    return flags


def region_attributes(regions: Sequence[str]) -> dict[str, object]:
    """CF attributes of the flag variable; `regions` as kept in the file, empty without."""
    masks = list(REGION_MASKS.values())
    meanings = list(REGION_MASKS)
    if not regions:
        return {
            "flag_masks": np.array(masks, dtype=np.int16),
            "flag_meanings": " ".join(meanings),
        }
    values = [(k + 1) << PLACE_SHIFT for k in range(len(regions))]
    names = [name.replace(" ", "_") for name in regions]
    return {
        "flag_masks": np.array([*masks, *[PLACE_MASK] * len(names)], dtype=np.int16),
        "flag_values": np.array([*masks, *values], dtype=np.int16),
        "flag_meanings": " ".join([*meanings, *names]),
    }


def plasma_attributes(mode: ModeRun) -> dict[str, object]:
    """Attributes of the file about a plasma along the orbit; empty without one."""
    along = mode.around.along
    if along is None:
        return {}
    return {
        "plasma_regions": json.dumps(list(along.regions)),
        "plasma_basis_shares": json.dumps(dict(along.sampled.bases)),
        "plasma_sources": json.dumps(
            {one.label: one.source for one in along.sampled.populations}, ensure_ascii=False
        ),
    }
