"""Where the time of a check goes. A script: ``python tests/benchmarks/check_time.py [PART.toml] [--repeats N]``.

Start-up (imports, finding MKL, both kernels' template processes) is timed on its own; then every stage runs one after
the other in the warm process, with its wall and CPU seconds. Solid and meshes are made as in any run: each job in a
process of its own, copied from a template that has the kernel loaded; their CPU seconds count. Then the whole chain,
spec to written results, is timed as `studies.check.run.check` runs it in this warm process, stages side by side.
Pictures are left out unless asked for. A whole run in a new process, start-up and all, ends the list.

Seconds say little about another machine: beside them stand ratios to two reference kernels timed in the same
run, one bound by arithmetic (a dense matrix product) and one by memory (``a = b + s c`` on long vectors). On a machine
that others use too, the CPU seconds are the ones to compare.
"""

from __future__ import annotations

import argparse
import importlib
import os
import resource
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any, NamedTuple

ROOT = Path(__file__).resolve().parents[2]
DEMO = ROOT / "studies" / "examples" / "camera_arm.toml"
SMALL = ROOT / "studies" / "examples" / "cantilever.toml"
LIMIT = 900  # s for one check
SIDE_BY_SIDE = (("beam",), ("solid", "mesh"))
RUN = """
import sys
from geometry.budget import Budget
from studies.check.run import check
check(sys.argv[1], sys.argv[2], Budget(threads=int(sys.argv[3])), pictures=sys.argv[4] == "1")
"""


class Spent(NamedTuple):
    """Seconds on the wall, and CPU seconds of this process and its ended children."""

    wall: float
    cpu: float


def timed(work: Callable[[], Any]) -> tuple[Spent, Any]:
    """What some work takes, and what it returns."""
    wall, cpu = time.perf_counter(), _cpu()
    answer = work()
    return Spent(time.perf_counter() - wall, _cpu() - cpu), answer


def _cpu() -> float:
    """Of this process, of its ended children, and of the templates with their ended jobs."""
    used = [resource.getrusage(who) for who in (resource.RUSAGE_SELF, resource.RUSAGE_CHILDREN)]
    return sum(u.ru_utime + u.ru_stime for u in used) + sum(map(_cpu_of, _templates()))


def _templates() -> list[int]:
    owner = sys.modules.get("geometry.process.owner")
    return [] if owner is None else [t.pid for t in owner._shared.values() if t.pid is not None]


def _cpu_of(pid: int) -> float:
    """CPU seconds of another process and of its children that have ended (Linux)."""
    fields = Path(f"/proc/{pid}/stat").read_text(encoding="ascii").rpartition(")")[2].split()
    return sum(map(int, fields[11:15])) / os.sysconf("SC_CLK_TCK")


def best(kernel: Callable[[], object], repeats: int = 5) -> Spent:
    """Shortest of several times: the one least disturbed by others."""
    times = [timed(kernel)[0] for _ in range(repeats)]
    return Spent(min(t.wall for t in times), min(t.cpu for t in times))


def reference_times() -> tuple[Spent, Spent]:
    """Times of a 1500 x 1500 matrix product (6.75 GFLOP) and of a triad on 2e7 doubles (480 MB moved)."""
    import numpy as np

    rng = np.random.default_rng(0)
    a, b = rng.random((1500, 1500)), rng.random((1500, 1500))
    c, d, out = rng.random(20_000_000), rng.random(20_000_000), np.empty(20_000_000)

    def triad() -> None:
        np.multiply(d, 3.0, out=out)
        np.add(c, out, out=out)

    return best(lambda: a @ b), best(triad)


def start_up() -> dict[str, Spent]:
    """Load everything that a check loads."""

    def load() -> None:
        for name in ("geometry.spec", "mesher", "fem.beam", "fem.solid", "studies.check.run", "studies.judge"):
            importlib.import_module(name)
        from fem.solid.factor import pardiso_available

        pardiso_available()

    def kernels() -> None:
        from geometry.budget import Budget
        from geometry.spec import read_part
        from studies.check.run import begin_loading

        begin_loading()
        part = read_part(SMALL)
        _mesh(_solid(part, Budget()), part, Budget())

    return {"Haunch": timed(load)[0], "both kernels, and a first small mesh": timed(kernels)[0]}


def _solid(part: Any, budget: Any) -> Any:
    from studies.check.solid_child import SolidChild

    with SolidChild(part, budget) as child:
        return child.result()[0]


def _mesh(solid: Any, part: Any, budget: Any) -> Any:
    from mesher import mesh_solid

    return mesh_solid(solid, part.accuracy, budget)


def stages(part: Path, threads: int, pictures: bool) -> tuple[dict[str, Spent], str]:
    """Times of each stage, one after the other, and the size of the mesh in words."""
    from fem.beam import solve_beam
    from fem.beam.section import integrals
    from fem.solid import solve_solid
    from geometry.budget import Budget
    from geometry.spec import read_part
    from studies.check import run
    from studies.check.stages import Clock

    integrals._integrals.cache_clear()  # a user's run begins without them
    budget, clock, spent = Budget(threads=threads), Clock(), {}
    spent["spec"], resolved = timed(lambda: read_part(part))
    spent["solid"], solid = timed(lambda: _solid(resolved, budget))
    spent["mesh"], mesh = timed(lambda: _mesh(solid, resolved, budget))
    spent["beam"], beam = timed(lambda: solve_beam(resolved, budget))
    sharp = [(edge.label, edge.points) for edge in solid.sharp_edges]
    spent["solve"], solved = timed(lambda: solve_solid(resolved, mesh, budget, sharp_edges=sharp))
    models = run.Models(resolved, solid, mesh, beam, solved)
    spent["compare"], result = timed(lambda: run._compare(models, part.name, "", clock))
    with tempfile.TemporaryDirectory() as room:
        spent["write"], _ = timed(lambda: run.write_run(Path(room), result, models, clock, pictures))
    parts = ", ".join(f"{name} {seconds:.2f}" for name, seconds in solved.timings.items())
    size = f"{mesh.tets.shape[1]} tetrahedra, {mesh.nodes.size} displacements\nwithin solve (wall): {parts}"
    return spent, size


def warm_chain(part: Path, threads: int, pictures: bool) -> Spent:
    """Spec to written results as a run does it, in this process, which has done it before."""
    from fem.beam.section import integrals
    from geometry.budget import Budget
    from studies.check.run import check

    integrals._integrals.cache_clear()
    with tempfile.TemporaryDirectory() as folder:
        return timed(lambda: check(part, Path(folder) / "timed.run", Budget(threads=threads), pictures=pictures))[0]


def whole_run(part: Path, threads: int, pictures: bool) -> Spent:
    """A run in a process of its own, start-up included."""
    with tempfile.TemporaryDirectory() as folder:
        words = [sys.executable, "-c", RUN, str(part), str(Path(folder) / "timed.run"), str(threads),
                 str(int(pictures))]
        return timed(lambda: subprocess.run(words, check=True, timeout=LIMIT, cwd=ROOT))[0]


def table(runs: list[dict[str, Spent]], product: Spent, triad: Spent) -> str:
    """Medians over the runs, and their ratios in CPU seconds to the reference kernels."""
    rows = {name: Spent(statistics.median(r[name].wall for r in runs), statistics.median(r[name].cpu for r in runs))
            for name in runs[0]}
    beside = [name for names in SIDE_BY_SIDE for name in names]
    rest = sum(spent.wall for name, spent in rows.items() if name not in beside)
    longest = max(sum(rows[name].wall for name in names) for names in SIDE_BY_SIDE)
    rows["check"] = Spent(rest + longest, sum(spent.cpu for spent in rows.values()))
    lines = [f"{'stage':<10}{'wall s':>9}{'CPU s':>9}{'CPU / product':>15}{'CPU / triad':>13}"]
    for name, (wall, cpu) in rows.items():
        lines.append(f"{name:<10}{wall:>9.2f}{cpu:>9.2f}{cpu / product.cpu:>15.1f}{cpu / triad.cpu:>13.1f}")
    return "\n".join([*lines, "check: wall with the beam beside solid and mesh, as a run does them; CPU of all"])


def main() -> None:
    parser = argparse.ArgumentParser(description="Stage times of haunch check, beside two reference kernels.")
    parser.add_argument("part", nargs="?", type=Path, default=DEMO)
    parser.add_argument("--repeats", type=int, default=3)
    parser.add_argument("--threads", type=int, default=2)
    parser.add_argument("--pictures", action="store_true", help="draw the pictures too")
    options = parser.parse_args()
    part = options.part.resolve()
    for name in ("OMP_NUM_THREADS", "MKL_NUM_THREADS", "OPENBLAS_NUM_THREADS"):
        os.environ.setdefault(name, str(options.threads))
    os.environ.setdefault("KMP_BLOCKTIME", "0")
    sys.path.insert(0, str(ROOT))
    loading = start_up()
    product, triad = reference_times()
    stages(SMALL, options.threads, options.pictures)  # what is loaded or prepared at the first use
    runs, size = [], ""
    for _ in range(options.repeats):
        spent, size = stages(part, options.threads, options.pictures)
        runs.append(spent)
    again = reference_times()
    print(f"{part.name}: {size}\n{options.repeats} runs, {options.threads} threads, "
          f"load {os.getloadavg()[0]:.1f} on {os.cpu_count()} cores")
    for name, first, last in (("matrix product", product, again[0]), ("triad", triad, again[1])):
        print(f"reference {name}: wall {first.wall * 1e3:.0f} and {last.wall * 1e3:.0f} ms before and after, "
              f"CPU {first.cpu * 1e3:.0f} and {last.cpu * 1e3:.0f} ms")
    for name, (wall, cpu) in loading.items():
        print(f"start-up {name}: wall {wall:.2f} s, CPU {cpu:.2f} s")
    print(f"\n{table(runs, product, triad)}")
    warm_chain(part, options.threads, options.pictures)
    chains = [warm_chain(part, options.threads, options.pictures) for _ in range(options.repeats)]
    wall, cpu = (statistics.median(c[k] for c in chains) for k in (0, 1))
    least = min(c.wall for c in chains)
    print(f"\nwhole chain, spec to written results, in this warm process: wall {wall:.2f} s (least {least:.2f}), "
          f"CPU {cpu:.2f} s, {cpu / triad.cpu:.1f} triads; load {os.getloadavg()[0]:.1f}")
    wall, cpu = whole_run(part, options.threads, options.pictures)
    print(f"\nwhole run in a new process, start-up included: wall {wall:.2f} s, CPU {cpu:.2f} s")
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    print(f"most memory of this process (reference kernels included): {peak:.0f} MiB")


if __name__ == "__main__":
    main()
