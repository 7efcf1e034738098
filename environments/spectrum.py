"""Solar photon flux from soft X-rays to 400 nm, scaled with activity and distance."""

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from math import isfinite
from types import MappingProxyType
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import c, e, h

from environments.errors import EnvironmentDataError, nearest_name

BANDS: Final = MappingProxyType(
    {
        "X-ray": "0.05-5 nm",
        "EUV": "5-105 nm",
        "FUV below Lyman-alpha": "105-120 nm",
        "Lyman-alpha": "121.567 nm",
        "FUV above Lyman-alpha": "123-200 nm",
        "MUV": "200-300 nm",
        "NUV": "300-400 nm",
    }
)
"""Bands of the composite and the wavelengths they cover."""

F107_RANGE_SFU: Final = (50.0, 500.0)
"""Accepted F10.7 [sfu]; records run from 62 to about 380 (from memory), the rest is a slip."""

DISTANCE_RANGE_AU: Final = (0.01, 100.0)
"""Accepted distance from the Sun [AU]."""

ACTIVITY_REFERENCE_SFU: Final = 80.0
ACTIVITY_FLOOR: Final = 0.8
X_RAY_JOIN_NM: Final = 5.0

NM_EV: Final = h * c / e * 1e9
"""Photon energy times wavelength [eV nm]: 1239.84."""


@dataclass(frozen=True, slots=True)
class BandRow:
    """Photons and power of one band.

    Attributes
    ----------
    band : str
        A name of `BANDS`.
    wavelength_low_nm, wavelength_high_nm : float
        Extent of the bins [nm].
    photon_flux_m2_s : float
        Photons [m-2 s-1].
    irradiance_W_m2 : float
        Power [W m-2], every bin at its centre energy.
    """

    band: str
    wavelength_low_nm: float
    wavelength_high_nm: float
    photon_flux_m2_s: float
    irradiance_W_m2: float


@dataclass(frozen=True, slots=True, eq=False)
class SolarSpectrum:
    """Photons of the Sun in bins; see `solar_spectrum`.

    Attributes
    ----------
    wavelength_low_nm, wavelength_high_nm : ndarray, shape (bin,)
        Edges [nm]; equal for a line. A band of the EUV part and the lines inside it
        overlap: the flux of the band excludes the lines.
    photon_energy_eV : ndarray, shape (bin,)
        Energy at the middle wavelength [eV].
    photon_flux_m2_s : ndarray, shape (bin,)
        Photons in the bin through a plane facing the Sun [m-2 s-1].
    band : tuple of str
        Name in `BANDS`, by bin.
    f107, f107_81day : float
        Activity used [sfu].
    distance_au : float
        Distance from the Sun [AU].

    Notes
    -----
    Arrays are read-only.
    """

    wavelength_low_nm: NDArray[np.float64]
    wavelength_high_nm: NDArray[np.float64]
    photon_energy_eV: NDArray[np.float64]
    photon_flux_m2_s: NDArray[np.float64]
    band: tuple[str, ...]
    f107: float
    f107_81day: float
    distance_au: float

    def photons_above(self, threshold_eV: float) -> float:
        """Photons with more energy than a threshold.

        Parameters
        ----------
        threshold_eV : float
            Photon energy [eV], > 0.

        Returns
        -------
        float
            Flux [m-2 s-1]. A bin that holds the threshold counts with the share of its
            photons below that wavelength, irradiance constant within the bin (as in
            `environments.rebin`), a line wholly or not at all. Below 3.1 eV (400 nm, the
            end of the data) the flux stays at its total: the spectrum knows no more.

        Raises
        ------
        ValueError
            threshold <= 0 or not finite.

        Examples
        --------
        >>> spectrum = solar_spectrum()
        >>> 0.0 < spectrum.photons_above(10.3) < 0.01 * spectrum.photons_above(5.0)
        True
        """
        if not (isfinite(threshold_eV) and threshold_eV > 0.0):
            raise ValueError("threshold_eV must be finite and positive")
        edge_nm = NM_EV / threshold_eV
        low, high = self.wavelength_low_nm, self.wavelength_high_nm
        is_line = high == low
        below = (edge_nm**2 - low**2) / np.where(is_line, 1.0, high**2 - low**2)
        share = np.where(is_line, edge_nm > low, np.clip(below, 0.0, 1.0))
        return float(np.sum(share * self.photon_flux_m2_s))


def solar_spectrum(
    *,
    f107: float = 150.0,
    f107_81day: float | None = None,
    distance_au: float = 1.0,
    band_factors: Mapping[str, float] | None = None,
) -> SolarSpectrum:
    """Composite solar spectrum, 0.05 to 400 nm.

    Parameters
    ----------
    f107 : float, optional
        Solar radio flux at 10.7 cm of the day [sfu], 50 to 500.
    f107_81day : float, optional
        Its mean over 81 days around the day [sfu]; default: `f107`.
    distance_au : float, optional
        Distance from the Sun [AU], 0.01 to 100; all fluxes go as its inverse square.
    band_factors : mapping of str to float, optional
        Extra factor by band (names of `BANDS`), for flares; >= 0.

    Returns
    -------
    SolarSpectrum
        Bins by rising band, arrays read-only.

    Raises
    ------
    EnvironmentDataError
        A figure outside its range, an unknown band.

    Notes
    -----
    F = F_80 max(0.8, 1 + A (P - 80)) with P = (F10.7 + its 81-day mean)/2 below 123 nm; the
    floor acts below P = 80 only, where the X-ray bins would otherwise turn negative.
    X-ray bins end at 5 nm: the last one (3.2-7 nm) gives (5-3.2)/(7-3.2) of its photons.
    Then 37 EUV bins to 105 nm and three FUV bins to 120 nm. Lyman-alpha is one line that
    replaces the table of 120-123 nm, so it counts once. ASTM E490 begins at 123 nm and does
    not scale; what that leaves out at P = 150 is, by the factors of the FUV reference, a
    fifth at 130 nm, a tenth at 150 nm, 4 percent at 170 nm and less beyond.

    References
    ----------
    Richards, Fennelly & Torr (1994), J. Geophys. Res. 99, 8981 (bins, A, P);
    Solomon & Qian (2005), J. Geophys. Res. 110, A10306 (X-rays); Woods & Rottman (2002),
    AGU Geophys. Monograph 130 (FUV, Lyman-alpha); ASTM E490-00a (2014), table 3. The floor
    0.8 follows published implementations of the first.

    Examples
    --------
    >>> spectrum = solar_spectrum(f107=80.0)
    >>> line = spectrum.band.index("Lyman-alpha")
    >>> round(float(spectrum.photon_energy_eV[line]), 3)
    10.199
    >>> f"{spectrum.photon_flux_m2_s[line]:.3g}"
    '3.94e+15'
    """
    mean = f107 if f107_81day is None else f107_81day
    _check("f107", f107, F107_RANGE_SFU, "sfu")
    _check("f107_81day", mean, F107_RANGE_SFU, "sfu")
    _check("distance_au", distance_au, DISTANCE_RANGE_AU, "AU")
    table = _table()
    flux = photon_flux(0.5 * (f107 + mean)) / distance_au**2
    if band_factors:
        flux = flux * _factors(band_factors, table.band)
    flux.flags.writeable = False
    return SolarSpectrum(
        wavelength_low_nm=table.low_nm,
        wavelength_high_nm=table.high_nm,
        photon_energy_eV=table.photon_energy_eV,
        photon_flux_m2_s=flux,
        band=table.band,
        f107=float(f107),
        f107_81day=float(mean),
        distance_au=float(distance_au),
    )


def photon_flux(activity_sfu: ArrayLike) -> NDArray[np.float64]:
    """Photons by bin at 1 AU for many activities at once; bins as in `solar_spectrum`.

    Parameters
    ----------
    activity_sfu : array_like, (...)
        P, mean of F10.7 and its 81-day mean [sfu], 50 to 500.

    Returns
    -------
    ndarray, (..., bin)
        [m-2 s-1].

    Raises
    ------
    EnvironmentDataError
        An activity outside its range.

    Examples
    --------
    >>> photon_flux([80.0, 150.0]).shape
    (2, 163)
    """
    activity = np.asarray(activity_sfu, dtype=np.float64)
    for extreme in (activity.min(), activity.max()):
        _check("activity_sfu", float(extreme), F107_RANGE_SFU, "sfu")
    table = _table()
    change = table.activity_per_sfu * (activity[..., np.newaxis] - ACTIVITY_REFERENCE_SFU)
    return table.photon_flux_m2_s * np.maximum(ACTIVITY_FLOOR, 1.0 + change)


def band_table(spectrum: SolarSpectrum) -> tuple[BandRow, ...]:
    """Photons and power of a spectrum by band.

    Parameters
    ----------
    spectrum : SolarSpectrum
        From `solar_spectrum`.

    Returns
    -------
    tuple of BandRow
        In the order of `BANDS`.

    Examples
    --------
    >>> [row.band for row in band_table(solar_spectrum())][:2]
    ['X-ray', 'EUV']
    """
    power = spectrum.photon_flux_m2_s * spectrum.photon_energy_eV * e
    rows = []
    for band in BANDS:
        here = np.array([b == band for b in spectrum.band])
        rows.append(
            BandRow(
                band=band,
                wavelength_low_nm=float(spectrum.wavelength_low_nm[here].min()),
                wavelength_high_nm=float(spectrum.wavelength_high_nm[here].max()),
                photon_flux_m2_s=float(spectrum.photon_flux_m2_s[here].sum()),
                irradiance_W_m2=float(power[here].sum()),
            )
        )
    return tuple(rows)


def spectrum_sources() -> dict[str, str]:
    """Source of every part of the spectrum, by its name in the data file.

    Examples
    --------
    >>> "Richards" in spectrum_sources()["euv"]
    True
    """
    return {part: str(entry["source"]) for part, entry in _document().items()}


@dataclass(frozen=True, slots=True, eq=False)
class _Table:
    low_nm: NDArray[np.float64]
    high_nm: NDArray[np.float64]
    photon_energy_eV: NDArray[np.float64]
    photon_flux_m2_s: NDArray[np.float64]
    activity_per_sfu: NDArray[np.float64]
    band: tuple[str, ...]


@cache
def _document() -> dict[str, dict[str, object]]:
    path = files("environments").joinpath("data", "solar_spectrum.toml")
    return tomllib.loads(path.read_text(encoding="utf-8"))


@cache
def _table() -> _Table:
    document = _document()

    def column(part: str, key: str) -> NDArray[np.float64]:
        return np.array(document[part][key], dtype=np.float64)

    x_low, x_high = column("x_ray", "low_nm"), column("x_ray", "high_nm")
    used = (np.minimum(x_high, X_RAY_JOIN_NM) - x_low) / (x_high - x_low)
    centre = column("e490_1nm", "centre_nm")
    # irradiance over the 1 nm of a sample, divided by the photon energy at its centre
    fine_flux = column("e490_1nm", "irradiance_W_m2_nm") * 1.0 * centre / (NM_EV * e)
    scaled = ("euv", "fuv", "lyman_alpha")
    low = [
        x_low,
        *(column(p, "low_nm") for p in scaled),
        centre - 0.5,
        column("e490_5nm", "low_nm"),
    ]
    high = [
        np.minimum(x_high, X_RAY_JOIN_NM),
        *(column(p, "high_nm") for p in scaled),
        centre + 0.5,
        column("e490_5nm", "high_nm"),
    ]
    flux = [
        column("x_ray", "photon_flux_m2_s") * used,
        *(column(p, "photon_flux_m2_s") for p in scaled),
        fine_flux,
        column("e490_5nm", "photon_flux_m2_s"),
    ]
    factor = [column(p, "activity_per_sfu") for p in ("x_ray", *scaled)]
    count = [len(part) for part in low]
    labels = ["X-ray", "EUV", "FUV below Lyman-alpha", "Lyman-alpha", "FUV above Lyman-alpha"]
    band = [label for label, n in zip(labels, count, strict=False) for _ in range(n)]
    band += ["MUV" if edge < 300.0 else "NUV" for edge in low[-1]]
    low_nm, high_nm = np.concatenate(low), np.concatenate(high)
    activity = np.concatenate([*factor, np.zeros(count[-2] + count[-1])])
    table = _Table(
        low_nm=low_nm,
        high_nm=high_nm,
        photon_energy_eV=NM_EV / (0.5 * (low_nm + high_nm)),
        photon_flux_m2_s=np.concatenate(flux),
        activity_per_sfu=activity,
        band=tuple(band),
    )
    for array in (
        table.low_nm,
        table.high_nm,
        table.photon_energy_eV,
        table.photon_flux_m2_s,
        table.activity_per_sfu,
    ):
        array.flags.writeable = False
    return table


def _factors(band_factors: Mapping[str, float], band: tuple[str, ...]) -> NDArray[np.float64]:
    for name, value in band_factors.items():
        if name not in BANDS:
            raise EnvironmentDataError(
                "is not a band",
                key=("band_factors",),
                value=name,
                allowed=", ".join(f'"{known}"' for known in BANDS),
                nearest=nearest_name(name, BANDS),
            )
        if not (isfinite(value) and value >= 0.0):
            raise EnvironmentDataError(
                "cannot be a factor",
                key=("band_factors", name),
                value=value,
                allowed="finite, >= 0",
            )
    return np.array([band_factors.get(name, 1.0) for name in band])


def _check(key: str, value: float, limits: tuple[float, float], unit: str) -> None:
    low, high = limits
    if not (isfinite(value) and low <= value <= high):
        raise EnvironmentDataError(
            "is out of range", key=(key,), value=value, allowed=f"{low:g} to {high:g} {unit}"
        )
