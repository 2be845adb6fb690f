"""One solved solid model: from the part and its mesh to the figures."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from time import perf_counter

import numpy as np

from fem.solid.balance import balance_checks, load_checks, strain_energies
from fem.solid.cut import Cutter
from fem.solid.denting import denting
from fem.solid.edge_stress import nominal_figures, notch_figures
from fem.solid.eigen import solid_modes
from fem.solid.figures import displacement_figures, reaction_figures, scalar_figures, section_force_figures
from fem.solid.kept import KeptSystem
from fem.solid.model import build_model
from fem.solid.node_order import as_given, in_order
from fem.solid.peak import case_stresses, node_sizes, peak_places, singular_nodes, singular_places
from fem.solid.reaction import reactions
from fem.solid.result import SolidResult
from fem.solid.sections import member_sections, section_forces, section_motions
from fem.solid.shape import Array
from fem.solid.solver import Choice
from fem.solid.stress import nodal_stress, principal_stresses, von_mises
from fem.solid.system import HeldSystem
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
    given, (mesh, number) = mesh, in_order(mesh)
    model = build_model(part, mesh, budget.threads)
    cases = tuple(case.name for case in part.cases)
    stage("factor and solve")
    n = mesh.nodes.shape[1]
    total = (model.mechanical + model.thermal).reshape(len(cases), 3 * n).T
    if kept is None:
        count = None if part.vibration or part.buckling else len(cases)
        system = HeldSystem(model.K, model.constraints, mesh, budget, solver, backend, count)
    else:
        system = kept.system(model, budget, solver, backend)
    try:
        solution = system.solve(total, model.change != 0)
        u = np.ascontiguousarray(solution.u.T.reshape(len(cases), n, 3).transpose(0, 2, 1))
        cutter = Cutter(mesh)
        vibration, buckling = solid_modes(model, system, u, budget, cutter, stage, solver, backend)
    finally:
        if kept is None:
            system.close()
    stage("reactions and balance")
    reacting = reactions(model, solution.u, solution.mean_forces)
    energy, thermal_part = strain_energies(model, u, cutter, budget.threads)
    checks = [*load_checks(model), *balance_checks(model, u, reacting, energy, thermal_part, solution)]
    stage("stress")
    stress, spread, lost = nodal_stress(model, u)
    energy_error = lost / np.where(energy > 0, energy, np.inf)
    mises, principal = von_mises(stress, axis=1), principal_stresses(stress, budget.threads)
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
        tresca=principal[:, 0] - principal[:, 2],
        principal=principal,
        figures=figures,
        peaks=tuple(peak_places(model, mises, principal, places, near, budget.threads)),
        case_stress=tuple(case_stresses(model, mises, near)),
        denting=tuple(denting(model, u, sections, motions)),
        section_gap=gap,
        mass=model.mass,
        centre_of_mass=model.centre_of_mass,
        external_work=np.einsum("cni,cin->c", model.mechanical, u) / 2,
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
