"""Straight and curved meshes for the tests of the kernels, and scikit-fem's own numbering of the same unknowns."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from skfem import Basis, ElementTetP2, ElementVector, MeshTet, MeshTet2
from solid_help import named_mesh

from mesher.named_mesh import NamedMesh

E, NU = 210000.0, 0.3


def straight() -> NamedMesh:
    """A box of irregular straight elements."""
    mesh = MeshTet.init_tensor(np.linspace(0, 40, 5), np.linspace(-10, 10, 4), np.linspace(-5, 5, 3))
    rng = np.random.default_rng(5)
    inner = np.setdiff1d(np.arange(mesh.p.shape[1]), mesh.boundary_nodes())
    x = mesh.p.copy()
    x[:, inner] += rng.uniform(-0.8, 0.8, size=(3, inner.size))
    return named_mesh(MeshTet2.from_mesh(MeshTet(x, mesh.t)), {})


def ball() -> NamedMesh:
    """A refined ball: curved at its surface, straight inside."""
    return named_mesh(MeshTet2.init_ball(2), {})


def pipe() -> NamedMesh:
    """A quarter of a pipe, all elements curved."""
    grid = MeshTet.init_tensor(np.linspace(8, 11, 3), np.linspace(0, np.pi / 2, 5), np.linspace(0, 9, 4))
    mesh = MeshTet2.from_mesh(grid)
    r, angle, z = mesh.doflocs
    return named_mesh(MeshTet2(np.array([r * np.cos(angle), r * np.sin(angle), z]), mesh.t), {})


MESHES: dict[str, Callable[[], NamedMesh]] = {"straight": straight, "ball": ball, "pipe": pipe}


def close(found: NDArray[np.float64], want: NDArray[np.float64], rel: float = 0.0, abs: float = 0.0) -> bool:
    """What ``found == pytest.approx(want, rel, abs)`` says of large arrays, which takes them one by one, at once."""
    assert found.shape == want.shape
    return bool((np.abs(found - want) <= np.maximum(rel * np.abs(want), abs)).all())


class Plain:
    """scikit-fem's basis on the same mesh. `place` (3 n,) is its unknown of our unknown 3 node + direction."""

    def __init__(self, mesh: NamedMesh, order: int) -> None:
        self.mesh = MeshTet2(mesh.nodes, mesh.tets[:4])
        self.basis = Basis(self.mesh, ElementVector(ElementTetP2()), intorder=order)
        n = mesh.nodes.shape[1]
        node_of = np.empty(n, dtype=int)
        node_of[self.mesh.dofs.element_dofs.ravel()] = mesh.tets.ravel()
        place = np.empty((n, 3), dtype=int)
        local = self.basis.element_dofs.reshape(10, 3, -1)
        place[node_of[self.mesh.dofs.element_dofs].ravel()] = local.transpose(0, 2, 1).reshape(-1, 3)
        self.place: NDArray[np.int64] = place.ravel()

    def matrix(self, form) -> object:  # type: ignore[no-untyped-def]
        """Its matrix in our numbering."""
        return form.assemble(self.basis).tocsr()[self.place][:, self.place]

    def vector(self, form) -> NDArray[np.float64]:  # type: ignore[no-untyped-def]
        """Its vector in our numbering."""
        return np.asarray(form.assemble(self.basis))[self.place]

    def field(self, u: NDArray[np.float64]) -> NDArray[np.float64]:
        """Our displacements (3, n) in its numbering."""
        out = np.empty(u.size)
        out[self.place] = u.T.ravel()
        return out
