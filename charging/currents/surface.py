"""Current densities of many surfaces in a mixture of plasmas: the inner kernel.

Leading axes broadcast (members, times); the last axis is the surface. No energy
integral happens here: closed forms and the tables of `emission`.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from charging.currents.arrivals import arrivals, limits_of_plasmas
from charging.currents.barrier import escape_height
from charging.currents.collection import (
    Geometry,
    sheath_weight,
    thick_geometry,
)
from charging.currents.emission import (
    Emitter,
    electron_tables,
    emitter,
    escape_tables,
    ion_tables,
    line_ends_V,
    photo_saturation_A_m2,
)
from charging.currents.focus_table import FocusPlace
from charging.currents.populations import (
    Populations,
    electron_sheath,
    populations,
    refuse_one_sided,
)
from charging.currents.spectra import SpectrumTable, spectrum_table
from charging.currents.streams import Stream, StreamModel, Streams, stream_model
from charging.currents.tables import YieldTable
from environments.plasma import Plasma
from environments.spectrum import SolarSpectrum
from materials.record import Material
from materials.secondary import YieldLaw

Array = NDArray[np.float64]

__all__ = [
    "MECHANISMS",
    "Currents",
    "Populations",
    "Setting",
    "SurfaceModel",
    "electron_sheath",
    "limits_and_gross",
    "limits_of_each",
    "populations",
    "surface_currents",
    "surface_model",
    "surface_models",
]

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
class SurfaceModel:
    """S surfaces in P plasmas, ready for `surface_currents`.

    Attributes
    ----------
    radius_m, collection
        Body radius [m] and collection keyword of `sheath_weight`.
    electrons, ions : Populations
    electron_table, ion_table, escape_table : YieldTable
        What Maxwellian electrons and ions release; shares that escape.
    electron_spectra, ion_spectra : tuple of SpectrumTable
        Everything about the populations that are no Maxwellians.
    escape_breaks_V : tuple of float
        Where the escape of photoelectrons has noticeable kinks: a strong line ends.
    photo_saturation_A_m2 : ndarray [S]
        Photocurrent density at normal incidence in full sun.
    angle_growth : ndarray [S]
        Largest growth of the yield at oblique incidence, 1: none.
    streams : StreamModel or None
        Ions that stream past.
    """

    radius_m: float
    collection: str
    electrons: Populations
    ions: Populations
    electron_table: YieldTable
    ion_table: YieldTable
    escape_table: YieldTable
    photo_saturation_A_m2: Array
    angle_growth: Array
    electron_spectra: tuple[SpectrumTable, ...] = ()
    ion_spectra: tuple[SpectrumTable, ...] = ()
    escape_breaks_V: tuple[float, ...] = ()
    streams: StreamModel | None = None


def surface_model(
    materials: Sequence[Material],
    plasmas: Sequence[Plasma],
    spectrum: SolarSpectrum,
    *,
    law: YieldLaw,
    radius_m: float,
    collection: str = "auto",
    photo_geometry: str = "auto",
) -> SurfaceModel:
    """Tabulate the answers of S surfaces to P plasmas and the Sun for one emission law.

    Arguments as in `surface_models`.
    """
    return surface_models(
        materials,
        plasmas,
        spectrum,
        laws=[law],
        radius_m=radius_m,
        collection=collection,
        photo_geometry=photo_geometry,
    )[0]


def surface_models(
    materials: Sequence[Material],
    plasmas: Sequence[Plasma],
    spectrum: SolarSpectrum,
    *,
    laws: Sequence[YieldLaw],
    radius_m: float,
    collection: str = "auto",
    photo_geometry: str = "auto",
    parts: int = 0,
    streams: Streams | None = None,
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
    photo_geometry : {"auto", "planar", "point source"}
        How photoelectrons leave a positive surface.
    parts : int, optional
        Number of the first plasmas that are parts of one, and need not hold both signs.
    streams : Streams, optional
        Ions that stream past, which no plasma holds.
    """
    refuse_one_sided(plasmas[parts:])
    thick = thick_geometry(collection)
    electrons = populations(plasmas, electrons=True)
    ions = populations(plasmas, electrons=False)
    emitters = [[emitter(material, law) for material in materials] for law in laws]
    ion_table = ion_tables(emitters[0], ions.temperature_eV[ions.maxwellian], thick)
    ion_spectra = _spectra(plasmas, emitters[0], thick, electrons=False)
    hot = electrons.temperature_eV[electrons.maxwellian]
    escape_table = escape_tables(
        materials, spectrum, radius_m=radius_m, photo_geometry=photo_geometry
    )
    saturation = np.array([photo_saturation_A_m2(m, spectrum) for m in materials])
    growth = np.array(
        [1.0 if m.photoyield is None else m.photoyield.largest_angle_growth for m in materials]
    )
    return tuple(
        SurfaceModel(
            radius_m=radius_m,
            collection=collection,
            electrons=electrons,
            ions=ions,
            electron_table=electron_tables(of_law, hot, thick),
            ion_table=ion_table,
            escape_table=escape_table,
            photo_saturation_A_m2=saturation,
            angle_growth=growth,
            electron_spectra=_spectra(plasmas, of_law, thick, electrons=True),
            ion_spectra=ion_spectra,
            escape_breaks_V=line_ends_V(materials, spectrum),
            streams=None if streams is None else stream_model(materials, streams),
        )
        for of_law in emitters
    )


def _spectra(
    plasmas: Sequence[Plasma], surfaces: Sequence[Emitter], thick: Geometry, *, electrons: bool
) -> tuple[SpectrumTable, ...]:
    unique = {m.key: m for m in surfaces}
    place = {key: i for i, key in enumerate(unique)}
    yields = [(m.secondary, m.backscatter) if electrons else (m.ion,) for m in unique.values()]
    rows = [place[m.key] for m in surfaces]
    return tuple(
        spectrum_table(p, i, yields, thick, rows)
        for i, plasma in enumerate(plasmas)
        for p in plasma.populations
        if p.distribution is not None and (p.species.charge_number < 0) == electrons
    )


class Kept(NamedTuple):
    """What follows from a `Setting` alone, for members [m].

    sheath_m2 : ndarray [m, 1], Debye length squared; child_m2 : ndarray [m, 1], squared length
    of a Child sheath at 1 V; photo_A_m2 : ndarray [m, S], photocurrent before escape;
    focus : place of streaming ions in the table of their orbits, or None.
    """

    sheath_m2: Array
    child_m2: Array
    photo_A_m2: Array
    focus: FocusPlace | None = None


class Setting(NamedTuple):
    """What surrounds the surfaces at one moment.

    strength : ndarray [..., P], share of each plasma, adding to 1;
    light : ndarray [..., S], illumination times incidence cosine;
    illumination : ndarray [..., 1], share of the solar disc in view, which light that grows
    at oblique incidence cannot exceed;
    stream, ions that stream past, or None;
    kept, what a march works out once per moment from the rest, or None.
    """

    strength: Array
    light: Array
    illumination: Array | float = 1.0
    stream: Stream | None = None
    kept: Kept | None = None


class Currents(NamedTuple):
    """Current densities [A m-2] by mechanism and the slope of their sum [A m-2 V-1].

    `by_mechanism` [..., S, 6] in the order of `MECHANISMS`; `slope` [..., S].
    """

    by_mechanism: Array
    slope: Array


def surface_currents(
    model: SurfaceModel, potential_V: Array, setting: Setting, height_V: Array | None = None
) -> Currents:
    """Evaluate every mechanism and the slope of the sum.

    Parameters
    ----------
    model : SurfaceModel
    potential_V : ndarray [..., S]
        Potential of each surface against the plasma.
    setting : Setting
    height_V : ndarray [..., S], optional
        What photo- and secondary electrons must climb, >= 0; held while the potential moves
        in the slope. Default: `escape_height` of the surface's own potential.

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
    electron, d_electron, answer, d_answer = arrivals(
        model.electrons,
        model.electron_table,
        model.electron_spectra,
        model.collection,
        setting.strength,
        potential_V,
        1.0,
        sheath,
    )
    ion, d_ion, ion_answer, d_ion_answer = arrivals(
        model.ions,
        model.ion_table,
        model.ion_spectra,
        model.collection,
        setting.strength,
        potential_V,
        -1.0,
        sheath,
    )

    if model.streams is not None and setting.stream is not None:
        directed = model.streams.arrived(potential_V, setting.stream, sheath)
        ion, d_ion = ion + directed.collected_A_m2, d_ion + directed.slope
        ion_answer = ion_answer + directed.released_A_m2[..., None]
        d_ion_answer = d_ion_answer + directed.released_slope[..., None]

    height, height_slope = (
        escape_height(potential_V) if height_V is None else (height_V, np.zeros_like(height_V))
    )
    escape, d_escape = model.escape_table(height)
    d_escape = d_escape * height_slope[..., None]
    # illumination times `incidence_factor` of the cosine
    lit = np.minimum(model.angle_growth * setting.light, setting.illumination)
    photo = model.photo_saturation_A_m2 * lit
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


def limits_of_each(model: SurfaceModel, potential_V: Array) -> Array:
    """Dark currents of every plasma alone at full strength [A m-2].

    Parameters
    ----------
    model : SurfaceModel
    potential_V : ndarray [N, S]

    Returns
    -------
    ndarray [N, S, P, 4]
        Collected minus backscattered current in plane and in thick geometry, then secondary
        electrons, of electrons and ions together, before escape in both. One pass over the
        populations, however many plasmas they belong to.
    """
    return limits_and_gross(model, potential_V)[0]


def limits_and_gross(model: SurfaceModel, potential_V: Array) -> tuple[Array, Array]:
    """`limits_of_each`, and all that crosses the surface either way in the column's geometry."""
    groups = (model.electrons, model.ions)
    plasmas = 1 + max(int(group.plasma.max(initial=0)) for group in groups)
    electron = limits_of_plasmas(
        model.electrons,
        model.electron_table,
        model.electron_spectra,
        model.collection,
        plasmas,
        potential_V,
    )
    ion = limits_of_plasmas(
        model.ions, model.ion_table, model.ion_spectra, model.collection, plasmas, -potential_V
    )
    bare = electron[..., 0:2] + ion[..., 0:2] - electron[..., 4:6]
    gross = np.abs(electron).reshape(*electron.shape[:-1], 3, 2).sum(axis=-2)
    gross = gross + np.abs(ion).reshape(*ion.shape[:-1], 2, 2).sum(axis=-2)
    limits = np.concatenate([bare, ion[..., 2:4] - electron[..., 2:4]], axis=-1)
    return limits, np.concatenate([gross, gross], axis=-1)
