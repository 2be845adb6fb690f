"""A sweep over many variants: is one process with all threads better, or one process a core with one thread each?"""

from __future__ import annotations

import argparse
import tempfile
import time
from pathlib import Path
from typing import Any

from solver_timing import meshes
from solver_timing.child import Tell, start
from solver_timing.shapes import SHAPES

SECONDS, SIZE = 30.0, "small"
"""How long each way solves variants of the box, and which mesh it is."""


def sweep(job: dict[str, Any], tell: Tell) -> None:
    """Solve the mesh over and over for ``seconds``, after a warm-up; tells how many and in what time."""
    from fem.solid.solve import solve_solid
    from geometry.budget import Budget

    part, mesh = meshes.part_of(SHAPES["box"]), meshes.load(Path(job["mesh"]))
    budget = Budget(threads=job["threads"], memory=job["budget"])
    solve_solid(part, mesh, budget)
    tell(ready=True)
    Path(job["ready"]).touch()
    while not Path(job["go"]).exists():
        time.sleep(0.01)
    begun, count = time.perf_counter(), 0
    while time.perf_counter() - begun < job["seconds"]:
        solve_solid(part, mesh, budget)
        count += 1
    tell(count=count, seconds=time.perf_counter() - begun)


def _rate(folder: Path, mesh: Path, processes: int, threads: int, memory: int) -> float:
    """Variants a second of so many processes at once, all of which begin together."""
    go = folder / f"go-{processes}"
    ready = [folder / f"ready-{processes}-{k}" for k in range(processes)]
    job = {"mesh": str(mesh), "seconds": SECONDS, "budget": memory, "go": str(go)}
    limit = 10 * SECONDS
    running = [start("sweep", {**job, "ready": str(mark)}, threads, limit, 1.3 * memory) for mark in ready]
    begun = time.monotonic()
    while not all(mark.exists() for mark in ready) and time.monotonic() - begun < limit:
        time.sleep(0.05)
        if any(child.process.poll() is not None for child in running):
            break
    go.touch()
    done = [child.wait() for child in running]
    for outcome in done:
        if "count" not in outcome.facts:
            raise RuntimeError(f"a sweep with {threads} threads gave nothing: {outcome.failure}")
    return float(sum(outcome.facts["count"] / outcome.facts["seconds"] for outcome in done))


def compare(options: argparse.Namespace) -> str:
    """A sentence with both rates."""
    with tempfile.TemporaryDirectory(prefix="solver-time-") as name:
        folder = Path(name)
        mesh = folder / "box.npz"
        job = {"shape": "box", "size": SIZE, "mesh": str(mesh)}
        made = start("mesh", job, 1, 300, 8000).wait()
        if made.failure:
            raise RuntimeError(f"the mesh was not made: {made.failure}")
        together = _rate(folder, mesh, 1, options.threads, options.memory)
        apart = _rate(folder, mesh, options.threads, 1, options.memory)
    return (
        f"Sweep of the box with {made.facts['unknowns']} unknowns, six cases, mesh to figures: "
        f"{60 * together:.1f} variants a minute in one process with {options.threads} threads, {60 * apart:.1f} in "
        f"{options.threads} processes with one thread each ({apart / together:.2f} times)"
    )
