"""The nodes of a mesh in order along the part, in which the solid model works.

scikit-fem numbers the corners first and the mid-edge nodes after them, so that one row of the stiffness reaches far
through the vectors, at 140 000 nodes beyond the processor's cache. Along the part's longest direction the rows of a
slice of the part stand together.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from fem.solid.result import SolidResult
from fem.solid.shape import Array
from mesher.named_mesh import NamedMesh


def along_the_part(nodes: Array) -> NDArray[np.int64]:
    """(n,) numbers of the nodes (3, n) as they follow each other along the longest of the global directions."""
    return np.argsort(nodes[int(np.ptp(nodes, axis=1).argmax())], kind="stable")


def in_order(mesh: NamedMesh) -> tuple[NamedMesh, NDArray[np.int64]]:
    """The mesh with its nodes in order, and (n,) the new number of each of its nodes.

    It is not in the numbering of scikit-fem any more: for the solid model's own work only.
    """
    nodes = along_the_part(mesh.nodes)
    number = np.empty_like(nodes)
    number[nodes] = np.arange(nodes.size)
    return replace(
        mesh,
        nodes=mesh.nodes[:, nodes],
        tets=number[mesh.tets],
        facets={name: number[facets] for name, facets in mesh.facets.items()},
        boundary=number[mesh.boundary],
    ), number


def as_given(result: SolidResult, mesh: NamedMesh, number: NDArray[np.int64]) -> SolidResult:
    """A result on the nodes in order as one on the mesh that was given. Its arrays are used up."""
    nodes = np.empty_like(number)
    nodes[number] = np.arange(number.size)
    for name in ("u", "stress", "stress_error", "von_mises", "vibration_shapes", "buckling_shapes"):
        values: Array = getattr(result, name)
        for k in range(values.shape[0]):  # one after the other, in its place: they may be many
            values[k] = values[k][..., number]
    peaks = tuple(replace(peak, node=int(nodes[peak.node])) for peak in result.peaks)
    return replace(result, mesh=mesh, peaks=peaks)
