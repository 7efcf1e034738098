"""Surface currents of many members from coarse tables, in place of `NetCurrents`.

Each member has materials of its own, so each has tables of its own: cubics on knots that
scale with the peak energy of the material, one set per material and not per surface. What
leaves a lit surface follows curves that all members with the same light and yield curve
share, whatever the level of the curve.
"""

from __future__ import annotations

from collections.abc import Hashable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from charging.currents.cells import grids
from charging.currents.ensemble_tables import (
    chosen_law,
    is_scalable,
    knots_from,
    pair_tables,
    pairs_of,
)
from charging.currents.lookup import NetCurrents
from charging.currents.photo_escape import (
    PhotoSheath,
    photo_escape,
    photo_sheath,
    point_source_weight,
    sheath_of,
)
from charging.currents.sheath import Sheath
from charging.currents.splines import polynomial, polynomial_and_slope, spline
from charging.currents.tables import knots
from environments.plasma import Plasma
from environments.spectrum import SolarSpectrum
from materials.photoelectron_energies import LowEnergyPeak
from materials.photoemission import low_energy_peak
from materials.photoyield import photo_current_density
from materials.record import Material, PhotoYield
from materials.secondary import YieldLaw

Array = NDArray[np.float64]
Index = NDArray[np.intp]

ESCAPE_SCALE_V, ESCAPE_SPACING = 0.5, 0.02
COLDEST_SHARE = 0.02
"""First knot, as a share of the lowest ratio of a temperature to a peak energy."""

PEAK_STEP = 0.01
"""Curves of photoelectrons whose low-energy peaks differ by less than this share are one."""

MOST_PLASMAS = 8
"""More would make tables of more than 100 kB per member and material."""

LARGEST_PEAK_eV = 2000.0
"""Peak energy that decides on the first knot: the same for every study of a case."""


@dataclass(frozen=True, slots=True)
class EnsembleEscape:
    """Escape above a barrier for M members and S surfaces; stands for `Escape`.

    Attributes
    ----------
    knots_V : ndarray [K]
    curves : ndarray [H, K-1, 4, 2]
        Photoelectrons of H pairs of light and yield curve; columns: from a plane, from a point.
    curve : ndarray of int [M, S]
    point_share : ndarray [M, S]
        Share of escape as from a point source.
    energy_eV : ndarray [M, S]
        Of secondaries: work function of conductors, temperature of the others, inf where all
        leave.
    conductor : ndarray of bool [M, S]
    """

    knots_V: Array
    curves: Array
    curve: Index
    point_share: Array
    energy_eV: Array
    conductor: NDArray[np.bool_]

    def shares(self, table: Index, height_V: Array) -> Array:
        """Shares [m, S, 2] that leave surfaces of members [m] at heights [m, S] >= 0."""
        found = np.ones((*height_V.shape, 2))
        member, surface = np.nonzero(height_V > 0.0)
        if member.size:
            own, height = table[member], height_V[member, surface]
            c, x = self._cells(own, surface, height)
            limits = polynomial(c, x)
            point = self.point_share[own, surface]
            found[member, surface, 0] = limits[:, 0] + point * (limits[:, 1] - limits[:, 0])
            found[member, surface, 1] = self._secondaries(own, surface, height)[0]
        return found

    def shares_and_slopes(self, table: Index, height_V: Array) -> tuple[Array, Array]:
        """`shares` and their derivatives by height, 0 where the height is 0."""
        found, slope = np.ones((*height_V.shape, 2)), np.zeros((*height_V.shape, 2))
        member, surface = np.nonzero(height_V > 0.0)
        if member.size:
            own, height = table[member], height_V[member, surface]
            c, x = self._cells(own, surface, height)
            point = self.point_share[own, surface]
            for out, limits in zip((found, slope), polynomial_and_slope(c, x), strict=True):
                out[member, surface, 0] = limits[:, 0] + point * (limits[:, 1] - limits[:, 0])
            value, by_height = self._secondaries(own, surface, height)
            found[member, surface, 1], slope[member, surface, 1] = value, by_height
        return found, slope

    def _secondaries(self, own: Index, surface: Index, height: Array) -> tuple[Array, Array]:
        energy = self.energy_eV[own, surface]
        metal = self.conductor[own, surface]
        rest = 1.0 / (1.0 + height / energy)
        value = np.where(metal, rest**2, np.exp(-height / energy))
        return value, -value / energy * np.where(metal, 2.0 * rest, 1.0)

    def _cells(self, own: Index, surface: Index, height: Array) -> tuple[Array, Array]:
        k = np.searchsorted(self.knots_V, height, side="right") - 1
        k = np.minimum(k, len(self.knots_V) - 2)
        x = np.minimum(height, self.knots_V[-1]) - self.knots_V[k]
        return self.curves[self.curve[own, surface], k], x[:, None]


@dataclass(frozen=True, slots=True, kw_only=True)
class EnsembleCurrents(NetCurrents):
    """`NetCurrents` whose knots scale with the material.

    Attributes
    ----------
    relative_knots : ndarray [K]
        Knots over the scale.
    scale_V : ndarray [M, U]
        Of each member's materials.
    material : ndarray of int [S]
        Which material of its member a surface has; `coefficients` are [M, U, ...].
    """

    relative_knots: Array
    scale_V: Array
    material: Index

    def _cells(self, which: Index, potential_V: Array) -> tuple[Array, Array, NDArray[np.bool_]]:
        scale = self.scale_V[which][:, self.material]
        size = np.abs(potential_V)
        last = len(self.relative_knots) - 2
        k = np.searchsorted(self.relative_knots, size / scale, side="right") - 1
        k = np.minimum(k, last)
        x = size - scale * self.relative_knots[k]
        positive = potential_V >= 0.0
        rows = self.coefficients.reshape(-1, *self.coefficients.shape[3:])
        materials, per_material = self.coefficients.shape[1:3]
        first = (which[:, None] * materials + self.material) * per_material
        return rows[first + k + (per_material // 2) * positive], x[..., None], positive


@dataclass(frozen=True, slots=True)
class Question:
    """What one member asks of the tables.

    Attributes
    ----------
    materials : sequence [S] of Material
        In the state of the surface.
    plasmas : sequence [P] of Plasma
    spectrum : SolarSpectrum
    law : YieldLaw
    radius_m : float
    collection, photo_geometry : str
        As in `surface_models`.
    """

    materials: Sequence[Material]
    plasmas: Sequence[Plasma]
    spectrum: SolarSpectrum
    law: YieldLaw
    radius_m: float
    collection: str
    photo_geometry: str


def fits_ensemble(questions: Sequence[Question]) -> bool:
    """Whether coarse tables know every law, distribution and geometry asked for."""
    first = questions[0]
    if len(first.plasmas) > MOST_PLASMAS:
        return False
    shape = [[p.species for p in plasma.populations] for plasma in first.plasmas]
    known_plasmas: set[int] = set()
    known_materials: set[int] = set()
    for one in questions:
        if one.collection == "cylinder":
            return False
        if [[p.species for p in plasma.populations] for plasma in one.plasmas] != shape:
            return False
        for plasma in one.plasmas:
            if id(plasma) in known_plasmas:
                continue
            if any(p.distribution is not None for p in plasma.populations):
                return False
            known_plasmas.add(id(plasma))
        for material in one.materials:
            if id(material) in known_materials:
                continue
            curve = material.photoyield
            warm = curve is not None and curve.temperature_K > 0.0
            if warm or not is_scalable(material):
                return False
            known_materials.add(id(material))
    return True


def ensemble_currents(questions: Sequence[Question], curves: EscapeCurves) -> EnsembleCurrents:
    """Tabulate members; `fits_ensemble` must hold.

    The tables of a member do not depend on the others.
    """
    first = questions[0]
    # surfaces of one material share a table; members that pair them otherwise fall back to
    # one table a surface
    pattern = _pattern(first.materials)
    if any(_pattern(q.materials) != pattern for q in questions):
        pattern = tuple(range(len(first.materials)))
    holders = [pattern.index(u) for u in range(max(pattern) + 1)]
    coldest = min(p.temperature_eV for plasma in first.plasmas for p in plasma.populations)
    grid = knots_from(COLDEST_SHARE * coldest / LARGEST_PEAK_eV)
    members, materials = len(questions), len(holders)
    scale = np.empty((members, materials))
    width = 4 * len(first.plasmas)
    tables = np.empty((members, materials, 2 * (len(grid) - 1), 4, width))
    for u, surface in enumerate(holders):
        laws = [chosen_law(q.materials[surface], q.law) for q in questions]
        for law in dict.fromkeys(laws):
            here = [i for i, own in enumerate(laws) if own == law]
            pairs = pairs_of([questions[i].materials[surface] for i in here], law)
            scale[here, u] = pairs.peak_energy_eV
            tables[here, u] = pair_tables(pairs, [questions[i].plasmas for i in here], grid)
    photo, escape = _light(questions, curves)
    growth = [
        [1.0 if m.photoyield is None else m.photoyield.largest_angle_growth for m in q.materials]
        for q in questions
    ]
    return EnsembleCurrents(
        table=np.arange(members),
        grids=grids([grid]),
        coefficients=tables,
        escape=escape,
        photo_saturation_A_m2=photo,
        sheath=_sheath(questions),
        angle_growth=np.array(growth),
        relative_knots=grid,
        scale_V=scale,
        material=np.array(pattern, dtype=np.intp),
    )


def _pattern(materials: Sequence[Material]) -> tuple[int, ...]:
    known: dict[int, int] = {}
    return tuple(known.setdefault(id(m), len(known)) for m in materials)


@dataclass(frozen=True, slots=True)
class YieldInLight:
    """A yield curve in a light, at level 1.

    saturation_A_m2 : photocurrent; sheath : of all its photoelectrons, None where there are
    none; pieces : ndarray [K-1, 4, 2], escape from a plane and from a point.
    """

    saturation_A_m2: float
    sheath: PhotoSheath | None
    pieces: Array


class EscapeCurves:
    """Escape curves made so far, for blocks that follow each other.

    A curve depends on its material and light alone: keeping it changes no number.
    """

    def __init__(self) -> None:
        self.height_V = knots(ESCAPE_SCALE_V, ESCAPE_SPACING)
        self._known: dict[Hashable, YieldInLight] = {}

    def of(self, material: Material, spectrum: SolarSpectrum) -> tuple[Hashable, YieldInLight]:
        """Curve of a material, and a key that materials with the same curve share."""
        own = material.photoyield
        if own is None:
            if None not in self._known:
                all_leave = np.ones((len(self.height_V), 2))
                self._known[None] = YieldInLight(0.0, None, spline(self.height_V, all_leave, 3))
            return None, self._known[None]
        peak = low_energy_peak(material)
        scale = float(np.exp(PEAK_STEP * np.round(np.log(peak.scale_eV) / PEAK_STEP)))
        peak = peak._replace(scale_eV=scale)
        key = (
            spectrum.photon_flux_m2_s.tobytes(),
            peak,
            own.photon_energy_eV.tobytes(),
            own.electrons_per_photon.tobytes(),
            (own.law, own.electrons_per_photon_at_1_eV, own.exponent, own.above_last_point),
            (own.x_ray, own.counts, own.reflectance, own.energies),
        )
        if key not in self._known:
            self._known[key] = self._made(material, own, peak, spectrum)
        return key, self._known[key]

    def _made(
        self, material: Material, own: PhotoYield, peak: LowEnergyPeak, spectrum: SolarSpectrum
    ) -> YieldInLight:
        curve = replace(own, level_factor=1.0, peak=peak)
        plain = replace(material, photoyield=curve)
        limits = [
            photo_escape(self.height_V, plain, spectrum, radius_m=1.0, geometry=geometry)
            for geometry in ("planar", "point source")
        ]
        energy, flux = spectrum.photon_energy_eV, spectrum.photon_flux_m2_s
        return YieldInLight(
            float(photo_current_density(energy, flux, curve)),
            photo_sheath(plain, spectrum),
            spline(self.height_V, np.stack(limits, axis=-1), 3),
        )


def _light(questions: Sequence[Question], curves: EscapeCurves) -> tuple[Array, EnsembleEscape]:
    """Photocurrents [M, S] and escape of every member."""
    places: dict[Hashable, int] = {}
    pieces: list[Array] = []
    shape = (len(questions), len(questions[0].materials))
    photo, share = np.zeros(shape), np.zeros(shape)
    energy = np.full(shape, np.inf)
    place = np.zeros(shape, dtype=np.intp)
    metal = np.zeros(shape, dtype=np.bool_)
    for i, q in enumerate(questions):
        for s, material in enumerate(q.materials):
            if material.emits:
                metal[i, s] = material.kind == "conductor"
                key = "work_function_eV" if metal[i, s] else "secondary_energy_eV"
                energy[i, s] = material.value(key)
            name, one = curves.of(material, q.spectrum)
            if name not in places:
                places[name] = len(pieces)
                pieces.append(one.pieces)
            curve = material.photoyield
            level = 1.0 if curve is None else curve.level_factor
            place[i, s] = places[name]
            photo[i, s] = level * one.saturation_A_m2
            share[i, s] = _point_share(one, level, q)
    escape = EnsembleEscape(curves.height_V, np.stack(pieces), place, share, energy, metal)
    return photo, escape


def _point_share(curve: YieldInLight, level: float, question: Question) -> float:
    """Share of escape as from a point; the Debye length goes as the root of the level."""
    if question.photo_geometry != "auto":
        return float(question.photo_geometry == "point source")
    if curve.sheath is None or level <= 0.0:
        return 0.0
    sheath = sheath_of(level * curve.sheath.saturation_current_A_m2, curve.sheath.mean_energy_eV)
    return point_source_weight(sheath, question.radius_m)


def _sheath(questions: Sequence[Question]) -> Sheath:
    """Sheaths of the members."""
    known: dict[int, tuple[float, float]] = {}

    def electrons(plasma: Plasma) -> tuple[float, float]:
        if id(plasma) not in known:
            own = [p for p in plasma.populations if p.species.charge_number < 0]
            known[id(plasma)] = (
                sum(p.density_m3 for p in own),
                sum(p.density_m3 / p.temperature_eV for p in own),
            )
        return known[id(plasma)]

    both = np.array([[electrons(plasma) for plasma in q.plasmas] for q in questions])
    return Sheath(
        both[..., 0],
        both[..., 1],
        np.array([q.radius_m for q in questions]) ** 2,
        np.array([0.0 if q.collection == "plane" else 1.0 for q in questions]),
        np.array([q.collection == "auto" for q in questions]),
        any(q.collection != "auto" for q in questions),
    )
