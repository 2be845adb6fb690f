"""The solid model: quadratic tetrahedra, isotropic linear elasticity, figures and stress of every load case."""

from typing import TYPE_CHECKING, Any

from fem.solid.result import CaseStress, Check, Denting, PeakPlace, SolidResult

if TYPE_CHECKING:
    from fem.solid.solve import solve_solid

__all__ = ["CaseStress", "Check", "Denting", "PeakPlace", "SolidResult", "solve_solid"]


def __getattr__(name: str) -> Any:
    # the solver brings scikit-fem and numba along: only who solves waits for them
    if name == "solve_solid":
        from fem.solid.solve import solve_solid

        return solve_solid
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
