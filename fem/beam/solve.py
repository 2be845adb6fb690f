"""The beam model of a part, start to end."""

from __future__ import annotations

import time

import numpy as np

from fem.beam.along import SectionSolver
from fem.beam.cases import solve_cases
from fem.beam.causes import find_causes, find_mode_causes
from fem.beam.figures import all_figures, diagram, energies, line_values, properties_table
from fem.beam.mesh import BeamMesh
from fem.beam.modes import beam_vibration, buckling_studies
from fem.beam.result import BeamResult
from fem.beam.section import sections_properties
from fem.beam.stress import nominal_shear
from fem.mode import Mode
from geometry.budget import Budget
from geometry.part import Part


def solve_beam(
    part: Part,
    budget: Budget | None = None,
    *,
    shear: bool = True,
    section_solver: SectionSolver = sections_properties,
) -> BeamResult:
    """Solve every case of a part with the beam model.

    Parameters
    ----------
    budget
        Not needed: the beam model is small.
    shear
        False leaves the shear flexibility out (for comparison with Euler-Bernoulli formulas).
    section_solver
        Section analysis of many outlines (see `fem.beam.section.sections_properties`).

    Raises
    ------
    RunError
        Stage ``beam``: what the beam model cannot represent, or a region that does not exist.
    SolveError
        The supports leave a motion free or contradict one another.
    """
    clock = time.perf_counter()
    mesh = BeamMesh.of(part, section_solver, shear)
    built = time.perf_counter()
    solved = solve_cases(mesh)
    line = line_values(solved)
    figures, notes = all_figures(solved, line)
    causes = find_causes(mesh, line, lambda changed: line_values(solve_cases(changed)))
    energy, shear_stress = energies(solved), nominal_shear(solved)
    solve_done = time.perf_counter()
    vibration, buckling, why = _modes(part, mesh)
    notes += why
    causes += find_mode_causes(mesh, vibration, buckling)
    depth = max(float(np.ptp(s.extremes[:2, 1])) for s in mesh.sections.solved)
    mass = next(f.value for f in figures if f.key.quantity == "mass")
    return BeamResult(
        figures=tuple(figures),
        diagrams={case.name: diagram(solved, k) for k, case in enumerate(part.cases)},
        properties=properties_table(mesh),
        mass=mass,
        shear_share={case.name: float(e[1] / e.sum()) if e.sum() else 0.0
                     for case, e in zip(part.cases, energy.T, strict=True)},
        nominal_shear={case.name: shear_stress[..., k] for k, case in enumerate(part.cases)},
        slenderness=mesh.length / depth,
        causes=causes,
        notes=tuple(notes),
        seconds={"sections": built - clock, "solve": solve_done - built,
                 "modes": time.perf_counter() - solve_done},
        vibration=vibration,
        buckling=buckling,
    )


def _modes(part: Part, mesh: BeamMesh) -> tuple[tuple[Mode, ...], tuple[Mode, ...], list[str]]:
    """Natural vibrations and buckling shapes that the part asks for, and what the beam cannot say about them."""
    notes = []
    vibration: tuple[Mode, ...] = ()
    if part.vibration is not None and part.material.density > 0.0:
        vibration = beam_vibration(part, mesh)
    elif part.vibration is not None:
        notes.append(f"natural frequencies: material {part.material.name} has no density")
    buckling, why = buckling_studies(part, mesh)
    notes += why
    if part.buckling or part.vibration is not None:
        words = "modes: sections keep their shape, so that waves of a wall by itself are outside the beam"
        if part.buckling:
            words += "; deflection before buckling is left out"
            if any(piece.open_thin for piece in mesh.sections.pieces):
                words += ", and so is the stress of restrained warping before it"
        notes.append(words)
    return vibration, buckling, notes
