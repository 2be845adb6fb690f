"""The mesh of a section's outline: what the mesher hands to the beam model's section analysis."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True)
class OutlineMesh:
    """Curved 6-node triangles in the numbering of scikit-fem's ``MeshTri2`` with ``ElementTriP2``.

    Attributes
    ----------
    nodes
        (2, n) coordinates (y, z) of the outline, mm. Corner nodes first, then one node for each edge.
    tris
        (6, m) node indices: three corners, then the nodes between corners 01, 12, 02. Counter-clockwise.
    boundary
        (3, b) node indices of the boundary edges: start, end, middle; the material lies to the left.
    loop, edge
        (b,) which loop each lies on (0: outer, 1, 2, ...: inner), and which edge of that loop.
    area
        Area of the mesh, mm^2.
    """

    nodes: NDArray[np.float64]
    tris: NDArray[np.int64]
    boundary: NDArray[np.int64]
    loop: NDArray[np.int64]
    edge: NDArray[np.int64]
    area: float
