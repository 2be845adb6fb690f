"""Points on the faces of the solid in the mesh kernel: seeds of the size field. Runs in the child only."""

from __future__ import annotations

from dataclasses import dataclass
from math import inf, pi

import gmsh
import numpy as np
from numpy.typing import NDArray

from mesher.sizes import Sizes

Floats = NDArray[np.float64]

_MOST_ALONG_ONE_WAY = 400


STRAIGHT_TOLERANCE = 1e-9
CURVED_TOLERANCE = 2e-3
"""Allowed relative error of a face's area: plane with straight edges, or any other."""

_ARC_COEFFICIENT = 8.8e-4
"""A parabola through the ends and the middle of an arc of angle a (rad) is short by this times a^4."""


@dataclass(frozen=True, slots=True)
class FaceSamples:
    """Points (n, 3) on one face, mm; the size that the face asks for (mm); its area (mm^2).

    `tolerance` is the relative error of its area that is due to the shape of the elements at that size.
    """

    points: Floats
    size: float
    area: float
    tolerance: float


def sample_faces(faces: list[int], areas: list[float], sizes: Sizes) -> list[FaceSamples]:
    """Samples of every face (`faces`: kernel tags in the order of the solid's marks)."""
    samples = []
    for index, (tag, area) in enumerate(zip(faces, areas, strict=True)):
        radius = _least_radius(tag)
        size = min(sizes.faces.get(index, sizes.bulk), _curvature_size(tag, radius, sizes, index in sizes.roundings))
        samples.append(FaceSamples(_points(tag, size), size, area, _tolerance(tag, size / radius)))
    return samples


def _least_radius(tag: int) -> float:
    """Least radius of curvature of a face, mm, at three places inside; infinite for a plane."""
    if gmsh.model.getType(2, tag) == "Plane":
        return inf
    low, high = (np.array(b) for b in gmsh.model.getParametrizationBounds(2, tag))
    middle = low + (high - low) * np.array([[0.3, 0.4], [0.5, 0.5], [0.7, 0.6]])
    bend = float(np.max(np.abs(gmsh.model.getCurvature(2, tag, middle.ravel().tolist()))))
    return 1.0 / bend if np.isfinite(bend) and bend > 0 else inf


def _curvature_size(tag: int, radius: float, sizes: Sizes, along: bool) -> float:
    """Size that a curved face needs for its shape alone, mm.

    `sizes.turn` elements to the full turn, two thirds of that on a rounding (named as one, or less than 135
    degrees). Small roundings are let off with half the bulk size, as long as a quarter turn still has an
    element of its own.
    """
    if radius == inf:
        return sizes.bulk
    low, high = gmsh.model.getParametrizationBounds(2, tag)
    rounding = along or (gmsh.model.getType(2, tag) in ("Cylinder", "Cone") and high[0] - low[0] < 0.75 * pi)
    if not rounding:
        return min(sizes.bulk, 2 * pi * radius / sizes.turn)
    return min(sizes.bulk, max(3 * pi * radius / sizes.turn, min(sizes.bulk / 2, pi * radius / 2)))


def _tolerance(tag: int, angle: float) -> float:
    if gmsh.model.getType(2, tag) != "Plane":
        return max(CURVED_TOLERANCE, 3 * _ARC_COEFFICIENT * min(angle, pi / 2) ** 4)
    edges = gmsh.model.getBoundary([(2, tag)], oriented=False)
    straight = all(gmsh.model.getType(1, edge) == "Line" for _, edge in edges)
    return STRAIGHT_TOLERANCE if straight else CURVED_TOLERANCE


def _points(tag: int, size: float) -> Floats:
    """A grid in the face's parameters with points about `size` apart; those outside its edges are dropped."""
    low, high = (np.array(b) for b in gmsh.model.getParametrizationBounds(2, tag))
    counts = [_steps(tag, low, high, axis, size) for axis in (0, 1)]
    u, v = (low[a] + (high[a] - low[a]) * (np.arange(n) + 0.5) / n for a, n in enumerate(counts))
    grid = np.stack(np.meshgrid(u, v, indexing="ij"), axis=-1).reshape(-1, 2)
    kept = grid[_inside(tag, grid)]
    if len(kept) == 0:
        kept = grid  # a sliver of a face between all grid points: its surroundings serve as well
    return np.array(gmsh.model.getValue(2, tag, kept.ravel().tolist())).reshape(-1, 3)


def _inside(tag: int, grid: Floats) -> NDArray[np.bool_]:
    """(n,) which of the points (n, 2), in the face's parameters, lie within its edges.

    The edges are taken as chains of chords, which is wrong only for a point so near to an edge that it makes no
    difference. Where the face closes on itself, its seam has two places in the parameters, and the kernel is asked
    point by point, which takes a hundred times as long.
    """
    around = [abs(edge) for _, edge in gmsh.model.getBoundary([(2, tag)], combined=False)]
    if len(set(around)) < len(around):
        return np.array([gmsh.model.isInside(2, tag, uv.tolist(), parametric=True) > 0 for uv in grid], dtype=bool)
    crossings = np.zeros(len(grid), dtype=np.int64)
    plane = gmsh.model.getType(2, tag) == "Plane"
    for edge in around:
        (first,), (last,) = gmsh.model.getParametrizationBounds(1, edge)
        count = 2 if plane and gmsh.model.getType(1, edge) == "Line" else 33
        t = np.linspace(first, last, count)
        u, v = np.array(gmsh.model.reparametrizeOnSurface(1, edge, t.tolist(), tag)).reshape(-1, 2).T
        across = (v[:-1] > grid[:, 1:]) != (v[1:] > grid[:, 1:])
        rise = np.where(v[1:] == v[:-1], 1.0, v[1:] - v[:-1])
        right = u[:-1] + (grid[:, 1:] - v[:-1]) / rise * (u[1:] - u[:-1]) > grid[:, :1]
        crossings += (across & right).sum(axis=1)
    return crossings % 2 == 1


def _steps(tag: int, low: Floats, high: Floats, axis: int, size: float) -> int:
    """How many steps of about `size` fit along one parameter, measured in the middle of the other."""
    uv = np.tile((low + high) / 2, (17, 1))
    uv[:, axis] = np.linspace(low[axis], high[axis], 17)
    points = np.array(gmsh.model.getValue(2, tag, uv.ravel().tolist())).reshape(-1, 3)
    length = float(np.linalg.norm(np.diff(points, axis=0), axis=1).sum())
    return int(np.clip(np.ceil(length / size), 2, _MOST_ALONG_ONE_WAY))
