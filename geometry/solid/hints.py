"""Where the mesh must be fine, and re-entrant corners where stress has no converged value."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from geometry.named_solid import SharpEdge, SizeHint
from geometry.outline import Arc, Line
from geometry.part import Member
from geometry.solid.body import Piece, piece_at
from geometry.solid.chords import inside
from geometry.solid.cuts import Tool
from geometry.solid.eased import edge_name
from geometry.solid.edges import edge_marks
from geometry.solid.frame import Frame
from geometry.solid.lofts import radius_of
from geometry.solid.radii import Radius
from geometry.solid.regions import TOLERANCE
from geometry.solid.samples import FaceSamples
from geometry.solid.walls import walls_of

SHARP = math.radians(5.0)
"""Least angle (rad) between the normals at a re-entrant edge that counts as sharp (common practice, no source)."""

Names = Sequence[set[str]]


def least_wall(member: Member, pieces: Sequence[Piece]) -> float:
    """Thinnest wall of the sections, mm: declared walls, or for solid shapes and free outlines the shortest
    run of material straight inwards from the middle of a side."""
    found = []
    for piece in pieces:
        for dims, profile in ((piece.stretch.first, piece.first), (piece.stretch.last, piece.last)):
            walls = walls_of(member.section.shape, dims)
            if walls:
                found += [w.thickness for w in walls]
                continue
            if "diameter" in dims:
                found.append(dims["diameter"])
                continue
            edges = [s.edge for loop in profile.loops for s in loop]
            found += [_depth_behind(e, edges) for e in edges if isinstance(e, Line)]
    return min((f for f in found if f > 0.0), default=0.0)


def _depth_behind(line: Line, edges: Sequence[Line | Arc]) -> float:
    """Material straight inwards (to the left of its direction) from the middle of a side; 0 when it has no length."""
    dy, dz = line.end[0] - line.start[0], line.end[1] - line.start[1]
    size = math.hypot(dy, dz)
    if size < 1e-9:
        return 0.0
    cos, sin = dy / size, dz / size
    mid = (0.5 * (line.start[0] + line.end[0]), 0.5 * (line.start[1] + line.end[1]))

    def turn(p: tuple[float, float]) -> tuple[float, float]:
        y, z = p[0] - mid[0], p[1] - mid[1]
        return (y * cos + z * sin, -y * sin + z * cos)

    turned: list[Line | Arc] = [
        Line(turn(e.start), turn(e.end))
        if isinstance(e, Line)
        else Arc(turn(e.start), turn(e.end), turn(e.centre), e.ccw)
        for e in edges
    ]
    return next((b - a for a, b in inside(turned, 0, 0.0) if abs(a) < 1e-6 * size + 1e-9), 0.0)


def _wall_hints(
    member: Member, pieces: Sequence[Piece], samples: Sequence[FaceSamples], names: Names
) -> list[SizeHint]:
    shape = member.section.shape
    by_name: dict[str, tuple[float, list[int]]] = {}
    if shape == "tube":
        faces = [i for i, n in enumerate(names) if n & {"surface", "bore"}]
        return [SizeHint("wall", "tube wall", tuple(faces), 0.0, least_wall(member, pieces))]
    for first in walls_of(shape, pieces[0].stretch.first):
        by_name[first.name] = (math.inf, [])
    for name, (_, faces) in by_name.items():
        thick = [
            w.thickness
            for p in pieces
            for d in (p.stretch.first, p.stretch.last)
            for w in walls_of(shape, d)
            if w.name == name
        ]
        faces += [i for i, s in enumerate(samples) if "~side" in names[i] and _in_wall(s, shape, name, pieces)]
        by_name[name] = (min(thick), faces)
    return [SizeHint("wall", name, tuple(faces), 0.0, t) for name, (t, faces) in by_name.items()]


def _in_wall(s: FaceSamples, shape: str, name: str, pieces: Sequence[Piece]) -> bool:
    """Whether all samples lie on one of a wall's two faces, looking along or against its axis."""
    for point, normal in zip(s.points, s.normals, strict=True):
        piece = piece_at(pieces, float(point[0]))
        wall = next(w for w in walls_of(shape, piece.stretch.at(float(point[0]))) if w.name == name)
        k = 1 if wall.axis == "y" else 2
        place = point[k] - piece.origin(float(point[0]))[k - 1]
        if abs(normal[k]) < 0.7 or min(abs(place - f) for f in wall.faces) > TOLERANCE:
            return False
    return True


def _near(s: FaceSamples, made: Radius) -> bool:
    """Whether all samples lie within reach of the edge that a radius replaced."""
    limit = 1.1 * made.radius
    for point in s.points:
        gap = min(_to_line(point, line) for line in made.lines)
        if gap > limit:
            return False
    return True


def _to_line(point: NDArray[np.float64], line: NDArray[np.float64]) -> float:
    a, d = line[:-1], np.diff(line, axis=0)
    t = np.clip(np.einsum("ij,ij->i", point - a, d) / np.einsum("ij,ij->i", d, d), 0.0, 1.0)
    return float(np.min(np.linalg.norm(point - a - t[:, None] * d, axis=1)))


def size_hints(
    member: Member,
    pieces: Sequence[Piece],
    samples: Sequence[FaceSamples],
    names: Names,
    tool_faces: Sequence[tuple[Tool, Sequence[int]]],
    radii: Sequence[Radius],
) -> list[SizeHint]:
    """Every place that must be meshed finely, then one hint for each wall."""
    thin = least_wall(member, pieces)
    hints: list[SizeHint] = []
    for tool, faces in tool_faces:
        arcs = [radius_of(e) for e in tool.loop if isinstance(e, Arc)]
        round_faces = [i for i in faces if _curved(samples[i])]
        if arcs and round_faces:
            hints.append(
                SizeHint("hole", f"{tool.cut.kind} {tool.cut.name}", tuple(round_faces), min(arcs), tool.thickness)
            )
    root = [i for i, n in enumerate(names) if "~root fillet" in n]
    if root:
        radius = min(
            radius_of(s.edge)
            for p in pieces
            for q in (p.first, p.last)
            for loop in q.loops
            for s in loop
            if s.wall == "root fillet" and isinstance(s.edge, Arc)
        )
        hints.append(SizeHint("fillet", "root fillet", tuple(root), radius, thin))
    for name, radius in ((edge_name(e.edges), e.radius) for e in member.edge_radii if edge_name(e.edges)):
        along = tuple(i for i, n in enumerate(names) if f"~edge radius {name}" in n)
        hints.append(SizeHint("rim", f"edge radius {name}", along, radius, thin))
    taken = {i for _, faces in tool_faces for i in faces}
    spare = [i for i, n in enumerate(names) if not n and i not in taken]
    for made in radii:
        own = tuple(i for i in spare if _near(samples[i], made))
        if own:
            hints.append(SizeHint(made.kind, made.label, own, made.radius, thin))
    for piece in pieces:
        if piece.stretch.step and piece.stretch.shoulder <= 0.0:
            x = piece.stretch.start
            walls = tuple(i for i in spare if np.all(np.abs(samples[i].points[:, 0] - x) < TOLERANCE))
            if walls:
                hints.append(SizeHint("step", f"step at {x:g} mm", walls, 0.0, thin))
    return hints + _wall_hints(member, pieces, samples, names)


def _curved(s: FaceSamples) -> bool:
    return bool(np.ptp(s.normals, axis=0).max() > 1e-6)


def sharp_edges(
    solid: Any,
    frame: Frame,
    member: Member,
    pieces: Sequence[Piece],
    names: Names,
    tool_faces: Sequence[tuple[Tool, Sequence[int]]],
) -> list[SharpEdge]:
    """Re-entrant edges of the final solid (member axes), each with a label and points in global axes."""
    owner = {i: tool.cut for tool, faces in tool_faces for i in faces}
    steps = {p.stretch.start for p in pieces if p.stretch.step}
    found = []
    for mark in edge_marks(solid):
        if mark.angle > -SHARP:
            continue
        a, b = mark.faces
        x = mark.points[:, 0]
        if a in owner or b in owner:
            cut = owner[a] if a in owner else owner[b]
            label = f"sharp corner of {cut.kind} {member.name}.{cut.name}"
        elif np.ptp(x) < TOLERANCE:
            at = float(x.mean())
            label = f"sharp step at {at:g} mm" if any(abs(at - s) < TOLERANCE for s in steps) else f"kink at {at:g} mm"
        elif "~side" in names[a] and "~side" in names[b]:
            label = f"inner corner without radius along {member.name}"
        else:
            label = f"re-entrant edge of {member.name} near x = {float(x.mean()):g} mm"
        found.append(SharpEdge(label, frame.to_global(mark.points)))
    return found
