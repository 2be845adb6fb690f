"""Motions of the rigid part: what a mode carries of the mass, and what must cost nothing."""

from __future__ import annotations

import numpy as np

from fem.solid.shape import Array
from fem.solid.support import rigid_map


def rigid_motions(nodes: Array, centre: Array) -> Array:
    """(3 n, 6) displacement of the nodes (3, n) for unit displacements and unit turns about `centre`."""
    return np.ascontiguousarray(rigid_map(nodes, centre).reshape(-1, 6))


def orthonormal(R: Array, heavy: Array) -> Array:
    """(n, 6) the same space as R with R^T M R = 1, from heavy = M R."""
    gram = R.T @ heavy
    scale = 1.0 / np.sqrt(np.diag(gram))
    values, Q = np.linalg.eigh(gram * scale * scale[:, None])
    return np.asarray(R @ ((scale[:, None] * Q) / np.sqrt(values)))
