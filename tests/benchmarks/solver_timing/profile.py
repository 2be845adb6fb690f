"""Where the solid model spends its time: the functions that are watched, and the bytes that they must move."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from solver_timing.watch import Bytes

STAGES: Mapping[str, Sequence[str]] = {
    "checks": ["fem.solid.model:check_mesh"],
    "pattern": ["fem.solid.stiffness:NodePattern"],
    "assembly": ["fem.solid.stiffness:element_groups", "fem.solid.stiffness:stiffness_matrix"],
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
    "product": ["fem.solid.system:HeldSystem.apply"],
}
"""Parts of set-up and solve."""

MOVED: Mapping[str, Bytes] = {}
"""Least bytes of a call."""
