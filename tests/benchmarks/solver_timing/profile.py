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

INSIDE: Mapping[str, Sequence[str]] = {
    "factor": ["fem.solid.factor:Cholesky"],
    "back-substitution": ["fem.solid.factor:Cholesky.solve"],
    "reduction": ["fem.solid.solver.elimination:Elimination", "fem.solid.solver.elimination:Elimination.square"],
    "held": ["fem.solid.held:free_motions"],
    "product": ["fem.solid.kernels.product:product"],
}
"""Parts of set-up and solve."""



def _product_bytes(indptr: Any, indices: Any, blocks: Any, x: Any, out: Any, threads: int) -> float:
    """Every block and its column number once, x read and the product written once."""
    return float(indptr.nbytes + indices.nbytes + blocks.nbytes + x.nbytes + out.nbytes)


MOVED: Mapping[str, Bytes] = {"fem.solid.kernels.product:product": _product_bytes}
"""Least bytes of a call."""
