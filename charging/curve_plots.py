"""Pictures of the small questions: current against potential, photoyield, solar spectrum."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Unpack

import numpy as np

from charging.arguments import as_material
from charging.errors import InputError
from charging.photo_table import (
    PhotoRow,
    Sunlight,
    SunlightOptions,
    photoyield_table,
    retarding_curves,
)
from charging.point import PointResult
from charging.written_file import written_file
from environments.spectrum import BANDS
from materials.photoyield import yield_per_photon

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from environments.spectrum import SolarSpectrum
    from materials.record import Material

ENDINGS = (".png", ".svg", ".pdf")

# Colours after Okabe & Ito (2008), distinct for all common kinds of colour vision.
COLOURS = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9")
STYLES = ("-", "--", "-.", ":")
INK, GRID = "#222222", "#d9d9d9"

MECHANISM_WORDS = {
    "electron_collection": "electrons collected",
    "ion_collection": "ions collected",
    "secondary_electron": "secondary electrons",
    "ion_induced_secondary": "ion-induced secondaries",
    "backscatter": "backscattered electrons",
    "photoemission": "photoelectrons",
}
"""Mechanisms as tables and pictures call them."""


def refuse_unknown_ending(target: Path, *, option: str = "--plot") -> None:
    """Refuse a picture whose name does not say a known format.

    Raises
    ------
    InputError
        Ending other than those of `ENDINGS`.
    """
    if target.suffix.lower() not in ENDINGS:
        raise InputError(
            f"{option} {target}: is no picture name",
            value=target,
            allowed=f"a file ending in {', '.join(ENDINGS)}",
        )


def plot_point(result: PointResult, target: Path) -> None:
    """Draw current density against potential, with roots and mechanisms.

    Parameters
    ----------
    result : PointResult
    target : Path
        Picture to write; png, svg or pdf by its ending.

    Raises
    ------
    InputError
        Unknown ending, or the place cannot be written.
    """
    figure, (axes,) = _figure(1, (8.0, 5.8))
    potential = result.curve.potential_V
    parts = {name: 1e6 * j for name, j in result.curve.current_density_A_m2.items()}
    net = np.sum(list(parts.values()), axis=0)
    drawn = [name for name, j in parts.items() if np.any(j != 0.0)]
    for i, name in enumerate(drawn):
        axes.plot(
            potential,
            parts[name],
            color=COLOURS[i % len(COLOURS)],
            linestyle=STYLES[1 + i % 3],
            linewidth=1.2,
            label=MECHANISM_WORDS[name],
        )
    axes.plot(potential, net, color=INK, linewidth=2.0, label="net current")
    axes.axhline(0.0, color=INK, linewidth=0.6)
    for root in result.roots:
        reached = root.potential_V == result.reached_V
        axes.plot(
            [root.potential_V],
            [0.0],
            marker="o",
            markersize=9 if reached else 7,
            color=INK,
            markerfacecolor=INK if root.stable else "white",
            linestyle="none",
            label=f"{root.potential_V:+.4g} V, {'stable' if root.stable else 'unstable'}"
            + (", reached from 0 V" if reached else ""),
        )
    axes.set_xscale("asinh", linear_width=1.0)
    largest = max(float(np.abs(net).max()), 1e-12)
    axes.set_yscale("asinh", linear_width=1e-3 * largest)
    axes.set_xticks(_decades(float(potential[0]), float(potential[-1]), 1.0))
    every = np.concatenate(list(parts.values()))
    axes.set_yticks(_decades(float(every.min()), float(every.max()), 1e-3 * largest))
    axes.xaxis.set_major_formatter(lambda value, _: f"{value:g}")
    axes.yaxis.set_major_formatter(lambda value, _: f"{value:.2g}")
    axes.set_xlim(float(potential[0]), float(potential[-1]))
    axes.set_xlabel("potential against the plasma [V], asinh scale")
    axes.set_ylabel("current density [µA m$^{-2}$], asinh scale")
    light = "dark" if result.light == 0.0 else f"sunlit, cosine {result.light:g}"
    axes.set_title(f"{result.material} in {result.plasma}, {light}", loc="left", fontsize=11)
    figure.legend(fontsize=8, loc="outside lower center", ncols=3, frameon=False)
    _save(figure, target)


def plot_photoyield(
    materials: Sequence[Material | str],
    target: Path,
    **sunlight: Unpack[SunlightOptions],
) -> None:
    """Draw yield curves, shares of the bands and retarding curves of materials.

    Parameters
    ----------
    materials, **sunlight
        As in `charging.photo_table.photoyield_table`.
    target : Path
        Picture to write; png, svg or pdf by its ending.

    Raises
    ------
    InputError
        As `photoyield_table` and `plot_point`.
    """
    light = Sunlight(**sunlight)
    found = [as_material(given) for given in materials]
    records = [record for record in found if record.photoyield is not None]
    if not records:
        raise InputError(
            "none of these materials emits photoelectrons: nothing to draw",
            key=("material",),
            value=", ".join(record.name for record in found),
        )
    figure, (left, middle, right) = _figure(3, (14.5, 4.8))
    names = [record.name for record in records]
    typed = [m for m, r in zip(materials, found, strict=True) if r.photoyield is not None]
    potential = np.linspace(0.0, 30.0, 601)
    curves = retarding_curves(records, potential, **sunlight)
    rows = photoyield_table(records, **sunlight)
    highest = float(light.spectrum().photon_energy_eV.max())
    top = 0.0
    for i, record in enumerate(map(light.material, records)):
        colour = COLOURS[i % len(COLOURS)]
        style = STYLES[i // len(COLOURS) % len(STYLES)]
        yields, curve = record.photoyield, curves[i]
        assert yields is not None
        assert curve is not None
        label = names[i]
        if names.count(label) > 1 and isinstance(typed[i], str) and typed[i] != label:
            label = f"{label} ({typed[i]})"
        x = np.geomspace(1.001 * yields.threshold_eV, max(highest, 10.0 * yields.threshold_eV), 600)
        left.plot(x, yield_per_photon(x, yields), color=colour, linestyle=style, label=label)
        if np.any(curve > 0.0):
            right.plot(potential, 1e6 * curve, color=colour, linestyle=style, label=label)
        top = max(top, float(curve.max()))
    left.set_xscale("log")
    left.set_yscale("log")
    left.set_ylim(bottom=1e-7)
    left.set_xlabel("photon energy [eV], to the end of the spectrum")
    left.set_ylabel("electrons per photon")
    left.set_title("yield", loc="left", fontsize=11)
    left.set_xticks([5.0, 10.0, 30.0, 100.0, 1e3, 1e4], ["5", "10", "30", "100", "1000", "10⁴"])
    left.minorticks_off()
    if top > 0.0:
        right.set_yscale("log")
        right.set_ylim(1e6 * top * 1e-4, 2e6 * top)
        right.legend(fontsize=8)
    else:
        right.text(0.5, 0.5, "no current in this light", ha="center", transform=right.transAxes)
        left.legend(fontsize=8)
    right.set_xlabel("potential of the surface [V]")
    right.set_ylabel("escaping current density [µA m$^{-2}$]")
    right.set_title(
        f"{light.photo_escape} escape, {light.distance_au:g} AU, F10.7 {light.f107:g}, "
        f"cosine {light.incidence_cosine:g}",
        loc="left",
        fontsize=11,
    )
    _draw_bands(middle, [row for row in rows if row.bands])
    _save(figure, target)


def _draw_bands(axes: Axes, rows: Sequence[PhotoRow]) -> None:
    """Bars: what each band of the spectrum gives, one bar per material."""
    names = list(BANDS)
    height = 0.8 / max(len(rows), 1)
    for i, row in enumerate(rows):
        place = np.arange(len(names)) + (i - 0.5 * (len(rows) - 1)) * height
        axes.barh(
            place,
            [1e6 * share.current_A_m2 for share in row.bands],
            height=0.9 * height,
            color=COLOURS[i % len(COLOURS)],
            hatch=("", "//", "..", "xx")[i // len(COLOURS) % 4],
        )
    axes.set_yticks(np.arange(len(names)), names, fontsize=8)
    axes.invert_yaxis()
    axes.set_xlabel("part of the current [µA m$^{-2}$]")
    axes.set_title("bands of sunlight", loc="left", fontsize=11)


def plot_spectrum(spectrum: SolarSpectrum, target: Path) -> None:
    """Draw the photon flux per bin of a solar spectrum against wavelength.

    Parameters
    ----------
    spectrum : SolarSpectrum
    target : Path
        Picture to write; png, svg or pdf by its ending.

    Raises
    ------
    InputError
        Unknown ending, or the place cannot be written.
    """
    figure, (axes,) = _figure(1, (8.5, 4.8))
    low, high = spectrum.wavelength_low_nm, spectrum.wavelength_high_nm
    line = high == low
    wide = ~line
    axes.hlines(
        spectrum.photon_flux_m2_s[wide] / (high - low)[wide],
        low[wide],
        high[wide],
        color=COLOURS[0],
        linewidth=1.6,
        label="bins, per nm",
    )
    axes.plot(
        low[line],
        spectrum.photon_flux_m2_s[line],
        color=COLOURS[1],
        marker="D",
        markersize=4,
        linestyle="none",
        label="lines, whole flux",
    )
    axes.set_xscale("log")
    axes.set_yscale("log")
    axes.set_xlabel("wavelength [nm]")
    axes.set_ylabel("photon flux [m$^{-2}$ s$^{-1}$ nm$^{-1}$; lines m$^{-2}$ s$^{-1}$]")
    axes.set_title(
        f"sunlight at {spectrum.distance_au:g} AU, F10.7 {spectrum.f107:g}", loc="left", fontsize=11
    )
    axes.legend(fontsize=8, loc="upper left")
    _save(figure, target)


def _figure(panels: int, size: tuple[float, float]) -> tuple[Figure, list[Axes]]:
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(figsize=size, layout="constrained")
    FigureCanvasAgg(figure)
    axes = [figure.add_subplot(1, panels, i + 1) for i in range(panels)]
    for one in axes:
        one.grid(True, color=GRID, linewidth=0.6)
        one.set_axisbelow(True)
        one.spines[["top", "right"]].set_visible(False)
    return figure, axes


def _save(figure: Figure, target: Path) -> None:
    refuse_unknown_ending(target)
    with written_file(target, option="--plot") as scratch:
        figure.savefig(scratch, format=target.suffix.lower().removeprefix("."), dpi=150)


def _decades(low: float, high: float, linear: float) -> list[float]:
    """Ticks of an asinh axis: 0 and powers of ten beyond the linear part, at most seven a side."""
    ticks = [0.0]
    for end, sign in ((low, -1.0), (high, 1.0)):
        if sign * end > linear:
            powers = np.arange(np.ceil(np.log10(linear)), np.floor(np.log10(sign * end)) + 1.0)
            ticks += [float(sign * 10.0**p) for p in powers]
    return sorted(ticks)
