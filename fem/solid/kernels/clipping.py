"""The part of triangles where several distances are not negative, by cutting off a convex polygon's corners."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.jit import kernel
from fem.solid.shape import Array

Int = NDArray[np.int64]


@kernel
def _clip(children, values, distances, owner, corners):  # type: ignore[no-untyped-def]
    """See `clip_facets`; returns the number of triangles."""
    planes, count = distances.shape[0], 0
    most = 3 + planes
    polygon, other = np.empty((most, 3 + planes)), np.empty((most, 3 + planes))
    for f in range(distances.shape[2]):
        for t in range(children.shape[0]):
            size = 3
            for v in range(3):
                for c in range(3):
                    polygon[v, c] = children[t, v, c]
                for p in range(planes):
                    d = 0.0
                    for a in range(6):
                        d += values[t, v, a] * distances[p, a, f]
                    polygon[v, 3 + p] = d
            for p in range(planes):
                kept = 0
                for v in range(size):
                    w = v + 1 if v + 1 < size else 0
                    here, there = polygon[v, 3 + p], polygon[w, 3 + p]
                    if here >= 0.0:
                        other[kept] = polygon[v]
                        kept += 1
                    if (here >= 0.0) != (there >= 0.0):
                        share = here / (here - there)
                        for c in range(3 + planes):
                            other[kept, c] = polygon[v, c] * (1.0 - share) + polygon[w, c] * share
                        other[kept, 3 + p] = 0.0
                        kept += 1
                polygon, other = other, polygon
                size = kept
                if size < 3:
                    break
            for v in range(1, size - 1):
                owner[count] = f
                for c in range(3):
                    corners[count, 0, c] = polygon[0, c]
                    corners[count, 1, c] = polygon[v, c]
                    corners[count, 2, c] = polygon[v + 1, c]
                count += 1
    return count


def clip_facets(children: Array, values: Array, distances: Array) -> tuple[Int, Array]:
    """Triangles of what is left of facets: owner (s,) and barycentric corners (s, 3, 3) [triangle, corner, coordinate].

    Parameters
    ----------
    children, values
        (t, 3, 3) barycentric corners of the triangles that each facet is divided into, and (t, 3, 6) the shape
        functions there.
    distances
        (p, 6, k) at the facets' nodes; in each child they are taken as linear, and kept where all of them are >= 0.
    """
    most = distances.shape[2] * children.shape[0] * (1 + distances.shape[0])
    owner, corners = np.empty(most, np.int64), np.empty((most, 3, 3))
    count = _clip(children, values, np.ascontiguousarray(distances), owner, corners)
    return owner[:count], corners[:count]
