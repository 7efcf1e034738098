"""States of a surface: clean, air-exposed, aged in orbit; shifted barrier; chosen level.

Each returns a new material or curve that says in its note what was done.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from functools import cache
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from materials.errors import MaterialError, finite_array
from materials.library import load_material
from materials.photo_laws import law_yield
from materials.photoemission import low_energy_peak
from materials.photoyield import photo_current_density, yield_per_photon
from materials.record import BASES, Material, PhotoYield

STATES: Final = ("as recorded", "clean", "air-exposed", "aged")

AGED_FROM: Final = (
    "oxidised aluminium",
    "gold",
    "gold, air-exposed",
    "stainless steel",
    "ITO coating",
    "graphite",
)
"""Laboratory curves of conducting surfaces whose largest yields make the aged state."""

AGED_ENERGIES_OF: Final = "gold, air-exposed"
"""Conductor with adsorbed layers whose collided electrons have the energies of all aged ones."""

AGED_SPREAD_FACTOR: Final = 3.0
"""Smallest factor either way of the aged state: an envelope of other surfaces (assumed)."""

AGED_UPPER_EV: Final = 3e4

Load = Callable[[str], Material]

AGED_SOURCE: Final = (
    "largest of our laboratory curves of conducting surfaces at each photon energy, after the"
    " statement that the yields of all materials rise over the first months in space, become"
    " alike and lie well above those of clean surfaces: Pedersen 1995, Ann. Geophys. 13, 118"
    " (abstract)"
)


def records_of_state(material: Material, state: str) -> tuple[str, ...]:
    """Library materials whose records a state needs besides the material itself.

    Examples
    --------
    >>> records_of_state(load_material("gold"), "air-exposed")
    ('gold, air-exposed',)
    """
    if material.photoyield is None or state == "as recorded":
        return ()
    record = material.surface_states.get(state.replace("-", "_"))
    if record is None:
        return AGED_FROM if state == "aged" else ()
    return () if record.curve_of is None else (record.curve_of,)


def in_state(material: Material, state: str, *, load: Load = load_material) -> Material:
    """Return a material in a state of its surface; only photoemission changes.

    Parameters
    ----------
    material : Material
    state : {"as recorded", "clean", "air-exposed", "aged"}
        "clean" and "air-exposed" must be in the record (``[surface_state.clean]``,
        ``[surface_state.air_exposed]``); "aged" is `aged_photoyield` unless the record
        has its own ``[surface_state.aged]``.
    load : callable, optional
        Gives the materials of `records_of_state`, for a run repeated from kept records.

    Returns
    -------
    Material
        The same object for "as recorded" and for a material that emits nothing.

    Raises
    ------
    MaterialError
        Unknown state, or one that the record does not have.

    Notes
    -----
    Secondary emission ages too, towards carbon; that is not part of this state.

    Examples
    --------
    >>> gold = load_material("gold")
    >>> in_state(gold, "air-exposed").photoyield.threshold_eV
    4.2
    """
    if state not in STATES:
        raise MaterialError(("surface_state",), state, "is unknown", allowed=", ".join(STATES))
    curve = material.photoyield
    if state == "as recorded" or curve is None:
        return material
    record = material.surface_states.get(state.replace("-", "_"))
    if record is None:
        if state == "aged":
            aged = aged_photoyield() if load is load_material else _envelope(load)
            return replace(material, photoyield=aged)
        known = [s.replace("_", "-") for s in material.surface_states]
        raise MaterialError(
            ("surface_state",),
            state,
            f'is not in the record of "{material.name}"',
            allowed=", ".join(dict.fromkeys(("as recorded", *known, "aged"))),
        )
    if record.curve_of is not None:
        bearer = load(record.curve_of)
        other = bearer.photoyield
        assert other is not None  # `read_material` saw to it
        note = f"Curve of {record.curve_of}: {record.source}. {other.note}"
        changed = replace(other, note=note, peak=low_energy_peak(bearer))
    else:
        assert record.barrier_shift_eV is not None  # the reader saw to it
        changed = shift_barrier(curve, record.barrier_shift_eV, source=record.source)
    weaker = max(changed.basis, record.basis, key=BASES.index)
    return replace(material, photoyield=replace(changed, basis=weaker))


@cache
def aged_photoyield() -> PhotoYield:
    """Yield of a surface that has aged in orbit, the same for all materials.

    At each photon energy to 30 keV the largest of the laboratory yields of `AGED_FROM`. The
    electrons have the energies of a conductor with adsorbed layers, whatever lies below.

    Returns
    -------
    PhotoYield
        Read-only; basis "assumed".

    Notes
    -----
    No level comes from currents measured in orbit, so that those can test it: 85 +- 33
    uA m-2 (Nakagawa et al. 2000, Earth Planets Space 52, 283, abstract).

    Examples
    --------
    >>> aged_photoyield().threshold_eV
    4.0
    """
    return _envelope(load_material)


def _envelope(load: Load) -> PhotoYield:
    curves = [c for c in (load(name).photoyield for name in AGED_FROM) if c is not None]
    lowest = min(curve.threshold_eV for curve in curves)
    # log-log between points must follow the quadratic rise of each curve from its threshold
    fine = np.concatenate(
        [lowest + np.arange(0.0, 1.0, 0.02), np.geomspace(5.0, AGED_UPPER_EV, 260)]
    )
    points = [curve.photon_energy_eV for curve in curves]
    edges = [c.x_ray.photon_energy_eV for c in curves if c.x_ray is not None]
    energy = np.unique(np.concatenate([fine, *points, *edges]))
    energy = energy[(energy >= lowest) & (energy <= AGED_UPPER_EV)]
    emitted = np.max([yield_per_photon(energy, curve) for curve in curves], axis=0)
    return PhotoYield(
        photon_energy_eV=energy,
        electrons_per_photon=emitted,
        source=AGED_SOURCE,
        basis="assumed",
        level="largest of laboratory curves",
        spread_factor=max(AGED_SPREAD_FACTOR, *(c.spread_factor for c in curves)),
        near_threshold_factor=max(AGED_SPREAD_FACTOR, *(c.near_threshold_factor for c in curves)),
        near_threshold_to_eV=max(c.near_threshold_to_eV for c in curves),
        high_energy_factor=max(AGED_SPREAD_FACTOR, *(c.high_energy_factor for c in curves)),
        high_energy_from_eV=min(c.high_energy_from_eV for c in curves),
        note=f"Curves: {', '.join(AGED_FROM)}. Energies as of {AGED_ENERGIES_OF}.",
        largest_angle_growth=max(c.largest_angle_growth for c in curves),
        peak=low_energy_peak(load(AGED_ENERGIES_OF)),
    )


def shift_barrier(curve: PhotoYield, shift_eV: float, *, source: str) -> PhotoYield:
    r"""Return a curve whose barrier an oxide or an adsorbed layer has moved.

    The threshold moves by the shift; points further up move less, and none from twice
    the threshold on (assumed): a barrier decides there over few electrons. A law moves
    as a whole.

    Parameters
    ----------
    curve : PhotoYield
    shift_eV : float
        Change of the threshold [eV], negative for a lowered barrier; within half the threshold.
    source : str
        Where the shift comes from; goes into the note.

    Returns
    -------
    PhotoYield

    Raises
    ------
    ValueError
        Shift too large or not finite.

    Examples
    --------
    >>> curve = load_material("gold").photoyield
    >>> round(shift_barrier(curve, -0.6, source="adsorbed carbon").threshold_eV, 9)
    4.2
    """
    first = curve.threshold_eV
    shift = float(finite_array("shift_eV", shift_eV, at_least=-0.5 * first, at_most=0.5 * first))
    note = f"Barrier shifted by {shift:+g} eV: {source}. {curve.note}".strip()
    points = curve.photon_energy_eV
    if curve.law == "table":
        moved = points + shift * np.clip(2.0 - points / first, 0.0, 1.0)
        return replace(curve, photon_energy_eV=moved, note=note)
    last = points[-1]
    moved = (first + shift) + (points - first) * ((last - first - shift) / (last - first))
    sampled = law_yield(
        moved, first + shift, curve.electrons_per_photon_at_1_eV, exponent=curve.exponent
    )
    return replace(curve, photon_energy_eV=moved, electrons_per_photon=sampled, note=note)


def normalised_to_current(
    curve: PhotoYield,
    photon_energy_eV: ArrayLike,
    photon_flux_m2_s: ArrayLike,
    *,
    saturation_current_A_m2: float,
    source: str,
) -> PhotoYield:
    """Return a curve scaled to give a measured saturation current under a spectrum.

    Nothing in this project calls it on its own; a curve treated so is a calibration, says
    so in its `level`, and cannot be checked against that current.

    Parameters
    ----------
    curve : PhotoYield
    photon_energy_eV, photon_flux_m2_s : array_like, (bin,)
        The spectrum under which the current was measured.
    saturation_current_A_m2 : float
        The measured current [A m-2], > 0, normal incidence.
    source : str
        Where the current comes from; goes into the note with the factor.

    Returns
    -------
    PhotoYield
        Level "normalised to a measured current".

    Raises
    ------
    ValueError
        Current not above 0, or the curve gives none.

    Examples
    --------
    >>> curve = load_material("gold").photoyield
    >>> mine = normalised_to_current(curve, [10.2], [4e15], saturation_current_A_m2=3.2e-5,
    ...                              source="own measurement")
    >>> mine.level
    'normalised to a measured current'
    """
    wanted = float(finite_array("saturation_current_A_m2", saturation_current_A_m2, above=0.0))
    own = float(photo_current_density(photon_energy_eV, photon_flux_m2_s, curve))
    if own == 0.0:
        raise ValueError("the curve gives no current under this spectrum")
    factor = wanted / own
    return replace(
        curve,
        electrons_per_photon=factor * curve.electrons_per_photon,
        electrons_per_photon_at_1_eV=factor * curve.electrons_per_photon_at_1_eV,
        level="normalised to a measured current",
        normalised_to=None,
        note=f"All yields times {factor:.4g} to give {wanted:.4g} A m-2: {source}. "
        f"{curve.note}".strip(),
    )
