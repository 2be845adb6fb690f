"""One checked run: spec, solid, mesh, beam, solve, compare, write."""

from __future__ import annotations

import dataclasses
import sys
import threading
from collections.abc import Mapping
from concurrent.futures import ThreadPoolExecutor
from contextlib import ExitStack
from datetime import UTC, datetime
from functools import cache
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path
from types import MappingProxyType
from typing import TYPE_CHECKING

from geometry.budget import Budget
from geometry.named_solid import NamedSolid
from geometry.part import Part
from studies.check.folder import RESULT, refuse_existing, remove_stale, run_folder
from studies.check.record import SLOWER_SOLVER, kept_cases, make_result
from studies.check.result import CheckResult
from studies.check.solid_child import SolidChild, cad_template
from studies.check.stages import Clock, Event, Listener, blamed_on
from studies.check.threads import dense_products_in_one_thread
from studies.check.version import RESULTS

if TYPE_CHECKING:
    from fem.beam import BeamResult
    from fem.solid.result import SolidResult
    from fem.solid.solver import Choice
    from mesher.named_mesh import NamedMesh

PACKAGES = ("haunch", "cadquery", "cadquery-ocp", "gmsh", "scikit-fem", "numpy", "scipy", "pypardiso", "meshio",
            "matplotlib")


@dataclasses.dataclass(frozen=True, slots=True)
class Models:
    """Both models of one part, solved."""

    part: Part
    named_solid: NamedSolid
    mesh: NamedMesh
    beam: BeamResult
    solid: SolidResult


def check(part: Part | str | Path, out: str | Path, budget: Budget | None = None, listener: Listener | None = None, *,
          replace: bool = False, pictures: bool = True, solver: Choice = "auto") -> CheckResult:
    """Build both models of a part, compare them, and write the run folder `out`.

    Parameters
    ----------
    part
        A resolved part, or the path of a spec.
    out
        The run folder. It appears whole at the end, or not at all.
    budget
        Threads, memory and time that may be used.
    listener
        Hears each `Event`.
    replace
        Overwrite a finished run of that name.
    pictures
        Draw the PNG pictures.
    solver
        Of the solid model: ``auto`` chooses by size and shape of the part; ``cholesky`` or ``multigrid``.

    Raises
    ------
    SpecError
        The spec is wrong.
    RunError
        A stage failed, or `out` exists; `RunError.stage` says which. An unforeseen exception is its cause.
    """
    out, budget, clock = Path(out), budget or Budget(), Clock(listener)
    started = datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
    refuse_existing(out, replace)
    begin_loading()
    with clock.stage("spec"):
        name, resolved = _read(part)
    models = build_models(resolved, budget, clock, solver)
    with clock.stage("compare"):
        result = _compare(models, name, started, clock)
    with clock.stage("write"):
        for stale in remove_stale(out):
            clock.note("write", f"removed {stale.name}, which an earlier run to this folder left when it was killed")
        with run_folder(out, replace) as room:
            result = write_run(room, result, models, clock, pictures)
    return dataclasses.replace(result, stages=clock.times())


def _read(part: Part | str | Path) -> tuple[str, Part]:
    if isinstance(part, Part):
        return "part.toml", part
    from geometry.spec import read_part

    return Path(part).name, read_part(part)


def begin_loading() -> None:
    """Begin to load both kernels in their processes, without waiting for them. A later run finds them loaded."""
    from mesher.child import mesh_template

    cad_template().start()
    mesh_template().start()


def build_models(part: Part, budget: Budget, clock: Clock, solver: Choice = "auto") -> Models:
    """Solve both models. The solid is built and meshed, in child processes, while the beam model is solved here."""
    with ExitStack() as stack:
        clock.tell(Event("solid", "start"))
        with blamed_on("solid"):
            # Left last: a meshing job under way is ended and waited for, so that nothing of it stays behind.
            pool = stack.enter_context(ThreadPoolExecutor(1, "mesh"))
            stack.callback((stop := threading.Event()).set)
            child = stack.enter_context(SolidChild(part, budget))
        meshed = pool.submit(_build_and_mesh, child, part, budget, clock, stop)
        with clock.stage("beam"):
            from fem.beam import solve_beam

            stack.enter_context(dense_products_in_one_thread())
            beam = solve_beam(part, budget)
        with blamed_on("solve"):  # what it needs is loaded while the mesh is made
            prepare_solver(clock)
        named_solid, mesh = meshed.result()
    with clock.stage("solve"), dense_products_in_one_thread():
        from fem.solid import solve_solid

        solid = solve_solid(part, mesh, budget, progress=lambda text: clock.note("solve", text),
                            sharp_edges=[(edge.label, edge.points) for edge in named_solid.sharp_edges],
                            solver=solver)
        if solid.backend == "cholesky (lu)":
            clock.note("solve", SLOWER_SOLVER)
    return Models(part, named_solid, mesh, beam, solid)


def prepare_solver(clock: Clock) -> None:
    """Load the solver's libraries, and compile its kernels where that has not been done on this machine: a minute,
    once, and told before it begins."""
    from fem.solid import solve_solid
    from fem.solid.factor import pardiso_available
    from fem.solid.kernels.warm import is_warm, warm_up

    assert solve_solid is not None
    pardiso_available()
    if not is_warm():
        clock.tell(Event("solve", "wait", "preparing the solver's kernels (once)"))
        warm_up(lambda text: clock.tell(Event("solve", "wait", text)))


def _build_and_mesh(child: SolidChild, part: Part, budget: Budget, clock: Clock,
                    stop: threading.Event) -> tuple[NamedSolid, NamedMesh]:
    """Mesh the solid as soon as it can be; what else is told of it (slices, STEP text) is made meanwhile."""
    with blamed_on("solid"):
        early, seconds = child.meshable()
    clock.finish("solid", seconds, f"{len(early.faces)} faces, {early.volume:.6g} mm^3")
    with clock.stage("mesh"):
        from mesher import mesh_solid

        mesh = mesh_solid(early, part.accuracy, budget, stop=stop)
        clock.note("mesh", f"{mesh.tets.shape[1]} tetrahedra, {mesh.nodes.shape[1]} nodes")
    with blamed_on("solid"):
        return child.result()[0], mesh


def _compare(models: Models, name: str, started: str, clock: Clock) -> CheckResult:
    from studies.judge import judge

    verdict = judge(models.part, models.named_solid, models.mesh, models.solid, models.beam)
    return make_result(models, verdict, name, started, clock)


@cache
def versions() -> Mapping[str, str]:
    """Version of Python and of each package that a number can depend on; read once in a process."""
    found = {"python": ".".join(map(str, sys.version_info[:3])), "results": str(RESULTS)}
    for package in PACKAGES:
        try:
            found[package] = version(package)
        except PackageNotFoundError:
            found[package] = "not installed"
    return MappingProxyType(found)


def write_run(room: Path, result: CheckResult, models: Models, clock: Clock, pictures: bool) -> CheckResult:
    """Write every file of a run into the folder `room`; returns the result that names them."""
    from studies.check.fields import write_fields
    from studies.report.summary import summary

    (room / "part.step").write_bytes(models.named_solid.step)
    write_fields(room / "solid.vtu", models.mesh, models.solid, kept_cases(models.part, result.travels))
    if pictures:
        from studies.report.pictures import draw_pictures

        draw_pictures(room, models.part, models.mesh, models.solid, models.beam, result,
                      lambda text: clock.note("write", text))
    names = sorted(p.name for p in room.iterdir())
    result = dataclasses.replace(result, files=("summary.md", RESULT, *names), stages=clock.times())
    (room / "summary.md").write_text(summary(result), encoding="utf-8")
    (room / RESULT).write_text(result.to_json(), encoding="utf-8")
    return result
