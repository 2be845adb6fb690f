"""Pictures of natural vibrations and buckling shapes: one small picture a mode, of the solid."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from geometry.part import Part
from mesher.named_mesh import NamedMesh
from studies.check.studied import ModePair
from studies.report import frame
from studies.report.raster import Camera, Canvas, Floats
from studies.report.scene import Surface, draw, draw_edges, view_of
from studies.report.tables import readable

MOST = 12
"""Modes in one picture."""
SWING = 0.10
"""Largest drawn motion over the part's extent."""


@dataclass(frozen=True, slots=True)
class _Drawn:
    """A mode ready to be drawn: where its nodes go (n, 3), how far each (n,), and what is said of it."""

    moved: Floats
    size: Floats
    text: str


def mode_picture(path: Path, part: Part, mesh: NamedMesh, title: str, modes: Sequence[ModePair],
                 shapes: Floats) -> None:
    """Draw the shapes (modes, 3, n) of the solid with the value of both models over each."""
    nodes, camera, surface = mesh.nodes.T, view_of(part), Surface.of(mesh)
    drawn = [_drawn(mode, shape, mesh, _reach(part, nodes, mode))
             for mode, shape in zip(modes[:MOST], shapes[:MOST], strict=True)]
    flat = np.vstack([camera.project(nodes), *(camera.project(one.moved) for one in drawn)])
    wide, high = float(np.ptp(flat[:, 0])), float(np.ptp(flat[:, 1]))
    cells = len(drawn) + (wide < 0.7 * high)  # beside an upright part there is room for the axes only in a panel
    columns, panel = _layout(cells, wide / high)
    rows = math.ceil(cells / columns)
    tall = panel * high / wide
    with frame.page(columns * panel + 0.6, float(np.clip(rows * (0.85 * tall + 0.9) + 1.7, 4.0, 18.0))) as figure:
        panels = figure.subplots(rows, columns, squeeze=False)
        for axes in panels.flat[len(drawn):]:
            axes.set_axis_off()
        for axes, one in zip(panels.flat, drawn, strict=False):
            canvas = Canvas.around(flat, round(frame.DPI * max(panel, tall)))
            colours = frame.colours_of(one.size, 0.0, 1.0, "viridis")
            draw(mesh, surface, one.moved, camera, canvas, colours)
            draw_edges(surface.outline, one.moved, camera, canvas)
            draw_edges(surface.outline, nodes, camera, canvas, (0.45, 0.45, 0.45, 0.8), hidden=True)
            frame.show(axes, canvas)
            axes.set_title(one.text, fontsize=10, loc="left")
        if rows * columns > len(drawn):
            _axes_cross(panels.flat[len(drawn)], camera)
        else:
            frame.triad(panels.flat[0], camera, size=2.0)
        more = f", the first {MOST} of {len(modes)}" if len(modes) > MOST else ""
        figure.suptitle(f"{part.title}: {title}{more}", fontsize=12)
        frame.colour_bar(figure, list(panels.flat), 0.0, 1.0, "", "viridis")
        figure.supxlabel("size of the motion over its largest (true size: open); grey lines: at rest; bending about "
                         "the member's own y or z", fontsize=10)
        frame.save(figure, path)


def _layout(cells: int, shape: float) -> tuple[int, float]:
    """Columns and the width of a panel (inches) for a picture `shape` times as wide as high."""
    columns = min(cells, 2 if shape > 1.6 else 3 if shape > 0.7 else 7)
    return columns, min(12.0 / columns, max(1.8, 7.0 * shape))


def _axes_cross(axes: Any, camera: Camera) -> None:
    """The global axes and what the pictures show, in a panel of their own."""
    axes.set_xlim(-2.5, 2.5)
    axes.set_ylim(-2.5, 2.5)
    axes.set_aspect("equal")
    ends = camera.project(np.eye(3))
    for (x, y, _), name in zip(ends.tolist(), "xyz", strict=True):
        axes.annotate("", (x, y), (0, 0), arrowprops={"arrowstyle": "-|>", "color": frame.NEUTRAL, "lw": 1.5,
                                                      "shrinkA": 0, "shrinkB": 0})
        axes.text(1.3 * x, 1.3 * y, name, ha="center", va="center", fontsize=11, color=frame.NEUTRAL)


def _reach(part: Part, nodes: Floats, mode: ModePair) -> float:
    """Largest drawn motion, mm: a twist is drawn small, for straight paths of the points would swell the section."""
    extent = float(np.ptp(nodes, axis=0).max())
    if mode.solid_kind != "torsion":
        return SWING * extent
    along = np.subtract(part.members[0].end, part.members[0].start)
    along = along / np.linalg.norm(along)
    off = nodes - nodes.mean(axis=0)
    return 0.4 * float(np.linalg.norm(off - np.outer(off @ along, along), axis=1).max())


def _drawn(mode: ModePair, shape: Floats, mesh: NamedMesh, reach: float) -> _Drawn:
    size = np.linalg.norm(shape, axis=0)
    largest = float(size.max()) or 1.0
    return _Drawn(mesh.nodes.T + reach / largest * shape.T, size / largest, said(mode))


def said(mode: ModePair) -> str:
    """Three lines about a mode: number and value; its kind; the beam's value."""
    number = mode.key.component.removeprefix("mode ")
    factor = mode.key.quantity == "buckling_factor"
    value = f"factor {readable(mode.solid, '1')}" if factor else readable(mode.solid, "Hz")
    beam = "no beam value" if mode.beam is None else f"beam {readable(mode.beam, mode.unit)}, {mode.judgement}"
    return f"{number}: {value}\n{mode.solid_kind}\n{beam}"
