"""Solvers of symmetric positive definite systems behind one interface: set up once, solve many right-hand sides."""

from __future__ import annotations

from typing import Literal, Protocol

from fem.solid.shape import Array

Choice = Literal["auto", "cholesky", "multigrid"]


class Solver(Protocol):
    """A system A y = b that is set up.

    Attributes
    ----------
    name
        ``cholesky (pardiso)``, ``cholesky (lu)`` or ``multigrid``.
    reason
        Why this one: a sentence for the result.
    iterations
        Of the last `solve`; 0 of a direct solver.
    """

    name: str
    reason: str
    iterations: int

    def solve(self, rhs: Array) -> Array:
        """(n, k) solutions of right-hand sides (n, k). Raises `SolveError` when it does not converge."""

    def precondition(self, residual: Array) -> Array:
        """(n, k): a fixed symmetric positive definite approximation of A^-1 applied to (n, k)."""

    def close(self) -> None:
        """Give memory back."""
