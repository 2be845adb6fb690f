"""Matrices and vectors of the kernels against scikit-fem's own assembly, on straight and on curved elements."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from kernel_help import MESHES, NU, E, Plain, straight
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import connected_components
from skfem import Basis, BilinearForm, ElementTetP1, ElementVector, LinearForm, MeshTet2
from skfem.helpers import dot, eye, grad, sym_grad, trace
from skfem.models.elasticity import lame_parameters, linear_elasticity

from fem.solid.geometric import geometric_stiffness
from fem.solid.kernels.mesh_graph import add_facets, pieces
from fem.solid.mass import mass_matrix
from fem.solid.model import check_mesh, mass_vector, thermal_vector
from fem.solid.stiffness import CURVED_ORDER, element_groups, group_stresses, linear_stiffness, stiffness_matrix
from geometry.problem import SolveError
from mesher.named_mesh import NamedMesh

KINDS = pytest.mark.parametrize("kind", list(MESHES))


def gap(ours, theirs) -> float:  # type: ignore[no-untyped-def]
    """Largest difference over the largest entry."""
    return float(abs(ours - theirs).max() / abs(theirs).max())


def smooth_field(mesh: NamedMesh) -> np.ndarray:
    x, y, z = mesh.nodes / 10.0
    return 1e-3 * np.array([np.sin(x + 2 * y) + z**2, np.cos(x - z) * y, x * y * z - np.sin(2 * z)])


@KINDS
def test_stiffness(kind: str) -> None:
    mesh = MESHES[kind]()
    K = stiffness_matrix(mesh.nodes, mesh.tets, element_groups(mesh.nodes, mesh.tets), E, NU).to_csr()
    assert gap(K, Plain(mesh, CURVED_ORDER).matrix(linear_elasticity(*lame_parameters(E, NU)))) < 1e-14


@KINDS
def test_stiffness_of_linear_displacements(kind: str) -> None:
    """Against scikit-fem's linear elements on the curved mesh, the corners in any order; and it is what the stiffness
    itself makes."""
    mesh = MESHES[kind]()
    groups = element_groups(mesh.nodes, mesh.tets)
    corners = np.random.default_rng(3).permutation(np.unique(mesh.tets[:4]))
    ours = linear_stiffness(corners, groups, E, NU)
    basis = Basis(MeshTet2(mesh.nodes, mesh.tets[:4]), ElementVector(ElementTetP1()), intorder=CURVED_ORDER)
    place = np.empty((mesh.nodes.shape[1], 3), dtype=int)
    place[mesh.tets[:4]] = basis.element_dofs.reshape(4, 3, -1).transpose(0, 2, 1)
    place = place[corners].ravel()
    plain = linear_elasticity(*lame_parameters(E, NU)).assemble(basis).tocsr()[place][:, place]
    assert gap(ours.to_csr(), plain) < 1e-14
    K = stiffness_matrix(mesh.nodes, mesh.tets, groups, E, NU)
    assert K.linear is not None and np.array_equal(K.linear(corners).blocks, ours.blocks)
    for threads in (2, 3):
        assert np.array_equal(linear_stiffness(corners, groups, E, NU, threads).blocks, ours.blocks)


@KINDS
def test_mass(kind: str) -> None:
    mesh = MESHES[kind]()
    groups = element_groups(mesh.nodes, mesh.tets)
    K = stiffness_matrix(mesh.nodes, mesh.tets, groups, E, NU)
    M = mass_matrix(groups, 7.85e-9, K)

    @BilinearForm
    def mass(u, v, w):  # type: ignore[no-untyped-def]
        return 7.85e-9 * dot(u, v)

    assert gap(M.to_csr(), Plain(mesh, 6).matrix(mass)) < 1e-14
    assert M.indices is K.indices
    moved = np.tile([1.0, 0.0, 0.0], mesh.nodes.shape[1])
    assert moved @ (M @ moved) == pytest.approx(7.85e-9 * mesh.volume, rel=1e-12 if kind == "straight" else 1e-9)


@KINDS
def test_geometric_stiffness(kind: str) -> None:
    mesh, plain = MESHES[kind](), Plain(MESHES[kind](), CURVED_ORDER)
    groups = element_groups(mesh.nodes, mesh.tets)
    u, lam, mu = smooth_field(mesh), *lame_parameters(E, NU)
    s = group_stresses(groups, u[None], E, NU, np.array([2e-4]))
    G = geometric_stiffness(groups, [each[0] for each in s], stiffness_matrix(mesh.nodes, mesh.tets, groups, E, NU))

    @BilinearForm
    def geometric(u, v, w):  # type: ignore[no-untyped-def]
        e = sym_grad(w["u0"])
        stress = lam * eye(trace(e), 3) + 2 * mu * e - eye((3 * lam + 2 * mu) * 2e-4 + 0 * trace(e), 3)
        # s_ij du_k/dx_i dv_k/dx_j
        return np.einsum("ij...,ki...,kj...->...", stress, grad(u), grad(v))

    reference = geometric.assemble(plain.basis, u0=plain.field(u)).tocsr()[plain.place][:, plain.place]
    assert gap(G.to_csr(), reference) < 2e-14


def test_tension_stiffens_and_leaves_translation_free() -> None:
    mesh = straight()
    groups = element_groups(mesh.nodes, mesh.tets)
    s = [np.zeros((g.elements.size, 6, g.rule.size)) for g in groups]
    s[0][:, 0] = 100.0
    G = geometric_stiffness(groups, s, stiffness_matrix(mesh.nodes, mesh.tets, groups, E, NU))
    n = mesh.nodes.shape[1]
    w = np.zeros((n, 3))
    w[:, 2] = mesh.nodes[0] / 40.0  # turned by 1/40: the work is N L times half the square of the slope
    assert w.ravel() @ (G @ w.ravel()) == pytest.approx(100.0 * mesh.volume / 40.0**2, rel=1e-12)
    assert np.abs(G @ np.ones(3 * n)).max() < 1e-12 * np.abs(G.values).max()


@KINDS
def test_vectors_of_body_force_and_free_expansion(kind: str) -> None:
    mesh, plain = MESHES[kind](), Plain(MESHES[kind](), CURVED_ORDER)
    groups = element_groups(mesh.nodes, mesh.tets)
    lam, mu = lame_parameters(E, NU)

    @LinearForm
    def weight(v, w):  # type: ignore[no-untyped-def]
        return v[0] + 2.0 * v[1] - 3.0 * v[2]

    @LinearForm
    def expansion(v, w):  # type: ignore[no-untyped-def]
        return (3 * lam + 2 * mu) * trace(grad(v))

    shares, volume, first = mass_vector(mesh, groups)
    assert gap((shares[:, None] * [1.0, 2.0, -3.0]).ravel(), plain.vector(weight)) < 1e-14
    assert gap(thermal_vector(mesh, groups, E, NU).ravel(), plain.vector(expansion)) < 1e-13
    assert volume == pytest.approx(plain.basis.dx.sum(), rel=1e-13)
    centre = (plain.basis.global_coordinates() * plain.basis.dx).sum(axis=(1, 2))
    assert first == pytest.approx(centre, abs=1e-12 * volume * np.abs(mesh.nodes).max())


@KINDS
def test_any_number_of_threads_gives_the_same_bits(kind: str) -> None:
    mesh = MESHES[kind]()

    def everything(threads: int) -> list[np.ndarray]:
        groups = element_groups(mesh.nodes, mesh.tets, threads)
        K = stiffness_matrix(mesh.nodes, mesh.tets, groups, E, NU, threads)
        s = group_stresses(groups, smooth_field(mesh)[None], E, NU, np.zeros(1), threads)
        G = geometric_stiffness(groups, [each[0] for each in s], K)
        return [K.indptr, K.indices, K.blocks, mass_matrix(groups, 1.0, K).values, G.values]

    one = everything(1)
    for threads in (2, 3):
        for a, b in zip(one, everything(threads), strict=True):
            assert np.array_equal(a, b)


def test_an_element_turned_inside_out_is_named_with_its_place() -> None:
    mesh = straight()
    tets = mesh.tets.copy()
    tets[:, 17] = tets[:, 17][[1, 0, 2, 3, 4, 6, 5, 8, 7, 9]]
    where = np.round(mesh.nodes[:, tets[:4, 17]].mean(axis=1), 3).tolist()
    with pytest.raises(SolveError, match="1 of 144 elements have no positive volume") as caught:
        element_groups(mesh.nodes, tets)
    assert str(where) in str(caught.value)


def test_a_curved_element_folded_at_a_node_is_named() -> None:
    mesh = MESHES["pipe"]()
    nodes = mesh.nodes.copy()
    a, middle = mesh.tets[0, 40], mesh.tets[4, 40]
    nodes[:, middle] = 0.9 * nodes[:, a] + 0.1 * nodes[:, mesh.tets[1, 40]]
    with pytest.raises(SolveError, match="no positive volume"):
        element_groups(nodes, mesh.tets)


def test_unused_nodes_and_detached_pieces_are_refused() -> None:
    mesh = replace(straight(), quality=np.full(144, 0.5))
    check_mesh(mesh)
    with pytest.raises(SolveError, match=r"1 unused nodes, the first one at \[7.0, 8.0, 9.0\]"):
        check_mesh(replace(mesh, nodes=np.hstack([mesh.nodes, [[7.0], [8.0], [9.0]]])))
    n = mesh.nodes.shape[1]
    both = replace(mesh, nodes=np.hstack([mesh.nodes, mesh.nodes + 99.0]), tets=np.hstack([mesh.tets, mesh.tets + n]))
    with pytest.raises(SolveError, match=f"2 pieces that do not touch .*{n}, {n}"):
        check_mesh(both)


def test_pieces_are_those_of_the_graph() -> None:
    rng = np.random.default_rng(8)
    for _ in range(20):
        elements = rng.integers(0, 60, size=(4, 12))
        rows, columns = np.repeat(elements[:1], 3, axis=0).ravel(), elements[1:].ravel()
        graph = coo_matrix((np.ones(rows.size), (rows, columns)), shape=(60, 60))
        count, label = connected_components(graph, directed=False)
        found = pieces(elements, 60)
        assert np.unique(found).size == count
        assert all(np.unique(found[label == k]).tolist() == [np.flatnonzero(label == k)[0]] for k in range(count))


def test_forces_on_facets_add_up_at_their_nodes() -> None:
    rng = np.random.default_rng(9)
    facets, forces, out = rng.integers(0, 30, size=(6, 40)), rng.normal(size=(6, 3, 40)), rng.normal(size=(30, 3))
    exact = out + np.array([np.bincount(facets.ravel(), forces[:, i].ravel(), 30) for i in range(3)]).T
    add_facets(facets, forces, out)
    assert gap(out, exact) < 1e-15
