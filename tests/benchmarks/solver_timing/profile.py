"""Where the solid model spends its time: the functions that are watched, and the bytes that they must move."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from solver_timing.watch import Bytes

STAGES: Mapping[str, Sequence[str]] = {
    "order": ["fem.solid.node_order:in_order"],
    "checks": ["fem.solid.model:check_mesh"],
    "pattern": ["fem.solid.kernels.pattern:incidence", "fem.solid.kernels.pattern:upper_pattern"],
    "assembly": ["fem.solid.stiffness:stiffness_matrix"],
    "gradients": ["fem.solid.stiffness:element_groups"],
    "supports": ["fem.solid.support:build_constraints"],
    "loads": [
        "fem.solid.load:solid_loads",
        "fem.solid.load:surface_vector",
        "fem.solid.mass:node_integrals",
        "fem.solid.mass:node_volumes",
    ],
}
"""Stages of `build_model`."""

_SOLVER = "fem.solid.solver"
INSIDE: Mapping[str, Sequence[str]] = {
    "factor": [f"{_SOLVER}.cholesky:CholeskySolver"],
    "back-substitution": [f"{_SOLVER}.cholesky:CholeskySolver.solve_bordered"],
    "reduction": [f"{_SOLVER}.elimination:Elimination", f"{_SOLVER}.elimination:Elimination.square"],
    "held motions": ["fem.solid.held:free_motions"],
    "product": ["fem.solid.block_matrix:BlockMatrix.product"],
    "smoother's product": ["fem.solid.block_matrix:SingleBlockMatrix.product"],
    "smoother's step": [f"{_SOLVER}.smoother:BlockJacobi.step"],
    "smoother's set-up": [f"{_SOLVER}.smoother:BlockJacobi", f"{_SOLVER}.cycle:Cycle"],
    "single copy": ["fem.solid.block_matrix:BlockMatrix.single"],
    "order": [f"{_SOLVER}.ordering:Ordering", f"{_SOLVER}.ordering:Ordering.matrix"],
    "linear level's matrix": [
        f"{_SOLVER}.transfer:Transfer",
        f"{_SOLVER}.transfer:Transfer.galerkin",
        "fem.solid.stiffness:linear_stiffness",
    ],
    "linear level's set-up": [f"{_SOLVER}.aggregate:AggregateSolver"],
    "linear level": [f"{_SOLVER}.aggregate:AggregateSolver.correct", f"{_SOLVER}.cholesky:CholeskySolver.solve"],
    "transfer": [
        f"{_SOLVER}.transfer:Transfer.{name}" for name in ("prolong", "restrict", "prolong_nodes", "restrict_nodes")
    ],
    "cycle": [f"{_SOLVER}.cycle:Cycle.__call__"],
    "vectors": [*(f"{_SOLVER}.conjugate:{name}" for name in ("dot", "advance", "move")), f"{_SOLVER}.cycle:largest"],
}
"""Parts of set-up and solve; a part does not count what another one takes within it."""

WHOLE = ("factor", "back-substitution", "smoother's set-up", "linear level's set-up", "linear level")
"""Parts that do count everything within them: a level below has matrices, products and smoothers of its own."""


def _product_bytes(matrix: Any, x: Any, out: Any, threads: int | None = None) -> float:
    """Every block and its column number once, x read and the product written once."""
    return float(matrix.indptr.nbytes + matrix.indices.nbytes + matrix.blocks.nbytes + x.nbytes + out.nbytes)


MOVED: Mapping[str, Bytes] = {
    "fem.solid.block_matrix:BlockMatrix.product": _product_bytes,
    "fem.solid.block_matrix:SingleBlockMatrix.product": _product_bytes,
}
"""Least bytes of a call."""

MODES: Mapping[str, Sequence[str]] = {
    "mass matrix": ["fem.solid.mass:mass_matrix"],
    "count of modes": ["fem.solid.eigen.vibration:_count"],
    "description": ["fem.solid.eigen.vibration:_modes"],
    "preconditioner": ["fem.solid.system:HeldSystem.precondition"],
    "product": ["fem.solid.block_matrix:BlockMatrix.product"],
    "other of the eigenvalue solver": ["fem.solid.eigen.pairs:extreme_pairs"],
}
"""Parts of the natural modes."""
