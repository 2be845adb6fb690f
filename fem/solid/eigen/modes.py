"""The eigenvalue studies that a part asks for, with the system of its static run."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

from fem.solid.cut import Cutter
from fem.solid.eigen.buckling import solid_buckling
from fem.solid.eigen.eigenmodes import Eigenmodes, NotSettled, no_modes
from fem.solid.eigen.motions import is_direct
from fem.solid.eigen.vibration import solid_vibration
from fem.solid.factor import TooLarge
from fem.solid.model import SolidModel
from fem.solid.shape import Array
from fem.solid.solver import Choice
from fem.solid.system import HeldSystem
from geometry.budget import Budget

__all__ = ["Eigenmodes", "solid_modes"]


def solid_modes(
    model: SolidModel,
    system: HeldSystem,
    u: Array,
    budget: Budget,
    cutter: Cutter,
    stage: Callable[[str], None],
    choice: Choice = "auto",
    backend: str = "auto",
) -> tuple[Eigenmodes, Eigenmodes]:
    """Natural frequencies and buckling, where the part asks for them; u (c, 3, n) of its cases.

    Where they do not settle with an iterative solver, they are sought again with a direct one, and a check says so.
    """
    part, nodes = model.part, model.mesh.nodes.shape[1]
    vibration = buckling = no_modes(nodes)

    def settled(solve: Callable[[HeldSystem, Choice], Eigenmodes]) -> Eigenmodes:
        try:
            return solve(system, choice)
        except NotSettled as error:
            if is_direct(system.solver.name):
                raise
            why = error.short
        try:
            direct = HeldSystem(model.K, model.constraints, model.mesh, budget, "cholesky", backend)
        except TooLarge as error:
            raise TooLarge(f"{why} The direct solver that would find them does not fit: {error}") from error
        try:
            found = solve(direct, "cholesky")
        finally:
            direct.close()
        first, *others = found.checks
        first = replace(first, note=f"{first.note}; a direct solver, as the iterative one failed: {why}")
        return Eigenmodes(found.modes, found.shapes, (first, *others))

    if part.vibration is not None:
        stage("natural frequencies")
        vibration = settled(lambda held, which: solid_vibration(model, held, budget, cutter, which, backend))
    if part.buckling:
        stage("buckling")
        buckling = settled(lambda held, which: solid_buckling(model, held, u, budget, cutter))
    return vibration, buckling
