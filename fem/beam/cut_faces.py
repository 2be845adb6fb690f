"""Inner faces of cuts as the beam sees them."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from fem.beam.along import Sections
from fem.beam.regions import CutFaces
from geometry.outline import Arc, Line, Outline
from geometry.part import Cut
from geometry.problem import RunError

Array = NDArray[np.float64]
_GAUSS = np.polynomial.legendre.leggauss(4)


def cut_faces(name: str, cuts: Sequence[Cut], nodes: Sequence[int], sections: Sections) -> CutFaces:
    """Sample the inner faces of cuts: along the rim of each, through each wall that it passes."""
    points, weight, owner = [], [], []
    for cut, node in zip(cuts, nodes, strict=True):
        p, w = _one(cut, sections)
        points.append(p)
        weight.append(w)
        owner.append(np.full(len(w), node))
    return CutFaces(name, np.concatenate(owner), np.vstack(points), np.concatenate(weight))


def _one(cut: Cut, sections: Sections) -> tuple[Array, Array]:
    rim, ds = _rim(cut, sections)
    points, weight = [], []
    for (x, v), length in zip(rim, ds, strict=True):
        walls = wall_intervals(sections.outline(float(np.clip(x, 0.0, sections.length))), cut, float(v))
        for a, b in walls:
            t = 0.5 * (a + b) + 0.5 * (b - a) * _GAUSS[0]
            across = np.full_like(t, v)
            yz = (t, across) if cut.axis == "y" else (across, t)
            points.append(np.column_stack([np.full_like(t, x), *yz]))
            weight.append(length * 0.5 * (b - a) * _GAUSS[1])
    if not points:
        raise RunError("beam", f"cut {cut.name} meets no material of its wall ({cut.through})")
    return np.vstack(points), np.concatenate(weight)


def _rim(cut: Cut, sections: Sections) -> tuple[Array, Array]:
    """Points (k, 2) (x, coordinate across) on the rim of the cut and their arc lengths (k,), mm."""
    c, s = np.cos(cut.turned), np.sin(cut.turned)
    if cut.kind == "hole":
        a = (np.arange(32) + 0.5) * 2 * np.pi / 32
        return (np.column_stack([cut.at + 0.5 * cut.length * np.cos(a), cut.offset + 0.5 * cut.length * np.sin(a)]),
                np.full(32, np.pi * cut.length / 32))
    if cut.kind == "slot":
        corners = _rounded(cut.length, cut.depth, 0.5 * cut.depth)
    elif cut.kind == "opening":
        corners = _rounded(cut.length, cut.depth, cut.corner_radius)
    else:
        return _notch_rim(cut, sections)
    mid, ds = corners
    return np.column_stack([cut.at + mid[:, 0] * c - mid[:, 1] * s, cut.offset + mid[:, 0] * s + mid[:, 1] * c]), ds


def _rounded(length: float, depth: float, radius: float, sides: int = 8, arcs: int = 6) -> tuple[Array, Array]:
    """Rim of a rounded rectangle about its middle: points (so many on each side and arc) and arc lengths."""
    points, ds = [], []
    r, (a, b) = radius, (0.5 * length - radius, 0.5 * depth - radius)
    corners = [(a, b), (-a, b), (-a, -b), (a, -b)]
    for k, (p, q) in enumerate(corners):
        first, nxt = 0.5 * np.pi * k, corners[(k + 1) % 4]
        if r > 0.0:
            angle = first + (np.arange(arcs) + 0.5) * np.pi / (2 * arcs)
            points.append(np.column_stack([p + r * np.cos(angle), q + r * np.sin(angle)]))
            ds.append(np.full(arcs, np.pi * r / (2 * arcs)))
        side = np.hypot(nxt[0] - p, nxt[1] - q)
        if side > 1e-12:
            n = np.array([np.cos(first + 0.5 * np.pi), np.sin(first + 0.5 * np.pi)]) * r
            t = (np.arange(sides) + 0.5) / sides
            points.append(np.array([p, q]) + n + t[:, None] * (np.array(nxt) - np.array([p, q])))
            ds.append(np.full(sides, side / sides))
    return np.vstack(points), np.concatenate(ds)


def _notch_rim(cut: Cut, sections: Sections) -> tuple[Array, Array]:
    """Rim of a notch from its edge inwards: half of a rounded rectangle of twice its depth."""
    e = sections.integrals(cut.at).extremes
    edge, sign = {"top": (e[0, 1], 1.0), "bottom": (e[1, 1], -1.0), "left": (e[2, 0], -1.0),
                  "right": (e[3, 0], 1.0)}[cut.edge]
    # finely, as the material behind an edge begins and ends at flanges and walls
    points, ds = _rounded(cut.length, 2.0 * cut.depth, min(cut.corner_radius, 0.5 * cut.length), 80, 60)
    keep = points[:, 1] < 0.0
    inwards = points[keep]
    return np.column_stack([cut.at + inwards[:, 0], edge + sign * inwards[:, 1]]), ds[keep]


def wall_intervals(outline: Outline, cut: Cut, v: float) -> list[tuple[float, float]]:
    """Stretches of the material along the cut's axis at coordinate `v` across, those of its wall only."""
    axis = 1 if cut.axis == "y" else 0
    hits = sorted(_crossings(outline, axis, v))
    walls = list(zip(hits[::2], hits[1::2], strict=False))
    if cut.through == "all" or not walls:
        return walls
    if cut.through in ("top flange", "top wall"):
        return walls[-1:]
    if cut.through in ("bottom flange", "bottom wall", "left wall", "upright leg", "bottom leg"):
        return walls[:1]
    if cut.through == "right wall":
        return walls[-1:]
    if cut.through == "flanges":
        return [walls[0], walls[-1]] if len(walls) > 1 else walls
    return [min(walls, key=lambda w: w[1] - w[0])]


def _crossings(outline: Outline, axis: int, v: float) -> list[float]:
    """Coordinates at which the line ``coordinate[axis] = v`` crosses the outline."""
    found = []
    for loop in (outline.outer, *outline.inner):
        for edge in loop:
            pieces = _chords(edge)
            for p, q in zip(pieces[:-1], pieces[1:], strict=True):
                if (p[axis] <= v) != (q[axis] <= v):
                    t = (v - p[axis]) / (q[axis] - p[axis])
                    found.append(float(p[1 - axis] + t * (q[1 - axis] - p[1 - axis])))
    return found


def _chords(edge: Line | Arc) -> Array:
    if isinstance(edge, Line):
        return np.array([edge.start, edge.end])
    from fem.beam.faces import curve

    return curve(edge, np.linspace(0.0, 1.0, 65))[0]
