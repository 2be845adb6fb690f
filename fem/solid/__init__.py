"""The solid model: quadratic tetrahedra, isotropic linear elasticity, figures and stress of every load case."""

from fem.solid.result import CaseStress, Check, Denting, PeakPlace, SolidResult
from fem.solid.solve import solve_solid

__all__ = ["CaseStress", "Check", "Denting", "PeakPlace", "SolidResult", "solve_solid"]
