"""What arrives at surfaces and what it releases, summed over the populations."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from charging.currents.collection import SheathWeight, rounded_pull, thick_geometry
from charging.currents.populations import Populations
from charging.currents.spectra import SpectrumTable
from charging.currents.tables import YieldTable

Array = NDArray[np.float64]


def arrivals(
    group: Populations,
    table: YieldTable,
    spectra: Sequence[SpectrumTable],
    collection: str,
    strength: Array,
    potential_V: Array,
    attracting_sign: float,
    sheath: SheathWeight,
) -> tuple[Array, Array, Array, Array]:
    """Collected current of electrons or ions, what it releases, and both slopes.

    Returns J [..., S], dJ/dphi, released [..., S, C], d(released)/dphi, summed over the
    populations; released has the sign of J and one column per yield (full escape).
    """
    pull = attracting_sign * potential_V
    value, slope = both_limits(group, table, spectra, collection, strength, pull)
    plane, gain = value[..., 0::2], value[..., 1::2] - value[..., 0::2]
    d_plane, d_gain = slope[..., 0::2], slope[..., 1::2] - slope[..., 0::2]
    weight = sheath.weight[..., None]
    total = plane + weight * gain
    d_total = attracting_sign * (d_plane + weight * d_gain) + sheath.slope[..., None] * gain
    return total[..., 0], d_total[..., 0], total[..., 1:], d_total[..., 1:]


def both_limits(
    group: Populations,
    table: YieldTable,
    spectra: Sequence[SpectrumTable],
    collection: str,
    strength: Array,
    pull_V: Array,
) -> tuple[Array, Array]:
    """Sum over all populations: columns [..., S, 2+2C] and slopes by `pull_V` [..., S].

    Columns: collected current in plane and thick sheath, then released current per yield
    in plane and thick sheath.
    """
    value, slope = _thermal_arrivals(group, table, collection, strength, pull_V)
    for spectrum in spectra:
        scale = _scale_of(spectrum, value.shape[-1])
        present = strength[..., spectrum.plasma, None, None]
        share, d_share = spectrum(pull_V)
        value = value + present * scale * share
        slope = slope + present * scale * d_share
    return value, slope


def limits_of_plasmas(
    group: Populations,
    table: YieldTable,
    spectra: Sequence[SpectrumTable],
    collection: str,
    plasmas: int,
    pull_V: Array,
) -> Array:
    """Columns of `both_limits` for each of P plasmas alone at full strength, [N, S, P, 2+2C].

    One pass over the populations, however many plasmas they belong to.
    """
    parts = [
        _limits(group, table, spectra, collection, plasmas, pull_V[k : k + _BLOCK])
        for k in range(0, len(pull_V), _BLOCK)
    ]
    return np.concatenate(parts)


_BLOCK = 64  # rows at a time, so that memory stays small with many populations


def _limits(
    group: Populations,
    table: YieldTable,
    spectra: Sequence[SpectrumTable],
    collection: str,
    plasmas: int,
    pull_V: Array,
) -> Array:
    full = np.ones((*pull_V.shape[:-1], plasmas))
    each, _ = _thermal_terms(group, table, collection, full, pull_V)
    found = np.zeros((*each.shape[:-2], plasmas, each.shape[-1]))
    for k, plasma in enumerate(group.plasma[group.maxwellian]):
        found[..., plasma, :] += each[..., k, :]
    for spectrum in spectra:
        scale = _scale_of(spectrum, found.shape[-1])
        found[..., spectrum.plasma, :] += scale * spectrum(pull_V)[0]
    return found


def _scale_of(spectrum: SpectrumTable, columns: int) -> Array:
    """Currents [A m-2] that columns of shares stand for; see `both_limits`."""
    # per particle: the collected columns count charge, the yields electrons
    scale = np.full(columns, spectrum.current_A_m2 / spectrum.charge_number)
    scale[:2] = spectrum.current_A_m2
    return scale


def _thermal_arrivals(
    group: Populations, table: YieldTable, collection: str, strength: Array, pull_V: Array
) -> tuple[Array, Array]:
    """Sum over the Maxwellians alone; see `both_limits`."""
    value, slope = _thermal_terms(group, table, collection, strength, pull_V)
    return value.sum(axis=-2), slope.sum(axis=-2)


def _thermal_terms(
    group: Populations, table: YieldTable, collection: str, strength: Array, pull_V: Array
) -> tuple[Array, Array]:
    """Each Maxwellian alone, [..., S, M, 2+2C]; see `both_limits`."""
    thick = thick_geometry(collection)
    which = group.maxwellian
    charge = group.charge_number[which]
    pull = pull_V[..., None]
    reduced = charge / group.temperature_eV[which]
    attracting, rise = rounded_pull(pull, group.temperature_eV[which] / charge)
    u = attracting * reduced
    boltzmann = np.exp((pull - attracting) * reduced)
    d_boltzmann = boltzmann * reduced * (1.0 - rise)
    present = strength[..., group.plasma[which]]
    thermal = (group.thermal_current_A_m2[which] * present)[..., None, :]
    factor = thick.factor(u)
    d_factor = thick.slope(u) * reduced * rise
    current = np.stack([boltzmann, boltzmann * factor], axis=-1)
    d_current = np.stack([d_boltzmann, d_boltzmann * factor + boltzmann * d_factor], axis=-1)

    surfaces, kinds = u.shape[-2:]
    energy = (attracting * charge).reshape(*u.shape[:-2], surfaces * kinds)
    found, d_found = table(energy)
    columns = found.shape[-1]
    found = found.reshape(*u.shape, columns)
    d_found = d_found.reshape(*u.shape, columns) * (charge * rise)[..., None]
    particles = 1.0 / charge[:, None]  # yields are per particle
    released = particles * boltzmann[..., None] * found
    d_released = particles * (d_boltzmann[..., None] * found + boltzmann[..., None] * d_found)
    scale = thermal[..., None]
    return (
        scale * np.concatenate([current, released], axis=-1),
        scale * np.concatenate([d_current, d_released], axis=-1),
    )
