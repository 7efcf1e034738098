"""One surface in one plasma: where it floats, and which currents hold it there."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from charging.arguments import (
    as_choice,
    as_material,
    as_number,
    as_plasma,
    from_environment,
    in_surface_state,
)
from charging.currents.balance import SEARCH_V, Root, breakdown, floating_potentials
from charging.currents.collection import COLLECTIONS, sheath_weight
from charging.currents.emission import SECONDARY_LAWS, law_of
from charging.currents.photo_escape import (
    PHOTO_GEOMETRIES,
    photo_sheath,
    point_source_weight,
)
from charging.currents.surface import (
    MECHANISMS,
    Setting,
    SurfaceModel,
    electron_sheath,
    surface_currents,
    surface_model,
)
from charging.errors import NoSolutionError
from charging.point_notes import angle_notes, general_notes, law_notes
from environments.errors import EnvironmentDataError
from environments.plasma import Plasma
from environments.spectrum import SolarSpectrum, solar_spectrum
from materials.record import Material
from materials.secondary import YIELD_LAWS, YieldLaw

Array = NDArray[np.float64]

LARGEST_RADIUS_M = 1000.0
CURVE_POINTS = 1201


@dataclass(frozen=True, slots=True)
class Sheath:
    """Sheath at the reached potential.

    Attributes
    ----------
    length_m : float
        Sheath length s [m].
    weight : float
        Share of the thick-sheath limit in the collection of attracted particles, 0…1.
    collection : str
        The keyword asked for: auto, sphere, cylinder, plane.
    """

    length_m: float
    weight: float
    collection: str


@dataclass(frozen=True, slots=True)
class PhotoelectronSheath:
    """Photoelectrons of the lit surface and how they leave.

    Attributes
    ----------
    debye_length_m, density_m3, mean_energy_eV : float
        At normal incidence, all electrons returning [m], [m-3], [eV].
    point_source_share : float
        Share of point-source escape, 0…1; the rest is planar.
    photo_escape : str
        The keyword asked for: auto, planar, point source.
    """

    debye_length_m: float
    density_m3: float
    mean_energy_eV: float
    point_source_share: float
    photo_escape: str


@dataclass(frozen=True, slots=True, eq=False)
class CurrentCurve:
    """Current densities against potential.

    Attributes
    ----------
    potential_V : ndarray [N]
        Rising; dense around 0 V.
    current_density_A_m2 : mapping of str to ndarray [N]
        By mechanism; their sum is the net current.
    """

    potential_V: Array
    current_density_A_m2: Mapping[str, Array]


@dataclass(frozen=True, slots=True, eq=False)
class PointResult:
    """Answer of `floating_point`.

    Attributes
    ----------
    material, plasma, law : str
        Names of what was asked.
    light : float
        Illumination times incidence cosine, 0 in the dark.
    radius_m : float
    roots : tuple of Root
        Floating potentials, ascending.
    reached_V : float
        The one that a surface reaches from 0 V [V].
    current_density_A_m2 : mapping of str to float
        By mechanism at `reached_V`, positive = positive charge arriving.
    electron_debye_length_m : float
        Of the electrons as printed.
    sheath : Sheath
    photoelectrons : PhotoelectronSheath or None
        None in the dark or where nothing is emitted.
    other_laws_reached_V : mapping of str to float or None
        What the other secondary-emission laws give; None: no floating potential.
    curve : CurrentCurve
    notes : tuple of str
        What a reader must know: figures assumed or from memory, several roots.
    """

    material: str
    plasma: str
    law: str
    light: float
    radius_m: float
    roots: tuple[Root, ...]
    reached_V: float
    current_density_A_m2: Mapping[str, float]
    electron_debye_length_m: float
    sheath: Sheath
    photoelectrons: PhotoelectronSheath | None
    other_laws_reached_V: Mapping[str, float | None]
    curve: CurrentCurve
    notes: tuple[str, ...]


def floating_point(
    material: Material | str,
    plasma: Plasma | str,
    *,
    sunlit: bool = False,
    incidence_cosine: float = 1.0,
    collection: str = "auto",
    radius_m: float = 1.0,
    distance_au: float = 1.0,
    f107: float = 150.0,
    law: str | None = None,
    surface_state: str = "as recorded",
    photo_escape: str = "auto",
    flare: Mapping[str, float] | None = None,
) -> PointResult:
    """Find every floating potential of a one-sided patch without conduction.

    Parameters
    ----------
    material, plasma : object or str
        Object, library name, or file (ends in .toml or holds a slash).
    sunlit : bool, optional
        Whether the Sun shines on it.
    incidence_cosine : float, optional
        Cosine of the angle between sunlight and the outward normal, 0 to 1.
    collection : {"auto", "sphere", "cylinder", "plane"}, optional
        Collection of attracted particles; auto blends plane and sphere by sheath length.
    radius_m : float, optional
        Radius of the body that carries the patch [m], above 0, up to 1000.
    distance_au : float, optional
        Distance from the Sun [AU], 0.01 to 100.
    f107 : float, optional
        Solar radio flux at 10.7 cm and its 81-day mean [1e-22 W m-2 Hz-1], 50 to 500.
    law : str, optional
        Secondary-emission law, one of `materials.secondary.YIELD_LAWS`; default: the one that
        the material's record chooses, else "sanders_inouye_1979".
    surface_state : {"as recorded", "clean", "air-exposed", "aged"}, optional
        State of the surface for photoemission, see `materials.surface_state`.
    photo_escape : {"auto", "planar", "point source"}, optional
        How photoelectrons leave a positive surface; auto blends by their Debye length.
    flare : mapping of str to float, optional
        Factor on the photons by band of the spectrum.

    Returns
    -------
    PointResult

    Raises
    ------
    InputError
        Unknown name, unusable file, number out of range, plasma without electrons or ions.
    NoSolutionError
        No floating potential within ±200 kV.

    Notes
    -----
    Not part of the model: conduction to what lies behind, barriers raised by neighbours,
    electron exchange between surfaces.

    Examples
    --------
    >>> found = floating_point("bare collector", "quiet geostationary", collection="sphere")
    >>> round(found.reached_V)
    -1177
    """
    record = in_surface_state(as_material(material), surface_state)
    surrounding = as_plasma(plasma, to_charge=True)
    as_choice("photo_escape", photo_escape, PHOTO_GEOMETRIES)
    if law is not None:  # overrides the choice of the record
        rest = {key: value for key, value in record.laws.items() if key != "secondary_law"}
        record = replace(record, laws=rest)
    chosen = _law(law, record)
    as_choice("collection", collection, COLLECTIONS)
    radius = as_number("radius_m", radius_m, above=0.0, high=LARGEST_RADIUS_M)
    cosine = as_number("incidence_cosine", incidence_cosine, at_least=0.0, high=1.0)
    try:
        spectrum = solar_spectrum(f107=f107, distance_au=distance_au, band_factors=flare)
    except EnvironmentDataError as error:
        raise from_environment(error) from None
    light = cosine if sunlit else 0.0

    def model(of: YieldLaw) -> SurfaceModel:
        return surface_model(
            [record],
            [surrounding],
            spectrum,
            law=of,
            radius_m=radius,
            collection=collection,
            photo_geometry=photo_escape,
        )

    mine = model(chosen)
    found = floating_potentials(mine, light)
    others: dict[str, float | None] = {}
    for other in SECONDARY_LAWS:
        if other != chosen and record.emits:
            try:
                others[other] = floating_potentials(model(other), light).reached_V
            except NoSolutionError:
                others[other] = None
    debye, temperature = electron_sheath(mine.electrons, np.ones(1))
    sheath = sheath_weight(
        np.array(found.reached_V),
        debye_length_m=debye,
        temperature_eV=temperature,
        radius_m=radius,
        collection=collection,
    )
    return PointResult(
        material=record.name,
        plasma=surrounding.name,
        law=chosen,
        light=light,
        radius_m=radius,
        roots=found.roots,
        reached_V=found.reached_V,
        current_density_A_m2=MappingProxyType(
            # adding 0 turns -0 into 0
            {name: j + 0.0 for name, j in breakdown(mine, found.reached_V, light).items()}
        ),
        electron_debye_length_m=float(debye),
        sheath=Sheath(float(sheath.length_m), float(sheath.weight), collection),
        photoelectrons=_photoelectrons(record, spectrum, radius, photo_escape)
        if light > 0.0
        else None,
        other_laws_reached_V=MappingProxyType(others),
        curve=_curve(mine, found.roots, light),
        notes=(
            *law_notes(record, surrounding, chosen, found.reached_V, others),
            *angle_notes(record, surrounding, chosen, light, radius, collection),
            *general_notes(record, surrounding, found.roots, light, collection),
        ),
    )


def _photoelectrons(
    material: Material,
    spectrum: SolarSpectrum,
    radius_m: float,
    photo_escape: str,
) -> PhotoelectronSheath | None:
    sheath = photo_sheath(material, spectrum)
    if sheath is None:
        return None
    share = {
        "auto": point_source_weight(sheath, radius_m),
        "point source": 1.0,
    }
    return PhotoelectronSheath(
        sheath.debye_length_m,
        sheath.density_m3,
        sheath.mean_energy_eV,
        share.get(photo_escape, 0.0),
        photo_escape,
    )


def _law(law: str | None, material: Material) -> YieldLaw:
    if law is None:
        return law_of(material, SECONDARY_LAWS[0])
    as_choice("law", law, YIELD_LAWS)
    return next(known for known in YIELD_LAWS if known == law)


def _curve(model: SurfaceModel, roots: tuple[Root, ...], light: float) -> CurrentCurve:
    """Tabulate the currents over three times the span of the roots, at least ±30 V."""
    low = max(-SEARCH_V, 3.0 * min(-10.0, *(root.potential_V for root in roots)))
    high = min(SEARCH_V, 3.0 * max(10.0, *(root.potential_V for root in roots)))
    potential = np.sinh(np.linspace(np.arcsinh(low), np.arcsinh(high), CURVE_POINTS))
    setting = Setting(np.ones((CURVE_POINTS, 1)), np.full((CURVE_POINTS, 1), light))
    currents = surface_currents(model, potential[:, None], setting).by_mechanism[:, 0, :]
    return CurrentCurve(
        potential,
        MappingProxyType({name: currents[:, i] for i, name in enumerate(MECHANISMS)}),
    )
