"""Heavy: what the runner takes beside geometry, mesh, both models and the comparison, in processor time."""

from __future__ import annotations

import os
import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parent))
import night

from studies.record import Record
from studies.vary.plan import read_plan
from studies.vary.run import Happening, vary

pytestmark = pytest.mark.heavy

WORK = ("solid", "mesh", "beam", "solve", "compare")


def used() -> float:
    """Processor seconds of this process and of all that it has started, finished or not."""
    tick = os.sysconf("SC_CLK_TCK")

    def of(pid: int) -> float:
        try:
            fields = Path(f"/proc/{pid}/stat").read_text().rpartition(")")[2].split()
        except OSError:  # ended meanwhile: its parent has its time
            return 0.0
        return sum(map(int, fields[11:15])) / tick + sum(of(child) for child in night.children(pid))

    return of(os.getpid())


def measured(room: Path, first: int) -> tuple[float, float, int]:
    """(processor seconds of the work, of all, variants) from the end of the `first` variant to that of the last."""
    marks: list[float] = []
    order: list[int] = []

    def listener(what: object) -> None:
        if isinstance(what, Happening) and what.kind == "finished":
            order.append(what.number)
            marks.append(used())

    plan = read_plan(room / "bars.toml")
    vary(plan, room / "bars.study", workers=1, listener=listener)
    counted = set(order[first:])
    with Record.open(room / "bars.study") as record:
        work = sum(outcome.seconds.get(stage, 0.0) for point, outcome in record.outcomes() if point.number in counted
                   for stage in WORK)
    return work, marks[-1] - marks[first - 1], len(counted)


@pytest.mark.parametrize(("shapes", "pushes"), [(24, 1), (4, 8)], ids=["own shapes", "one shape, many loads"])
def test_runner_takes_little(tmp_path, shapes, pushes):
    """On variants that are far smaller than a real part: under a fifth of a second each. On a real part (see
    tests/benchmarks) that is under 5 %."""
    night.make_room(tmp_path, shapes, pushes)
    work, total, count = measured(tmp_path, 4)
    print(f"{count} variants: {total / count:.3f} s each, of which {(total - work) / count:.3f} s is not work "
          f"({100 * (1 - work / total):.1f} %)")
    assert 0.0 < total - work < 0.1 * count
