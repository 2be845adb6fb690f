"""Pictures of natural vibrations and buckling shapes: one small picture a mode, of the solid."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from geometry.part import Part
from mesher.named_mesh import NamedMesh
from studies.check.studied import ModePair
from studies.report import frame
from studies.report.raster import Canvas, Floats
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
    """Draw the shapes (modes, 3, n) of the solid with the value of both models under each."""
    nodes, camera, surface = mesh.nodes.T, view_of(part), Surface.of(mesh)
    extent = float(np.ptp(nodes, axis=0).max())
    drawn = [_drawn(mode, shape, nodes, extent) for mode, shape in zip(modes[:MOST], shapes[:MOST], strict=True)]
    flat = np.vstack([camera.project(nodes), *(camera.project(one.moved) for one in drawn)])
    wide, high = np.ptp(flat[:, 0]), np.ptp(flat[:, 1])
    columns = min(len(drawn), 2 if wide > 1.6 * high else 3 if wide > 0.5 * high else 5)
    rows = math.ceil(len(drawn) / columns)
    panel = 12.0 / columns
    height = float(np.clip(rows * (panel * high / wide + 0.75) + 1.5, 4.0, 16.0))
    with frame.page(12.6, height) as figure:
        panels = figure.subplots(rows, columns, squeeze=False)
        for axes in panels.flat[len(drawn):]:
            axes.set_axis_off()
        for axes, one in zip(panels.flat, drawn, strict=False):
            canvas = Canvas.around(flat, frame.PIXELS // columns + 200)
            colours = frame.colours_of(one.size, 0.0, float(one.size.max()) or 1.0, "viridis")
            draw(mesh, surface, one.moved, camera, canvas, colours)
            draw_edges(surface.outline, one.moved, camera, canvas)
            draw_edges(surface.outline, nodes, camera, canvas, (0.45, 0.45, 0.45, 0.8), hidden=True)
            frame.show(axes, canvas)
            axes.set_title(one.text, fontsize=10.5, loc="left")
        frame.triad(panels.flat[0], camera)
        more = f"\nthe first {MOST} of {len(modes)}" if len(modes) > MOST else ""
        figure.suptitle(f"{part.title}: {title}{more}", fontsize=12)
        frame.colour_bar(figure, list(panels.flat), 0.0, 1.0, "size of the motion over its largest; its true size is "
                         "open, grey lines: at rest", "viridis")
        frame.save(figure, path)


def _drawn(mode: ModePair, shape: Floats, nodes: Floats, extent: float) -> _Drawn:
    size = np.linalg.norm(shape, axis=0)
    largest = float(size.max()) or 1.0
    return _Drawn(nodes + SWING * extent / largest * shape.T, size / largest, said(mode))


def said(mode: ModePair) -> str:
    """Two lines about a mode: number, value and kind; the beam's value."""
    number = mode.key.component.removeprefix("mode ")
    factor = mode.key.quantity == "buckling_factor"
    value = f"factor {readable(mode.solid, '1')}" if factor else readable(mode.solid, "Hz")
    beam = "no beam value" if mode.beam is None else f"beam {readable(mode.beam, mode.unit)}, {mode.judgement}"
    return f"{number}: {value}, {mode.solid_kind}\n{beam}"
