"""Tractions on facets, or on the part of them between two planes, and their consistent nodal forces."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.solid.clip import clip_triangles, smaller_triangles
from fem.solid.frame import Frame
from fem.solid.shape import (
    TRIANGLE_EDGES,
    Array,
    facet_points,
    triangle_gradients,
    triangle_quadrature,
    triangle_values,
)

Traction = Callable[[Array, Array], Array]
"""Traction (3, ...) in MPa at positions (3, ...) with outward unit normals (3, ...)."""

FORCE_ORDER = 6
_REFINE = 2
"""A curved facet is clipped as 4 ** this many smaller ones whose corners lie on it."""
_SNAP = 1e-9


@dataclass(frozen=True, slots=True)
class Window:
    """The space between two planes across a member, low <= x <= high (mm)."""

    frame: Frame
    low: float
    high: float

    def distances(self, points: Array) -> tuple[Array, Array]:
        """Distances of points (3, ...) from the two planes, not negative inside; rounding is set to zero."""
        x = self.frame.local(points)[0]
        both = x - self.low, self.high - x
        for d in both:
            d[np.abs(d) < _SNAP * self.frame.length] = 0.0
        return both


@dataclass(frozen=True, slots=True)
class SurfacePiece:
    """Traction on the facets (6, k), or on what of them lies within the window."""

    facets: NDArray[np.int64]
    traction: Traction
    window: Window | None = None


@dataclass(frozen=True, slots=True)
class FacetPoints:
    """Quadrature on facets: `owner` (p,) facet of each point, bary (3, p), points (3, p) in mm, outward unit normals
    (3, p) and area weights, areas (p,) in mm^2, some of which may be negative."""

    owner: NDArray[np.int64]
    bary: Array
    points: Array
    normals: Array
    areas: Array


def facet_quadrature(nodes: Array, facets: NDArray[np.int64], owner: NDArray[np.int64], bary: Array, w: Array
) -> FacetPoints:  # fmt: skip
    """Points bary (3, p) with reference weights w (p,) on the facets `owner` (p,) of `facets` (6, k)."""
    x = nodes[:, facets[:, owner]]
    dN = triangle_gradients(bary)
    normals = np.cross((x * dN[:, 0]).sum(axis=1), (x * dN[:, 1]).sum(axis=1), axis=0)
    size = np.linalg.norm(normals, axis=0)
    return FacetPoints(owner, bary, (x * triangle_values(bary)).sum(axis=1), normals / size, size * w)


def clipped_facets(nodes: Array, facets: NDArray[np.int64], distances: tuple[Array, ...]) -> FacetPoints:
    """Quadrature on the part of the facets (6, k) where every one of the distances (6, k) of their nodes is >= 0.

    Exact for flat facets. A curved one is cut along straight lines in each of the smaller triangles that it is divided
    into in barycentric coordinates; its normals and areas are its own.
    """
    x = nodes[:, facets]
    size = np.linalg.norm(x[:, 1] - x[:, 0], axis=0)
    off = np.linalg.norm(x[:, 3:] - x[:, :3][:, TRIANGLE_EDGES].mean(axis=2), axis=0)
    curved = (off > 1e-9 * size).any(axis=0)
    corners, owner = [], []
    for chosen, levels in ((np.flatnonzero(~curved), 0), (np.flatnonzero(curved), _REFINE)):
        children = smaller_triangles(levels)
        corners.append(np.tile(children, (chosen.size, 1, 1)))
        owner.append(np.repeat(chosen, children.shape[0]))
    pieces, own = np.concatenate(corners), np.concatenate(owner)
    for d in distances:
        values = triangle_values(pieces.reshape(-1, 3).T).reshape(6, -1, 3)
        pieces, index = clip_triangles(pieces, np.einsum("atc,at->tc", values, d[:, own]))
        own = own[index]
    L, w = triangle_quadrature(FORCE_ORDER)
    bary = np.matmul(pieces.transpose(2, 0, 1), L).reshape(3, -1)
    weights = (np.abs(np.linalg.det(pieces))[:, None] * w).ravel()
    return facet_quadrature(nodes, facets, np.repeat(own, w.size), bary, weights)


def piece_forces(nodes: Array, piece: SurfacePiece) -> Array:
    """(6, 3, k) consistent forces of a piece on the nodes of each of its facets, N."""
    k = piece.facets.shape[1]
    if piece.window is None:
        N, x, normals = facet_points(nodes, piece.facets, FORCE_ORDER)
        dA = np.linalg.norm(normals, axis=0)
        t = piece.traction(x, normals / dA) * dA
        return np.asarray(np.matmul(t, N.T).transpose(2, 0, 1))
    here = clipped_facets(nodes, piece.facets, piece.window.distances(nodes[:, piece.facets]))
    t = piece.traction(here.points, here.normals) * here.areas
    N = triangle_values(here.bary)
    return np.array([[np.bincount(here.owner, weights=N[a] * t[i], minlength=k) for i in range(3)] for a in range(6)])
