"""One solved solid model: from the part and its mesh to the figures."""

from __future__ import annotations

from collections.abc import Callable
from time import perf_counter

import numpy as np

from fem.solid.balance import balance_checks, load_checks, strain_energies
from fem.solid.cut import Cutter
from fem.solid.figures import displacement_figures, reaction_figures, scalar_figures, section_places
from fem.solid.frame import member_frame
from fem.solid.model import build_model
from fem.solid.reaction import reactions
from fem.solid.result import SolidResult
from fem.solid.system import solve_system
from geometry.budget import Budget
from geometry.part import Part
from mesher.named_mesh import NamedMesh


def solve_solid(part: Part, mesh: NamedMesh, budget: Budget, progress: Callable[[str], None] | None = None,
                backend: str = "auto") -> SolidResult:
    """Solve every case of the part on its mesh.

    Parameters
    ----------
    progress
        Called with the name of each stage as it begins.
    backend
        ``auto`` (PARDISO where it is installed), ``pardiso`` or ``lu``.

    Raises
    ------
    SolveError
        When the part is not held, the mesh has slivers or detached pieces, a region is missing, or the equations are
        not solved to the accuracy that a result needs.
    """
    timings: dict[str, float] = {}
    clock = [perf_counter(), ""]

    def stage(name: str) -> None:
        now = perf_counter()
        if clock[1]:
            timings[str(clock[1])] = now - float(clock[0])
        clock[:] = [now, name]
        if name and progress is not None:
            progress(name)

    stage("assemble")
    model = build_model(part, mesh)
    cases = tuple(case.name for case in part.cases)
    stage("factor and solve")
    n = mesh.nodes.shape[1]
    total = (model.mechanical + model.thermal).reshape(len(cases), 3 * n).T
    solution = solve_system(model.K, total, model.constraints, mesh, budget, backend)
    u = np.ascontiguousarray(solution.u.T.reshape(len(cases), n, 3).transpose(0, 2, 1))
    stage("reactions and balance")
    reacting = reactions(model, solution.u, solution.mean_forces)
    energy, thermal_part = strain_energies(model, u)
    checks = [*load_checks(model), *balance_checks(model, u, reacting, energy, thermal_part, solution)]
    stage("sections")
    cutter = Cutter(mesh)
    sections = {
        member.name: {at: cutter.cut(member_frame(member), at) for at in section_places(model)[member.name]}
        for member in part.members
    }
    figures = [
        *displacement_figures(model, cutter, u, sections),
        *reaction_figures(model, reacting),
        *scalar_figures(model, energy),
    ]
    stage("")
    work = np.einsum("cni,cin->c", model.mechanical, u) / 2
    empty, flat = np.zeros((len(cases), 0, n)), np.zeros((len(cases), n))
    return SolidResult(cases, mesh, u, empty, flat, flat, flat, empty, tuple(figures), (), (), (),
                       np.zeros((0, 0, len(cases), 6)), model.mass, model.centre_of_mass, work, energy,
                       tuple(checks), timings, solution.backend)
