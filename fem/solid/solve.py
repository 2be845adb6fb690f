"""One solved solid model: from the part and its mesh to the figures."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from time import perf_counter

import numpy as np

from fem.solid.balance import balance_checks, load_checks, strain_energies
from fem.solid.cut import Cutter
from fem.solid.denting import denting
from fem.solid.edge_stress import nominal_figures, notch_figures
from fem.solid.eigen import solid_modes
from fem.solid.factor import TooLarge
from fem.solid.figures import displacement_figures, reaction_figures, scalar_figures, section_force_figures
from fem.solid.kept import KeptSystem
from fem.solid.model import SolidModel, build_model
from fem.solid.nodal_forces import turns
from fem.solid.node_order import as_given, in_order
from fem.solid.peak import case_stresses, node_sizes, peak_places, singular_nodes, singular_places
from fem.solid.reaction import reactions
from fem.solid.result import SolidResult
from fem.solid.sections import member_sections, section_forces, section_motions
from fem.solid.shape import Array
from fem.solid.solver import Choice
from fem.solid.stress import nodal_stress, von_mises
from fem.solid.system import HeldSystem, Solution
from geometry.budget import Budget
from geometry.part import Part
from mesher.named_mesh import NamedMesh


def solve_solid(
    part: Part,
    mesh: NamedMesh,
    budget: Budget,
    progress: Callable[[str], None] | None = None,
    backend: str = "auto",
    sharp_edges: Sequence[tuple[str, Array]] = (),
    solver: Choice = "auto",
    kept: KeptSystem | None = None,
) -> SolidResult:
    """Solve every case of the part on its mesh.

    Parameters
    ----------
    progress
        Called with the name of each stage as it begins.
    backend
        Of the direct solver: ``auto`` (PARDISO where it is installed), ``pardiso`` or ``lu``.
    sharp_edges
        (label, points (k, 3) in mm) of re-entrant edges without a radius: peaks near them are marked.
    solver
        ``auto`` chooses by size and shape; ``cholesky`` or ``multigrid`` is taken as told.
    kept
        Keeps the factor for the next call, and gives that of the call before where the equations are the same.

    Raises
    ------
    SolveError
        When the part is not held, the mesh has slivers or detached pieces, a region is missing, the equations are not
        solved to the accuracy that a result needs, or modes that are asked for are not found.
    """
    timings: dict[str, float] = {}
    begun, running = perf_counter(), ""

    def stage(name: str) -> None:
        nonlocal begun, running
        now = perf_counter()
        if running:
            timings[running] = now - begun
        begun, running = now, name
        if name and progress is not None:
            progress(name)

    stage("assemble")
    _refuse_results(len(part.cases), mesh.nodes.shape[1], budget)
    given, (mesh, number) = mesh, in_order(mesh)
    model = build_model(part, mesh, budget.threads)
    cases = tuple(case.name for case in part.cases)
    stage("factor and solve")
    count = None if part.vibration or part.buckling else len(cases)
    if kept is None:
        system = HeldSystem(model.K, model.constraints, mesh, budget, solver, backend, count)
    else:
        system = kept.system(model, budget, solver, backend, count)
    try:
        u, solution = _displacements(model, system)
        cutter = Cutter(mesh)
        vibration, buckling = solid_modes(model, system, u, budget, cutter, stage, solver, backend)
    finally:
        if kept is None:
            system.close()
    stage("reactions and balance")
    reacting = reactions(model, u, solution.mean_forces)
    energy, thermal_part = strain_energies(model, u, cutter, budget.threads)
    checks = [*load_checks(model), *balance_checks(model, u, reacting, energy, thermal_part, solution)]
    stage("stress")
    stress, spread, lost = nodal_stress(model, u)
    energy_error = lost / np.where(energy > 0, energy, np.inf)
    mises = np.empty_like(spread)
    for k in range(len(cases)):
        mises[k] = von_mises(stress[k])
    stage("sections")
    sections = member_sections(model, cutter, budget.threads)
    motions = section_motions(model, u, sections)
    forces, gap = section_forces(model, u, reacting, sections, cutter, budget.threads)
    stage("figures")
    figures = (
        *displacement_figures(model, motions, energy_error),
        *reaction_figures(model, reacting),
        *section_force_figures(model, forces),
        *nominal_figures(model, stress, spread),
        *notch_figures(model, stress, spread),
        *scalar_figures(model, energy, energy_error),
    )
    sizes = node_sizes(mesh)
    places = singular_places(model, sharp_edges)
    near = singular_nodes(mesh, places, sizes)
    result = SolidResult(
        cases=cases,
        mesh=mesh,
        u=u,
        stress=stress,
        stress_error=spread,
        energy_error=energy_error,
        von_mises=mises,
        figures=figures,
        peaks=tuple(peak_places(model, mises, stress, places, near, budget.threads)),
        case_stress=tuple(case_stresses(model, mises, near)),
        denting=tuple(denting(model, u, sections, motions)),
        section_gap=gap,
        mass=model.mass,
        centre_of_mass=model.centre_of_mass,
        external_work=np.array([model.mechanical.work(k, u[k]) for k in range(len(cases))]) / 2,
        strain_energy=energy,
        checks=(*checks, *vibration.checks, *buckling.checks),
        timings=timings,
        backend=solution.backend,
        backend_reason=solution.reason,
        vibration=vibration.modes,
        buckling=buckling.modes,
        vibration_shapes=vibration.shapes,
        buckling_shapes=buckling.shapes,
    )
    result = as_given(result, given, number)
    stage("")
    return result


def _refuse_results(cases: int, nodes: int, budget: Budget) -> None:
    """Raises `TooLarge` when displacements, stresses, their spread and size, and reactions would not fit."""
    need = 8 * 14 * cases * nodes / 2**20
    if need > budget.memory:
        raise TooLarge(
            f"The results of {cases} load cases at {nodes} nodes take about {need:.0f} MiB and the budget is "
            f"{budget.memory} MiB. Raise the memory, ask for a coarser accuracy, or for fewer cases or positions of a "
            "travelling load."
        )


def _displacements(model: SolidModel, system: HeldSystem) -> tuple[Array, Solution]:
    """u (c, 3, n) of all cases, solved a few at a time, and the rest of the solution: of its measures the worst."""
    c, n = len(model.part.cases), model.mesh.nodes.shape[1]
    u, found = np.empty((c, 3, n)), []
    for some in turns(c):
        solution = system.solve(model.forces(some), model.change[some] != 0)
        u[some] = solution.u.T.reshape(solution.u.shape[1], n, 3).transpose(0, 2, 1)
        found.append(replace(solution, u=u[:0]))
    return u, replace(
        found[-1],
        mean_forces=np.hstack([each.mean_forces for each in found]),
        residual=max(each.residual for each in found),
        gauge=max(each.gauge for each in found),
        residual_allowed=max(each.residual_allowed for each in found),
        correction=max(each.correction for each in found),
    )
