"""Products and scalar forms of the block matrix against scipy's, and the thread runner."""

from __future__ import annotations

import threading

import numpy as np
import pytest
import scipy.sparse as sp
from kernel_help import MESHES, NU, E, straight

from fem.solid.block_matrix import BlockMatrix
from fem.solid.kernels.parallel import ranges, run, weighted_ranges
from fem.solid.stiffness import element_groups, stiffness_matrix


@pytest.fixture(scope="module")
def K() -> BlockMatrix:
    mesh = straight()
    return stiffness_matrix(mesh.nodes, mesh.tets, element_groups(mesh.nodes, mesh.tets), E, NU)


def whole(K: BlockMatrix) -> sp.csr_matrix:
    """The matrix by scipy's own means."""
    upper = sp.bsr_matrix((K.blocks, K.indices, K.indptr), shape=K.shape).tocsr()
    off = K.blocks.copy()
    off[K.indptr[:-1]] = 0.0
    return sp.csr_matrix(upper + sp.bsr_matrix((off, K.indices, K.indptr), shape=K.shape).T)


def test_the_pattern_has_the_pairs_of_nodes_that_share_an_element() -> None:
    for make in MESHES.values():
        mesh = make()
        n = mesh.nodes.shape[1]
        K = stiffness_matrix(mesh.nodes, mesh.tets, element_groups(mesh.nodes, mesh.tets), E, NU)
        i, j = np.repeat(mesh.tets, 10, axis=0).ravel(), np.tile(mesh.tets, (10, 1)).ravel()
        keys = np.unique((i * n + j)[i <= j])
        assert np.array_equal(np.repeat(np.arange(n), np.diff(K.indptr)) * n + K.indices, keys)
        assert K.indptr.dtype == K.indices.dtype == np.int32


@pytest.mark.parametrize("shape", [(), (0,), (1,), (2,), (3,), (4,), (6,), (8,), (13,)])
def test_double_products(K: BlockMatrix, shape: tuple[int, ...]) -> None:
    x = np.random.default_rng(1).normal(size=(K.shape[0], *shape))
    exact = whole(K) @ x
    assert np.abs(K @ x - exact).max(initial=0.0) <= 1e-14 * np.abs(exact).max(initial=0.0)
    for threads in (2, 3):
        assert np.array_equal(K.product(x, np.empty_like(x), threads), K @ x)
    assert np.array_equal(K @ np.asfortranarray(x), K @ x)


@pytest.mark.parametrize("shape", [(), (2,), (3,), (4,), (8,), (13,)])
def test_single_products(K: BlockMatrix, shape: tuple[int, ...]) -> None:
    x = np.random.default_rng(1).normal(size=(K.shape[0], *shape)).astype(np.float32)
    exact, light = whole(K) @ x.astype(float), K.single()
    y = light @ x
    assert y.dtype == np.float32
    assert np.abs(y - exact).max() < 2e-6 * np.abs(exact).max()
    for threads in (2, 3):
        assert np.array_equal(light.product(x, np.empty_like(x), threads), y)


def test_wrong_shapes_are_refused(K: BlockMatrix) -> None:
    x = np.zeros(K.shape[0])
    for bad, out in ((x[1:], x[1:].copy()), (x, x), (x, np.zeros((x.size, 1))), (x, x.astype(np.float32))):
        with pytest.raises(ValueError, match="product|out"):
            K.product(bad, out)


def test_scalar_forms(K: BlockMatrix) -> None:
    exact = whole(K)
    ours = K.to_csr()
    assert abs(ours - exact).max() == 0.0
    assert (np.diff(ours.indices)[np.diff(np.repeat(np.arange(K.shape[0]), np.diff(ours.indptr))) == 0] > 0).all()
    assert np.array_equal(K.diagonal(), exact.diagonal())
    assert abs(K.upper_csr() - sp.triu(exact)).max() == 0.0


def test_the_upper_triangle_of_some_unknowns(K: BlockMatrix) -> None:
    rng = np.random.default_rng(4)
    mask = rng.random(K.shape[0]) < 0.7
    kept = np.flatnonzero(mask)
    for given in (mask, kept, kept.astype(np.int32)):
        ours = K.upper_csr(given)
        assert ours.shape == (kept.size, kept.size)
        assert ours.indices.dtype == ours.indptr.dtype == np.int32
        same_row = np.diff(np.repeat(np.arange(kept.size), np.diff(ours.indptr))) == 0
        assert (np.diff(ours.indices)[same_row] > 0).all()
        assert (ours.indices[ours.indptr[:-1]] == np.arange(kept.size)).all()  # the diagonal stands first
        assert abs(ours - sp.triu(whole(K)[kept][:, kept])).max() == 0.0
    with pytest.raises(ValueError, match="rise"):
        K.upper_csr(kept[::-1])


def test_ranges_cover_everything_once() -> None:
    for size in (0, 1, 5, 16, 1000):
        parts = ranges(size)
        assert [k for a, b in parts for k in range(a, b)] == list(range(size))
        starts = np.cumsum([0, *[3] * size], dtype=np.int32)
        assert [k for a, b in weighted_ranges(starts, 4) for k in range(a, b)] == list(range(size))


def test_results_come_in_order_and_errors_are_passed_on() -> None:
    assert run(lambda a, b: a, ranges(100), 3) == [a for a, _ in ranges(100)]

    def fails(a: int, b: int) -> None:
        if a:
            raise ArithmeticError(f"at {a}")

    with pytest.raises(ArithmeticError, match="at"):
        run(fails, ranges(100), 3)


def test_calls_may_be_nested() -> None:
    done = []

    def outer(a: int, b: int) -> int:
        return sum(run(lambda c, d: d - c, ranges(50), 2))

    worker = threading.Thread(target=lambda: done.extend(run(outer, ranges(16), 2)), daemon=True)
    worker.start()
    worker.join(timeout=20)
    assert done == [50] * 16
