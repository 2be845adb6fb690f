"""The solver: fallback, refusal of bad meshes, and the gauges that catch a wrong factor."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import scipy.sparse as sp
import scipy.sparse.linalg as spla
from skfem import MeshTet, MeshTet2
from solid_help import box_mesh, box_part, box_regions, named_mesh

import fem.solid.factor as factor
from fem.solid import solve_solid
from fem.solid.balance import load_checks
from fem.solid.factor import Cholesky, NotPositive, pardiso_available, upper_triangle
from fem.solid.load import solid_loads
from fem.solid.model import build_model
from fem.solid.solver.elimination import Elimination, block_matrix
from geometry.budget import Budget
from geometry.part import BodyLoad, Pressure, RegionLoad, Support
from geometry.problem import SolveError
from mesher.named_mesh import NamedMesh

BUDGET = Budget(threads=1)
ALL = {"x": 0.0, "y": 0.0, "z": 0.0}
PART = box_part(
    100.0,
    10.0,
    20.0,
    [Support("wall", "arm.start", ALL)],
    [RegionLoad("tip", "arm.end", (10.0, 20.0, -30.0)), BodyLoad("self_weight", (0.0, 0.0, -9810.0))],
)


def mesh_with(nodes: np.ndarray | None = None, quality: float = 0.5) -> NamedMesh:
    mesh = box_mesh(100.0, 10.0, 20.0, (5, 1, 2))
    q = mesh.quality.copy()
    q[3] = quality
    return NamedMesh(
        mesh.nodes if nodes is None else nodes,
        mesh.tets,
        mesh.facets,
        mesh.boundary,
        mesh.face_index,
        q,
        mesh.volume,
        mesh.region_area,
        mesh.region_area_cad,
    )


@pytest.mark.skipif(not pardiso_available(), reason="MKL is not installed")
def test_the_fallback_equals_pardiso() -> None:
    mesh = mesh_with()
    a, b = (solve_solid(PART, mesh, BUDGET, backend=name) for name in ("pardiso", "lu"))
    assert (a.backend, b.backend) == ("cholesky (pardiso)", "cholesky (lu)")
    assert b.u == pytest.approx(a.u, abs=1e-10 * np.abs(a.u).max())


def test_the_fallback_is_taken_when_mkl_is_missing(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(factor.pardiso, "library", lambda: None)
    result = solve_solid(PART, mesh_with(), BUDGET)
    assert result.backend == "cholesky (lu)"
    assert [c for c in result.checks if not c.ok] == []


@pytest.mark.parametrize("backend", ["pardiso", "lu"])
def test_factor_solves_several_columns_and_sees_negative_pivots(backend: str) -> None:
    if backend == "pardiso" and not pardiso_available():
        pytest.skip("MKL is not installed")
    A = sp.diags([[-1.0] * 29, [2.0] * 30, [-1.0] * 29], [-1, 0, 1]).tocsr()
    b = np.random.default_rng(1).normal(size=(30, 3))
    solver = Cholesky(A, BUDGET, backend)
    assert A @ solver.solve(b) == pytest.approx(b, abs=1e-12)
    solver.close()
    bad = (A - sp.diags([np.r_[np.zeros(29), 1.5]], [0])).tocsr()
    with pytest.raises(NotPositive):
        Cholesky(bad, BUDGET, backend)


@pytest.mark.skipif(not pardiso_available(), reason="MKL is not installed")
def test_a_factor_beyond_the_memory_is_refused() -> None:
    with pytest.raises(SolveError, match="MiB"):
        solve_solid(PART, box_mesh(100.0, 10.0, 20.0, (12, 4, 6)), Budget(threads=1, memory=1))


@pytest.mark.parametrize("cells", [(6, 1, 2), (10, 2, 4)])
def test_the_memory_of_the_fallback_is_told_before_and_refused(cells: tuple[int, int, int]) -> None:
    model = build_model(PART, box_mesh(100.0, 10.0, 20.0, cells))
    free = np.flatnonzero(np.repeat(model.mesh.nodes[0] > 1e-6, 3))
    matrix = model.K.to_csr()[free][:, free].tocsr()
    entries = spla.splu(matrix.tocsc(), permc_spec="MMD_AT_PLUS_A", options={"SymmetricMode": True}).nnz
    need = factor.lu_memory(matrix)
    assert 1.0 < need * 2**20 / (24 * entries) < 2.0  # never less than L and U take, and not far above
    with pytest.raises(SolveError, match=rf"about {need:.0f} MiB and the budget is 1 MiB"):
        Cholesky(matrix, Budget(threads=1, memory=1), "lu")


def test_a_sliver_is_refused_by_its_quality() -> None:
    with pytest.raises(SolveError, match="quality"):
        solve_solid(PART, mesh_with(quality=1e-5), BUDGET)


def test_an_inverted_element_is_refused() -> None:
    nodes = mesh_with().nodes.copy()
    inner = int(np.argmin(np.linalg.norm(nodes - np.array([[40.0], [0.0], [0.0]]), axis=0)))
    nodes[:, inner] += 35.0
    with pytest.raises(SolveError, match="no positive volume"):
        solve_solid(PART, mesh_with(nodes), BUDGET)


def test_a_flattened_element_does_not_give_a_wrong_result_in_silence() -> None:
    # the declared quality lies; what is left are the solver's own gauges
    mesh = MeshTet.init_tensor(np.linspace(0, 100, 6), np.linspace(-5, 5, 2), np.linspace(-10, 10, 3))
    p = mesh.p.copy()
    corner = int(np.argmin(np.linalg.norm(p - np.array([[40.0], [5.0], [0.0]]), axis=0)))
    p[1, corner] = -5.0 + 1e-13
    try:
        bad = named_mesh(
            MeshTet2.from_mesh(MeshTet(p, mesh.t)),
            {"arm.start": lambda x: x[0] < 1e-6, "arm.end": lambda x: x[0] > 100 - 1e-6},
        )
        result = solve_solid(PART, bad, BUDGET)
    except SolveError:
        return
    assert [c for c in result.checks if not c.ok]


def test_a_wrong_factor_is_caught(monkeypatch: pytest.MonkeyPatch) -> None:
    honest = Cholesky.solve
    monkeypatch.setattr(Cholesky, "solve", lambda self, rhs: honest(self, rhs) * (1 + 1e-5))
    with pytest.raises(SolveError, match="residual"):
        solve_solid(PART, mesh_with(), BUDGET)


def test_the_gauge_is_caught(monkeypatch: pytest.MonkeyPatch) -> None:
    honest = Cholesky.solve

    def off(self: Cholesky, rhs: np.ndarray) -> np.ndarray:
        out = honest(self, rhs)
        out[:, -1] *= 1.001  # the gauge is the last column
        return out

    monkeypatch.setattr(Cholesky, "solve", off)
    with pytest.raises(SolveError, match="bending field"):
        solve_solid(PART, mesh_with(), BUDGET)


def test_detached_pieces_are_counted() -> None:
    mesh = box_mesh(100.0, 10.0, 20.0, (5, 1, 2))
    n = mesh.nodes.shape[1]
    twice = NamedMesh(
        np.hstack([mesh.nodes, mesh.nodes + 500.0]),
        np.hstack([mesh.tets, mesh.tets + n]),
        mesh.facets,
        mesh.boundary,
        mesh.face_index,
        np.ones(2 * mesh.tets.shape[1]),
        0.0,
        {},
        {},
    )
    with pytest.raises(SolveError, match="2 pieces"):
        solve_solid(PART, twice, BUDGET)


@pytest.mark.parametrize("rigid", [0, 2])
def test_the_upper_triangle_equals_the_product(rigid: int) -> None:
    """Plain, partly held, wholly held and rigidly coupled nodes."""
    rng = np.random.default_rng(3)
    n = 20
    full = sp.random(n, n, density=0.2, random_state=rng) + sp.eye(n)
    K = sp.kron(full + full.T, np.ones((3, 3))).tocsr()
    K.data *= rng.normal(size=K.nnz)
    K = sp.csr_matrix(K + K.T)
    kind = np.r_[np.full(12, 3), [2, 1, 0, 2, 0, 1, 3, 3]]  # unknowns of each node
    kind[17:20] = 3 if not rigid else 0
    T = np.zeros((3 * n, kind.sum() + 6 * rigid))
    column = 0
    for i, own in enumerate(kind):
        T[3 * i : 3 * i + 3, column : column + own] = np.eye(3) if own == 3 else rng.normal(size=(3, own))
        column += own
    if rigid:
        T[51:57, column:] = rng.normal(size=(6, 6 * rigid))
        T[57:, column + 3 :] = rng.normal(size=(3, 6 * rigid - 3))
    elimination = Elimination(sp.csr_matrix(T))
    exact = T.T @ K.toarray() @ T
    upper = elimination.square(block_matrix(K))
    assert upper.has_sorted_indices
    assert upper.toarray() == pytest.approx(np.triu(exact), abs=1e-13 * np.abs(exact).max())
    y, f = rng.normal(size=(T.shape[1], 2)), rng.normal(size=3 * n)
    assert elimination.expand(y) == pytest.approx(T @ y, abs=1e-13)
    assert elimination.gather(f) == pytest.approx(T.T @ f, abs=1e-13)
    assert abs(upper_triangle(K) - sp.triu(K)).max() == 0.0


def test_a_pressure_all_round_is_judged_by_what_it_presses_not_by_its_resultant() -> None:
    """On all four sides the resultant is nothing but rounding, which must not be divided by itself."""
    sides = box_regions(100.0, 10.0, 20.0)
    mesh = box_mesh(
        100.0, 10.0, 20.0, (5, 1, 2),
        {"arm.round": lambda x: np.any([sides[f"arm.{s}"](x) for s in ("top", "bottom", "left", "right")], axis=0)},
    )  # fmt: skip
    part = box_part(100.0, 10.0, 20.0, [Support("wall", "arm.start", ALL)], [Pressure("water", "arm.round", 3.7)])
    result = solve_solid(part, mesh, BUDGET)
    assert [c for c in result.checks if not c.ok] == []
    load = solid_loads(part, mesh)["water"]
    assert load.push == pytest.approx(3.7 * 2 * (10.0 + 20.0) * 100.0)
    # the check still sees a pressure that is lost on one element
    model = build_model(part, mesh)
    vectors = model.load_vectors.copy()
    vectors.data[np.abs(vectors.data).argmax()] *= 0.99
    assert any(not c.ok for c in load_checks(replace(model, load_vectors=vectors)))
