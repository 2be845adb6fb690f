"""The job that times Haunch's solid model, from the arrays of a mesh to displacements and on to figures.

Everything runs once on a small bar first, with either solver, so that imports, compiled code and libraries are loaded.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np

from geometry.part import Vibration
from solver_timing import meshes
from solver_timing.child import Tell
from solver_timing.measure import Clock, PeakMemory, answer, triad_rate
from solver_timing.profile import INSIDE, MODES, MOVED, STAGES, WHOLE
from solver_timing.shapes import FIRST_CASE, SHAPES
from solver_timing.watch import Watch

WARM = (8, 2, 2)


def clocked(work: Callable[[], Any]) -> tuple[float, Any]:
    """Wall seconds of some work, and what it returns."""
    begun = time.perf_counter()
    done = work()
    return time.perf_counter() - begun, done


def run(job: dict[str, Any], tell: Tell) -> None:
    """Time everything of ``shape`` on ``mesh``: ``threads``, ``budget`` (MiB), ``solver``, ``repeats``, ``modes``."""
    loading, _ = clocked(_imports)
    from geometry.budget import Budget

    part = meshes.part_of(SHAPES[job["shape"]])
    budget = Budget(threads=job["threads"], memory=job["budget"])
    choice = job.get("solver", "auto")
    warming, _ = clocked(lambda: _warm_up(budget, job["modes"]))
    mesh = meshes.load(Path(job["mesh"]))
    tell(
        imports=loading,
        warm_up=warming,
        triad=triad_rate(job["threads"]),
        unknowns=mesh.nodes.size,
        tets=mesh.tets.shape[1],
    )
    for repeat in range(job["repeats"]):
        _displacements(part, mesh, budget, choice, tell, modes=job["modes"] if repeat == job["repeats"] - 1 else 0)
    if job["results"]:
        _results(part, mesh, budget, choice, tell)
    if job["both"]:
        _other(part, mesh, budget, tell)


def warm(job: dict[str, Any], tell: Tell) -> None:
    """Import and compile everything once, so that no row pays for compiling after a change of the sources."""
    loading, _ = clocked(_imports)
    from geometry.budget import Budget

    warming, _ = clocked(lambda: _warm_up(Budget(threads=job["threads"], memory=job["budget"]), job["modes"]))
    tell(imports=loading, warm_up=warming, seconds=loading + warming)


def _imports() -> None:
    import fem.solid.solve
    import geometry.spec
    from fem.solid.factor import pardiso_available

    pardiso_available()
    del fem, geometry


def _one_case(part: Any) -> Any:
    return replace(part, cases=tuple(case for case in part.cases if case.name == FIRST_CASE))


def _warm_up(budget: Any, modes: int) -> None:
    from fem.solid.model import build_model
    from fem.solid.node_order import in_order
    from fem.solid.solve import solve_solid
    from fem.solid.system import HeldSystem

    part = meshes.part_of(SHAPES["box"])
    mesh, _ = in_order(meshes.structured(part, WARM))
    model = build_model(part, mesh, budget.threads)
    for choice in ("cholesky", "multigrid"):
        system = HeldSystem(model.K, model.constraints, mesh, budget, choice)
        for loads in (_loads(model), _loads(model)[:, :1]):
            system.solve(np.ascontiguousarray(loads))
        if modes:
            _modes(model, system, budget, 1, lambda **facts: None)
        system.close()
    solve_solid(_one_case(part), mesh, budget)


def _loads(model: Any) -> Any:
    """(3 n, c) nodal forces of every case."""
    return model.forces()


def _displacements(part: Any, mesh: Any, budget: Any, choice: str, tell: Tell, modes: int) -> None:
    """Mesh arrays to displacements: one right-hand side, then all six on the same set-up, then natural modes."""
    from fem.solid.model import build_model
    from fem.solid.node_order import in_order
    from fem.solid.system import HeldSystem

    memory, clock = PeakMemory(), Clock()
    with Watch(STAGES) as watch:
        ordering, (ordered, number) = clocked(lambda: in_order(mesh))
        building, model = clocked(lambda: build_model(part, ordered, budget.threads))
        building += ordering
    loads = _loads(model)
    first = np.ascontiguousarray(loads[:, [case.name for case in part.cases].index(FIRST_CASE)][:, None])
    with Watch(INSIDE, MOVED, WHOLE) as inside:
        setting_up, system = clocked(lambda: HeldSystem(model.K, model.constraints, ordered, budget, choice))
        in_set_up = dict(inside.seconds)
        solving, solution = clocked(lambda: system.solve(first))
    try:
        end = np.unique(mesh.facets["bar.end"])
        tell(
            build=building,
            set_up=setting_up,
            solve=solving,
            displacements=building + setting_up + solving,
            processor=clock.read()[1],
            memory=memory.now(),
            stages=watch.seconds,
            stages_processor=watch.processor,
            parts_processor=inside.processor,
            missing=watch.missing + inside.missing,
            set_up_parts=in_set_up,
            solve_parts={name: spent - in_set_up[name] for name, spent in inside.seconds.items()},
            solve_calls=inside.calls,
            bytes=inside.bytes,
            solver=system.solver.name,
            reason=system.solver.reason,
            iterations=system.solver.iterations,
            residual=solution.residual,
            gauge=solution.gauge,
            **answer(solution.u.reshape(-1, 3).T[:, number], end),
        )
        six, _ = clocked(lambda: system.solve(np.ascontiguousarray(loads)))
        tell(solve_six=six, six_over_one=six / solving, six_iterations=system.solver.iterations)
        if modes:
            _modes(model, system, budget, modes, tell)
    finally:
        system.close()


def _other(part: Any, mesh: Any, budget: Any, tell: Tell) -> None:
    """Set-up and solution of one case by either solver: whether the right one was chosen."""
    from fem.solid.model import build_model
    from fem.solid.node_order import in_order
    from fem.solid.system import HeldSystem

    end = np.unique(mesh.facets["bar.end"])
    mesh, number = in_order(mesh)
    model = build_model(_one_case(part), mesh, budget.threads)
    for choice in ("multigrid", "cholesky"):
        seconds, system = clocked(lambda name=choice: HeldSystem(model.K, model.constraints, mesh, budget, name))
        try:
            solving, solution = clocked(lambda held=system: held.solve(np.ascontiguousarray(_loads(model))))
            found = answer(solution.u.reshape(-1, 3).T[:, number], end)
            tell(**{choice: {"seconds": seconds + solving, "name": system.solver.name, **found}})
        finally:
            system.close()


def _modes(model: Any, system: Any, budget: Any, count: int, tell: Tell) -> None:
    """The lowest natural frequencies on the system that is set up already."""
    from fem.solid.eigen import solid_vibration

    wanted = replace(model, part=replace(model.part, vibration=Vibration(count)))
    with Watch(MODES) as watch:
        seconds, found = clocked(lambda: solid_vibration(wanted, system, budget))
    tell(
        modes=seconds,
        modes_parts=watch.seconds,
        modes_missing=watch.missing,
        frequencies=[mode.value for mode in found.modes],
        modes_notes=[check.note for check in found.checks if check.note],
    )


def _results(part: Any, mesh: Any, budget: Any, choice: str, tell: Tell) -> None:
    """The whole solid model of one case, for what comes after the displacements."""
    from fem.solid.solve import solve_solid

    memory = PeakMemory()
    whole, result = clocked(lambda: solve_solid(_one_case(part), mesh, budget, solver=choice))
    tell(
        whole=whole,
        whole_memory=memory.now(),
        after={name: spent for name, spent in result.timings.items() if name not in ("assemble", "factor and solve")},
    )
