"""Plane cuts of the mesh: quadrature points on the section, and the section's mean displacement and rotation.

A tetrahedron is cut in its reference element, where the cut of its corner plane is a triangle or a quadrilateral.
Curved elements are first divided into smaller ones whose corners lie on the curved element, so that round bores and
surfaces keep their area. A node on the plane counts as beyond it: a plane along element faces takes exactly
the faces of the elements before it.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from fem.solid.frame import Frame
from fem.solid.region import inertia
from fem.solid.shape import Array, curved_tets, tet_values, triangle_quadrature
from mesher.named_mesh import NamedMesh

ORDER = 4
_REFINE = 2


@dataclass(frozen=True, slots=True)
class Cut:
    """Quadrature on the section at `at` (mm).

    elements (p,), bary (4, p) barycentric coordinates there, weights (p,) mm^2, points (3, p) in *member* coordinates.
    """

    at: float
    elements: NDArray[np.int64]
    bary: Array
    weights: Array
    points: Array

    @property
    def area(self) -> float:
        """mm^2"""
        return float(self.weights.sum())

    @property
    def centroid(self) -> Array:
        """(3,) member coordinates, mm."""
        return np.asarray(self.points @ self.weights / self.weights.sum())


@cache
def _children(levels: int) -> Array:
    """(t, 4, 4) barycentric corners of the smaller tetrahedra: [child, corner, coordinate]."""
    tets = np.eye(4)[None]
    for _ in range(levels):
        a, b, c, d = tets.transpose(1, 0, 2)
        ab, bc, ac, ad, bd, cd = ((x + y) / 2 for x, y in ((a, b), (b, c), (a, c), (a, d), (b, d), (c, d)))
        parts = (
            (a, ab, ac, ad),
            (ab, b, bc, bd),
            (ac, bc, c, cd),
            (ad, bd, cd, d),
            (ab, ac, ad, bd),
            (ab, ac, bc, bd),
            (ac, ad, bd, cd),
            (ac, bc, bd, cd),
        )
        tets = np.concatenate([np.stack(p, axis=1) for p in parts])
    return tets


class Cutter:
    """Cuts one mesh at many planes."""

    def __init__(self, mesh: NamedMesh) -> None:
        self.mesh = mesh
        self.curved = curved_tets(mesh.nodes, mesh.tets)

    def cut(self, frame: Frame, at: float, inside: NDArray[np.bool_] | None = None) -> Cut:
        """Section of the elements (of those `inside` (m,)) at a station of the frame."""
        local = frame.local(self.mesh.nodes)
        tolerance = 1e-9 * frame.length
        d = local[0] - at
        d[np.abs(d) < tolerance] = 0.0
        cut = self._cut(local, d, at, inside)
        if not cut.weights.size:  # the start of the part: nothing before the plane
            cut = self._cut(local, -d, at, inside)
        return cut

    def _cut(self, local: Array, d: Array, at: float, inside: NDArray[np.bool_] | None) -> Cut:
        tets = self.mesh.tets
        side = d[tets] >= 0
        crossing = side.any(axis=0) & ~side.all(axis=0)
        if inside is not None:
            crossing &= inside
        corners, elements = [], []
        straight = np.flatnonzero(crossing & ~self.curved)
        if straight.size:
            corners.append(np.broadcast_to(np.eye(4), (straight.size, 4, 4)))
            elements.append(straight)
        bent = np.flatnonzero(crossing & self.curved)
        if bent.size:
            children = _children(_REFINE)
            corners.append(np.tile(children, (bent.size, 1, 1)))
            elements.append(np.repeat(bent, children.shape[0]))
        if not elements:
            return Cut(at, np.zeros(0, np.int64), np.zeros((4, 0)), np.zeros(0), np.zeros((3, 0)))
        bary, owner = np.concatenate(corners), np.concatenate(elements)
        N = tet_values(bary.reshape(-1, 4).T).reshape(10, -1, 4)
        distance = np.einsum("aec,ae->ec", N, d[tets[:, owner]])
        distance[np.abs(distance) < 1e-12 * np.ptp(d)] = 0.0
        return _polygons(local, tets, at, owner, bary, distance)


def _polygons(
    local: Array, tets: NDArray[np.int64], at: float, owner: NDArray[np.int64], bary: Array, distance: Array
) -> Cut:
    """Quadrature points on the cuts of the linear tetrahedra with barycentric corners bary (t, 4, 4)."""
    beyond = distance >= 0
    triangles, owners = [], []
    for code in range(1, 15):
        mask = np.flatnonzero((beyond @ np.array([1, 2, 4, 8])) == code)
        if not mask.size:
            continue
        bits = [bool(code >> i & 1) for i in range(4)]
        lone, rest = [i for i in range(4) if bits[i]], [i for i in range(4) if not bits[i]]
        if len(lone) == 3:
            lone, rest = rest, lone
        if len(lone) == 1:
            edges = [(lone[0], r) for r in rest]
        else:
            edges = [(lone[0], rest[0]), (lone[0], rest[1]), (lone[1], rest[1]), (lone[1], rest[0])]
        points = []
        for i, j in edges:
            di, dj = distance[mask, i], distance[mask, j]
            t = (di / (di - dj))[:, None]
            points.append(bary[mask, i] * (1 - t) + bary[mask, j] * t)
        for k in range(1, len(points) - 1):
            triangles.append(np.stack([points[0], points[k], points[k + 1]], axis=1))
            owners.append(owner[mask])
    if not triangles:
        return Cut(at, np.zeros(0, np.int64), np.zeros((4, 0)), np.zeros(0), np.zeros((3, 0)))
    tri, own = np.concatenate(triangles), np.concatenate(owners)  # (t, 3 corners, 4)
    N = tet_values(tri.reshape(-1, 4).T).reshape(10, -1, 3)
    corners = np.einsum("atc,iat->itc", N, local[:, tets[:, own]], optimize=True)
    sides = corners[1:, :, 1:] - corners[1:, :, :1]
    area = np.abs(sides[0, :, 0] * sides[1, :, 1] - sides[0, :, 1] * sides[1, :, 0])
    keep = area > 1e-14 * area.max()
    tri, own, area = tri[keep], own[keep], area[keep]
    L, w = triangle_quadrature(ORDER)
    at_points = np.einsum("tck,cq->ktq", tri, L).reshape(4, -1)
    elements = np.repeat(own, L.shape[1])
    x = interpolate(local, tets, elements, at_points)
    return Cut(at, elements, at_points, (area[:, None] * w).ravel(), x)


def interpolate(values: Array, tets: NDArray[np.int64], elements: NDArray[np.int64], bary: Array) -> Array:
    """(..., p) nodal values (..., n) at barycentric points (4, p) of elements (p,)."""
    N = tet_values(bary)
    out = np.zeros((*values.shape[:-1], elements.size))
    for a in range(10):
        out += values[..., tets[a, elements]] * N[a]
    return out


def section_means(cut: Cut, u: Array, tets: NDArray[np.int64], frame: Frame) -> tuple[Array, Array]:
    """Mean displacement and least-squares rotation (c, 3) of a section, global components, of u (c, 3, n).

    The rotation is that of the rigid motion nearest to the displacements: int r x u = (int r.r I - r r) rotation,
    r from the section's centroid.
    """
    field = interpolate(u, tets, cut.elements, cut.bary)  # (c, 3, p)
    mean = field @ cut.weights / cut.area
    arms = frame.axes.T @ (cut.points - cut.centroid[:, None])
    moment = np.cross(arms[None], field, axis=1) @ cut.weights
    return mean, np.asarray(np.linalg.solve(inertia(arms, cut.weights), moment.T).T, dtype=float)
