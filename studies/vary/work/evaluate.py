"""One variant, stage by stage, inside a job: spec, solid, mesh, beam, solve, compare, and the run folder if asked."""

from __future__ import annotations

import dataclasses
import time
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from datetime import UTC, datetime
from pathlib import Path

from fem.beam import solve_beam
from fem.beam.figures import mass_figures
from fem.beam.mesh import BeamMesh
from fem.beam.section import SectionProperties, sections_properties
from fem.solid import solve_solid
from fem.solid.kept import KeptSystem
from geometry.budget import Budget
from geometry.named_solid import NamedSolid
from geometry.outline import Outline
from geometry.part import LineLoad, Part
from geometry.problem import HaunchError, RunError
from geometry.process import LentTemplate
from mesher.attempts import CHAIN
from mesher.named_mesh import NamedMesh
from mesher.solid_mesher import mesh_solid
from studies.check.folder import refuse_existing, remove_stale, run_folder
from studies.check.record import make_result
from studies.check.result import CheckResult
from studies.check.run import Models, write_run
from studies.check.solid_child import SolidChild
from studies.check.stages import Clock, blamed_on
from studies.judge import Judgement, judge
from studies.vary.outcome import Outcome
from studies.vary.work.figures import Figures, headline
from studies.vary.work.limits import held
from studies.vary.work.order import Order
from studies.vary.work.words import suspicions

SAFER = (*CHAIN[4:], *CHAIN[2:4])
"""The attempts for a variant that has failed once: first finer and with the slower algorithms."""


class Sections:
    """Section analyses of the variant before, used again for the very same outlines and Poisson's ratio."""

    def __init__(self) -> None:
        self._asked: tuple[list[Outline], float] | None = None
        self._found: list[SectionProperties] = []

    def __call__(self, outlines: Sequence[Outline], nu: float) -> list[SectionProperties]:
        if self._asked != (list(outlines), nu):
            self._found = sections_properties(outlines, nu)
            self._asked = (list(outlines), nu)
        return self._found

    def any_of(self, outlines: Sequence[Outline], nu: float) -> list[SectionProperties]:
        """Properties of some section: for what does not depend on them."""
        return [self._found[0]] * len(outlines)


@dataclass
class Workshop:
    """What a job works with.

    Attributes
    ----------
    cad, mesh
        The host's templates.
    tell
        Told the name of each stage as it begins.
    """

    cad: LentTemplate
    mesh: LentTemplate
    tell: Callable[[str], None] = lambda stage: None
    seconds: dict[str, float] = field(default_factory=dict)
    """Processor seconds by stage, of this process and of the jobs that it started."""
    stage: str = "spec"
    made: Made | None = None
    sections: Sections = field(default_factory=Sections)
    kept: KeptSystem | None = None
    """The factor, where there is more than one variant."""

    @contextmanager
    def at(self, stage: str) -> Iterator[None]:
        """Work on a stage."""
        self.stage = stage
        self.tell(stage)
        began = self._used()
        try:
            with blamed_on(stage):
                yield
        finally:
            self.seconds[stage] = self.seconds.get(stage, 0.0) + self._used() - began

    def _used(self) -> float:
        return time.process_time() + sum(job.seconds for t in (self.cad, self.mesh) for job in t.jobs)


@dataclass
class Made:
    """Solid and mesh of one shape, or why there are none."""

    shape: object
    solid: NamedSolid | None = None
    mesh: NamedMesh | None = None
    fault: HaunchError | None = None
    stage: str = ""


def evaluate(order: Order, workshop: Workshop) -> Outcome:
    """The outcome of one variant; a fault of its own makes it a failed one."""
    workshop.seconds.clear()
    try:
        return dataclasses.replace(_evaluate(order, workshop), safer_mesh=order.safer, seconds=dict(workshop.seconds))
    except HaunchError as error:
        stage = error.stage if isinstance(error, RunError) else workshop.stage
        return Outcome(order.variant.key, "failed", stage=stage, reason=str(error), safer_mesh=order.safer,
                       seconds=dict(workshop.seconds))


def _evaluate(order: Order, workshop: Workshop) -> Outcome:
    started = datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
    variant, budget = order.variant, Budget(threads=1, memory=order.memory, seconds=order.seconds / 2)
    clock = Clock()
    with _timed(clock, workshop, "spec"):
        from geometry.spec.read import part_from_data

        part = dataclasses.replace(part_from_data(dict(variant.data)), source_text=spec_text(order))
        fullest = None if variant.fullest is None else part_from_data(dict(variant.fullest))
    named, mesh = _solid_and_mesh(part, order, budget, workshop, clock)
    with _timed(clock, workshop, "beam"):
        beam = solve_beam(part, budget, section_solver=workshop.sections)
    with _timed(clock, workshop, "solve"):
        sharp = [(edge.label, edge.points) for edge in named.sharp_edges]
        solid = solve_solid(part, mesh, budget, sharp_edges=sharp, kept=workshop.kept)
    most = None if fullest is None else _masses(fullest, budget, workshop)
    models = Models(part, named, mesh, beam, solid)
    with _timed(clock, workshop, "compare"):
        verdict = judge(part, named, mesh, solid, beam)
        result = make_result(models, verdict, order.spec_name, started, clock)
        outcome = _outcome(order, models, verdict, result, most)
    if order.run_folder is not None:
        with _timed(clock, workshop, "write"):
            _write(Path(order.run_folder), result, models, clock, order.pictures)
    return outcome


@contextmanager
def _timed(clock: Clock, workshop: Workshop, stage: str) -> Iterator[None]:
    started = time.perf_counter()
    with workshop.at(stage):
        yield
    clock.finish(stage, time.perf_counter() - started)


def shape_of(part: Part) -> object:
    """What the solid and its mesh are made from."""
    stretches = [(load.name, load.on, load.start, load.end) for load in part.loads if isinstance(load, LineLoad)]
    return part.members, stretches, part.accuracy


def _solid_and_mesh(part: Part, order: Order, budget: Budget, workshop: Workshop, clock: Clock
                    ) -> tuple[NamedSolid, NamedMesh]:
    """The ones of the variant before where the shape is the same, else new ones."""
    shape = shape_of(part)
    if workshop.made is None or workshop.made.shape != shape:
        workshop.made = made = Made(shape)
        try:
            with _timed(clock, workshop, "solid"), SolidChild(part, budget, workshop.cad) as child:
                made.solid, _ = child.result()
            with _timed(clock, workshop, "mesh"):
                made.mesh = mesh_solid(made.solid, part.accuracy, budget, chain=SAFER if order.safer else CHAIN)
        except HaunchError as fault:
            made.fault = fault
    made = workshop.made
    if made.fault is not None:
        raise made.fault
    assert made.solid is not None and made.mesh is not None
    return made.solid, made.mesh


def _masses(fullest: Part, budget: Budget, workshop: Workshop) -> tuple[float, float]:
    """(solid, beam) mass of the part at most material, t: of its CAD solid, and of the beam's own net sections."""
    with workshop.at("solid"), SolidChild(fullest, budget, workshop.cad) as child:
        volume = child.result()[0].volume
    with workshop.at("beam"):  # what is not exact integrals has no bearing on the mass, and is taken from the variant
        beam = next(mass_figures(BeamMesh.of(fullest, workshop.sections.any_of, True))).value
    return volume * fullest.material.density, beam


def _outcome(order: Order, models: Models, verdict: Judgement, result: CheckResult,
             most: tuple[float, float] | None) -> Outcome:
    figures = Figures(models.part, models.solid, models.beam, verdict, most)
    limits = held(result.limits, None if most is None else most[0])
    mesh, recipe = models.mesh, models.mesh.recipe
    return Outcome(
        key=order.variant.key, status="finished", judgement=result.judgement,
        fine=result.judgement != "suspicious" and all(limit.verdict == "met" for limit in limits),
        figures=figures.kept(order.keep or headline(models.part)), limits=limits, suspicions=suspicions(result),
        cautions=result.cautions, unknowns=mesh.nodes.size,
        mesh={"nodes": mesh.nodes.shape[1], "tets": mesh.tets.shape[1], "least_quality": float(mesh.quality.min()),
              "attempt": recipe["attempt"]["name"], "digest": recipe["mesh"],
              "failed": [f"{f['attempt']}: {f['message']}" for f in recipe["failed"]], "solver": models.solid.backend},
    )


def _write(out: Path, result: CheckResult, models: Models, clock: Clock, pictures: bool) -> None:
    out.parent.mkdir(parents=True, exist_ok=True)
    refuse_existing(out, True)
    remove_stale(out)
    with run_folder(out, True) as room:
        write_run(room, result, models, clock, pictures)


def spec_text(order: Order) -> str:
    """The spec of the variant as TOML, for its run folder."""
    if order.run_folder is None:
        return ""
    from studies.vary.work.toml import dumps

    changed = ", ".join(f"{name} = {value}" for name, value in order.variant.values.items())
    return f"# Variant {order.variant.number} of a plan: {changed}\n{dumps(order.variant.data)}"


