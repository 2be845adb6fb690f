"""Where the solid model spends its time: the functions that are watched, and the bytes that they must move."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from solver_timing.watch import Bytes

STAGES: Mapping[str, Sequence[str]] = {
    "checks": ["fem.solid.model:check_mesh"],
    "pattern": ["fem.solid.kernels.pattern:incidence", "fem.solid.kernels.pattern:upper_pattern"],
    "assembly": ["fem.solid.stiffness:stiffness_matrix"],
    "gradients": ["fem.solid.stiffness:element_groups"],
    "supports": ["fem.solid.support:build_constraints"],
    "loads": [
        "fem.solid.load:solid_loads",
        "fem.solid.load:surface_vector",
        "fem.solid.model:mass_vector",
        "fem.solid.model:thermal_vector",
    ],
}
"""Stages of `build_model`."""

_MULTIGRID = "fem.solid.solver.multigrid:MultigridSolver"
_DIRECT = "fem.solid.solver.cholesky:CholeskySolver"
INSIDE: Mapping[str, Sequence[str]] = {
    "factor": [_DIRECT, "fem.solid.factor:Cholesky"],
    "back-substitution": [f"{_DIRECT}.solve_bordered", "fem.solid.factor:Cholesky.solve"],
    "reduction": ["fem.solid.solver.elimination:Elimination", "fem.solid.solver.elimination:Elimination.square"],
    "held motions": ["fem.solid.held:free_motions"],
    "product": ["fem.solid.block_matrix:BlockMatrix.product"],
    "smoother's product": ["fem.solid.block_matrix:SingleBlockMatrix.product"],
    "smoother's step": ["fem.solid.solver.smoother:BlockJacobi.step"],
    "smoother's set-up": ["fem.solid.solver.smoother:BlockJacobi", "fem.solid.solver.smoother:BlockJacobi.largest"],
    "single copy": ["fem.solid.block_matrix:BlockMatrix.single"],
    "linear level": ["fem.solid.solver.transfer:Transfer", "fem.solid.solver.transfer:Transfer.galerkin"],
    "transfer": ["fem.solid.solver.transfer:Transfer.prolong", "fem.solid.solver.transfer:Transfer.restrict"],
    "cycle": [f"{_MULTIGRID}._cycle"],
    "vectors": [f"fem.solid.solver.conjugate:{name}" for name in ("dot", "advance", "move")],
    "multigrid": [_MULTIGRID],
    "held system": ["fem.solid.system:HeldSystem"],
}
"""Parts of set-up, solve and natural modes; a part does not count what is named above it. "back-substitution" is the
direct solver, which with multigrid serves the linear level."""


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
