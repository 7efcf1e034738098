"""Populations of the regions as series, every density times the share of its region."""

from collections.abc import Sequence
from typing import Final

import numpy as np
from numpy.typing import NDArray
from scipy.constants import electron_mass

from environments import lunar_wake, plasma_sheet, plasmasphere, tail_lobe
from environments.earth_axes import turning_with_earth_m_s
from environments.magnetosheath import Magnetosheath
from environments.plasma_sheet import SheetMoments
from environments.population_series import PopulationSeries
from environments.region_places import EarthShares
from environments.solar_wind import HALO_KAPPA, SolarWind
from environments.species import ELECTRON, HELIUM_ION, HYDROGEN_ION, OXYGEN_ION, Species
from environments.substorm import Substorm, substorm_strength

Array = NDArray[np.float64]

ALPHA: Final = Species("He++", HELIUM_ION.mass_kg - electron_mass, +2)
"""Alpha particle."""

_WIND: Final = "Feldman et al. 1977; Stverak et al. 2009; exponents see environments.solar_wind"
_SHEATH: Final = "energy balance of the shocked wind; Spreiter, Summers & Alksne 1966"
_SHEET: Final = "after Korth et al. 1999, Denton et al. 2005; tail Baumjohann et al. 1989"
_COLD: Final = "Carpenter & Anderson 1992"
_SUBSTORM: Final = "moments as the case or NASA TP-2361 gives them; history assumed"
_LOBE: Final = "Svenes et al. 2008; Pedersen et al. 2008"
_CAP: Final = "Persoon et al. 1983"


def stream_series(
    wind_share: Array,
    sheath_share: Array,
    wind: SolarWind,
    sheath: Magnetosheath | None,
    wind_velocity: Array,
    sheath_velocity: Array,
    left: Array,
) -> tuple[PopulationSeries, ...]:
    """Solar wind and magnetosheath, thinned out in the lunar wake.

    Parameters
    ----------
    wind_share, sheath_share : ndarray, shape (T,)
        Shares of both streams, the wake in them included.
    wind : SolarWind
        Moments.
    sheath : Magnetosheath or None
        None: nowhere.
    wind_velocity, sheath_velocity : ndarray, shape (3, T)
        [m s-1].
    left : ndarray, shape (T,)
        Density over that of the stream: 1 outside of the lunar wake.

    Returns
    -------
    tuple of PopulationSeries
        In the wake halo electrons of the wind get through to where core electrons do not.
    """
    core, halo, potential = lunar_wake.filtered_electrons(
        wind.core_density_m3, wind.core_temperature_eV, wind.halo_density_m3,
        wind.halo_temperature_eV, HALO_KAPPA, left,
    )  # fmt: skip
    halo_T = wind.halo_temperature_eV + potential / (HALO_KAPPA - 1.5)
    rows: list[tuple[str, Species, float | None, Array, Array, Array, Array, str]] = [
        ("solar wind core electrons", ELECTRON, None, wind_share, core,
         wind.core_temperature_eV, wind_velocity, _WIND),
        ("solar wind halo electrons", ELECTRON, HALO_KAPPA, wind_share, halo, halo_T,
         wind_velocity, _WIND),
        ("solar wind protons", HYDROGEN_ION, None, wind_share, left * wind.proton_density_m3,
         wind.proton_temperature_eV, wind_velocity, _WIND),
        ("solar wind alpha particles", ALPHA, None, wind_share, left * wind.alpha_density_m3,
         wind.alpha_temperature_eV, wind_velocity, _WIND),
    ]  # fmt: skip
    if sheath is not None:
        protons_T = sheath.proton_temperature_eV
        rows += [
            ("magnetosheath electrons", ELECTRON, None, sheath_share,
             left * sheath.electron_density_m3, sheath.electron_temperature_eV, sheath_velocity,
             _SHEATH),
            ("magnetosheath protons", HYDROGEN_ION, None, sheath_share,
             left * sheath.proton_density_m3, protons_T, sheath_velocity, _SHEATH),
            ("magnetosheath alpha particles", ALPHA, None, sheath_share,
             left * sheath.alpha_density_m3, 4.0 * protons_T, sheath_velocity, _SHEATH),
        ]  # fmt: skip
    return tuple(
        PopulationSeries(
            species, "maxwellian" if kappa is None else "kappa", kappa, share * density,
            temperature, velocity, label, source, "memory" if source == _WIND else "assumed",
        )
        for label, species, kappa, share, density, temperature, velocity, source in rows
    )  # fmt: skip


def hot_series(
    places: EarthShares,
    hot: SheetMoments,
    stamps: NDArray[np.datetime64],
    substorms: Sequence[Substorm] = (),
) -> tuple[PopulationSeries, ...]:
    """Hot populations of the plasma sheet.

    Parameters
    ----------
    places : EarthShares
        Shares and coordinates.
    hot : SheetMoments
        Of the sheet without substorms.
    stamps : ndarray of datetime64[ns], shape (T,)
        UTC.
    substorms : sequence of Substorm, optional
        Each mixes its plasma in, the last one over those before.

    Returns
    -------
    tuple of PopulationSeries
    """
    left = places.plasma_sheet
    injected: list[PopulationSeries] = []
    for number, one in reversed(tuple(enumerate(substorms, start=1))):
        part = left * substorm_strength(one, stamps, places.local_time_h)
        left = left - part
        word = "substorm" if len(substorms) == 1 else f"substorm {number}"
        rows: tuple[tuple[str, Species, float, float], ...] = (
            ("electrons", ELECTRON, one.electron_density_m3, one.electron_temperature_eV),
            ("H+", HYDROGEN_ION, one.ion_density_m3, one.ion_temperature_eV),
        )
        injected += [
            PopulationSeries(
                species, "maxwellian", None, part * density, np.full_like(part, temperature),
                None, f"{word} {label}", _SUBSTORM, "assumed",
            )
            for label, species, density, temperature in rows
        ]  # fmt: skip
    ions = left * hot.ion_density_m3
    return (
        PopulationSeries(
            ELECTRON, "kappa", plasma_sheet.ELECTRON_KAPPA, left * hot.electron_density_m3,
            hot.electron_temperature_eV, None, "plasma sheet electrons", _SHEET, "assumed",
        ),
        PopulationSeries(
            HYDROGEN_ION, "maxwellian", None, ions * (1.0 - hot.oxygen_share),
            hot.ion_temperature_eV, None, "plasma sheet H+", _SHEET, "assumed",
        ),
        PopulationSeries(
            OXYGEN_ION, "maxwellian", None, ions * hot.oxygen_share, hot.ion_temperature_eV, None,
            "plasma sheet O+", f"{_SHEET}; Young et al. 1982", "assumed",
        ),
        *injected,
    )  # fmt: skip


def cold_series(
    places: EarthShares, hot: SheetMoments, from_earth_m: Array
) -> tuple[PopulationSeries, ...]:
    """Cold populations of plasmasphere and trough, turning with the Earth.

    Within the plasma sheet the model's density counts all electrons, so that only what
    exceeds the hot ones is cold there.

    Parameters
    ----------
    places : EarthShares
        Shares and coordinates.
    hot : SheetMoments
        Of the sheet.
    from_earth_m : ndarray, shape (3, T)
        Position [m].

    Returns
    -------
    tuple of PopulationSeries
    """
    cold = places.cold
    # beyond the model's data the sheet holds no cold plasma that anyone has counted
    counted = 1.0 - plasmasphere_end(places.l_shell)
    beside = counted * np.maximum(cold.density_m3 - hot.electron_density_m3, 0.0)
    density = places.cold_only * cold.density_m3 + places.plasma_sheet * beside
    velocity = turning_with_earth_m_s(from_earth_m)
    found = [
        PopulationSeries(
            ELECTRON, "maxwellian", None, density, cold.temperature_eV, velocity,
            "cold electrons", _COLD, "memory",
        )
    ]  # fmt: skip
    ions = (HYDROGEN_ION, HELIUM_ION, OXYGEN_ION)
    for species, part in zip(ions, plasmasphere.ION_SHARES, strict=True):
        found.append(
            PopulationSeries(
                species, "maxwellian", None, part * density, cold.temperature_eV, velocity,
                f"cold {species.name}", _COLD, "memory",
            )
        )  # fmt: skip
    return tuple(found)


def open_series(places: EarthShares) -> tuple[PopulationSeries, ...]:
    """Populations of tail lobe and polar cap.

    Parameters
    ----------
    places : EarthShares
        Shares and coordinates.

    Returns
    -------
    tuple of PopulationSeries
        The lobe's plasma fills the cap's field lines too; the cap adds its cold one.
    """
    found = tail_lobe.lobe_plasma(places.radius_re)
    share = places.lobe + places.polar_cap
    lobe, cap = share * found.lobe_density_m3, places.polar_cap * found.cap_density_m3
    return (
        PopulationSeries(
            ELECTRON, "maxwellian", None, lobe, found.electron_temperature_eV, None,
            "lobe electrons", _LOBE, "memory",
        ),
        PopulationSeries(
            HYDROGEN_ION, "maxwellian", None, lobe, found.ion_temperature_eV, None,
            "lobe H+", _LOBE, "memory",
        ),
        PopulationSeries(
            ELECTRON, "maxwellian", None, cap, found.cap_temperature_eV, None,
            "polar cap electrons", _CAP, "memory",
        ),
        PopulationSeries(
            HYDROGEN_ION, "maxwellian", None, cap, found.cap_temperature_eV, None,
            "polar cap H+", _CAP, "memory",
        ),
    )  # fmt: skip


def plasmasphere_end(l_shell: Array) -> Array:
    """0 within the data of the cold plasma's model, 1 two L beyond.

    Examples
    --------
    >>> plasmasphere_end(np.array([6.6, 9.0, 12.0])).tolist()
    [0.0, 0.5, 1.0]
    """
    last = plasmasphere.FITTED_L[1]
    return np.asarray(np.clip((l_shell - last) / 2.0, 0.0, 1.0))
