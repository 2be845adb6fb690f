"""Loops over a mesh's connections: which nodes hang together, and sums of forces on facets at their nodes."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.jit import kernel
from fem.solid.shape import Array


@kernel
def _join(elements, root):  # type: ignore[no-untyped-def]
    """Union-find with halved paths: root[i] is a node of the same piece, not after i."""
    for e in range(elements.shape[1]):
        a = elements[0, e]
        while root[a] != a:
            root[a] = root[root[a]]
            a = root[a]
        for k in range(1, elements.shape[0]):
            b = elements[k, e]
            while root[b] != b:
                root[b] = root[root[b]]
                b = root[b]
            if b < a:
                root[a] = b
                a = b
            else:
                root[b] = a
    for i in range(root.size):
        root[i] = root[root[i]]


@kernel
def _add_facets(facets, forces, out):  # type: ignore[no-untyped-def]
    for a in range(facets.shape[0]):
        for f in range(facets.shape[1]):
            for i in range(3):
                out[facets[a, f], i] += forces[a, i, f]


def pieces(elements: NDArray[np.int64], node_count: int) -> NDArray[np.int64]:
    """(n,) the first node of the piece that each node belongs to; elements (w, m) join their nodes."""
    root = np.arange(node_count)
    _join(np.ascontiguousarray(elements), root)
    return root


def add_facets(facets: NDArray[np.int64], forces: Array, out: Array) -> None:
    """Add forces (6, 3, k) on the nodes of facets (6, k) to out (n, 3)."""
    _add_facets(np.ascontiguousarray(facets), np.ascontiguousarray(forces), out)
