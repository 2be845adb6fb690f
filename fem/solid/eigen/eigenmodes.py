"""What an eigenvalue study of the solid gives."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fem.mode import Mode
from fem.solid.result import Check
from fem.solid.shape import Array
from geometry.problem import SolveError

RESIDUAL_ALLOWED = {True: 1e-6, False: 1e-3}
"""Residual in the norm of the inverse stiffness, by whether the solver is direct: its square is the error of an
eigenvalue that stands alone, 1e-6 for an iterative solver."""
GUARD_ALLOWED = 1e-2
GUARDS = 2
"""Modes beyond those that are wanted, and the residual they are taken to: they tell where to count."""


class NotSettled(SolveError):
    """Eigenvalues that do not converge; `short` says which and how far they came."""

    def __init__(self, short: str) -> None:
        self.short = short
        super().__init__(f"{short} Ask for fewer modes, or mesh the part again.")


@dataclass(frozen=True, slots=True)
class Eigenmodes:
    """Modes, shapes (modes, 3, n) of largest size 1 mm, checks."""

    modes: tuple[Mode, ...]
    shapes: Array
    checks: tuple[Check, ...]


def no_modes(nodes: int) -> Eigenmodes:
    """Of a study that is not asked for, on a mesh of so many nodes."""
    return Eigenmodes((), np.zeros((0, 3, nodes)), ())
