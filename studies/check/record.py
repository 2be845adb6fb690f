"""From two solved models and the judge's words to the record of the run."""

from __future__ import annotations

import dataclasses
from collections.abc import Sequence
from typing import TYPE_CHECKING

from fem.figure import Figure
from geometry.part import Case, Part
from studies.check.result import CaseStress, CheckResult, Denting, MeshSummary
from studies.check.stages import Clock
from studies.check.studied import SolverSummary, TravelSummary

if TYPE_CHECKING:
    from fem.solid.result import SolidResult
    from studies.check.run import Models
    from studies.judge import Judgement

SLOWER_SOLVER = ("MKL PARDISO could not be loaded, so SciPy's sparse LU solved the solid model: "
                 "the same equations, but slower and with more memory")

RESIDUAL, GAUGE = "residual of the equations over the load", "error of a known bending field"
"""Names of the solid model's checks of its solver."""


def make_result(models: Models, verdict: Judgement, name: str, started: str, clock: Clock) -> CheckResult:
    """The record of a run, without its files.

    Of the positions of a travelling load the figures are left out (`envelopes` holds their extremes), and peaks,
    denting and stresses are those of the position that governs.
    """
    from studies.check.run import versions

    part, mesh, solid = models.part, models.mesh, models.solid
    kept = kept_cases(part, verdict.travels)
    still = {case.name for case in part.cases if case.travel is None} | {""}
    return CheckResult(
        title=part.title, spec_name=name, spec_text=part.source_text, parameters=dict(part.parameters),
        accuracy=part.accuracy, material=dataclasses.asdict(part.material),
        cases=dict(declared_factors(case) for case in part.cases),
        solid_figures=_of(solid.figures, still), beam_figures=_of(models.beam.figures, still),
        pairs=tuple(verdict.pairs), limits=tuple(verdict.limits), checks=tuple(verdict.checks),
        peaks=tuple(p for p in verdict.peaks if p.case in kept),
        case_stress=tuple(CaseStress(c.case, c.established, c.everywhere, c.yield_factor_established,
                                     c.yield_factor_everywhere) for c in solid.case_stress if c.case in kept),
        denting=tuple(Denting(d.case, d.region, d.value) for d in solid.denting if d.case in kept),
        cautions=(*verdict.cautions, *((f"{SLOWER_SOLVER}.",) if solid.backend == "cholesky (lu)" else ())),
        notes=tuple(models.beam.notes),
        mesh=MeshSummary(mesh.nodes.shape[1], mesh.tets.shape[1], mesh.nodes.size, float(mesh.quality.min()),
                         mesh.volume, dict(mesh.recipe)),
        stages=clock.times(), versions=versions(), started=started,
        modes=tuple(verdict.modes), travels=tuple(verdict.travels), envelopes=tuple(verdict.envelopes),
        solver=_solver(solid),
    )


def declared_factors(case: Case) -> tuple[str, dict[str, float]]:
    """The case as the spec declares it, and its factors: a position under the names of the case and the load."""
    if case.travel is None:
        return case.name, dict(case.factors)
    return case.travel.case, {name.partition("@")[0]: factor for name, factor in case.factors.items()}


def kept_cases(part: Part, travels: Sequence[TravelSummary]) -> set[str]:
    """Cases that the record holds peaks and stresses of: those that stand still, and the governing positions."""
    governing = {(travel.case, travel.governing) for travel in travels}
    return {case.name for case in part.cases
            if case.travel is None or (case.travel.case, case.travel.position) in governing}


def _of(figures: tuple[Figure, ...], cases: set[str]) -> tuple[Figure, ...]:
    return tuple(figure for figure in figures if figure.key.case in cases)


def _solver(solid: SolidResult) -> SolverSummary:
    values = {check.name: check.value for check in solid.checks}
    return SolverSummary(solid.backend, solid.backend_reason, values.get(RESIDUAL), values.get(GAUGE))
