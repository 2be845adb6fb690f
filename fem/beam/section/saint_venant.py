"""Saint-Venant torsion and flexure of a section by finite elements.

Torsion: warping function omega, lap omega = 0, d omega/dn = z n_y - y n_z; shear stress for unit G theta' is
tau_T = grad omega + (-z, y).

Flexure by a force (Vy, Vz): the bending stress grows along the member at the rate f = a_y y + a_z z with
[[Izz, Iyz], [Iyz, Iyy]] a = V, so div tau = -f, and compatibility with the anticlastic (Poisson) strains
gives tau = grad phi - p with
p = nu / (2 (1 + nu)) (a_y (y^2 - z^2)/2 + a_z y z, a_y y z + a_z (z^2 - y^2)/2).
Weakly: int grad phi . grad v = int f v + int p . grad v for every v. Both are pure Neumann problems, so
voids need no extra condition.

The flexure is fixed up to a torsion field. Here the one whose shear energy is uncoupled from torsion is
taken, int tau_V . tau_T dA = 0: then the force acts through the Trefftz shear centre, which does not depend
on nu, and int tau_V . tau_V is the shear compliance.

Sources: Gruttmann, Sauer & Wagner, Comput. Methods Appl. Mech. Engng 179 (1999) 7 (shear stresses of
arbitrary sections); Gruttmann & Wagner, Comput. Mech. 27 (2001) 199 (shear correction factors); Trefftz, ZAMM
15 (1935) 220 (shear centre).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.sparse.linalg import splu
from skfem import Basis, MeshTri2

from fem.beam.section.space import Points, Space, element_of, nodes_of, quadrature
from geometry.problem import SolveError

Array = NDArray[np.float64]

_REFERENCE_NODES = np.array([[0.0, 1.0, 0.0, 0.5, 0.5, 0.0], [0.0, 0.0, 1.0, 0.0, 0.5, 0.5]])


@dataclass(frozen=True, slots=True)
class SaintVenant:
    """Solved torsion and flexure of one meshed section, in coordinates from its centroid.

    Attributes
    ----------
    mesh
        Curved triangles, shifted so that the centroid is the origin, mm.
    space
        The functions on it that the fields are taken from.
    nu
        Poisson's ratio.
    centroid
        (2,) in the outline's coordinates, mm.
    omega
        Warping function about the centroid at the unknowns of `space`, zero mean, mm^2.
    flexure
        (2, n) potentials phi for unit Vy and unit Vz.
    rates
        (2, 2) row i: (a_y, a_z) for unit force i, 1/mm^4.
    coupling
        (2,) share of tau_T in each flexure field that uncouples it from torsion.
    J, Iw
        mm^4 and mm^6 (Iw about the shear centre).
    shear_centre
        (2,) from the centroid, mm.
    compliance
        (2, 2) int tau_i . tau_j dA for unit forces, 1/mm^2.
    """

    mesh: MeshTri2
    space: Space
    nu: float
    centroid: Array
    omega: Array
    flexure: Array
    rates: Array
    coupling: Array
    J: float
    Iw: float
    shear_centre: Array
    compliance: Array

    @property
    def basis(self) -> Basis:
        """scikit-fem's basis of the same space, for its own forms and interpolations."""
        return Basis(self.mesh, element_of(self.space.order), intorder=2 * self.space.order)

    def shear_at(self, basis: Basis) -> Array:
        """(3, 2, ...) shear stress (tau_xy, tau_xz), 1/mm^2 and 1/mm^3, at the points of a basis of the same space.

        First index: unit Vy through the shear centre, unit Vz, unit T.
        """
        x = np.asarray(basis.global_coordinates())
        twist = np.asarray(basis.interpolate(self.omega).grad) + _rigid(x)
        fields = [
            np.asarray(basis.interpolate(phi).grad) - _poisson(a, x, self.nu) + c * twist
            for phi, a, c in zip(self.flexure, self.rates, self.coupling, strict=True)
        ]
        return np.stack([*fields, twist / self.J])

    def nodal_shear(self) -> tuple[Array, Array]:
        """Points (2, m, 6) at corners and mid-sides of each triangle, from the centroid, and (3, 2, m, 6) stresses."""
        points = self.space.at(_REFERENCE_NODES)
        return points.x, self._shear(points)

    def _shear(self, points: Points) -> Array:
        twist, *slopes = self.space.gradient(np.vstack([self.omega[None], self.flexure]), points)
        twist = twist + _rigid(points.x)
        fields = [g - _poisson(a, points.x, self.nu) + c * twist
                  for g, a, c in zip(slopes, self.rates, self.coupling, strict=True)]
        return np.stack([*fields, twist / self.J])


def saint_venant(mesh: MeshTri2, nu: float, order: int = 3) -> SaintVenant:
    """Solve torsion and flexure on `mesh` with polynomials of `order` 2 or 3.

    The mesh may come from anywhere; its triangles may be curved and in any corner order. Needs a connected
    section: disjoint pieces give a singular matrix (SolveError).
    """
    return solved_about(*about_centroid(mesh), nu, order)


def about_centroid(mesh: MeshTri2) -> tuple[MeshTri2, Array]:
    """The mesh with its centroid at the origin, ready for `solved_about`, and where the centroid was."""
    centroid = _centroid(mesh)
    return sorted_mesh(mesh, centroid), centroid


def solved_about(mesh: MeshTri2, centroid: Array, nu: float, order: int) -> SaintVenant:
    """`saint_venant` on a mesh that `about_centroid` has made; two orders on one mesh share it."""
    space = Space(mesh, order)
    points = space.points
    x, dA = points.x, points.dx
    inertia = np.einsum("ieq,jeq,eq->ij", x, x, dA)
    rates = np.linalg.inv(inertia)
    poisson = np.array([_poisson(a, x, nu) for a in rates])
    loads = space.loads(np.concatenate([-_rigid(x)[None], poisson]),
                        np.concatenate([np.zeros((1, *dA.shape)), np.einsum("ki,ieq->keq", rates, x)]))
    # a circle does not warp: its torsion load is rounding error, to be measured against what it is made of
    natural = np.sqrt(np.trace(inertia) / mesh.nelements)
    found = _solve_neumann(space, loads, np.array([natural, 0.0, 0.0]))
    omega, flexure = found[0], found[1:]

    slopes = space.gradient(found, points)
    twist = slopes[0] + _rigid(x)
    J = float(np.einsum("ieq,ieq,eq->", twist, twist, dA))
    coupling = np.einsum("kieq,ieq,eq->k", poisson, twist, dA) / J
    tau = slopes[1:] - poisson + coupling[:, None, None, None] * twist
    compliance = np.einsum("kieq,lieq,eq->kl", tau, tau, dA)

    # torque of each uncoupled field about the centroid: T = -int f omega, and T = ys Vz - zs Vy
    warp = space.interpolate(omega[None], points)[0]
    torque = -np.einsum("ki,ieq,eq,eq->k", rates, x, warp, dA)
    centre = np.array([torque[1], -torque[0]])
    about_centre = warp - centre[1] * x[0] + centre[0] * x[1]
    Iw = float(np.einsum("eq,eq,eq->", about_centre, about_centre, dA))
    return SaintVenant(mesh, space, nu, centroid, omega, flexure, rates, coupling, J, Iw, centre, compliance)


def _rigid(x: Array) -> Array:
    return np.stack([-x[1], x[0]])


def _poisson(a: Sequence[float] | Array, x: Array, nu: float) -> Array:
    """The field p of the module's text, (2, ...) at points x (2, ...)."""
    y, z = x
    half, cross = 0.5 * (y * y - z * z), y * z
    return nu / (2 * (1 + nu)) * np.stack([a[0] * half + a[1] * cross, a[0] * cross - a[1] * half])


def _solve_neumann(space: Space, loads: Array, natural: Array) -> Array:
    """(k, n) solutions of the Neumann problem with zero mean, for (k, n) loads that sum to zero.

    One unknown is held to make the matrix regular; the loads balance, so holding it costs nothing. The residual
    is judged against each load, or against its `natural` (k,) size where that is larger.
    """
    K = space.stiffness()
    try:
        lu = splu(K[1:, 1:], permc_spec="MMD_AT_PLUS_A", options={"SymmetricMode": True}, diag_pivot_thresh=0.0)
    except RuntimeError as singular:
        raise SolveError(f"the section is not in one piece ({singular}): take outline_integrals instead.") from singular
    solution = np.zeros_like(loads)
    solution[:, 1:] = lu.solve(loads[:, 1:].T).T
    left = np.abs(K @ solution.T - loads.T).max(axis=0)
    residual = float((left / np.maximum(np.abs(loads).max(axis=1), natural)).max())
    if not residual < 1e-8:
        raise SolveError(f"the section's equations were solved to a residual of {residual:.1e} only: "
                         "is the outline in one piece and the mesh sound?")
    mean = space.loads(np.zeros((1, 2, *space.points.dx.shape)), np.ones((1, *space.points.dx.shape)))[0]
    return solution - (solution @ mean / mean.sum())[:, None]


def _centroid(mesh: MeshTri2) -> Array:
    points = Points(nodes_of(mesh), 2, *quadrature(6))
    return np.asarray(np.einsum("ieq,eq->i", points.x, points.dx) / points.dx.sum())


def sorted_mesh(mesh: MeshTri2, origin: Array) -> MeshTri2:
    """The same curved triangles with corners in ascending order, as cubic elements need, and `origin` at zero."""
    nodes = np.array(mesh.dofs.element_dofs)
    order = np.argsort(nodes[:3], axis=0)
    columns = np.arange(nodes.shape[1])
    corners = nodes[order, columns]
    middle = {frozenset((0, 1)): 3, frozenset((1, 2)): 4, frozenset((0, 2)): 5}
    table = np.array([[middle[frozenset((i, j))] if i != j else 0 for j in range(3)] for i in range(3)])
    mids = np.array([nodes[table[order[i], order[j]], columns] for i, j in ((0, 1), (1, 2), (0, 2))])
    return MeshTri2(mesh.doflocs - origin[:, None], np.vstack([corners, mids]))
