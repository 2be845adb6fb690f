"""Mass and geometric stiffness: until the model's own come."""

from __future__ import annotations

import numpy as np

from fem.solid.block_matrix import BlockMatrix
from fem.solid.model import SolidModel
from fem.solid.shape import Array, tet_quadrature, tet_values
from fem.solid.stiffness import element_gradients


def mass_matrix(model: SolidModel) -> BlockMatrix:
    mesh = model.mesh
    values = []
    for group in model.groups:
        L, w = tet_quadrature(6)
        N = tet_values(L)
        _, det = element_gradients(mesh.nodes, mesh.tets[:, group.elements], L)
        values.append(np.einsum("aq,bq,mq->mab", N, N, det * w * model.part.material.density, optimize=True))
    return _isotropic(model, values)


def geometric_stiffness(model: SolidModel, stress: list[Array]) -> BlockMatrix:
    T = np.array([[0, 3, 5], [3, 1, 4], [5, 4, 2]])
    values = []
    for group, s in zip(model.groups, stress, strict=True):
        m, _, q = group.gradients.shape
        g = group.gradients.reshape(m, 10, 3, q)
        t = np.einsum("mijq,mbjq->mibq", s[:, T] * group.weights[:, None, None, :], g)
        values.append(np.matmul(g.reshape(m, 10, 3 * q), t.transpose(0, 1, 3, 2).reshape(m, 3 * q, 10)))
    return _isotropic(model, values)


def _isotropic(model: SolidModel, values: list[Array]) -> BlockMatrix:
    K, n = model.K, model.mesh.nodes.shape[1]
    keys = np.repeat(np.arange(n, dtype=np.int64), np.diff(K.indptr)) * n + K.indices
    total = np.zeros(keys.size)
    for group, v in zip(model.groups, values, strict=True):
        nodes = model.mesh.tets[:, group.elements].T
        a, b = np.broadcast_arrays(nodes[:, :, None], nodes[:, None, :])
        up = a <= b
        slot = np.searchsorted(keys, a[up] * n + b[up])
        total += np.bincount(slot, weights=v[up], minlength=keys.size)
    return BlockMatrix(K.indptr, K.indices, total[:, None, None] * np.eye(3), K.threads)
