"""The mesh as scikit-fem's mesh object, without working out its edges again."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from mesher.named_mesh import NamedMesh
from mesher.numbering import TET_EDGES, TRI_EDGES
from mesher.outline_mesh import OutlineMesh

if TYPE_CHECKING:
    from skfem import MeshTet2, MeshTri2


def to_skfem(mesh: NamedMesh) -> MeshTet2:
    """scikit-fem's mesh of the same elements.

    Its nodes are `mesh.nodes`, its ``dofs.element_dofs`` are `mesh.tets`, and the degrees of freedom of
    ``ElementVector(ElementTetP2())`` are ``3 node + component``.
    """
    from skfem import MeshTet2

    # scikit-fem would take ten rows as a foreign order and renumber; four rows keep ours.
    result = MeshTet2(mesh.nodes, mesh.tets[:4].astype(np.int32), validate=False)
    # Its edges are already known from the mid-edge nodes; finding them again costs seconds on a large mesh.
    result._t2e = mesh.tets[4:] - result.nvertices
    result._edges = _edge_ends(mesh.tets, TET_EDGES, 4)
    return result


def outline_to_skfem(mesh: OutlineMesh) -> MeshTri2:
    """scikit-fem's mesh of the same triangles; its ``dofs.element_dofs`` are `mesh.tris`."""
    from skfem import MeshTri2

    result = MeshTri2(mesh.nodes, mesh.tris[:3].astype(np.int32), sort_t=False, validate=False)
    result._t2f = mesh.tris[3:] - result.nvertices
    result._facets = _edge_ends(mesh.tris, TRI_EDGES, 3)
    return result


def _edge_ends(elements: np.ndarray, edges: tuple[tuple[int, int], ...], corners: int) -> np.ndarray:
    """(2, edges) lower and higher corner of each edge, in the order of the mid-edge nodes."""
    first = int(elements[:corners].max()) + 1
    ends = np.empty((2, int(elements[corners:].max()) + 1 - first), dtype=np.int32)
    for row, (a, b) in enumerate(edges):
        ends[:, elements[corners + row] - first] = np.sort(elements[[a, b]], axis=0)
    return ends
