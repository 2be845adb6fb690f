"""Stress of the kernels against scikit-fem's interpolation, and principal stresses against numpy's eigenvalues."""

from __future__ import annotations

import numpy as np
import pytest
from kernel_help import MESHES, NU, E, Plain
from skfem import Basis, ElementTetP2, ElementVector

from fem.solid.kernels import recovery
from fem.solid.kernels.pattern import incidence
from fem.solid.shape import NODE_BARY, tet_quadrature
from fem.solid.stiffness import element_groups, group_stresses, lame, mesh_arrays, point_slopes
from fem.solid.stress import principal_stresses, von_mises
from mesher.named_mesh import NamedMesh

KINDS = pytest.mark.parametrize("kind", list(MESHES))
TENSOR = np.array([[0, 3, 5], [3, 1, 4], [5, 4, 2]])
STRAIN = np.array([0.0, 3e-4])


def fields(mesh: NamedMesh) -> np.ndarray:
    """(2, 3, n) two displacement fields."""
    x, y, z = mesh.nodes / 10.0
    return 1e-3 * np.array(
        [[np.sin(x + 2 * y) + z**2, np.cos(x - z) * y, x * y * z], [y * z, np.exp(-x) * z, np.sin(x * y)]]
    )


def interpolated(mesh: NamedMesh, bary: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Stress (2, 6, m, q) at barycentric points and Jacobian determinants (m, q), by scikit-fem."""
    plain = Plain(mesh, 2)
    basis = Basis(plain.mesh, ElementVector(ElementTetP2()), quadrature=(bary[1:], np.ones(bary.shape[1])))
    lam, mu = lame(E, NU)
    out = []
    for u, strain in zip(fields(mesh), STRAIN, strict=True):
        H = np.asarray(basis.interpolate(plain.field(u)).grad)
        e = (H + H.transpose(1, 0, 2, 3)) / 2
        s = 2 * mu * e + np.eye(3)[:, :, None, None] * (lam * np.trace(e) - (3 * lam + 2 * mu) * strain)
        out.append([s[0, 0], s[1, 1], s[2, 2], s[0, 1], s[1, 2], s[2, 0]])
    return np.array(out), basis.dx


def recovered(mesh: NamedMesh, threads: int = 1) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    lam, mu = lame(E, NU)
    points, tets = mesh_arrays(mesh.nodes, mesh.tets)
    return recovery.nodal_stress(
        points,
        tets,
        incidence(tets, points.shape[0]),
        point_slopes(NODE_BARY),
        np.ascontiguousarray(fields(mesh).transpose(2, 0, 1)),
        (lam, mu, E, NU),
        (3 * lam + 2 * mu) * STRAIN,
        threads,
    )


@KINDS
def test_stress_at_the_points_of_the_groups(kind: str) -> None:
    mesh = MESHES[kind]()
    groups = element_groups(mesh.nodes, mesh.tets)
    for group, s in zip(groups, group_stresses(groups, fields(mesh), E, NU, STRAIN), strict=True):
        exact, _ = interpolated(mesh, group.points)
        exact = exact[:, :, group.elements].transpose(0, 2, 1, 3)
        assert np.abs(s - exact).max() < 1e-13 * np.abs(exact).max()


@KINDS
def test_nodal_mean_spread_and_energy_of_the_difference(kind: str) -> None:
    mesh = MESHES[kind]()
    s, det = interpolated(mesh, NODE_BARY)
    n, index = mesh.nodes.shape[1], mesh.tets.T
    volume = det[:, :4].mean(axis=1)
    weight = np.zeros(n)
    total, squares = np.zeros((2, 6, n)), np.zeros((2, n))
    np.add.at(weight, index, volume[:, None])
    for k in range(2):
        for i in range(6):
            np.add.at(total[k, i], index, s[k, i] * volume[:, None])
    mean = total / weight
    off = s - mean[:, :, index]
    for k in range(2):
        np.add.at(squares[k], index, von_mises(off[k]) ** 2 * volume[:, None])
    ours, spread, energy = recovered(mesh)
    assert np.abs(ours.transpose(1, 2, 0) - mean).max() < 1e-13 * np.abs(mean).max()
    assert np.abs(spread.T - np.sqrt(squares / weight)).max() < 1e-12 * spread.max()
    # the energy of the difference, linear between the corners, by quadrature
    L, w = tet_quadrature(2)
    corner = off[:, :, :, :4] @ L
    square = (corner[:, :3] ** 2).sum(axis=1) + 2 * (corner[:, 3:] ** 2).sum(axis=1)
    density = ((1 + NU) * square - NU * corner[:, :3].sum(axis=1) ** 2) / (2 * E)
    assert energy == pytest.approx((density @ w) @ volume, rel=1e-12)


@KINDS
def test_any_number_of_threads_gives_the_same_bits(kind: str) -> None:
    mesh = MESHES[kind]()
    one = recovered(mesh)
    for threads in (2, 3):
        for a, b in zip(one, recovered(mesh, threads), strict=True):
            assert np.array_equal(a, b)


def test_principal_stresses() -> None:
    rng = np.random.default_rng(2)
    s = rng.normal(size=(2, 6, 500)) * 10.0 ** rng.uniform(-6, 3, size=(2, 1, 500))
    s[0, :, :4] = np.array(
        [[0, 0, 0, 0, 0, 0], [5, 5, 5, 0, 0, 0], [0, 0, 0, 1, 0, 0], [1, 1, 1, 1, 1, 1]], dtype=float
    ).T
    s[0, 3:, 4:50] *= 1e-9
    exact = np.linalg.eigvalsh(s[:, TENSOR].transpose(0, 3, 1, 2))[..., ::-1].transpose(0, 2, 1)
    ours = principal_stresses(s)
    assert (np.abs(ours - exact) <= 1e-14 * np.abs(s).sum(axis=1, keepdims=True)).all()
    assert (np.diff(ours, axis=1) <= 0).all()
    assert np.array_equal(principal_stresses(s, 3), ours)
