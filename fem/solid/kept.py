"""A held system that is used again while only loads and cases change."""

from __future__ import annotations

import numpy as np
import scipy.sparse as sp

from fem.solid.model import SolidModel
from fem.solid.solver import Choice
from fem.solid.system import HeldSystem
from geometry.budget import Budget


class KeptSystem:
    """Keeps the last held system with its factor, for `fem.solid.solve_solid`.

    It is used again only where the very same equations would be set up: the same mesh, the same stiffness
    and constraint matrices bit by bit, the same budget and choice of solver; so the solution is the same bit by bit.
    Prescribed values of the supports may differ. A system that has changed its solver on the way is not used again.
    """

    def __init__(self) -> None:
        self._system: HeldSystem | None = None
        self._model: SolidModel | None = None
        self._settings: tuple[Budget, Choice, str, int | None] | None = None
        self._solver: object = None
        self.reused = 0
        """How often one was used again."""

    def system(self, model: SolidModel, budget: Budget, choice: Choice, backend: str, cases: int | None) -> HeldSystem:
        """The system of a model, with the solver that it would have by itself for so many `cases` (see `choose`): the
        numbers of a variant must not depend on what it is solved together with. It stays this object's: do not close
        it."""
        settings = (budget, choice, backend, cases)
        if self._system is not None and self._settings == settings and self._same(model, self._system):
            self.reused += 1
            self._system.constraints = model.constraints
            return self._system
        self.close()
        self._system = HeldSystem(model.K, model.constraints, model.mesh, budget, choice, backend, cases)
        self._model, self._settings, self._solver = model, settings, self._system.solver
        return self._system

    def _same(self, model: SolidModel, system: HeldSystem) -> bool:
        before = self._model
        return (
            before is not None
            and system.solver is self._solver
            and np.array_equal(before.mesh.nodes, model.mesh.nodes)
            and np.array_equal(before.mesh.tets, model.mesh.tets)
            and np.array_equal(before.K.indices, model.K.indices)
            and np.array_equal(before.K.blocks, model.K.blocks)
            and _equal(before.constraints.T, model.constraints.T)
            and _equal(before.constraints.rows, model.constraints.rows)
        )

    def close(self) -> None:
        """Give the memory back; it may be used again."""
        if self._system is not None:
            self._system.close()
        self._system = self._model = self._settings = self._solver = None


def _equal(a: sp.csr_matrix, b: sp.csr_matrix) -> bool:
    return a.shape == b.shape and all(
        np.array_equal(getattr(a, name), getattr(b, name)) for name in ("indptr", "indices", "data")
    )
