"""The benchmark runs, its children are bounded, and its table says what was measured. No test looks at a time."""

from __future__ import annotations

import json
import mmap
import subprocess
import sys
import threading
import time
from pathlib import Path

import numpy as np
import pytest

HERE = Path(__file__).resolve().parent
ROOT = HERE.parents[1]
sys.path.insert(0, str(HERE))

from solver_timing import child, measure, meshes, table, watch  # noqa: E402
from solver_timing.shapes import SHAPES, SIZES  # noqa: E402


def row(**facts: object) -> dict[str, object]:
    """A finished row of Haunch alone."""
    known = {
        "build": 1.0, "set_up": 2.0, "solve": 3.0, "displacements": 6.0, "memory": 1234.4, "unknowns": 60000,
        "stages": {"pattern": 0.25, "assembly": 0.5, "loads": 0.125}, "set_up_parts": {"factor": 1.5},
        "solve_parts": {"product": 2.9}, "bytes": {"product": 6e9}, "triad": 1.2e10, "solver": "multigrid",
        "reason": "A bulky part.", "iterations": 12, "tip": [0.0, 0.0, -2.0], "sample": [0.0, 1.0, -2.0],
        "largest": 2.0, "processor": 11.0,
    }  # fmt: skip
    return {
        "shape": "box", "size": "small", "unknowns": 60000, "haunch": {"facts": {**known, **facts}, "failure": ""}
    }  # fmt: skip


def rival(**facts: object) -> dict[str, object]:
    known = {"solve": 5.0, "memory": 500.0, "tip": [0.0, 0.0, -2.0], "sample": [0.0, 1.0, -2.0], "largest": 2.0}
    return {"facts": {**known, **facts}, "failure": ""}


def test_the_table_holds_what_was_measured() -> None:
    told = table.report([{**row(), "assemble": {"facts": {"assembly": 4.0}, "failure": ""}, "pardiso": rival()}], "")
    assert "| box | 60 000 | multigrid | 12 | 0.75 | 0.25 | 2 | 3 | **6** | 11 | – | 1 234 |" in told
    assert "| box | 60 000 | 6 | 4 | – | 9 (500) | – | 0e+00 |" in told
    assert "factor 75 %, other 25 %" in told
    assert "0.5 s at the 12.0 GB/s" in told and "6.0 times the least time" in told


def test_a_row_that_does_not_fit_says_so() -> None:
    stopped = {"facts": {}, "failure": "not within 60 s"}
    told = table.report([{**row(), "assemble": {"facts": {"assembly": 4.0}, "failure": ""}, "lu": stopped}], "")
    assert "not within 60 s" in told
    gone = {"shape": "box", "size": "large", "unknowns": None, "haunch": {"facts": {}, "failure": "not within 9 MiB"}}
    assert "| box | – | not within 9 MiB |" in table.report([gone], "")


def test_answers_that_differ_are_told() -> None:
    assert table.disagreements([{**row(), "amg": rival()}]) == []
    told = table.disagreements([{**row(), "amg": rival(tip=[0.0, 0.0, -2.00001])}])
    assert len(told) == 1 and "5.0e-06 at the tip" in told[0]
    assert len(table.disagreements([{**row(), "amg": rival(sample=[0.0, 1.0001, -2.0])}])) == 1
    other = {"seconds": 1.0, "name": "cholesky (pardiso)", **rival(tip=[0.0, 0.001, -2.0])["facts"]}  # type: ignore[dict-item]
    assert len(table.disagreements([row(cholesky=other)])) == 1


def test_growth_is_from_the_first_to_the_last_size() -> None:
    rows = [row(), row(displacements=18.0, unknowns=120000)]
    assert "box 100.0, 150.0 (growth 1.50)" in table.growth(rows)


def test_the_readme_is_changed_between_its_marks_only(tmp_path: Path) -> None:
    readme = tmp_path / "README.md"
    readme.write_text(f"before\n{table.BEGIN}\nold\n{table.END}\nafter\n", encoding="utf-8")
    table.write_between_marks(readme, "new")
    assert readme.read_text(encoding="utf-8") == f"before\n{table.BEGIN}\n\nnew\n\n{table.END}\nafter\n"
    readme.write_text("no marks", encoding="utf-8")
    with pytest.raises(ValueError, match="needs the marks"):
        table.write_between_marks(readme, "new")


def test_the_readme_has_the_marks() -> None:
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    assert text.count(table.BEGIN) == text.count(table.END) == 1
    assert text.index(table.BEGIN) < text.index(table.END)


def outer(seconds: float) -> None:
    time.sleep(seconds)
    inner(seconds)


def inner(seconds: float) -> None:
    time.sleep(3 * seconds)


def test_a_watched_function_is_charged_for_its_own_time() -> None:
    here, own = sys.modules[__name__], outer
    sys.modules["timed_here"] = here
    try:
        stages = {"outer": ["timed_here:outer"], "inner": ["timed_here:inner"], "gone": ["timed_here:nothing"]}
        with watch.Watch(stages, {"timed_here:inner": lambda seconds: 7.0}) as found:
            here.outer(0.02)  # type: ignore[attr-defined]
            other = threading.Thread(target=here.inner, args=(0.02,))  # type: ignore[attr-defined]
            other.start()
            other.join()
        with watch.Watch(stages, {"timed_here:inner": lambda seconds: 7.0}, ["outer"]) as whole:
            here.outer(0.005)  # type: ignore[attr-defined]
    finally:
        del sys.modules["timed_here"]
    assert whole.calls == {"outer": 1, "inner": 0, "gone": 0}
    assert whole.seconds["outer"] > 0.018 and whole.bytes["outer"] == 7.0
    assert here.outer is own  # type: ignore[attr-defined]
    assert found.missing == ["timed_here:nothing"]
    assert found.calls == {"outer": 1, "inner": 1, "gone": 0}
    assert found.bytes["inner"] == 7.0
    assert 0.018 < found.seconds["outer"] < 0.055 < found.seconds["inner"]


def test_peak_memory_counts_what_was_given_back() -> None:
    memory = measure.PeakMemory()
    # Fresh pages from the system: what numpy gets may be memory that this process has freed, but not given back.
    with mmap.mmap(-1, 60 * 2**20) as fresh:
        np.frombuffer(fresh, dtype=np.uint8)[:] = 1
    assert 50 < memory.now() < 80


@pytest.mark.parametrize(("seconds", "memory"), [(0.3, 4000.0), (60.0, 5.0)])
def test_a_child_is_ended_at_its_bounds(seconds: float, memory: float) -> None:
    job = {"shape": "box", "size": "large", "mesh": "never.npz"}
    done = child.start("mesh", job, 1, seconds, memory).wait()
    assert done.failure == ("not within 0 s" if seconds < 1 else "not within 5 MiB")
    assert done.seconds < 30


def test_a_child_that_fails_says_why() -> None:
    done = child.start("mesh", {"shape": "no such", "size": "small"}, 1, 60.0, 4000.0).wait()
    assert "KeyError" in done.failure and done.facts == {}


def test_a_structured_mesh_fills_its_box_and_comes_back_from_its_file(tmp_path: Path) -> None:
    made = meshes.structured(meshes.part_of(SHAPES["box"]), (8, 2, 2))
    corners = made.nodes[:, made.boundary[:3]]
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0], axis=0) / 2
    assert (corners.mean(axis=1) * normal).sum() / 3 == pytest.approx(400 * 100 * 100)
    assert made.quality.min() > 0.3
    for name, area in made.region_area.items():
        flat = made.nodes[:, made.facets[name][:3]]
        found = np.cross(flat[:, 1] - flat[:, 0], flat[:, 2] - flat[:, 0], axis=0) / 2
        assert np.linalg.norm(found, axis=0).sum() == pytest.approx(area)
    meshes.save(made, tmp_path / "mesh.npz")
    back = meshes.load(tmp_path / "mesh.npz")
    assert (back.nodes == made.nodes).all() and back.facets.keys() == made.facets.keys()


def test_every_shape_is_a_part_with_six_cases() -> None:
    for shape in SHAPES.values():
        assert len(meshes.part_of(shape).cases) == 6
        assert set(shape.sizes) <= set(SIZES)


@pytest.mark.heavy
def test_the_quick_benchmark_runs_and_all_answers_agree(tmp_path: Path) -> None:
    script = HERE / "solver_time.py"
    done = subprocess.run(
        [sys.executable, str(script), "--quick", "--within", "280", "--rows", str(tmp_path / "rows.jsonl")],
        cwd=ROOT,
        capture_output=True,
        text=True,
        timeout=300,
        check=False,
    )
    assert done.returncode == 0, done.stdout + done.stderr
    last = json.loads((tmp_path / "rows.jsonl").read_text(encoding="utf-8").splitlines()[-1])
    facts = last["haunch"]["facts"]
    assert last["haunch"]["failure"] == "" and facts["missing"] == facts["modes_missing"] == []
    for word in ("build", "set_up", "solve", "solve_six", "modes", "whole", "triad", "memory", "processor"):
        assert facts[word] > 0, word
    assert all(spent > 0 for spent in facts["stages"].values())
    assert facts["frequencies"] == sorted(facts["frequencies"]) and facts["frequencies"][0] > 0
    assert {"assemble", "lu", "pardiso", "amg"} <= last.keys()
    for name in table.COMPARED:
        tip, anywhere = table.differences(last, name) or (1.0, 1.0)
        assert tip <= 1e-6 and anywhere <= 1e-5, name
