"""Pictures of one case's fields: deflected shape and von Mises stress; and the mesh."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np

from geometry.part import Part
from mesher.named_mesh import NamedMesh
from studies.check.result import PeakPlace
from studies.report import frame
from studies.report.raster import Canvas, Floats
from studies.report.scene import Surface, draw, draw_edges, view_of


def mesh_picture(path: Path, part: Part, mesh: NamedMesh) -> None:
    """The mesh on the undeflected part."""
    surface, nodes, camera = Surface.of(mesh), mesh.nodes.T, view_of(part)
    canvas = Canvas.around(camera.project(nodes), frame.PIXELS)
    draw(mesh, surface, nodes, camera, canvas)
    draw_edges(surface.lines, nodes, camera, canvas, (0.1, 0.15, 0.25, 0.45))
    draw_edges(surface.outline, nodes, camera, canvas, thick=2)
    with frame.page(11, frame.page_height(canvas, 10.4, 1.2)) as figure:
        axes = figure.add_subplot()
        frame.show(axes, canvas)
        frame.triad(axes, camera)
        frame.scale_line(axes, canvas)
        figure.suptitle(f"{part.title}: mesh, {mesh.tets.shape[1]} tetrahedra of second order, "
                        f"{mesh.nodes.shape[1]} nodes, least quality {mesh.quality.min():.2f}", fontsize=12)
        frame.save(figure, path)


def deflected_picture(path: Path, part: Part, mesh: NamedMesh, case: str, displacement: Floats) -> None:
    """The deflected shape, magnified by the number in its title; the undeflected outline beside it.

    `displacement` is (3, n), mm.
    """
    size = np.linalg.norm(displacement, axis=0)
    largest = float(size.max())
    nodes = mesh.nodes.T
    extent = float(np.ptp(nodes, axis=0).max())
    scale = frame.round_number(0.08 * extent / largest) if largest > 0 else 1.0
    moved = nodes + scale * displacement.T
    surface, camera = Surface.of(mesh), view_of(part)
    canvas = Canvas.around(np.vstack([camera.project(nodes), camera.project(moved)]), frame.PIXELS)
    draw(mesh, surface, moved, camera, canvas, frame.colours_of(size, 0.0, largest, "viridis"))
    draw_edges(surface.outline, moved, camera, canvas)
    draw_edges(surface.outline, nodes, camera, canvas, (0.45, 0.45, 0.45, 0.8), hidden=True)
    with frame.page(11, frame.page_height(canvas, 10.4, 2.3)) as figure:
        axes = figure.add_subplot()
        frame.show(axes, canvas)
        frame.triad(axes, camera)
        frame.scale_line(axes, canvas)
        figure.suptitle(f"{part.title}, case {case}: deflected shape, largest displacement {largest:.4g} mm\n"
                        f"displacements drawn {scale:g} times their size; grey lines: undeflected", fontsize=12)
        frame.colour_bar(figure, axes, 0.0, largest, "size of the displacement (mm)", "viridis")
        frame.save(figure, path)


def stress_picture(path: Path, part: Part, mesh: NamedMesh, case: str, von_mises: Floats,
                   peaks: Sequence[PeakPlace] = ()) -> None:
    """Von Mises stress at the surface from two sides, the peak places numbered. `von_mises` is (n,), MPa."""
    surface, nodes = Surface.of(mesh), mesh.nodes.T
    high = float(von_mises[np.unique(mesh.boundary)].max())
    colours = frame.colours_of(np.clip(von_mises, 0.0, high), 0.0, high or 1.0, "viridis")
    views = [view_of(part), view_of(part, below=True)]
    canvases = [Canvas.around(camera.project(nodes), frame.PIXELS) for camera in views]
    height = sum(frame.page_height(canvas, 9.0, 0.3) for canvas in canvases)
    with frame.page(11, float(np.clip(height + 1.4, 6, 13))) as figure:
        panels = figure.subplots(len(views), 1)
        for axes, camera, canvas, side in zip(panels, views, canvases,
                                              ["from above, in front", "from below, behind"], strict=True):
            draw(mesh, surface, nodes, camera, canvas, colours)
            draw_edges(surface.outline, nodes, camera, canvas, (0.1, 0.1, 0.12, 0.7))
            frame.show(axes, canvas)
            frame.triad(axes, camera, right=camera is views[1])
            if camera is views[0]:
                frame.scale_line(axes, canvas)
            axes.set_title(side, fontsize=10, loc="left", color=frame.NEUTRAL, pad=16)
            for spot, text in _labels(canvas, camera.project(np.array([peak.point for peak in peaks]).reshape(-1, 3))):
                _mark(axes, spot, text)
        figure.suptitle(f"{part.title}, case {case}: von Mises stress at the surface, largest {high:.4g} MPa"
                        + ("\nnumbers: peak places of the summary" if peaks else ""), fontsize=12)
        frame.colour_bar(figure, list(panels), 0.0, high or 1.0, "von Mises stress (MPa)", "viridis")
        frame.save(figure, path)


def _seen(canvas: Canvas, spot: Floats) -> bool:
    """Whether a point (picture coordinates) is on the side that faces the viewer."""
    column, row, depth = canvas.to_pixels(spot[None])[0]
    r, c = round(float(row)), round(float(column))
    near = canvas.depth[max(r - 3, 0):r + 4, max(c - 3, 0):c + 4]
    near = near[np.isfinite(near)]
    return bool(near.size > 0 and depth <= near.max() + 4 * canvas.pixel)


def _labels(canvas: Canvas, spots: Floats) -> list[tuple[Floats, str]]:
    """Numbers of the points (n, 3) that are seen, one label for those too close to be told apart."""
    left, right, _, _ = canvas.extent
    groups: list[tuple[Floats, list[int]]] = []
    for number, spot in enumerate(spots, start=1):
        if not _seen(canvas, spot):
            continue
        close = next((group for group in groups if np.hypot(*(group[0] - spot)[:2]) < 0.03 * (right - left)), None)
        if close is None:
            groups.append((spot, [number]))
        else:
            close[1].append(number)
    return [(spot, " ".join(map(str, numbers))) for spot, numbers in groups]


def _mark(axes: Any, spot: Floats, text: str) -> None:
    """Label a point beside it."""
    from matplotlib.patheffects import withStroke

    axes.annotate(
        text, spot[:2], (16, 16), textcoords="offset points", fontsize=10, ha="center", va="center", zorder=6,
        bbox={"boxstyle": "round,pad=0.3,rounding_size=0.7", "fc": "white", "ec": "#222222", "lw": 0.9},
        arrowprops={"arrowstyle": "-", "color": "#222222", "lw": 0.9, "shrinkB": 0,
                    "path_effects": [withStroke(linewidth=2.5, foreground="white")]})
