"""Products of tall arrays and of matrices of numbers against numpy and scikit-fem's sums, whatever the threads."""

from __future__ import annotations

import numpy as np
import pytest
from kernel_help import MESHES, NU, E, close

from fem.solid.geometric import geometric_stiffness
from fem.solid.kernels.tall import combine, gram, turn
from fem.solid.mass import mass_matrix
from fem.solid.stiffness import element_groups, group_stresses, stiffness_matrix

THREADS = (1, 2, 3)


@pytest.mark.parametrize("columns", [1, 2, 3, 6, 8, 13])
@pytest.mark.parametrize("size", [1, 5, 9])
def test_tall_products(size: int, columns: int) -> None:
    rng = np.random.default_rng(1)
    a, b, c = (rng.standard_normal(shape) for shape in ((5000, 9), (5000, columns), (size, columns)))
    grams = [gram(a, size, b, threads) for threads in THREADS]
    sums = [combine(a, size, c, b.copy(), threads, -0.5) for threads in THREADS]
    news = [combine(a, size, c, np.full_like(b, np.nan), threads) for threads in THREADS]
    assert close(grams[0], a[:, :size].T @ b, rel=1e-12, abs=1e-12 * 5000)
    assert close(sums[0], a[:, :size] @ c - b / 2, rel=1e-12, abs=1e-12)
    assert close(news[0], a[:, :size] @ c, rel=1e-12, abs=1e-12)
    for results in (grams, sums, news):
        assert all(np.array_equal(results[0], other) for other in results[1:])


def test_nothing_to_combine() -> None:
    out = combine(np.zeros((4, 3)), 0, np.zeros((0, 2)), np.ones((4, 2)), 1, 1.0)
    assert np.array_equal(out, np.ones((4, 2)))
    assert gram(np.zeros((4, 3)), 0, np.ones((4, 2)), 1).shape == (0, 2)


def test_a_turn_in_place() -> None:
    rng = np.random.default_rng(2)
    a, c = rng.standard_normal((70_000, 12)), rng.standard_normal((10, 7))
    want = a[:, :10] @ c
    turned = []
    for threads in THREADS:
        turned.append(a.copy())
        turn(turned[-1], 10, c, threads)
    assert close(turned[0][:, :7], want, rel=1e-12, abs=1e-12)
    assert np.array_equal(turned[0][:, 7:], a[:, 7:])
    assert np.array_equal(turned[0], turned[1]) and np.array_equal(turned[0], turned[2])


@pytest.mark.parametrize("kind", list(MESHES))
def test_products_of_numbers(kind: str) -> None:
    """Mass and geometric stiffness, whose entries are compared with scikit-fem's elsewhere, against their own CSR."""
    mesh = MESHES[kind]()
    groups = element_groups(mesh.nodes, mesh.tets)
    K = stiffness_matrix(mesh.nodes, mesh.tets, groups, E, NU)
    rng = np.random.default_rng(3)
    s = group_stresses(groups, 1e-3 * rng.standard_normal((1, *mesh.nodes.shape)), E, NU, np.zeros(1))
    for matrix in (mass_matrix(groups, 7.85e-9, K), geometric_stiffness(groups, [each[0] for each in s], K)):
        csr = matrix.to_csr()
        for columns in ((), (1,), (3,), (8,), (11,)):
            x = rng.standard_normal((K.shape[0], *columns))
            products = [type(matrix)(K.indptr, K.indices, matrix.values, threads) @ x for threads in THREADS]
            assert close(products[0], csr @ x, rel=1e-12, abs=1e-13 * abs(csr @ x).max())
            assert all(np.array_equal(products[0], other) for other in products[1:])
        assert close(np.repeat(matrix.sizes(), 3), np.asarray(abs(csr).sum(axis=1)).ravel(), rel=1e-12)
        blocks = K.blocks.copy()
        matrix.add_to(blocks, -2.0)
        summed = type(K)(K.indptr, K.indices, blocks).to_csr() - K.to_csr()
        assert abs(summed + 2.0 * csr).max() <= 1e-10 * max(abs(K.blocks).max(), abs(csr).max())
        with pytest.raises(ValueError, match="columns"):
            matrix @ np.zeros(K.shape[0] + 3)
