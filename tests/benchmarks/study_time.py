"""What a variant of a study takes, stage by stage, and what two workers do beside one.

    python tests/benchmarks/study_time.py                        # under four minutes on two quiet cores
    python tests/benchmarks/study_time.py --quick                # a few variants of a small bar: does it run at all?
    python tests/benchmarks/study_time.py --variants 40 --within 900
    python tests/benchmarks/study_time.py --keep FILE.json       # the measurements as they are
    python tests/benchmarks/study_time.py --from FILE.json --write-readme

One seeded plan of the demo part (a Latin hypercube over depth, flange and bore, so that each variant has a mesh of its
own; two load cases; accuracy 2 %) is run as `haunch vary` runs it, into a record on disk: with one worker, with two,
and again, in turn. Processes are warm: each has evaluated the part once before the clock runs. Then two small plans in
which only loads or only a support vary, which share the mesh. Between and around them two reference kernels are timed
(see `check_time`).

Processor seconds of a stage are those of the variant's own processes. The runner's overhead is every other processor
second of the driver, of the templates (starting processes among it) and of the jobs, as a share of all. The rate is
taken between the first and the last but one finished variant, as in a long night; the wall of the whole study, start
and end included, stands beside it. Both runs must give the same numbers: the exit status is 1 when they do not.
"""

from __future__ import annotations

import argparse
import json
import os
import platform
import statistics
import sys
import tempfile
import time
from pathlib import Path
from typing import Any

ROOT = Path(__file__).resolve().parents[2]
sys.path[:0] = [str(Path(__file__).resolve().parent), str(ROOT)]

from check_time import DEMO, SMALL, _cpu_of, reference_times  # noqa: E402

README = ROOT / "README.md"
BEGIN, END = "<!-- study times: begin -->", "<!-- study times: end -->"
NIGHT = 8 * 3600
STAGES = ("spec", "solid", "mesh", "beam", "solve", "compare")
SECOND_CASE = "[cases.lifting]\ncamera = 1.5\nself_weight = 1.0\n\n[limits]"
# The bore stays clear of the web's roundings: within 0.1 mm of one, all six meshing attempts are made, in 20 s.
SHAPES = {
    "root_depth": {"from": "50 mm", "to": "64 mm"},
    "tip_depth": {"from": "28 mm", "to": "36 mm"},
    "flange": {"path": "members.arm.section.flange", "from": "4.5 mm", "to": "6 mm"},
    "bore": {"from": "8 mm", "to": "12 mm"},
}
LOADS = {"force": {"path": "cases.carrying.camera", "from": "0.6", "to": "1.4"}}
HELD = {"supports.wall.hold": ["all", "pin"], "cases.carrying.camera": ["0.8", "1.0", "1.2"]}


def demo(folder: Path) -> Path:
    """The demo part with a second load case."""
    part = folder / DEMO.name
    part.write_text(DEMO.read_text(encoding="utf-8").replace("[limits]", SECOND_CASE, 1), encoding="utf-8")
    return part


def plan_of(part: Path, vary: dict[str, Any], points: int, seed: int) -> Any:
    """A plan without run folders; points <= 0: the grid."""
    from studies.vary.plan import plan_from_data

    sampling = {"method": "latin hypercube", "points": points, "seed": seed} if points > 0 else {"method": "grid"}
    data = {"title": f"Time of {', '.join(vary)}", "part": part.name, "vary": vary, "sampling": sampling,
            "keep": {"runs": {"best": 0, "worst": 0, "suspicious": 0}}}
    return plan_from_data(data, part.parent)


class Measured:
    """One study, run and timed.

    Attributes
    ----------
    facts
        JSON: workers, seconds, rate (variants a second), cpu (all processes), and of the variants: stages, wall,
        unknowns, solvers.
    numbers
        Key of a variant -> its figures, to be compared between runs.
    """

    def __init__(self, plan: Any, folder: Path, workers: int) -> None:
        from studies.record import Record
        from studies.vary.run import vary
        from studies.vary.run.local import LocalBackend

        self._backend = LocalBackend(workers, plan.run.memory)
        self._templates = [t.pid for t in self._backend._host.templates]
        close, self._backend.close = self._backend.close, lambda: None  # type: ignore[method-assign]
        try:
            self._warm(plan, workers)
            record = folder / f"{len(list(folder.iterdir()))}.study"
            ends: list[float] = []
            cpu, began = self._cpu(), time.perf_counter()
            summary = vary(plan, record, backend=lambda: self._backend,
                           listener=lambda said: ends.append(time.perf_counter()) if _is_end(said) else None)
            seconds = time.perf_counter() - began
            if summary.interrupted:
                raise SystemExit(f"stopped ({summary.interrupted}): half a study says nothing")
            time.sleep(0.5)  # the templates count the time of a job once it has ended
            cpu = self._cpu() - cpu
        finally:
            close()
        with Record.open(record) as written:
            outcomes = [outcome for _, outcome in written.outcomes()]
        steady = (len(ends) - 2) / (ends[-2] - ends[0]) if len(ends) > 3 else len(ends) / seconds
        self.numbers = {o.key: [list(kept) for kept in o.figures.values()] for o in outcomes}
        self.facts: dict[str, Any] = {
            "workers": workers, "variants": len(outcomes), "failed": sum(o.status == "failed" for o in outcomes),
            "seconds": seconds, "rate": steady, "cpu": cpu, "summary": summary.seconds,
            "stages": {name: [o.seconds.get(name, 0.0) for o in outcomes] for name in STAGES},
            "walls": [o.seconds.get("wall", 0.0) for o in outcomes],
            "unknowns": [o.unknowns for o in outcomes], "memory": [o.peak_memory for o in outcomes],
            "solvers": sorted({o.mesh.get("solver", "none") for o in outcomes}),
        }

    def _cpu(self) -> float:
        return time.process_time() + sum(_cpu_of(pid) for pid in self._templates if pid is not None)

    def _warm(self, plan: Any, workers: int) -> None:
        """One variant for each worker, side by side; so that every template has loaded its kernel."""
        from concurrent.futures import ThreadPoolExecutor

        from studies.vary.work import Order

        order = Order(next(iter(plan.variants())), memory=plan.run.memory)
        with ThreadPoolExecutor(workers) as pool:
            list(pool.map(self._backend._host.evaluate, [order] * workers))


def _is_end(said: Any) -> bool:
    return getattr(said, "kind", "") in ("finished", "failed")


def measure(options: argparse.Namespace) -> dict[str, Any]:
    """Everything, in turn, as JSON."""
    begun = time.monotonic()
    with tempfile.TemporaryDirectory(prefix="study-time-") as name:
        folder = Path(name)
        part = folder / SMALL.name
        if options.quick:
            part.write_bytes(SMALL.read_bytes())
            shapes: dict[str, Any] = {"depth": {"from": "38 mm", "to": "42 mm"}}
        else:
            part, shapes = demo(folder), SHAPES
        plan = plan_of(part, shapes, options.variants, options.seed)
        found: dict[str, Any] = {"references": [_references()], "studies": [], "shared": [], "same": True}
        numbers: dict[str, Any] = {}
        for done in range(options.rounds):
            for workers in (1, options.workers):
                _say(begun, f"{options.variants} variants, {workers} worker{'s' * (workers > 1)}")
                study = Measured(plan, folder, workers)
                found["studies"].append(study.facts)
                found["same"] &= (numbers or study.numbers) == study.numbers
                numbers = study.numbers
            found["references"].append(_references())
            spent = time.monotonic() - begun
            if spent * (1.0 + 1.2 / (done + 1)) > options.within:
                break
        for what, vary, points in () if options.quick else (("loads vary", LOADS, 6), ("a support varies", HELD, 0)):
            if time.monotonic() - begun < 0.85 * options.within:
                _say(begun, what)
                shared = Measured(plan_of(part, vary, points, options.seed), folder, 1)
                found["shared"].append({"what": what, **shared.facts})
    return found


def _references() -> list[float]:
    product, triad = reference_times()
    return [product.cpu, triad.cpu, os.getloadavg()[0]]


def _say(begun: float, text: str) -> None:
    print(f"[{time.monotonic() - begun:4.0f} s] {text}", flush=True)


def of(found: dict[str, Any], workers: int) -> list[dict[str, Any]]:
    """The studies with so many workers."""
    return [s for s in found["studies"] if s["workers"] == workers]


def overhead(study: dict[str, Any]) -> float:
    """Share of the processor time that is not geometry, mesh, solve and compare."""
    return 1.0 - sum(sum(times) for times in study["stages"].values()) / study["cpu"]


def medians(studies: list[dict[str, Any]]) -> dict[str, float]:
    """Processor seconds a variant of each stage."""
    return {name: statistics.median(t for s in studies for t in s["stages"][name]) for name in STAGES}


def report(found: dict[str, Any]) -> str:
    """The table, in Markdown."""
    most = max(s["workers"] for s in found["studies"])
    one, more = of(found, 1), of(found, most)
    product, triad = (min(r[k] for r in found["references"]) for k in (0, 1))
    stages = [medians(one), medians(more)]
    lines = [f"| processor seconds a variant | 1 worker | {most} workers | in matrix products | in triads |",
             "|---|---:|---:|---:|---:|"]
    rest = [statistics.median(overhead(s) * s["cpu"] / s["variants"] for s in some) for some in (one, more)]
    rows = {name: (stages[0][name], stages[1][name]) for name in STAGES} | {"runner": (rest[0], rest[1])}
    rows["all"] = (sum(stages[0].values()) + rest[0], sum(stages[1].values()) + rest[1])
    lines += [f"| {name} | {a:.3f} | {b:.3f} | {a / product:.2f} | {a / triad:.1f} |" for name, (a, b) in rows.items()]
    walls = [statistics.median(w for s in some for w in s["walls"]) for some in (one, more)]
    rates = [statistics.median(s["rate"] for s in some) for some in (one, more)]
    wholes = [statistics.median(s["seconds"] for s in some) for some in (one, more)]
    lines += [
        f"| wall of a variant, s | {walls[0]:.2f} | {walls[1]:.2f} | | |",
        f"| variants an hour | {3600 * rates[0]:.0f} | {3600 * rates[1]:.0f} | | |",
        f"| in a night of eight hours | {NIGHT * rates[0]:.0f} | {NIGHT * rates[1]:.0f} | | |",
        f"| runner's share of the processor time | {_share(one)} | {_share(more)} | | |",
        "",
        f"{most} workers do {rates[1] / rates[0]:.2f} times the variants of one "
        f"({wholes[0] / wholes[1]:.2f} with the start and end of a study of {one[0]['variants']} variants)"
        f"{'.' if found['same'] else '; THEIR NUMBERS DIFFER.'}",
    ]
    if found["same"]:
        lines[-1] += " Their numbers are the same, bit by bit."
    for shared in found["shared"]:
        cpu = sum(sum(times) for times in shared["stages"].values()) / shared["variants"]
        lines.append(f"Where only {shared['what']}: {cpu:.2f} processor seconds a variant "
                     f"({', '.join(shared['solvers'])}).")
    return "\n".join(lines)


def _share(studies: list[dict[str, Any]]) -> str:
    return f"{100 * statistics.median(overhead(s) for s in studies):.1f} %"


def about(found: dict[str, Any]) -> str:
    """What was measured, where."""
    studies = found["studies"]
    unknowns = [n for s in studies for n in s["unknowns"]]
    loads = [r[2] for r in found["references"]]
    size = f"{min(unknowns)} to {max(unknowns)} unknowns" if unknowns else "no answer"
    return (f"Measured by `python tests/benchmarks/study_time.py` on {os.cpu_count()} cores ({platform.machine()}, "
            f"{platform.system()}), {len(studies)} studies of {studies[0]['variants']} variants, {size}, two load "
            f"cases, at most {max(m for s in studies for m in s['memory']):.0f} MiB a worker; load {min(loads):.1f} to "
            f"{max(loads):.1f}, matrix product {min(r[0] for r in found['references']) * 1e3:.0f} ms, triad "
            f"{min(r[1] for r in found['references']) * 1e3:.0f} ms.")


def write_between_marks(readme: Path, text: str) -> None:
    """Put the text between the two marks of the README. Raises `ValueError` when they are not there once each."""
    old = readme.read_text(encoding="utf-8")
    if old.count(BEGIN) != 1 or old.count(END) != 1:
        raise ValueError(f"{readme.name} needs the marks {BEGIN} and {END}, once each")
    before, rest = old.split(BEGIN)
    readme.write_text(f"{before}{BEGIN}\n\n{text}\n\n{END}{rest.split(END)[1]}", encoding="utf-8")


def arguments() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(description=(__doc__ or "").split("\n\n")[0])
    parser.add_argument("--quick", action="store_true", help="a few variants of a small bar")
    parser.add_argument("--variants", type=int, default=14, help="of the seeded plan")
    parser.add_argument("--workers", type=int, default=2, help="beside one")
    parser.add_argument("--rounds", type=int, default=2, help="each with one worker, then with more")
    parser.add_argument("--within", type=float, default=220, help="s: no round is begun that would end later")
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--keep", type=Path, help="file for the measurements, JSON")
    parser.add_argument("--from", dest="source", type=Path, help="make the table of these; measure nothing")
    parser.add_argument("--write-readme", action="store_true", help="put the table between its marks in README.md")
    return parser


def main() -> int:
    options = arguments().parse_args()
    for name in ("OMP_NUM_THREADS", "MKL_NUM_THREADS", "OPENBLAS_NUM_THREADS"):
        os.environ[name] = "1"
    if options.quick:
        options.variants, options.rounds = min(options.variants, 4), 1
    found = json.loads(options.source.read_text(encoding="utf-8")) if options.source else measure(options)
    if options.keep:
        options.keep.write_text(json.dumps(found, indent=1), encoding="utf-8")
    text = f"{report(found)}\n\n{about(found)}"
    print(f"\n{text}\n")
    if options.write_readme:
        write_between_marks(README, text)
        print(f"written into {README.name}")
    failed = sum(s["failed"] for s in found["studies"])
    numbers = "the same" if found["same"] else "DIFFERENT"
    print(f"{failed} variants failed; numbers {numbers} with one worker and with more")
    return 0 if found["same"] and not failed else 1


if __name__ == "__main__":
    raise SystemExit(main())
