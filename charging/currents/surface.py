"""Current densities of many surfaces in a mixture of plasmas: the inner kernel.

Leading axes broadcast (members, times); the last axis is the surface. No energy
integral happens here: closed forms and the tables of `emission`.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.constants import e, epsilon_0

from charging.currents.barrier import escape_height
from charging.currents.collection import SheathWeight, sheath_weight, thick_geometry
from charging.currents.emission import (
    electron_tables,
    emitter,
    escape_tables,
    ion_tables,
    photo_saturation_A_m2,
)
from charging.currents.tables import YieldTable
from environments.plasma import Plasma, one_sided_maxwellian_current
from environments.spectrum import SolarSpectrum
from materials.record import Material
from materials.secondary import YieldLaw

Array = NDArray[np.float64]

MECHANISMS = (
    "electron_collection",
    "ion_collection",
    "secondary_electron",
    "ion_induced_secondary",
    "backscatter",
    "photoemission",
)
"""Order of the mechanisms in the output of `surface_currents`."""


@dataclass(frozen=True, slots=True)
class Populations:
    """Maxwellian populations of all plasmas of a case, electrons or ions.

    Attributes
    ----------
    temperature_eV, density_m3, thermal_current_A_m2 : ndarray [K]
        Temperature; density and signed one-sided current at full strength.
    charge_number : ndarray [K]
        Magnitude of the charge in units of e.
    plasma : ndarray of int [K]
        Which plasma a population belongs to.
    """

    temperature_eV: Array
    density_m3: Array
    thermal_current_A_m2: Array
    charge_number: Array
    plasma: NDArray[np.intp]


def populations(plasmas: Sequence[Plasma], *, electrons: bool) -> Populations:
    """Gather the electron (or ion) populations of several plasmas."""
    rows = [
        (p.temperature_eV, p.density_m3, p.species.mass_kg, p.species.charge_number, i)
        for i, plasma in enumerate(plasmas)
        for p in plasma.populations
        if (p.species.charge_number < 0) == electrons
    ]
    temperature, density, _, charge, owner = (
        np.array([row[i] for row in rows], dtype=np.float64) for i in range(5)
    )
    thermal = np.array(
        [
            float(one_sided_maxwellian_current(n, t, mass_kg=m, charge_number=int(z)))
            for t, n, m, z, _ in rows
        ]
    )
    return Populations(temperature, density, thermal, np.abs(charge), owner.astype(np.intp))


@dataclass(frozen=True, slots=True)
class SurfaceModel:
    """S surfaces in P plasmas, ready for `surface_currents`.

    Attributes
    ----------
    radius_m, collection
        Body radius [m] and collection keyword of `sheath_weight`.
    electrons, ions : Populations
    electron_table, ion_table, escape_table : YieldTable
    photo_saturation_A_m2 : ndarray [S]
        Photocurrent density at normal incidence in full sun.
    """

    radius_m: float
    collection: str
    electrons: Populations
    ions: Populations
    electron_table: YieldTable
    ion_table: YieldTable
    escape_table: YieldTable
    photo_saturation_A_m2: Array


def surface_model(
    materials: Sequence[Material],
    plasmas: Sequence[Plasma],
    spectrum: SolarSpectrum,
    *,
    law: YieldLaw,
    radius_m: float,
    collection: str = "auto",
) -> SurfaceModel:
    """Tabulate the answers of S surfaces to P plasmas and the Sun for one emission law.

    Arguments as in `surface_models`.
    """
    return surface_models(
        materials, plasmas, spectrum, laws=[law], radius_m=radius_m, collection=collection
    )[0]


def surface_models(
    materials: Sequence[Material],
    plasmas: Sequence[Plasma],
    spectrum: SolarSpectrum,
    *,
    laws: Sequence[YieldLaw],
    radius_m: float,
    collection: str = "auto",
) -> tuple[SurfaceModel, ...]:
    """Tabulate the answers of S surfaces to P plasmas and the Sun, one model per law.

    Parameters
    ----------
    materials : sequence of Material, length S
    plasmas : sequence of Plasma, length P
    spectrum : SolarSpectrum
        At the spacecraft's distance and solar activity.
    laws : sequence of YieldLaw
        Secondary-emission laws, each one of `emission.SECONDARY_LAWS`.
    radius_m : float
        Radius of the body, for the sheath [m].
    collection : {"auto", "sphere", "cylinder", "plane"}
    """
    thick = thick_geometry(collection)
    electrons = populations(plasmas, electrons=True)
    ions = populations(plasmas, electrons=False)
    emitters = [[emitter(material, law) for material in materials] for law in laws]
    ion_table = ion_tables(emitters[0], ions.temperature_eV, thick)
    escape_table = escape_tables(materials, spectrum)
    saturation = np.array([photo_saturation_A_m2(m, spectrum) for m in materials])
    return tuple(
        SurfaceModel(
            radius_m=radius_m,
            collection=collection,
            electrons=electrons,
            ions=ions,
            electron_table=electron_tables(of_law, electrons.temperature_eV, thick),
            ion_table=ion_table,
            escape_table=escape_table,
            photo_saturation_A_m2=saturation,
        )
        for of_law in emitters
    )


class Setting(NamedTuple):
    """What surrounds the surfaces at one moment.

    strength : ndarray [..., P], share of each plasma, adding to 1;
    light : ndarray [..., S], illumination times incidence cosine.
    """

    strength: Array
    light: Array


class Currents(NamedTuple):
    """Current densities [A m-2] by mechanism and the slope of their sum [A m-2 V-1].

    `by_mechanism` [..., S, 6] in the order of `MECHANISMS`; `slope` [..., S].
    """

    by_mechanism: Array
    slope: Array


def electron_sheath(electrons: Populations, strength: Array) -> tuple[Array, Array]:
    r"""Electron Debye length [m] and the temperature [eV] that belongs to it, each [...].

    :math:`\lambda_D^{-2} = \sum n e/(\varepsilon_0 T)` over the electrons as printed; the
    temperature is the harmonic one, :math:`\sum n/\sum(n/T)`.
    """
    density = electrons.density_m3 * strength[..., electrons.plasma]
    stiffness = (density / electrons.temperature_eV).sum(axis=-1)
    return np.sqrt(epsilon_0 / (e * stiffness)), density.sum(axis=-1) / stiffness


def surface_currents(model: SurfaceModel, potential_V: Array, setting: Setting) -> Currents:
    """Evaluate every mechanism and the slope of the sum.

    Parameters
    ----------
    model : SurfaceModel
    potential_V : ndarray [..., S]
        Potential of each surface against the plasma.
    setting : Setting

    Returns
    -------
    Currents
        Positive = positive charge arriving; emission of electrons is positive.
    """
    debye, temperature = electron_sheath(model.electrons, setting.strength)
    sheath = sheath_weight(
        potential_V,
        debye_length_m=debye[..., None],
        temperature_eV=temperature[..., None],
        radius_m=model.radius_m,
        collection=model.collection,
    )
    electron, d_electron, answer, d_answer = _arrivals(
        model.electrons, model.electron_table, model.collection, setting, potential_V, 1.0, sheath
    )
    ion, d_ion, ion_answer, d_ion_answer = _arrivals(
        model.ions, model.ion_table, model.collection, setting, potential_V, -1.0, sheath
    )

    height, height_slope = escape_height(potential_V)
    escape, d_escape = model.escape_table(height)
    d_escape = d_escape * height_slope[..., None]
    photo = model.photo_saturation_A_m2 * setting.light
    true_secondary, d_true_secondary = -answer[..., 0], -d_answer[..., 0]
    impact, d_impact = ion_answer[..., 0], d_ion_answer[..., 0]
    leaves, d_leaves = escape[..., 1], d_escape[..., 1]

    by_mechanism = np.stack(
        [
            electron,
            ion,
            true_secondary * leaves,
            impact * leaves,
            # backscattered electrons keep most of their energy: none is held back at the
            # volts of a positive surface
            -answer[..., 1],
            photo * escape[..., 0],
        ],
        axis=-1,
    )
    slope = (
        d_electron
        + d_ion
        + (d_true_secondary + d_impact) * leaves
        + (true_secondary + impact) * d_leaves
        - d_answer[..., 1]
        + photo * d_escape[..., 0]
    )
    return Currents(by_mechanism, slope)


def _arrivals(
    group: Populations,
    table: YieldTable,
    collection: str,
    setting: Setting,
    potential_V: Array,
    attracting_sign: float,
    sheath: SheathWeight,
) -> tuple[Array, Array, Array, Array]:
    """Collected current of electrons or ions, what it releases, and both slopes.

    Returns J [..., S], dJ/dphi, released [..., S, C], d(released)/dphi, summed over the
    populations; released has the sign of J and one column per yield (full escape).
    """
    thick = thick_geometry(collection)
    w, dw = sheath.weight[..., None], attracting_sign * sheath.slope[..., None]
    pull = attracting_sign * potential_V[..., None]
    reduced = group.charge_number / group.temperature_eV
    attracted = pull > 0.0
    u = np.where(attracted, pull, 0.0) * reduced
    boltzmann = np.exp(np.where(attracted, 0.0, pull) * reduced)
    d_boltzmann = np.where(attracted, 0.0, boltzmann * reduced)
    gain = thick.factor(u) - 1.0
    collected = 1.0 + w * gain
    d_collected = np.where(attracted, w * thick.slope(u) * reduced, 0.0) + dw * gain
    strength = setting.strength[..., group.plasma]
    thermal = (group.thermal_current_A_m2 * strength)[..., None, :]
    current = thermal * boltzmann * collected
    d_current = thermal * (d_boltzmann * collected + boltzmann * d_collected)

    surfaces, kinds = u.shape[-2:]
    energy = (np.where(attracted, pull, 0.0) * group.charge_number).reshape(
        *u.shape[:-2], surfaces * kinds
    )
    value, slope = table(energy)
    value = value.reshape(*u.shape, -1)
    slope = slope.reshape(*u.shape, -1) * group.charge_number[:, None]
    slope = np.where(attracted[..., None], slope, 0.0)
    plane, thick_value = value[..., 0::2], value[..., 1::2]
    mean = plane + w[..., None] * (thick_value - plane)
    d_mean = (
        slope[..., 0::2]
        + w[..., None] * (slope[..., 1::2] - slope[..., 0::2])
        + dw[..., None] * (thick_value - plane)
    )
    particles = (thermal / group.charge_number)[..., None]  # yields are per particle
    released = particles * boltzmann[..., None] * mean
    d_released = particles * (d_boltzmann[..., None] * mean + boltzmann[..., None] * d_mean)
    sign = attracting_sign
    return (
        current.sum(axis=-1),
        sign * d_current.sum(axis=-1),
        released.sum(axis=-2),
        sign * d_released.sum(axis=-2),
    )
