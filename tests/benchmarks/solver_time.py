"""How fast the solid model is, beside general libraries and beside what the machine's memory allows.

    python tests/benchmarks/solver_time.py                       # the table: under ten minutes on two quiet cores
    python tests/benchmarks/solver_time.py --quick               # one small bar, about a minute: does it run at all?
    python tests/benchmarks/solver_time.py --shapes box --sizes small medium --rivals none
    python tests/benchmarks/solver_time.py --keep FOLDER         # meshes are kept there and used again
    python tests/benchmarks/solver_time.py --from FILE --write-readme     # the table of an earlier run, into README.md
    python tests/benchmarks/solver_time.py --throughput          # two threads, or two processes with one each?

Every measurement runs in a process of its own, within a limit of time and memory; a row that does not fit is told as
that. Each finished row is written to a file at once (its name is printed), so nothing is lost when a later one fails
or the run is stopped. Times are of a warm process: imports, compiled code and libraries have been used before on a
small bar, and of the runs of a small row the last one counts. "All" is from the arrays of a mesh to displacements of
one load case. Memory is the peak of those stages, above what the process held before them. The rivals get the same
mesh and the same load; the answers are compared. The last line says whether they agree, and the exit status is 1 when
not.
"""

from __future__ import annotations

import argparse
import json
import os
import platform
import sys
import tempfile
import time
from dataclasses import asdict
from pathlib import Path
from typing import Any

ROOT = Path(__file__).resolve().parents[2]
sys.path[:0] = [str(Path(__file__).resolve().parent), str(ROOT)]

from solver_timing import table, throughput  # noqa: E402
from solver_timing.child import Outcome, start  # noqa: E402
from solver_timing.rivals import NAMES  # noqa: E402
from solver_timing.shapes import SHAPES, SIZES  # noqa: E402

README = ROOT / "README.md"
MAIN = "box"
"""The shape that is measured most closely; the other rules tell it (True) from the others (False)."""
RIVALS_AT = {
    True: {"tiny": ("lu", "pardiso", "amg"), "small": ("lu", "pardiso", "amg"), "medium": ("pardiso", "amg")},
    False: {"small": ("pardiso", "amg")},
}
"""Rivals that have a chance within the limits."""
MODES_AT = {True: ("tiny", "small", "medium"), False: ("small",)}
"""Sizes at which natural frequencies are found."""
BOTH_AT = ("tiny", "small")
"""Sizes at which either solver of Haunch is tried, so that the table shows whether the right one was chosen."""
REPEATED = ("tiny", "small")
"""Sizes that are run more than once: what a first run costs beside them (pages, plans) is little in the others."""


class Bench:
    """A run: its options, its folder of meshes, its rows, and the file that they are written to."""

    def __init__(self, options: argparse.Namespace, folder: Path) -> None:
        self.options = options
        self.folder = folder
        self.rows: list[dict[str, Any]] = []
        self.begun = time.monotonic()
        self.file = options.rows or folder / "rows.jsonl"

    def say(self, text: str) -> None:
        print(f"[{time.monotonic() - self.begun:5.0f} s] {text}", flush=True)

    def left(self) -> float:
        """Seconds that remain of the whole run."""
        return float(self.options.within) - (time.monotonic() - self.begun)

    def job(self, task: str, job: dict[str, Any], seconds: float, memory: float) -> Outcome:
        """One child, within its own limit and what remains of the whole."""
        if self.left() < 5:
            return Outcome({}, "not begun: the time of the whole run was over", 0.0)
        return start(task, job, self.options.threads, min(seconds, self.left()), memory).wait()

    def haunch(self, shape: str, size: str) -> dict[str, Any]:
        """Mesh and Haunch; the row is written down and returned."""
        options = self.options
        mesh = self.mesh_file(shape, size)
        if not mesh.exists():
            made = self.job("mesh", {"shape": shape, "size": size, "mesh": str(mesh)}, 300, 8000)
            self.say(f"{shape}, {size}: mesh {_told(made, 'seconds')}")
        job = {
            "shape": shape,
            "mesh": str(mesh),
            "budget": options.memory,
            "solver": options.solver,
            "results": options.figures,
            "modes": options.modes if size in MODES_AT[shape == MAIN] else 0,
            "repeats": options.repeats if size in REPEATED else 1,
            "both": size in BOTH_AT,
        }
        done = self.job("haunch", job, options.seconds, 1.3 * options.memory)
        row = {"shape": shape, "size": size, "unknowns": done.facts.get("unknowns"), "haunch": asdict(done)}
        self.rows.append(row)
        self.keep(row)
        self.say(f"{shape}, {size}: Haunch {_told(done, 'displacements')}, {done.facts.get('solver', '')}")
        if missing := [*done.facts.get("missing", ()), *done.facts.get("modes_missing", ())]:
            self.say(f"    not timed, no longer there: {', '.join(missing)}")
        return row

    def rivals(self, row: dict[str, Any]) -> None:
        """The rivals on the row's mesh; it is written down again after each of them."""
        shape, size = row["shape"], row["size"]
        chosen = [name for name in RIVALS_AT[shape == MAIN].get(size, ()) if name in self.options.rivals]
        system = self.folder / "system.npz"
        job = {"shape": shape, "mesh": str(self.mesh_file(shape, size)), "system": str(system)}
        system.unlink(missing_ok=True)
        for task in ("assemble", *chosen) if chosen else ():
            if task != "assemble" and not system.exists():
                continue
            done = self.job(task, job, self.options.rival_seconds, self.options.rival_memory)
            row[task] = asdict(done)
            self.keep(row)
            word = "assembly" if task == "assemble" else "solve"
            self.say(f"{shape}, {size}: {NAMES.get(task, 'scikit-fem')} {word} {_told(done, word)}")

    def mesh_file(self, shape: str, size: str) -> Path:
        return self.folder / SHAPES[shape].file(size)

    def keep(self, row: dict[str, Any]) -> None:
        """Add the row as it is now; of several lines for one row the last one counts."""
        with open(self.file, "a", encoding="utf-8") as file:
            file.write(json.dumps(row) + "\n")


def read_rows(path: Path) -> list[dict[str, Any]]:
    """The rows of a file, in the order of shapes and sizes."""
    found = {}
    for line in path.read_text(encoding="utf-8").splitlines():
        row = json.loads(line)
        found[row["shape"], row["size"]] = row
    return sorted_rows(list(found.values()))


def sorted_rows(rows: list[dict[str, Any]]) -> list[dict[str, Any]]:
    order = list(SHAPES)
    return sorted(rows, key=lambda row: (order.index(row["shape"]), SIZES.index(row["size"])))


def _told(done: Outcome, word: str) -> str:
    found = f"{done.facts[word]:.2f} s" if word in done.facts else ""
    return " ".join(piece for piece in (found, done.failure) if piece)


def about(options: argparse.Namespace, rows: list[dict[str, Any]]) -> str:
    """One sentence on the machine and the run."""
    rates = [row["haunch"]["facts"]["triad"] for row in rows if "triad" in row.get("haunch", {}).get("facts", {})]
    rate = f", memory {max(rates) / 1e9:.1f} GB/s in a triad" if rates else ""
    return (
        f"Measured by `python tests/benchmarks/solver_time.py` with {options.threads} threads on {os.cpu_count()} "
        f"cores ({platform.machine()}, {platform.system()}){rate}; seconds on the wall in a warm process."
    )


def arguments() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        description=(__doc__ or "").split("\n\n")[0], epilog="See the head of this file for examples."
    )
    parser.add_argument("--quick", action="store_true", help="a tiny bar with every rival, about a minute")
    parser.add_argument("--shapes", nargs="+", choices=SHAPES, default=list(SHAPES))
    parser.add_argument("--sizes", nargs="+", choices=SIZES, default=["small", "medium", "large"])
    parser.add_argument("--rivals", nargs="+", choices=[*NAMES, "none"], default=list(NAMES))
    parser.add_argument("--solver", choices=["auto", "cholesky", "multigrid"], default="auto")
    parser.add_argument("--threads", type=int, default=2)
    parser.add_argument("--repeats", type=int, default=2, help="runs of a small row; the last counts")
    parser.add_argument("--modes", type=int, default=6, help="natural frequencies to find; 0 for none")
    parser.add_argument("--no-figures", dest="figures", action="store_false", help="stop at the displacements")
    parser.add_argument("--within", type=float, default=590, help="s for the whole run")
    parser.add_argument("--seconds", type=float, default=150, help="s for Haunch on one mesh, everything together")
    parser.add_argument("--memory", type=int, default=6000, help="MiB that Haunch may use")
    parser.add_argument("--rival-seconds", type=float, default=45, help="s for each step of a rival")
    parser.add_argument("--rival-memory", type=float, default=8000, help="MiB for each rival")
    parser.add_argument("--keep", type=Path, help="folder in which meshes and rows stay; else a temporary one")
    parser.add_argument("--rows", type=Path, help="file for the finished rows; rows.jsonl in the folder")
    parser.add_argument("--from", dest="source", type=Path, help="make the table of these rows; measure nothing")
    parser.add_argument("--write-readme", action="store_true", help="put the table between its marks in README.md")
    parser.add_argument("--throughput", action="store_true", help="a sweep in one process, or in one a core")
    return parser


def measure(options: argparse.Namespace) -> list[dict[str, Any]]:
    """All rows that were asked for: main shape first, rivals last, so that a stopped run has the most of it."""
    folder = options.keep or Path(tempfile.mkdtemp(prefix="solver-time-"))
    folder.mkdir(parents=True, exist_ok=True)
    bench = Bench(options, folder)
    bench.say(f"rows go to {bench.file}")
    wanted = [(shape, size) for shape in options.shapes for size in options.sizes if size in SHAPES[shape].sizes]
    warmed = bench.job("warm", {"budget": options.memory, "modes": options.modes}, 300, options.memory)
    bench.say(f"compiled code {_told(warmed, 'seconds')}")
    wanted.sort(key=lambda row: (row[0] != MAIN, SIZES.index(row[1])))
    try:
        for row in [bench.haunch(shape, size) for shape, size in wanted]:
            bench.rivals(row)
    except KeyboardInterrupt:
        bench.say("stopped; the rows so far follow")
    finally:
        if not options.keep:
            for file in folder.glob("*.npz"):
                file.unlink()
    return sorted_rows(bench.rows)


def main() -> int:
    options = arguments().parse_args()
    if options.quick:
        options.shapes, options.sizes, options.modes = ["box"], ["tiny"], min(options.modes, 2)
    if options.throughput:
        print(throughput.compare(options))
        return 0
    rows = read_rows(options.source) if options.source else measure(options)
    text = table.report(rows, about(options, rows))
    print(f"\n{text}\n")
    if options.write_readme:
        table.write_between_marks(README, text)
        print(f"written into {README.name}")
    apart = table.disagreements(rows)
    failed = [row for row in rows if "displacements" not in row["haunch"]["facts"]]
    compared = sum(table.differences(row, rival) is not None for row in rows for rival in table.COMPARED)
    print(f"{compared} answers compared, {len(apart)} disagree; {len(failed)} rows without an answer of Haunch")
    return 1 if apart or failed else 0


if __name__ == "__main__":
    raise SystemExit(main())
