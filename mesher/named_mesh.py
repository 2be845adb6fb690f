"""A mesh whose regions are named: what the mesher hands to the solid model."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True)
class NamedMesh:
    """Curved 10-node tetrahedra in the numbering of scikit-fem's ``MeshTet2``.

    Attributes
    ----------
    nodes
        (3, n) coordinates, mm, global. All nodes, corner and mid-edge.
    tets
        (10, m) node indices: four corners, then the nodes between corners 01, 12, 02, 03, 13, 23 (the
        order of scikit-fem's ``MeshTet2.t`` together with its ``ElementTetP2`` edges; a test holds it).
        Positively oriented.
    facets
        Region name -> (6, k) node indices of its boundary triangles: three corners, then the nodes
        between corners 01, 12, 02; outward oriented.
    boundary, face_index
        (6, b) all boundary triangles, and (b,) the CAD face each lies on.
    quality
        (m,) least scaled Jacobian of each curved element, 1 for the regular one, <= 0 inverted.
    region_area, region_area_cad
        Area of each region on the mesh and on the solid, mm^2.
    recipe
        The attempt that succeeded (algorithms, sizes, kernel version): replaying it gives this mesh.
    """

    nodes: NDArray[np.float64]
    tets: NDArray[np.int64]
    facets: Mapping[str, NDArray[np.int64]]
    boundary: NDArray[np.int64]
    face_index: NDArray[np.int64]
    quality: NDArray[np.float64]
    volume: float
    region_area: Mapping[str, float]
    region_area_cad: Mapping[str, float]
    recipe: Mapping[str, Any] = field(default_factory=dict)
