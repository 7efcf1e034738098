"""Picture of the shapes of a case: lit and shaded, or coloured by potential."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.cm import ScalarMappable
from matplotlib.colors import Normalize
from matplotlib.figure import Figure
from mpl_toolkits.mplot3d.art3d import Poly3DCollection  # type: ignore[import-untyped]
from mpl_toolkits.mplot3d.axes3d import Axes3D  # type: ignore[import-untyped]
from numpy.typing import NDArray

from charging.case_tables import Case
from charging.plot_page import FONT, INK, QUIET, SMALL_PT, TEXT_PT, TITLE_PT, signed
from charging.shape.shadow import panel_light
from charging.shape.solution import middles
from charging.shape.views import Wings, craft_of
from charging.written_file import written_file

Array = NDArray[np.float64]

SIZE_IN = (10.0, 6.4)
COLOURS = "cividis"
"""Even in lightness and the same for readers who do not tell red from green."""
SHADE = 0.45
"""Panels in shade keep this much of their colour's light."""
EDGE = "#8d949b"
VIEWS = ((22.0, -58.0), (-18.0, 122.0))
"""Elevation and azimuth [deg] of the eye, from one side and from the other."""


def shape_picture(
    case: Case,
    target: Path,
    *,
    sun_body: Array,
    wings: Wings | None = None,
    potential_V: Mapping[str, float] | None = None,
    structure_V: float = 0.0,
    caption: str = "",
) -> Path:
    """Draw a spacecraft from two sides.

    Parameters
    ----------
    case : Case
        With shapes.
    target : Path
        .png, .svg or .pdf.
    sun_body : ndarray [3]
        Direction of the Sun in body axes; zeros: no light.
    wings : Wings, optional
        Where the wings stand; default: they track the Sun.
    potential_V : mapping of str to float, optional
        Potential of each surface, written beside its number; without it, light is shown.
    structure_V : float, optional
        Potential of faces without a surface.
    caption : str, optional
        Second line of the title.

    Raises
    ------
    InputError
        The file cannot be written.
    """
    craft = craft_of(case)
    sun = np.asarray(sun_body, dtype=np.float64)
    angle = float((wings or Wings()).angles(sun[:, None])[0])
    towards = sun if sun.any() else np.array([0.0, 0.0, 1.0])
    panels, cosine = panel_light(craft, towards, angle)
    if not sun.any():
        cosine = np.zeros_like(cosine)
    values = cosine
    norm, label = Normalize(0.0, 1.0), "sunlight, cosine of incidence"
    if potential_V is not None:
        by_patch = np.array([*(potential_V[name] for name in case.names), structure_V])
        values = by_patch[panels.patch]
        low, high = float(by_patch.min()), float(by_patch.max())
        norm = Normalize(low, high if high > low else low + 1.0)
        label = "potential [V]; shaded panels are darker"
    mapped = ScalarMappable(norm, COLOURS)
    colours = mapped.to_rgba(values)
    if potential_V is not None:
        colours[:, :3] *= np.where(cosine > 0.0, 1.0, SHADE)[:, None]
    figure = Figure(figsize=SIZE_IN)
    FigureCanvasAgg(figure)
    begin, way = middles(craft, angle)
    reach = float(np.ptp(panels.corners_m.reshape(-1, 3), axis=0).max())
    for side, (elevation, azimuth) in enumerate(VIEWS):
        # 3-D axes clip at a square: two large ones, one over the other
        high = 0.72 * SIZE_IN[0] / SIZE_IN[1]
        bottom = (0.705, 0.295)[side] - 0.5 * high
        axes = figure.add_axes((0.0, bottom, 0.72, high), projection="3d")
        assert isinstance(axes, Axes3D)
        _draw(axes, panels.corners_m, colours, elevation, azimuth)
        eye = _eye(elevation, azimuth)
        for k in range(len(case.surface)):
            if way[k] @ eye > 0.05:
                place = begin[k] + 0.02 * reach * way[k]
                axes.text(
                    *place, str(k + 1), size=SMALL_PT - 1.5, color="w", ha="center", va="center",
                    family=FONT, zorder=1e6,
                    bbox={"boxstyle": "circle,pad=0.12", "fc": INK, "ec": "w", "lw": 0.5},
                )  # fmt: skip
        if sun.any():
            _arrow(axes, sun, reach)
    legend = figure.add_axes((0.745, 0.1, 0.25, 0.78))
    _names(legend, case, potential_V, structure_V)
    bar = figure.add_axes((0.08, 0.075, 0.58, 0.02))
    colourbar = figure.colorbar(mapped, cax=bar, orientation="horizontal")
    colourbar.set_label(label, size=SMALL_PT, family=FONT, color=INK)
    colourbar.ax.tick_params(labelsize=SMALL_PT, color=QUIET)
    figure.text(0.02, 0.965, case.title, size=TITLE_PT, family=FONT, color=INK, va="center",
                parse_math=False)  # fmt: skip
    figure.text(0.02, 0.925, caption, size=TEXT_PT, family=FONT, color=QUIET, va="center",
                parse_math=False)  # fmt: skip
    with written_file(target, option="--plot") as scratch:
        figure.savefig(scratch, format=target.suffix.lower().removeprefix("."), dpi=150)
    return target


def _draw(axes: Axes3D, corners: Array, colours: Array, elevation: float, azimuth: float) -> None:
    axes.add_collection3d(
        Poly3DCollection(list(corners), facecolors=colours, edgecolors=EDGE, linewidths=0.25)
    )
    points = corners.reshape(-1, 3)
    low, high = points.min(axis=0), points.max(axis=0)
    for set_limits, a, b in zip((axes.set_xlim, axes.set_ylim, axes.set_zlim), low, high,
                                strict=True):  # fmt: skip
        set_limits(float(a), float(b))
    axes.set_box_aspect(tuple((high - low).tolist()), zoom=0.95)
    axes.view_init(elev=elevation, azim=azimuth)
    axes.set_axis_off()
    axes.patch.set_alpha(0.0)
    length = 0.12 * float((high - low).max())
    for k, name in enumerate("xyz"):  # body axes at the lower corner
        tip = low.copy()
        tip[k] += length
        axes.plot(*np.stack([low, tip], axis=1), color=QUIET, linewidth=0.9)
        axes.text(*tip, f"+{name}", size=SMALL_PT, color=QUIET, family=FONT)


def _eye(elevation: float, azimuth: float) -> Array:
    e, a = np.radians(elevation), np.radians(azimuth)
    return np.array([np.cos(e) * np.cos(a), np.cos(e) * np.sin(a), np.sin(e)])


def _arrow(axes: Axes3D, sun: Array, reach: float) -> None:
    far = 0.32 * reach * sun
    axes.plot(*np.stack([0.2 * reach * sun, far], axis=1), color="#c8932b", linewidth=1.8)
    axes.text(*(1.08 * far), "Sun", size=SMALL_PT, color="#8a6414", family=FONT, zorder=1e6)


def _names(
    axes: Axes, case: Case, potential_V: Mapping[str, float] | None, structure_V: float
) -> None:
    axes.set_axis_off()
    axes.set_xlim(0.0, 1.0)
    rows = [(str(k + 1), s.name, None if potential_V is None else potential_V[s.name])
            for k, s in enumerate(case.surface)]  # fmt: skip
    if potential_V is not None:
        rows.append(("", "structure", structure_V))
    height = min(0.06, 1.0 / max(len(rows), 1))
    for line, (number, name, value) in enumerate(rows):
        y = 1.0 - height * (line + 0.5)
        for x, text, align in (
            (0.07, number, "right"),
            (0.1, name, "left"),
            (1.0, "" if value is None else f"{signed(value)} V", "right"),
        ):
            axes.text(x, y, text, size=SMALL_PT, color=INK, ha=align, va="center", family=FONT,
                      parse_math=False)  # fmt: skip
