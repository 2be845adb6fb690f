"""Plane cuts of the mesh: quadrature points on the section, and the section's mean displacement and rotation.

A tetrahedron is cut in its reference element, where the cut of its corner plane is a triangle or a quadrilateral.
Curved elements are first divided into smaller ones whose corners lie on the curved element, so that round bores and
surfaces keep their area. A node on the plane counts as beyond it: a plane along element faces takes exactly
the faces of the elements before it.

The integrals over a section are kept as weights of its nodes: the displacements of any number of cases then cost a
small matrix product.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.solid.frame import Frame
from fem.solid.kernels.cutting import EDGES, curved_flags, element_ranges, section_points, section_weights
from fem.solid.region import inertia
from fem.solid.shape import Array
from mesher.named_mesh import NamedMesh

_CURVED = 1e-10


@dataclass(frozen=True, slots=True)
class Cut:
    """Quadrature on the section at `at` (mm), and integrals over it as weights of the displacements of its nodes.

    elements (p,), bary (4, p) barycentric coordinates there, weights (p,) mm^2, points (3, p) in *member* coordinates.
    nodes (k,) of the cut elements; shares (k, 4): int N_a {1, r} dA with r from the centroid, mm^2 and mm^3; slopes
    (k, 3, 3): int {1, r_y, r_z} dN_a/dx_j dA [k, moment, j]; both in member axes.
    """

    at: float
    elements: NDArray[np.int32]
    bary: Array
    weights: Array
    points: Array
    nodes: NDArray[np.int32]
    shares: Array
    slopes: Array

    @property
    def area(self) -> float:
        """mm^2"""
        return float(self.weights.sum())

    @property
    def centroid(self) -> Array:
        """(3,) member coordinates, mm."""
        return np.asarray(self.points @ self.weights / self.weights.sum())


@dataclass(frozen=True, slots=True)
class View:
    """The mesh along one member: local (n, 3) member coordinates; low, high, middle (m,): the range of each element's
    nodes along the member and the mean of its corners."""

    local: Array
    low: Array
    high: Array
    middle: Array


class Cutter:
    """Cuts one mesh at many planes."""

    def __init__(self, mesh: NamedMesh) -> None:
        self.mesh = mesh
        self.points = np.ascontiguousarray(mesh.nodes.T)
        self.tets = np.ascontiguousarray(mesh.tets.T, dtype=np.int32)
        self.curved = np.empty(self.tets.shape[0], dtype=np.bool_)
        curved_flags(self.points, self.tets, EDGES, _CURVED, self.curved)
        self._views: list[tuple[Frame, View]] = []

    def view(self, frame: Frame) -> View:
        """The mesh along a member."""
        for known, view in self._views:
            if known is frame or (
                np.array_equal(known.axes, frame.axes) and np.array_equal(known.origin, frame.origin)
            ):
                return view
        local = np.ascontiguousarray(frame.local(self.mesh.nodes).T)
        low, high, middle = (np.empty(self.tets.shape[0]) for _ in range(3))
        element_ranges(np.ascontiguousarray(local[:, 0]), self.tets, low, high, middle)
        self._views.append((frame, View(local, low, high, middle)))
        return self._views[-1][1]

    def cut(self, frame: Frame, at: float, inside: NDArray[np.bool_] | None = None) -> Cut:
        """Section of the elements (of those `inside` (m,)) at a station of the frame."""
        view = self.view(frame)
        tolerance = 1e-9 * frame.length
        before, beyond = view.low - at, view.high - at
        crossing = (before <= -tolerance) & (beyond > -tolerance)
        cut = self._cut(view, at, tolerance, 1.0, crossing, inside)
        if not cut.weights.size:  # the start of the part: nothing before the plane
            cut = self._cut(view, at, tolerance, -1.0, (beyond >= tolerance) & (before < tolerance), inside)
        return cut

    def _cut(
        self,
        view: View,
        at: float,
        tolerance: float,
        sign: float,
        crossing: NDArray[np.bool_],
        inside: NDArray[np.bool_] | None,
    ) -> Cut:
        if inside is not None:
            crossing &= inside
        chosen = np.flatnonzero(crossing).astype(np.int32)
        limits = tolerance, 1e-12 * float(np.ptp(view.local[:, 0])) if chosen.size else 0.0
        elements, bary, weights, x = section_points(view.local, self.tets, self.curved, chosen, at, limits, sign)
        total = float(weights.sum())
        arms = x - (x @ weights / total)[:, None] if weights.size else x
        nodes, shares, slopes = section_weights(view.local, self.tets, self.curved, elements, bary, weights, arms)
        return Cut(at, elements, bary, weights, x, nodes, shares, slopes)


def section_means(cut: Cut, u: Array, frame: Frame) -> tuple[Array, Array]:
    """Mean displacement and least-squares rotation (c, 3) of a section, global components, of u (c, 3, n).

    The rotation is that of the rigid motion nearest to the displacements: int r x u = (int r.r I - r r) rotation,
    r from the section's centroid.
    """
    moments = u[:, :, cut.nodes] @ cut.shares  # (c, 3, 4)
    arms = frame.axes.T @ (cut.points - cut.centroid[:, None])
    R = moments[:, :, 1:] @ frame.axes  # int u_i r_j dA
    turned = np.stack([R[:, 2, 1] - R[:, 1, 2], R[:, 0, 2] - R[:, 2, 0], R[:, 1, 0] - R[:, 0, 1]], axis=1)
    turn = np.linalg.solve(inertia(arms, cut.weights), turned.T).T
    return moments[:, :, 0] / cut.area, np.asarray(turn, dtype=float)
