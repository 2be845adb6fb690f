"""Putting the kernel's arrays together as a `NamedMesh`, and checking it against the solid."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from geometry.named_solid import NamedSolid
from mesher.child import ChildResult
from mesher.measure import facet_areas, tetrahedron_volumes
from mesher.named_mesh import NamedMesh
from mesher.numbering import TET_EDGES, TET_FACES, from_gmsh
from mesher.quality import scaled_jacobian

Ints = NDArray[np.int64]
Floats = NDArray[np.float64]


def assemble(result: ChildResult, solid: NamedSolid, recipe: Mapping[str, Any]) -> NamedMesh:
    """The named mesh from the arrays of one attempt.

    Raises
    ------
    ValueError
        The arrays do not fit together (elements missing, boundary not covered by the faces).
    """
    arrays = result.arrays
    nodes, tets, index = from_gmsh(arrays["tags"], arrays["points"], arrays["tets"])
    boundary = boundary_facets(tets)
    face_index = _owners(boundary, index[arrays["triangles"].T], arrays["owner"])
    areas = facet_areas(nodes, boundary)
    facets, area, area_cad = {}, {}, {}
    for name, faces in solid.regions.items():
        mine = np.isin(face_index, faces)
        facets[name] = np.ascontiguousarray(boundary[:, mine])
        area[name] = float(areas[mine].sum())
        area_cad[name] = float(sum(solid.faces[i].area for i in faces))
    volume = float(tetrahedron_volumes(nodes, tets).sum())
    quality = scaled_jacobian(nodes, tets)
    return NamedMesh(nodes, tets, facets, boundary, face_index, quality, volume, area, area_cad, dict(recipe))


def boundary_facets(tets: Ints) -> Ints:
    """(6, b) boundary triangles of tetrahedra (10, m), outward, in the order of the elements they belong to."""
    local = [(*face, *(_edge_row(face[a], face[b]) for a, b in ((0, 1), (1, 2), (0, 2)))) for face in TET_FACES]
    every = np.concatenate([tets[list(rows)] for rows in local], axis=1)
    count = int(tets[:4].max()) + 1
    low, middle, high = np.sort(every[:3], axis=0)
    key = (low * count + middle) * count + high  # below 2^63 for up to two million corners
    _, first, times = np.unique(key, return_index=True, return_counts=True)
    alone = np.sort(first[times == 1])
    return np.ascontiguousarray(every[:, alone])


def _edge_row(a: int, b: int) -> int:
    return 4 + TET_EDGES.index((min(a, b), max(a, b)))


def _owners(boundary: Ints, triangles: Ints, owner: Ints) -> Ints:
    """Face index of each boundary triangle, from the kernel's triangles on the faces."""
    mine, theirs = np.sort(boundary, axis=0), np.sort(triangles, axis=0)
    order, order_theirs = np.lexsort(mine), np.lexsort(theirs)
    if mine.shape != theirs.shape or not np.array_equal(mine[:, order], theirs[:, order_theirs]):
        raise ValueError("the triangles on the faces are not the boundary of the tetrahedra")
    result = np.empty(boundary.shape[1], dtype=np.int64)
    result[order] = owner[order_theirs]
    return result
