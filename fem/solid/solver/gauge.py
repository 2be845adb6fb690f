"""What tells whether a solution is right: a known field, and the rounding that no solver can go below."""

from __future__ import annotations

import numpy as np

from fem.solid.block_matrix import BlockMatrix
from fem.solid.shape import Array


def bending_field(nodes: Array) -> Array:
    """(3, n) pure bending with anticlastic curvature along the longest direction, of size one."""
    extent = np.ptp(nodes, axis=1)
    a, b, c = np.argsort(-extent)
    x = (nodes - nodes.mean(axis=1)[:, None]) / extent[a]
    u = np.zeros_like(nodes)
    u[a] = x[a] * x[c]
    u[c] = -(x[a] ** 2 + 0.3 * (x[c] ** 2 - x[b] ** 2)) / 2
    u[b] = -0.3 * x[b] * x[c]
    return u


def rounding_of_product(K: BlockMatrix, u: Array) -> Array:
    """(c,) size of the rounding error that computing K u (3 n, c) itself makes, in the norm of the residual.

    Of a very slender part the terms of K u are many powers of ten larger than the load that they add up to, and no
    solver can bring the residual below this. First-order bound with random signs: eps sqrt(terms) |K| |u| (Higham,
    Accuracy and Stability of Numerical Algorithms, ch. 3; from memory).
    """
    blocks = np.bincount(K.indices, minlength=K.indptr.size - 1) + np.diff(K.indptr) - 1
    terms = 3.0 * float(blocks.max(initial=1))
    sizes = BlockMatrix(K.indptr, K.indices, np.abs(K.blocks))
    return np.asarray(np.finfo(float).eps * np.sqrt(terms) * np.linalg.norm(sizes @ np.abs(u), axis=0))
