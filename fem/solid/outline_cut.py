"""Outline of a plane section as cut from the mesh's boundary: segments that carry values of the surface.

The extreme points of a section are found here, on the mesh, and nowhere from declared dimensions.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.solid.clip import smaller_triangles
from fem.solid.frame import Frame
from fem.solid.shape import TRIANGLE_EDGES, Array, triangle_values

FLAT = 1e-4
"""A side is flat where its points lie within this part of the section's extent."""


@dataclass(frozen=True, slots=True)
class Segments:
    """Straight segments of a section's outline.

    facets (s,) columns of the facet array that was cut; bary (3, s, 2) barycentric coordinates of the ends;
    yz (2, s, 2) member coordinates of the ends, mm.
    """

    facet_nodes: NDArray[np.int64]
    facets: NDArray[np.int64]
    bary: Array
    yz: Array

    @property
    def lengths(self) -> Array:
        """(s,) mm"""
        return np.asarray(np.hypot(*(self.yz[:, :, 1] - self.yz[:, :, 0])))

    def values(self, nodal: Array, chosen: NDArray[np.int64], t: Array) -> Array:
        """(..., k) nodal values (..., n) at fraction t (k,) of the chosen segments (k,)."""
        L = self.bary[:, chosen, 0] * (1 - t) + self.bary[:, chosen, 1] * t
        N = triangle_values(L)
        return np.asarray((nodal[..., self.facet_nodes[:, self.facets[chosen]]] * N).sum(axis=-2))

    def mean(self, nodal: Array, chosen: NDArray[np.int64]) -> Array:
        """(...) mean along the chosen segments (two-point Gauss rule on each)."""
        length = self.lengths[chosen]
        total = sum(
            (self.values(nodal, chosen, np.full(chosen.size, t)) @ length for t in (0.2113248654, 0.7886751346)),
            np.zeros(nodal.shape[:-1]),
        )
        return np.asarray(total / (2 * length.sum()))


class Outline:
    """Boundary triangles that are cut at many stations of a member."""

    def __init__(
        self, nodes: Array, facets: NDArray[np.int64], frame: Frame, place: NDArray[np.int64] | None = None
    ) -> None:
        """nodes (3, n) mm, global; facets (6, k); place (n,): number of each node in the values that will be asked."""
        self.facets, self.length = facets if place is None else place[facets], frame.length
        self.x = frame.local(nodes[:, facets])  # (3, 6, k)
        self.low, self.high = self.x[0].min(axis=0), self.x[0].max(axis=0)
        middles = self.x[:, :3][:, TRIANGLE_EDGES].mean(axis=2)
        size = np.linalg.norm(self.x[:, 1] - self.x[:, 0], axis=0)
        self.curved = (np.linalg.norm(self.x[:, 3:] - middles, axis=0) > 1e-9 * size).any(axis=0)
        self.extent = float(np.ptp(self.x[0])) if facets.size else 0.0

    def at(self, at: float) -> Segments:
        """Segments of the plane at a station; a node on the plane counts as beyond it."""
        tolerance = 1e-9 * self.length
        before, beyond = self.low - at, self.high - at
        segments = self._cut(at, np.flatnonzero((before <= -tolerance) & (beyond > -tolerance)), 1.0)
        if segments.facets.size:
            return segments
        return self._cut(at, np.flatnonzero((beyond >= tolerance) & (before < tolerance)), -1.0)

    def _cut(self, at: float, crossing: NDArray[np.int64], sign: float) -> Segments:
        x, bent = self.x[:, :, crossing], self.curved[crossing]
        d = x[0] - at
        d[np.abs(d) < 1e-9 * self.length] = 0.0
        d *= sign
        bary, owner, distances = [], [], []
        for chosen, levels in ((np.flatnonzero(~bent), 0), (np.flatnonzero(bent), 3)):
            children = smaller_triangles(levels)
            bary.append(np.tile(children, (chosen.size, 1, 1)))
            owner.append(np.repeat(chosen, children.shape[0]))
            distances.append((d[:, chosen].T @ triangle_values(children.reshape(-1, 3).T)).reshape(-1, 3))
        corners, own = np.concatenate(bary), np.concatenate(owner)  # (t, 3 corners, 3), (t,)
        distance = np.concatenate(distances)  # (t, 3)
        distance[np.abs(distance) < 1e-12 * max(self.extent, 1e-300)] = 0.0
        code = (distance >= 0) @ np.array([1, 2, 4])
        ends, owners = [], []
        for lone, codes in enumerate(((1, 6), (2, 5), (4, 3))):
            mask = np.flatnonzero((code == codes[0]) | (code == codes[1]))
            pair = []
            for other in (k for k in range(3) if k != lone):
                t = (distance[mask, lone] / (distance[mask, lone] - distance[mask, other]))[:, None]
                pair.append(corners[mask, lone] * (1 - t) + corners[mask, other] * t)
            ends.append(np.stack(pair, axis=-1))
            owners.append(own[mask])
        points, owned = np.concatenate(ends).transpose(1, 0, 2), np.concatenate(owners)  # (3, s, 2)
        N = triangle_values(points.reshape(3, -1)).reshape(6, -1, 2)
        yz = (x[1:, :, owned, None] * N).sum(axis=1)
        keep = np.hypot(*(yz[:, :, 1] - yz[:, :, 0])) > 1e-12 * max(self.extent, 1e-300)
        return Segments(self.facets, crossing[owned[keep]], points[:, keep], yz[:, keep])


SIDES = {"top": (1, 1.0), "bottom": (1, -1.0), "left": (0, -1.0), "right": (0, 1.0)}
"""Coordinate (0: y, 1: z) and direction of each side."""


def side_segments(segments: Segments, side: str) -> NDArray[np.int64]:
    """Segments on the flat side that is extreme (of several the upper one, or for top and bottom the widest)."""
    axis, sign = SIDES[side]
    level = sign * segments.yz[axis]
    extent = max(float(np.ptp(segments.yz[0])), float(np.ptp(segments.yz[1])))
    flat = np.flatnonzero((level > level.max() - FLAT * extent).all(axis=1))
    if not flat.size:
        return flat
    along = np.sort(segments.yz[1 - axis][flat], axis=1)
    order = np.argsort(along[:, 0])
    reach = np.maximum.accumulate(along[order, 1])
    group = np.concatenate([[0], np.cumsum(along[order[1:], 0] > reach[:-1] + FLAT * extent)])
    lows = np.array([along[order[group == k], 0].min() for k in range(group[-1] + 1)])
    highs = np.array([along[order[group == k], 1].max() for k in range(group[-1] + 1)])
    best = int(highs.argmax()) if axis == 0 else int((highs - lows).round(9).argmax())
    return flat[order[group == best]]


def extreme_value(segments: Segments, side: str, nodal: Array) -> tuple[Array, Array]:
    """Values (...) of nodal (..., n) at the extreme point of a side, and the point's (y, z)."""
    chosen = side_segments(segments, side)
    axis, sign = SIDES[side]
    if not chosen.size:
        s, e = np.unravel_index(int((sign * segments.yz[axis]).argmax()), segments.yz.shape[1:])
        return segments.values(nodal, np.array([s]), np.array([float(e)]))[..., 0], segments.yz[:, s, e]
    along = segments.yz[1 - axis][chosen]
    middle = (along.min() + along.max()) / 2
    low, high = along.min(axis=1), along.max(axis=1)
    k = int((np.maximum(low - middle, 0) + np.maximum(middle - high, 0)).argmin())
    t = float(np.clip((middle - along[k, 0]) / (along[k, 1] - along[k, 0]), 0, 1))
    ends = segments.yz[:, chosen[k]]
    point = ends[:, 0] * (1 - t) + ends[:, 1] * t
    return segments.values(nodal, chosen[[k]], np.array([t]))[..., 0], point
