"""The constrained system: K u + C^T m = f with u = T y + g and C u = d, for all load cases at once.

Without mean rows C this is one Cholesky factorisation. With them K alone may leave rigid motions free, so a few
springs at three far nodes are added (which makes it positive definite) and taken out again exactly: spring forces p and
multipliers m are the unknowns of a dense Schur complement of at most 9 + rows.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp

from fem.solid.factor import GAUGE_ALLOWED, RESIDUAL_ALLOWED, Cholesky, NotPositive
from fem.solid.held import free_motions
from fem.solid.shape import Array
from fem.solid.support import Constraints
from geometry.budget import Budget
from geometry.problem import SolveError
from mesher.named_mesh import NamedMesh


@dataclass(frozen=True, slots=True)
class Solution:
    """u (3 n, c) mm; mean_forces (rows, c) generalised force of each mean row *on the part*; residual and gauge.

    `residual_allowed` is `RESIDUAL_ALLOWED`, or more where rounding alone makes more of it; then `correction` is
    what one further step of refinement would change the displacements by, relative to the largest.
    """

    u: Array
    mean_forces: Array
    residual: float
    gauge: float
    backend: str
    residual_allowed: float = RESIDUAL_ALLOWED
    correction: float = 0.0


def bending_field(nodes: Array) -> Array:
    """(3, n) pure bending with anticlastic curvature along the longest direction, of size one."""
    extent = np.ptp(nodes, axis=1)
    a, b, c = np.argsort(-extent)
    x = (nodes - nodes.mean(axis=1)[:, None]) / extent[a]
    u = np.zeros_like(nodes)
    u[a] = x[a] * x[c]
    u[c] = -(x[a] ** 2 + 0.3 * (x[c] ** 2 - x[b] ** 2)) / 2
    u[b] = -0.3 * x[b] * x[c]
    return u


def _spring_unknowns(mesh: NamedMesh, T: sp.csr_matrix) -> np.ndarray:
    """Unknowns of three far, not collinear nodes that have three plain unknowns each."""
    plain = np.diff(T.indptr).reshape(-1, 3)
    nodes = np.flatnonzero((plain == 1).all(axis=1))
    x = mesh.nodes[:, nodes]
    first = int(((x - x.mean(axis=1)[:, None]) ** 2).sum(axis=0).argmax())
    away = x - x[:, [first]]
    second = int((away**2).sum(axis=0).argmax())
    line = away[:, second] / np.linalg.norm(away[:, second])
    third = int(((away - np.outer(line, line @ away)) ** 2).sum(axis=0).argmax())
    rows = (3 * nodes[[first, second, third]][:, None] + np.arange(3)).ravel()
    return T.indices[T.indptr[rows]]


def reduced(K: sp.csr_matrix, T: sp.csr_matrix) -> sp.csr_matrix:
    """T^T K T. Where T only leaves unknowns out, rows and columns are picked instead of multiplied."""
    counts = np.diff(T.indptr)
    kept = np.flatnonzero(counts)
    if counts.max(initial=0) <= 1 and (T.data == 1.0).all() and np.array_equal(T.indices, np.arange(T.shape[1])):
        place = np.full(K.shape[0], -1, dtype=np.int32)
        place[kept] = np.arange(kept.size, dtype=np.int32)
        rows = K[kept]
        columns = place[rows.indices]
        stays = columns >= 0
        starts = np.concatenate([[0], np.cumsum(stays)])[rows.indptr].astype(np.int32)
        return sp.csr_matrix((rows.data[stays], columns[stays], starts), shape=(kept.size, kept.size))
    return (T.T @ K @ T).tocsr()


def solve_system(
    K: sp.csr_matrix, f: Array, constraints: Constraints, mesh: NamedMesh, budget: Budget, backend: str = "auto"
) -> Solution:
    """Solve for the columns of f (3 n, c), N.

    Raises
    ------
    SolveError
        When the part is not held, or the residual or the forward-error gauge is off.
    """
    motions = free_motions(mesh, constraints)
    if motions:
        raise SolveError("The supports do not hold the part: " + "; ".join(motions) + ". Hold these motions.")
    T, g = constraints.T, constraints.g
    Ky = reduced(K, T)
    rhs = T.T @ (f - (K @ g)[:, None])
    size = np.asarray(T.power(2).sum(axis=0)).ravel()
    y0 = (T.T @ bending_field(mesh.nodes).T.ravel()) / size
    C = (constraints.rows @ T).toarray()
    rows = C.shape[0]
    A, springs, stiffness = Ky, np.zeros(0, dtype=np.int64), 0.0
    if rows:
        springs = _spring_unknowns(mesh, T)
        stiffness = float(np.median(Ky.diagonal()))
        A = (Ky + sp.csr_matrix((np.full(9, stiffness), (springs, springs)), shape=Ky.shape)).tocsr()
    try:
        factor = Cholesky(A, budget, backend)
    except NotPositive as error:
        raise SolveError(
            "The stiffness matrix is not positive definite although the supports hold every rigid "
            "motion: the mesh has a detached piece or an element that is nearly flat. "
            "Mesh the part again."
        ) from error
    try:
        y, multipliers, back = _solve_bordered(factor, A, rhs, A @ y0, C, constraints, springs, stiffness)
        left = rhs - Ky @ y - C.T @ multipliers
        scale = np.maximum(np.linalg.norm(rhs, axis=0), np.abs(K @ g).max() * np.sqrt(g.size))
        scale = np.where(scale > 0, scale, 1.0)
        residual = float((np.linalg.norm(left, axis=0) / scale).max())
        allowed, correction = RESIDUAL_ALLOWED, 0.0
        if not residual <= RESIDUAL_ALLOWED:
            allowed = max(allowed, float((rounding_of_product(Ky, y) / scale).max()))
            again, _, _ = _solve_bordered(factor, A, left, A @ y0, C, constraints, springs, stiffness)
            largest = np.abs(y).max(axis=0)
            correction = float((np.abs(again).max(axis=0) / np.where(largest > 0, largest, 1.0)).max())
    finally:
        factor.close()
    u = T @ y + g[:, None]
    gauge = float(np.abs(back - y0).max() / np.abs(y0).max())
    if not (residual <= allowed and correction <= GAUGE_ALLOWED):
        raise SolveError(
            f"The equations are not met: residual {residual:.2e} of the load, allowed {allowed:.0e}; correcting it "
            f"would move the part by {correction:.1e} of its largest displacement, allowed {GAUGE_ALLOWED:.0e}. "
            "The part is extremely slender, or the mesh holds a nearly flat element; mesh the part again."
        )
    if not gauge <= GAUGE_ALLOWED:
        raise SolveError(
            f"A known bending field comes back with an error of {gauge:.2e}, allowed {GAUGE_ALLOWED:.0e}: "
            "the matrix is too badly conditioned. Look for nearly flat elements; mesh the part again."
        )
    return Solution(u, -multipliers, residual, gauge, factor.backend, allowed, correction)


def rounding_of_product(K: sp.csr_matrix, y: Array) -> Array:
    """(c,) size of the rounding error that computing K y itself makes, in the norm of the residual.

    Of a very slender part the terms of K y are many powers of ten larger than the load that they add up to, and no
    solver can bring the residual below this. First-order bound with random signs: eps sqrt(terms) |K| |y| (Higham,
    Accuracy and Stability of Numerical Algorithms, ch. 3; from memory).
    """
    terms = float(np.diff(K.indptr).max(initial=1))
    return np.finfo(float).eps * np.sqrt(terms) * np.linalg.norm(abs(K) @ np.abs(y), axis=0)


def _solve_bordered(
    factor: Cholesky,
    A: sp.csr_matrix,
    rhs: Array,
    gauge: Array,
    C: Array,
    constraints: Constraints,
    springs: np.ndarray,
    stiffness: float,
) -> tuple[Array, Array, Array]:
    """y, multipliers, and the solution for the gauge's right-hand side.

    With mean rows two steps of refinement, as the springs' part is large when they carry the load alone.
    """
    if not C.shape[0]:
        both = factor.solve(np.column_stack([rhs, gauge]))
        return both[:, :-1], np.zeros((0, rhs.shape[1])), both[:, -1]
    n, k, s = A.shape[0], C.shape[0], springs.size
    weight = np.linalg.norm(C, axis=1, keepdims=True)
    scaled = C / weight
    E = np.zeros((n, s))
    E[springs, np.arange(s)] = 1.0
    B = np.hstack([scaled.T, E])  # A y + scaled^T m - E p = rhs;  scaled y = d;  E^T y - p / stiffness = 0
    both = factor.solve(np.column_stack([B, gauge]))
    W, back = both[:, :-1], both[:, -1]
    d = (constraints.row_values - constraints.rows @ constraints.g)[:, None] / weight
    sign = np.r_[np.ones(k), -np.ones(s)]
    S = (B.T @ W) * sign
    S[range(k, k + s), range(k, k + s)] += 1.0 / stiffness  # E^T y - p/c = 0 with y = W0 - W sign q
    target = np.vstack([np.repeat(d, rhs.shape[1], axis=1), np.zeros((s, rhs.shape[1]))])
    y, q = np.zeros_like(rhs), np.zeros((k + s, rhs.shape[1]))
    for _ in range(3):
        left = rhs - A @ y - (B * sign) @ q
        gap = B.T @ y - np.vstack([np.zeros((k, rhs.shape[1])), q[k:] / stiffness]) - target
        base = factor.solve(left)
        # B^T (y + base - W sign dq) - dq_p / c = target + ...
        dq = np.linalg.solve(S, B.T @ base + gap)
        y += base - (W * sign) @ dq
        q += dq
    return y, q[:k] / weight, back
