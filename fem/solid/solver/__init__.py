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
        """(n, k) solutions of right-hand sides (n, k). `Stalled` is raised when it does not converge."""

    def solve_bordered(self, rhs: Array, values: Array) -> tuple[Array, Array]:
        """y (n, k) that meets the mean rows C y = values (rows, k), and the rows' multipliers (rows, k)."""

    def precondition(self, residual: Array) -> Array:
        """(n, k): a fixed symmetric positive definite approximation of A^-1 applied to (n, k)."""

    def close(self) -> None:
        """Give memory back."""
