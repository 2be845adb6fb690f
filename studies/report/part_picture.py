"""Picture of the part with its supports and loads."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np

from geometry.part import (
    BearingLoad,
    BodyLoad,
    LineLoad,
    Load,
    Part,
    Pressure,
    RegionLoad,
    RemotePoint,
    StripLoad,
    Support,
    TemperatureLoad,
)
from mesher.named_mesh import NamedMesh
from studies.report import frame
from studies.report.raster import Camera, Canvas, Floats
from studies.report.scene import GREY, Surface, draw, draw_edges, facets_in, view_of
from studies.report.tables import digits

Arrow = tuple[Floats, Floats, bool]
"""Foot (3,), direction (3,), and whether it is a moment."""


def part_picture(path: Path, part: Part, mesh: NamedMesh) -> None:
    """The part, its support regions blue, its loaded regions vermillion, an arrow for each force and moment."""
    surface, nodes, camera = Surface.of(mesh), mesh.nodes.T, view_of(part)
    extent = float(np.ptp(nodes, axis=0).max())
    loads = shown_loads(part)
    arrows = [(load, arrow) for load in loads for arrow in _arrows(load, part, mesh)]
    reach = 0.16 * extent
    ends = [foot + side * reach * _unit(way) for _, (foot, way, _) in arrows for side in (-1, 0)]
    canvas = Canvas.around(np.vstack([camera.project(nodes), *(camera.project(end[None]) for end in ends)]),
                           frame.PIXELS, margin=0.05)
    draw(mesh, surface, nodes, camera, canvas, by_facet=_facet_colours(part, mesh))
    draw_edges(surface.outline, nodes, camera, canvas, thick=2)
    with frame.page(11, frame.page_height(canvas, 10.4, 1.6)) as figure:
        axes = figure.add_subplot()
        frame.show(axes, canvas)
        frame.triad(axes, camera)
        frame.scale_line(axes, canvas)
        named: set[str] = set()
        for load, arrow in arrows:
            spread = isinstance(load, LineLoad | Pressure | StripLoad)  # several arrows for one load: named once
            _draw_arrow(axes, camera, load, arrow, reach, mesh, named=not (spread and load.name in named))
            named.add(load.name)
        for support in part.supports:
            _name_support(axes, camera, support, mesh)
        for load in loads:
            if isinstance(load, StripLoad):
                _draw_travel(axes, camera, load, part, mesh)
        _legend(figure, part)
        figure.suptitle(f"{part.title}: supports and loads (arrow length is not to scale)", fontsize=12)
        frame.save(figure, path)


def shown_loads(part: Part) -> list[Load]:
    """The loads to draw: of a travelling one the position a quarter of its way along, beside most still loads."""
    positions: dict[str, list[StripLoad]] = {}
    for load in part.loads:
        if isinstance(load, StripLoad):
            positions.setdefault(load.name.partition("@")[0], []).append(load)
    shown = [strips[len(strips) // 4] for strips in positions.values()]
    return [load for load in part.loads if not isinstance(load, StripLoad)] + shown


def describe_support(support: Support) -> str:
    """``wall: arm.start held x y z (surface)``."""
    held = " ".join(name if value == 0 else f"{name}={value:g}" for name, value in support.held.items())
    axes = "" if support.axes == "global" else ", member axes"
    return f"{support.name}: {support.on} held {held} ({support.coupling}{axes})"


def describe_load(load: Load) -> str:
    """One line with the unit of every number."""
    match load:
        case RegionLoad():
            return f"{load.name}: {_wrench(load.force, load.moment)} on {load.on} ({load.coupling})"
        case Pressure():
            return f"{load.name}: pressure {load.value:g} MPa on {load.on}"
        case BearingLoad():
            return f"{load.name}: bearing force {_vector(load.force, 'N')} in {load.on}"
        case LineLoad():
            same = load.first == load.last
            size = _vector(load.first, "N/mm") if same else f"{_vector(load.first, 'N/mm')} to " \
                f"{_vector(load.last, 'N/mm')}"
            return f"{load.name}: {size} on {load.on}, {load.start:g} to {load.end:g} mm"
        case StripLoad():
            axles = "" if len(load.centres) == 1 else f" on each of {len(load.centres)} axles"
            return f"{load.name.partition('@')[0]}: {_vector(load.force, 'N')}{axles}, travels along {load.on} " \
                f"(drawn at {load.centres[0]:.6g} mm)"
        case RemotePoint():
            mass = f", mass {1e3 * load.mass:g} kg" if load.mass else ""
            wrench = _wrench(load.force, load.moment)
            return f"{load.name}: remote point {_vector(load.point, 'mm')} on {load.on} ({load.coupling})" \
                f"{', ' + wrench if wrench else ''}{mass}"
        case BodyLoad():
            return f"{load.name}: {_vector(tuple(1e-3 * a for a in load.force_per_mass), 'N/kg')} on all mass"
        case TemperatureLoad():
            return f"{load.name}: temperature change {load.change:g} K"


def _vector(value: tuple[float, ...], unit: str) -> str:
    return f"({', '.join(digits(v) for v in value)}) {unit}"


def _wrench(force: tuple[float, ...], moment: tuple[float, ...]) -> str:
    parts = ([_vector(force, "N")] if any(force) else []) + \
        ([_vector(tuple(1e-3 * m for m in moment), "N m")] if any(moment) else [])
    return " and ".join(parts)


def _unit(vector: Floats) -> Floats:
    return vector / max(float(np.linalg.norm(vector)), 1e-30)


def _region_facets(mesh: NamedMesh, region: str) -> tuple[Floats, Floats]:
    """(k, 3) centres and (k, 3) area vectors of the region's facets (corner triangles)."""
    facets = mesh.facets.get(region)
    if facets is None or facets.shape[1] == 0:
        return np.zeros((0, 3)), np.zeros((0, 3))
    a, b, c = (mesh.nodes[:, facets[k]].T for k in range(3))
    return (a + b + c) / 3, np.cross(b - a, c - a) / 2


def _middle(mesh: NamedMesh, region: str) -> Floats:
    centres, areas = _region_facets(mesh, region)
    weight = np.linalg.norm(areas, axis=1)
    if len(centres) == 0:
        return mesh.nodes.mean(axis=1)
    return np.asarray((centres * weight[:, None]).sum(axis=0) / weight.sum())


def _arrows(load: Load, part: Part, mesh: NamedMesh) -> list[Arrow]:
    """The arrows that stand for a load; the head is at the foot point given, the shaft comes from outside."""
    match load:
        case RegionLoad():
            return _pair(_middle(mesh, load.on), load.force, load.moment)
        case BearingLoad():
            return _pair(_middle(mesh, load.on), load.force, (0.0, 0.0, 0.0))
        case RemotePoint():
            weight = np.zeros(3)
            if load.mass:
                weight = sum((np.array(b.force_per_mass) for b in part.loads if isinstance(b, BodyLoad)), weight)
            return _pair(np.array(load.point), tuple(np.array(load.force) + load.mass * weight), load.moment)
        case Pressure():
            return _pressure_arrows(load, mesh)
        case LineLoad():
            return _line_arrows(load, part, mesh)
        case StripLoad():
            return [(foot, np.array(load.force), False) for foot in _on_face(load.on, load.centres, part, mesh)]
        case BodyLoad():
            return [(mesh.nodes.mean(axis=1), np.array(load.force_per_mass), False)]
    return []


def _pair(foot: Floats, force: tuple[float, ...], moment: tuple[float, ...]) -> list[Arrow]:
    return [(foot, np.array(way), turns) for way, turns in ((force, False), (moment, True)) if any(way)]


def _pressure_arrows(load: Pressure, mesh: NamedMesh) -> list[Arrow]:
    centres, areas = _region_facets(mesh, load.on)
    chosen = np.unique(np.linspace(0, len(centres) - 1, min(len(centres), 5)).astype(int))
    return [(centres[i], -np.sign(load.value) * _unit(areas[i]), False) for i in chosen]


def _line_arrows(load: LineLoad, part: Part, mesh: NamedMesh) -> list[Arrow]:
    member = next(m for m in part.members if load.on.startswith(f"{m.name}."))
    along = _unit(np.subtract(member.end, member.start))
    foot = _middle(mesh, f"{member.name}.load:{load.name}")
    here = float((foot - member.start) @ along)
    arrows: list[Arrow] = []
    for share in np.linspace(0.0, 1.0, 6):
        force = (1 - share) * np.array(load.first) + share * np.array(load.last)
        at = load.start + share * (load.end - load.start)
        if force.any():
            arrows.append((foot + (at - here) * along, force, False))
    return arrows


def _on_face(face: str, at: Sequence[float], part: Part, mesh: NamedMesh) -> list[Floats]:
    """Points (3,) on a face along the member at distances from its start, mm, beside the middle of the facets there."""
    member = next(m for m in part.members if face.startswith(f"{m.name}."))
    along = _unit(np.subtract(member.end, member.start))
    centres, areas = _region_facets(mesh, face)
    if len(centres) == 0:
        return []
    where = (centres - member.start) @ along
    points = []
    for x in at:
        near = np.argsort(np.abs(where - x))[:12]
        weight = np.linalg.norm(areas[near], axis=1)
        middle = (centres[near] * weight[:, None]).sum(axis=0) / weight.sum()
        points.append(middle + (x - float((middle - member.start) @ along)) * along)
    return points


def _draw_travel(axes: Any, camera: Camera, load: StripLoad, part: Part, mesh: NamedMesh) -> None:
    """A dashed line with two heads from the first axle's first position to the last axle's last."""
    name = load.name.partition("@")[0]
    strips = [s for s in part.loads if isinstance(s, StripLoad) and s.name.partition("@")[0] == name]
    ends = _on_face(load.on, (strips[0].centres[0], strips[-1].centres[-1]), part, mesh)
    if len(ends) == 2:
        first, last = camera.project(np.array(ends))[:, :2]
        axes.annotate("", last, first, zorder=6, arrowprops={"arrowstyle": "<|-|>", "ls": "--", "color": frame.LOAD,
                                                            "lw": 1.6, "shrinkA": 0, "shrinkB": 0})


def _facet_colours(part: Part, mesh: NamedMesh) -> Floats:
    from matplotlib.colors import to_rgb

    colours = np.tile(GREY, (mesh.boundary.shape[1], 1))
    for load in part.loads:
        if isinstance(load, RegionLoad | Pressure | BearingLoad | RemotePoint):
            colours[facets_in(mesh, load.on)] = 0.45 * GREY + 0.55 * np.array(to_rgb(frame.LOAD))
        elif isinstance(load, LineLoad):
            region = f"{load.on.partition('.')[0]}.load:{load.name}"
            colours[facets_in(mesh, region)] = 0.45 * GREY + 0.55 * np.array(to_rgb(frame.LOAD))
    for support in part.supports:
        colours[facets_in(mesh, support.on)] = 0.3 * GREY + 0.7 * np.array(to_rgb(frame.SUPPORT))
    return colours


def _draw_arrow(axes: Any, camera: Camera, load: Load, arrow: Arrow, reach: float, mesh: NamedMesh,
                named: bool) -> None:
    foot, way, turns = arrow
    share = 0.45 if isinstance(load, LineLoad | Pressure) else 0.7 if isinstance(load, StripLoad) else 1.0
    tail = foot - share * reach * _unit(way)
    head, start = camera.project(foot[None])[0, :2], camera.project(tail[None])[0, :2]
    colour = frame.NEUTRAL if isinstance(load, BodyLoad) else frame.LOAD
    style = {"color": colour, "lw": 2.0 if share > 0.5 else 1.3, "shrinkA": 0, "shrinkB": 0, "mutation_scale": 16}
    if np.linalg.norm(head - start) < 0.15 * reach:  # it runs along the line of sight
        axes.plot(*head, marker="o", mfc="white", mec=colour, mew=2, ms=9, zorder=6)
    else:
        axes.annotate("", head, start, arrowprops={"arrowstyle": "-|>", **style}, zorder=6)
        if turns:  # the usual second head of a moment
            second = head + 0.14 * (start - head)
            axes.annotate("", second, start, arrowprops={"arrowstyle": "-|>", **style}, zorder=6)
    if isinstance(load, RemotePoint):
        spot = camera.project(np.array([load.point, _middle(mesh, load.on)]))
        axes.plot(spot[:, 0], spot[:, 1], ls="--", lw=1.2, color=frame.NEUTRAL, zorder=5)
        axes.plot(*spot[0, :2], marker="D", color=frame.LOAD, ms=6, zorder=7)
    if not named:
        return
    back = (start - head) / max(float(np.linalg.norm(start - head)), 1e-30)
    axes.annotate(load.name.partition("@")[0], start, 9 * back, textcoords="offset points", fontsize=10, color=colour,
                  zorder=7,
                  ha="right" if back[0] < -0.5 else "left" if back[0] > 0.5 else "center",
                  va="top" if back[1] < -0.5 else "bottom" if back[1] > 0.5 else "center",
                  bbox={"fc": "white", "ec": "none", "alpha": 0.75, "pad": 0.8})


def _name_support(axes: Any, camera: Camera, support: Support, mesh: NamedMesh) -> None:
    """The support's name outside the part, with a line to its region, which may look away from the viewer."""
    spot, middle = camera.project(np.array([_middle(mesh, support.on), mesh.nodes.mean(axis=1)]))[:, :2]
    left = spot[0] <= middle[0]
    axes.annotate(support.name, spot, (-42 if left else 42, -34), textcoords="offset points", fontsize=10, zorder=7,
                  color=frame.SUPPORT, ha="right" if left else "left", va="top",
                  bbox={"fc": "white", "ec": "none", "alpha": 0.75, "pad": 0.8},
                  arrowprops={"arrowstyle": "-", "color": frame.SUPPORT, "lw": 1.2, "shrinkB": 0})


def _legend(figure: Any, part: Part) -> None:
    from matplotlib.patches import Patch as Swatch

    handles = [Swatch(color=frame.SUPPORT, label=describe_support(support)) for support in part.supports]
    for load in shown_loads(part):
        handles.append(Swatch(color=frame.NEUTRAL if isinstance(load, BodyLoad | TemperatureLoad) else frame.LOAD,
                              label=describe_load(load)))
    figure.legend(handles=handles, loc="outside lower center", frameon=False, ncols=1, fontsize=9.5)
