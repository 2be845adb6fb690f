"""The page around a picture: fonts, title, colour bar, axis triad, scale line."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import numpy as np

from studies.report.raster import Camera, Canvas, Floats

SUPPORT = "#0072B2"
LOAD = "#D55E00"
BEAM = "#000000"
SOLID = "#0072B2"
NEUTRAL = "#555555"
"""Blue and vermillion of the palette of M. Okabe and K. Ito (Color Universal Design): told apart with any vision."""

STYLE = {
    "font.family": "DejaVu Sans", "font.size": 11, "axes.titlesize": 12, "axes.labelsize": 11, "legend.fontsize": 10,
    "axes.spines.top": False, "axes.spines.right": False, "axes.grid": True, "grid.color": "#dddddd",
    "grid.linewidth": 0.7, "axes.axisbelow": True, "savefig.facecolor": "white", "figure.facecolor": "white",
    "svg.hashsalt": "haunch", "text.parse_math": False,
}

PIXELS = 1500
DPI = 150


@contextmanager
def page(width: float, height: float) -> Iterator[Any]:
    """A figure (inches) in the house style; closed at the end. No window system is touched."""
    from matplotlib import rc_context
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    with rc_context(STYLE):
        figure = Figure(figsize=(width, height), layout="constrained")
        FigureCanvasAgg(figure)
        yield figure


def save(figure: Any, path: Path) -> None:
    """Write a PNG; the same picture gives the same bytes."""
    figure.savefig(path, dpi=DPI, metadata={"Software": None}, pil_kwargs={"compress_level": 4})


def show(axes: Any, canvas: Canvas) -> None:
    """Put the canvas on the axes, in mm of the picture plane, without a frame."""
    axes.imshow(canvas.colour, origin="lower", extent=canvas.extent, interpolation="antialiased", zorder=2)
    axes.set_axis_off()
    axes.set_aspect("equal")


def page_height(canvas: Canvas, width: float, extra: float) -> float:
    """Height (inches) of a page for the canvas; between 3 and 10."""
    left, right, bottom, top = canvas.extent
    return float(np.clip(width * (top - bottom) / (right - left) + extra, 3.0, 10.0))


def triad(axes: Any, camera: Camera, right: bool = False, size: float = 1.0) -> None:
    """Global axes in the lower left (or right) corner of the axes; `size` makes them larger in a small picture."""
    (left, right_), (bottom, top) = axes.get_xlim(), axes.get_ylim()
    if right_ - left < 0.6 * (top - bottom):
        # An upright part leaves no room inside: the triad stands beside the picture, in inches.
        from mpl_toolkits.axes_grid1.inset_locator import inset_axes

        inset = inset_axes(axes, width=1.1, height=1.1, loc="lower left" if right else "lower right", borderpad=1.5,
                           bbox_to_anchor=(1.0 if right else 0.0, 0.0), bbox_transform=axes.transAxes)
        inset.set_zorder(5)
    else:
        wide, high = 0.11 * size, 0.24 * size
        inset = axes.inset_axes([1.0 - wide if right else 0.0, -0.04, wide, high], zorder=5)
    inset.set_axis_off()
    inset.set_aspect("equal")
    inset.set_xlim(-1.5, 1.5)
    inset.set_ylim(-1.5, 1.5)
    ends = camera.project(np.eye(3))
    for (x, y, _), name in sorted(zip(ends.tolist(), "xyz", strict=True), key=lambda item: -item[0][2]):
        inset.annotate("", (x, y), (0, 0), arrowprops={"arrowstyle": "-|>", "color": NEUTRAL, "lw": 1.5,
                                                       "shrinkA": 0, "shrinkB": 0})
        inset.text(1.3 * x, 1.3 * y, name, ha="center", va="center", fontsize=11, color=NEUTRAL)


def scale_line(axes: Any, canvas: Canvas) -> None:
    """A line of a round length under the picture, true for lines square to the view."""
    left, right, bottom, top = canvas.extent
    length = round_number(0.2 * (right - left))
    y = bottom - 0.03 * (top - bottom)
    axes.plot([right - length, right], [y, y], color=NEUTRAL, lw=2.5, solid_capstyle="butt", zorder=5)
    axes.annotate(f"{length:g} mm", (right - length / 2, y), (0, -4), textcoords="offset points", ha="center",
                  va="top", fontsize=10, color=NEUTRAL)


def round_number(value: float) -> float:
    """The largest of 1, 2, 5 x 10^n that is not above `value`."""
    power = 10.0 ** np.floor(np.log10(value))
    return float(max(m for m in (1, 2, 5) if m * power <= value * (1 + 1e-9)) * power)


def colour_bar(figure: Any, axes: Any, low: float, high: float, label: str, name: str) -> None:
    """A colour bar under the axes, with the quantity and its unit."""
    from matplotlib.cm import ScalarMappable
    from matplotlib.colors import Normalize

    bar = figure.colorbar(ScalarMappable(Normalize(low, high), name), ax=axes, location="bottom", shrink=0.6,
                          aspect=40, pad=0.06)
    bar.set_label(label)
    bar.outline.set_visible(False)


def colours_of(values: Floats, low: float, high: float, name: str) -> Floats:
    """(n, 3) RGB of values (n,) on the map `name`."""
    from matplotlib import colormaps

    span = high - low
    return np.asarray(colormaps[name]((values - low) / span if span > 0 else np.zeros_like(values)))[:, :3]
