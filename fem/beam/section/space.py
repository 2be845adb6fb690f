"""Scalar polynomials on the curved triangles of a section: shape functions at points, gradients, sums of elements.

The shape functions and the numbers of the unknowns are scikit-fem's; what its bases and forms do for any element is
done here for this one, all elements and right-hand sides in one product, since a study analyses thousands of sections
and each is small.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from numpy.typing import NDArray
from scipy import sparse
from skfem import ElementTriP2, ElementTriP3, MeshTri2
from skfem.assembly import Dofs
from skfem.quadrature import get_quadrature_tri

Array = NDArray[np.float64]


def element_of(order: int) -> ElementTriP2 | ElementTriP3:
    """scikit-fem's element with polynomials of `order` 2 or 3."""
    return ElementTriP3() if order == 3 else ElementTriP2()


def shape_functions(order: int, X: Array) -> tuple[Array, Array]:
    """Values (b, ...) and slopes (2, b, ...) of the shape functions at places X (2, ...) of the reference triangle."""
    if order == 2:
        return _quadratic(X)
    element = element_of(order)
    pairs = [element.lbasis(X, i) for i in range(10)]
    return (np.array([np.broadcast_to(value, X.shape[1:]) for value, _ in pairs]),
            np.stack([np.broadcast_to(np.asarray(slopes), X.shape) for _, slopes in pairs], axis=1))


def _quadratic(X: Array) -> tuple[Array, Array]:
    """Corners, then the middles of the sides 01, 12 and 02."""
    x, y = X
    z = 1.0 - x - y
    zero = np.zeros_like(x)
    values = np.stack([z * (2.0 * z - 1.0), x * (2.0 * x - 1.0), y * (2.0 * y - 1.0), 4.0 * x * z, 4.0 * x * y,
                       4.0 * y * z])
    at_origin = 1.0 - 4.0 * z
    slopes = np.stack([np.stack([at_origin, 4.0 * x - 1.0, zero, 4.0 * (z - x), 4.0 * y, -4.0 * y]),
                       np.stack([at_origin, zero, 4.0 * y - 1.0, -4.0 * x, 4.0 * x, 4.0 * (z - y)])])
    return values, slopes


@lru_cache(maxsize=8)
def quadrature(order: int) -> tuple[Array, Array]:
    """Places (2, q) and weights (q,) in the reference triangle, exact for polynomials of `order`."""
    X, W = get_quadrature_tri(order)
    return X, W


def nodes_of(mesh: MeshTri2) -> Array:
    """(2, 6, m) nodes of each triangle."""
    return np.asarray(mesh.doflocs[:, mesh.dofs.element_dofs])


class Points:
    """The same places of the reference triangle in every element.

    Attributes
    ----------
    x
        (2, m, q) where they are.
    dx
        (m, q) area that each stands for.
    values
        (b, q) shape functions.
    gradients
        (m, b, 2 q) their gradients, the first component at all points, then the second.
    """

    def __init__(self, nodes: Array, order: int, X: Array, weights: Array) -> None:
        value, slope = shape_functions(2, X)
        self.values, slopes = shape_functions(order, X)
        by_element = nodes.transpose(0, 2, 1)
        self.x = by_element @ value
        a, c = by_element @ slope[0]  # (m, q): the first coordinate's and the second's slope along the first
        b, d = by_element @ slope[1]
        det = a * d - b * c
        self.dx = np.abs(det) * weights
        first, second = slopes[0], slopes[1]
        inverse = [(v / det)[:, None] for v in (d, -c, -b, a)]
        self.gradients = np.concatenate([inverse[0] * first + inverse[1] * second,
                                         inverse[2] * first + inverse[3] * second], axis=2)


class Space:
    """Continuous functions on a mesh, polynomials of `order` 2 or 3 in each element, and the points of its quadrature.

    The mesh's corners must be in ascending order in each triangle (cubic elements).
    """

    def __init__(self, mesh: MeshTri2, order: int) -> None:
        dofs = Dofs(mesh, element_of(order))
        self.order, self.element_dofs, self.size = order, np.asarray(dofs.element_dofs), int(dofs.N)
        self.nodes = nodes_of(mesh)
        self.points = Points(self.nodes, order, *quadrature(2 * order))

    def at(self, X: Array) -> Points:
        """Points at places X (2, q) of each element; they stand for no area."""
        return Points(self.nodes, self.order, X, np.zeros(X.shape[1]))

    def stiffness(self) -> sparse.csc_matrix:
        """int grad u . grad v."""
        G = self.points.gradients
        local = (G * np.tile(self.points.dx, 2)[:, None]) @ G.transpose(0, 2, 1)
        count = len(self.element_dofs)
        rows = np.repeat(self.element_dofs.T, count, axis=1).ravel()
        columns = np.tile(self.element_dofs.T, count).ravel()
        return sparse.csc_matrix((local.ravel(), (rows, columns)), shape=(self.size, self.size))

    def loads(self, vectors: Array, scalars: Array) -> Array:
        """(k, n) int w . grad v + f v for k fields w (k, 2, m, q) and f (k, m, q) at the points."""
        p = self.points
        count, elements = len(vectors), len(p.dx)
        weighted = (vectors * p.dx).transpose(2, 1, 3, 0).reshape(elements, -1, count)
        local = p.gradients @ weighted + p.values @ (scalars * p.dx).transpose(1, 2, 0)
        return np.array([np.bincount(self.element_dofs.T.ravel(), local[:, :, k].ravel(), self.size)
                         for k in range(count)])

    def interpolate(self, u: Array, points: Points) -> Array:
        """(k, m, q) functions u (k, n) at points."""
        return np.asarray(u[:, self.element_dofs].transpose(0, 2, 1) @ points.values)

    def gradient(self, u: Array, points: Points) -> Array:
        """(k, 2, m, q) gradients of functions u (k, n) at points."""
        local = u[:, self.element_dofs].transpose(2, 0, 1) @ points.gradients
        return local.reshape(len(local), len(u), 2, -1).transpose(1, 2, 0, 3)
