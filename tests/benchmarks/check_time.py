"""Where the time of a check goes. A script: ``python tests/benchmarks/check_time.py [PART.toml] [--repeats N]``.

Each check runs in a process of its own, as a user's does, so imports are part of the times. Seconds say little about
another machine: beside them stand ratios to two reference kernels timed in the same minute, one bound by arithmetic
(a dense matrix product) and one by memory (``a = b + s c`` on long vectors).
"""

from __future__ import annotations

import argparse
import json
import os
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
DEMO = ROOT / "studies" / "examples" / "camera_arm.toml"
LIMIT = 900  # s for one check
RUN = """
import json
import sys
from geometry.budget import Budget
from studies.check.run import check
result = check(sys.argv[1], sys.argv[2], Budget(threads=int(sys.argv[3])))
stages = {stage.name: stage.seconds for stage in result.stages}
print(json.dumps([stages, f"{result.mesh.tets} tetrahedra, {result.mesh.nodes} nodes"]))
"""


def best(kernel: Callable[[], object], repeats: int = 5) -> float:
    """Shortest of several times, s: the one least disturbed by others."""
    times = []
    for _ in range(repeats):
        begin = time.perf_counter()
        kernel()
        times.append(time.perf_counter() - begin)
    return min(times)


def reference_times() -> tuple[float, float]:
    """Seconds of a 1500 x 1500 matrix product (6.75 GFLOP) and of a triad on 2e7 doubles (480 MB moved)."""
    import numpy as np

    rng = np.random.default_rng(0)
    a, b = rng.random((1500, 1500)), rng.random((1500, 1500))
    c, d, out = rng.random(20_000_000), rng.random(20_000_000), np.empty(20_000_000)

    def triad() -> None:
        np.multiply(d, 3.0, out=out)
        np.add(c, out, out=out)

    return best(lambda: a @ b), best(triad)


def one_check(part: Path, threads: int) -> tuple[dict[str, float], float, str]:
    """Seconds of each stage, seconds of the whole process, and the size of the mesh in words."""
    with tempfile.TemporaryDirectory() as folder:
        words = [sys.executable, "-c", RUN, str(part), str(Path(folder) / "timed.run"), str(threads)]
        begin = time.perf_counter()
        told = subprocess.run(words, check=True, timeout=LIMIT, stdout=subprocess.PIPE, text=True).stdout
        whole = time.perf_counter() - begin
    # The last stage, writing, is timed in what the check returns and cannot be in the file that it writes.
    stages, mesh = json.loads(told.splitlines()[-1])
    return stages, whole, mesh


def table(runs: list[tuple[dict[str, float], float, str]], product: float, triad: float) -> str:
    """The times as text: the median, the least and the largest, and the median over each reference kernel."""
    names = list(runs[0][0])
    rows = [(name, [stages[name] for stages, _, _ in runs]) for name in names]
    # Stages overlap (the solid is built while the beam is solved), so the rest cannot be told by subtraction.
    rows.append(("whole process", [whole for _, whole, _ in runs]))
    lines = [f"{'stage':<14}{'median s':>10}{'least':>8}{'most':>8}{'x product':>11}{'x triad':>9}"]
    for name, times in rows:
        mid = statistics.median(times)
        lines.append(
            f"{name:<14}{mid:>10.2f}{min(times):>8.2f}{max(times):>8.2f}{mid / product:>11.1f}{mid / triad:>9.1f}"
        )
    return "\n".join(lines)


def main() -> None:
    parser = argparse.ArgumentParser(description="Stage times of haunch check, beside two reference kernels.")
    parser.add_argument("part", nargs="?", type=Path, default=DEMO)
    parser.add_argument("--repeats", type=int, default=3)
    parser.add_argument("--threads", type=int, default=os.cpu_count() or 1)
    options = parser.parse_args()
    product, triad = reference_times()
    runs = [one_check(options.part.resolve(), options.threads) for _ in range(options.repeats)]
    print(f"{options.part.name}: {runs[0][2]}; {options.repeats} runs, {options.threads} threads")
    print(f"reference: matrix product {product * 1e3:.0f} ms, triad {triad * 1e3:.0f} ms\n")
    print(table(runs, product, triad))


if __name__ == "__main__":
    main()
