"""Tractions on facets, or on the part of them between two planes, and their consistent nodal forces."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.solid.clip import clip_beyond
from fem.solid.frame import Frame
from fem.solid.shape import (
    TRIANGLE_EDGES,
    Array,
    facet_points,
    triangle_gradients,
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
    """Traction on the facets (6, k), or on what of them lies within the window; `forces` (6, 3, k) on the facets' nodes
    where they are known already."""

    facets: NDArray[np.int64]
    traction: Traction
    window: Window | None = None
    forces: Array | None = None


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
    every, found = np.array(distances), []
    for chosen, levels in ((np.flatnonzero(~curved), 0), (np.flatnonzero(curved), _REFINE)):
        own, bary, weights = clip_beyond(every[:, :, chosen], FORCE_ORDER, levels)
        found.append((chosen[own], bary, weights))
    owner, bary, weights = (np.concatenate(parts, axis=-1) for parts in zip(*found, strict=True))
    return facet_quadrature(nodes, facets, owner, bary, weights)


def piece_forces(nodes: Array, piece: SurfacePiece) -> Array:
    """(6, 3, k) consistent forces of a piece on the nodes of each of its facets, N."""
    if piece.forces is not None:
        return piece.forces
    if piece.window is None:
        N, x, normals = facet_points(nodes, piece.facets, FORCE_ORDER)
        dA = np.linalg.norm(normals, axis=0)
        t = piece.traction(x, normals / dA) * dA
        return np.asarray(np.matmul(t, N.T).transpose(2, 0, 1))
    here = clipped_facets(nodes, piece.facets, piece.window.distances(nodes[:, piece.facets]))
    t = piece.traction(here.points, here.normals) * here.areas
    return np.array([node_sums(here, row, piece.facets.shape[1]) for row in t]).transpose(1, 0, 2)


def node_sums(points: FacetPoints, values: Array, count: int) -> Array:
    """(6, count) sum of the values (p,) times each shape function over every facet's points."""
    N = triangle_values(points.bary)
    return np.array([np.bincount(points.owner, weights=row * values, minlength=count) for row in N])
