"""The inverse of the retarding curve: where sunlight holds a surface."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Unpack

import numpy as np
from scipy.optimize import brentq

from charging.arguments import as_material, as_number
from charging.currents.photo_escape import photo_escape
from charging.photo_table import Sunlight, SunlightOptions
from charging.point import floating_point
from environments.plasma import Plasma
from materials.record import Material


def sunlit_potentials(
    materials: Sequence[Material | str], plasma: Plasma | str, **sunlight: Unpack[SunlightOptions]
) -> tuple[float, ...]:
    """Potentials that lit surfaces reach from 0 V in a plasma, all currents balanced.

    Parameters
    ----------
    materials : sequence of Material or str
        Objects, library names, or files (end in .toml or hold a slash).
    plasma : Plasma or str
    **sunlight : optional
        Attributes of `charging.photo_table.Sunlight`.

    Returns
    -------
    tuple of float
        [V], in the order of `materials`; positive where photoelectrons rule.

    Raises
    ------
    InputError
        Unknown name, unusable file, number out of range.
    NoSolutionError
        No floating potential within ±200 kV.

    Examples
    --------
    >>> volts = sunlit_potentials(["ITO coating", "bare collector"], "quiet geostationary")
    >>> bool(1.0 < volts[0] < 20.0), bool(volts[1] < -100.0)
    (True, True)
    """
    light = Sunlight(**sunlight)
    return tuple(
        floating_point(
            given,
            plasma,
            sunlit=True,
            incidence_cosine=light.incidence_cosine,
            radius_m=light.radius_m,
            distance_au=light.distance_au,
            f107=light.f107,
            surface_state=light.surface_state,
            photo_escape=light.photo_escape,
            flare=light.flare,
        ).reached_V
        for given in materials
    )


def potential_for_current(
    material: Material | str, escaping_current_A_m2: float, **sunlight: Unpack[SunlightOptions]
) -> float:
    """Potential at which a given photocurrent still escapes: the retarding curve inverted.

    Parameters
    ----------
    material : Material or str
    escaping_current_A_m2 : float
        Current density to be carried away [A m-2], above 0: the net current of electrons
        that a positive surface collects.
    **sunlight : optional
        Attributes of `charging.photo_table.Sunlight`.

    Returns
    -------
    float
        [V], >= 0; 0 where the saturation current is smaller than what is asked, so that
        no positive potential exists.

    Raises
    ------
    InputError
        Unknown name, unusable file, number out of range.

    Examples
    --------
    >>> round(potential_for_current("gold", 1.0), 3)  # no material emits 1 A m-2
    0.0
    """
    light = Sunlight(**sunlight)
    record, spectrum = light.material(as_material(material)), light.spectrum()
    wanted = as_number("escaping_current_A_m2", escaping_current_A_m2, above=0.0, high=1e6)
    saturation = light.current_A_m2(record, spectrum)
    if saturation <= wanted:
        return 0.0

    def excess(volts: float) -> float:
        share = photo_escape(
            np.array(volts),
            record,
            spectrum,
            radius_m=light.radius_m,
            geometry=light.photo_escape,
        )
        return float(share) * saturation - wanted

    high = 1.0
    while excess(high) > 0.0:  # ends: nothing escapes above the largest photon energy
        high *= 2.0
    return float(brentq(excess, 0.0, high, xtol=1e-9, rtol=1e-13))
