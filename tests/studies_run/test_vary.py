"""The driver: what is evaluated, how often, what is tried again, what is kept."""

from __future__ import annotations

import threading
from collections import Counter
from pathlib import Path
from typing import Any

import pytest

from geometry.problem import SpecError
from studies.record import Record, RecordError, RecordHeldError
from studies.vary.run import Happening, StudyStopped, Summary, kept_run, vary


def run(small: Any, room: Path, plan: Any = None, *, slots: int = 2, record: str = "bars.study", **more: Any
        ) -> Summary:
    plan = plan or small.make_plan(room)
    return vary(plan, room / record, backend=lambda: small.SmallBackend(room, slots), **more)


def table(path: Path, title: str | None = None) -> list[dict[str, Any]]:
    with Record.open(path, title) as record:
        return record.table()


def numbers_started(small: Any, room: Path) -> list[int]:
    return [number for _, _, number, _ in small.started(room)]


def test_every_variant_is_evaluated_once(small, tmp_path):
    summary = run(small, tmp_path)
    assert sorted(numbers_started(small, tmp_path)) == list(range(1, 13))
    assert summary.counts == {"agrees": 11, "suspicious": 1} and summary.points == summary.evaluated == 12
    # by arithmetic: fine are those with 4e6/(w d^3) <= 3 and >= 1.9; the lightest is 42 x 18, then 44 x 18
    assert summary.fine == 6
    assert [(row.values["depth"], row.values["width"]) for row in summary.best[:2]] == [("42 mm", "18 mm"),
                                                                                      ("44 mm", "18 mm")]
    assert summary.suspicions == {"displacement z at bar.end in case tip_force": 1}
    assert not summary.interrupted and summary.reused == 0


def test_table_does_not_depend_on_workers(small, tmp_path):
    for name, slots in (("one", 1), ("four", 4)):
        (tmp_path / name).mkdir()
        run(small, tmp_path / name, slots=slots)
    assert table(tmp_path / "one" / "bars.study") == table(tmp_path / "four" / "bars.study")


def test_finished_study_starts_nothing(small, tmp_path):
    run(small, tmp_path)
    made = []
    summary = vary(small.make_plan(tmp_path), tmp_path / "bars.study", backend=lambda: made.append(1))
    assert not made and summary.evaluated == 0 and summary.reused == 12 and summary.fine == 6


def test_stopped_study_goes_on(small, tmp_path):
    stop = threading.Event()

    def listener(what):
        if isinstance(what, Happening) and what.kind == "finished":
            heard.append(what.number)
            if len(heard) == 4:
                stop.set()

    heard: list[int] = []
    first = run(small, tmp_path, listener=listener, stop=stop)
    assert first.interrupted and 4 <= first.done < 12
    with Record.open(tmp_path / "bars.study") as record:
        before = {key: record.outcome(key) for key in record.finished_keys()}
    begun = len(small.started(tmp_path))
    second = run(small, tmp_path)
    assert not second.interrupted and second.done == 12
    assert not set(before) & {key for _, key, _, _ in small.started(tmp_path)[begun:]}
    assert second.reused == len(before) and second.evaluated == 12 - len(before)
    (tmp_path / "whole").mkdir()
    run(small, tmp_path / "whole")
    assert table(tmp_path / "bars.study") == table(tmp_path / "whole" / "bars.study")


def test_study_that_shares_the_record_uses_what_is_there(small, tmp_path):
    run(small, tmp_path)
    other = small.make_plan(tmp_path, {"depth": ["36 mm", "4 cm", "50 mm"], "width": ["22 mm"]}, title="Other bars")
    with pytest.raises(RecordError, match="another study"):
        run(small, tmp_path, other)
    summary = run(small, tmp_path, other, share=True)
    assert summary.points == 3 and summary.reused == 2 and summary.evaluated == 1
    assert numbers_started(small, tmp_path)[12:] == [3]


def test_two_points_of_one_content_are_one_variant(small, tmp_path):
    (tmp_path / "bar.toml").write_text(small.SPEC.read_text().replace('= "depth"', '= "max(depth, 40 mm)"'))
    plan = small.make_plan(tmp_path, {"depth": ["30 mm", "40 mm"], "width": ["20 mm"]})
    keys = {variant.key for variant in plan.variants()}
    assert plan.count() == 2 and len(keys) == 1
    summary = run(small, tmp_path, plan)
    assert len(small.started(tmp_path)) == 1 and summary.done == 2 and summary.evaluated == 1 and summary.reused == 1


def test_own_fault_is_tried_once_on_a_safer_mesh(small, tmp_path):
    small.faults(tmp_path, n3="fails once", n5="fails", n7="spec", n9="crashes")
    summary = run(small, tmp_path)
    tries = Counter(numbers_started(small, tmp_path))
    assert {n: tries[n] for n in (3, 5, 7, 9)} == {3: 2, 5: 2, 7: 1, 9: 2}
    assert [safer for _, _, number, safer in small.started(tmp_path) if number == 3] == [False, True]
    with Record.open(tmp_path / "bars.study") as record:
        of = {point.number: outcome for point, outcome in record.outcomes()}
    assert of[3].status == "finished" and of[3].safer_mesh
    assert of[3].first_reason == "mesh: no attempt gave a mesh" and not of[4].safer_mesh
    assert of[5].status == "failed" and of[5].safer_mesh and of[5].reason == "no attempt gave a mesh"
    assert of[7].status == "failed" and not of[7].safer_mesh
    assert [failure.number for failure in summary.failures] == [5, 7, 9] and summary.failed == 3 and summary.safer == 3


def test_no_safer_mesh_where_the_plan_wants_none(small, tmp_path):
    small.faults(tmp_path, n3="fails once")
    summary = run(small, tmp_path, small.make_plan(tmp_path, run={"safer_mesh": False}))
    assert summary.failed == 1 and numbers_started(small, tmp_path).count(3) == 1


def test_ended_from_outside_is_run_again_as_it_was(small, tmp_path):
    small.faults(tmp_path, n2="killed 1", n6="killed 3")
    heard = []
    summary = run(small, tmp_path, listener=lambda what: heard.append(what) if isinstance(what, Happening) else None)
    assert summary.failed == 0 and summary.safer == 0
    assert Counter(numbers_started(small, tmp_path)) == Counter({**dict.fromkeys(range(1, 13), 1), 2: 2, 6: 4})
    assert [h.number for h in heard if h.kind == "again"].count(6) == 3
    (tmp_path / "whole").mkdir()
    run(small, tmp_path / "whole")
    assert table(tmp_path / "bars.study") == table(tmp_path / "whole" / "bars.study")


def test_one_that_is_always_ended_fails_last_and_stops_no_other(small, tmp_path, monkeypatch):
    monkeypatch.setattr("studies.vary.run.attempts.FIRST_WAIT", 0.002)
    small.faults(tmp_path, n1="always killed")
    order = []
    summary = run(small, tmp_path, listener=lambda what: order.append(what.number) if isinstance(what, Happening)
                  and what.kind in ("finished", "failed") else None)
    assert summary.failed == 1 and summary.done == 12 and order[-1] == 1
    assert 5 <= numbers_started(small, tmp_path).count(1) <= 8
    assert summary.failures[0].stage == "ended" and "SIGKILL) 5 times in a row" in summary.failures[0].reason
    small.faults(tmp_path)
    assert run(small, tmp_path, again=["failed"]).failed == 0


def test_again_replaces_what_is_there(small, tmp_path):
    small.faults(tmp_path, n3="fails", n5="fails")
    run(small, tmp_path)
    begun = len(small.started(tmp_path))
    assert run(small, tmp_path).failed == 2 and len(small.started(tmp_path)) == begun  # failed ones stay so
    small.faults(tmp_path, n5="fails")
    summary = run(small, tmp_path, again=["failed"])
    assert summary.failed == 1 and summary.evaluated == 2 and summary.reused == 10
    assert sorted(numbers_started(small, tmp_path)[begun:]) == [3, 5, 5]
    begun = len(small.started(tmp_path))
    small.faults(tmp_path, n12="fails")
    heard = []
    summary = run(small, tmp_path, again=[1, 12], listener=heard.append)
    assert sorted(numbers_started(small, tmp_path)[begun:]) == [1, 12, 12] and summary.done == 12
    assert [failure.number for failure in summary.failures] == [5]  # what had finished is not lost to a later failure
    assert any("variant 12 failed this time" in getattr(what, "text", "") for what in heard)
    with pytest.raises(SpecError, match="numbers of points from 1 to 12"):
        run(small, tmp_path, again=[13])
    with pytest.raises(SpecError, match="allowed: failed"):
        run(small, tmp_path, again=["all"])


def test_points_left_out_are_counted_with_their_rule(small, tmp_path):
    plan = small.make_plan(tmp_path, constraints={"slim": "depth >= 2 * width"})
    summary = run(small, tmp_path, plan)
    assert sum(summary.left_out.values()) == 4 and list(summary.left_out) == ["constraints.slim"]
    assert summary.points == summary.done == 8
    with Record.open(tmp_path / "bars.study") as record:
        assert record.progress().left_out == 4 and record.progress().finished == 8


def test_runs_are_kept_once(small, tmp_path):
    bars = {"depth": {"from": "36 mm", "to": "46 mm", "steps": 5}, "width": ["22 mm", "18 mm"]}
    plan = small.make_plan(tmp_path, bars, keep={"runs": {"best": 2, "worst": 1, "suspicious": 3, "every": 6}})
    summary = run(small, tmp_path, plan)
    of = {variant.number: variant for variant in plan.variants()}
    best = [row.number for row in summary.best[:2]]
    odd = next(v.number for v in of.values() if v.values == {"depth": "46 mm", "width": "22 mm"})
    worst = next(v.number for v in of.values() if v.values == {"depth": "36 mm", "width": "18 mm"})
    wanted = {1, 7, *best, odd, worst}
    assert len(wanted) == 6  # nobody is chosen for two reasons
    assert {path.name for path in (tmp_path / "bars.runs").iterdir()} == {
        f"{number:04d}-{of[number].key[:12]}" for number in wanted}
    assert sorted(summary.kept) == sorted((tmp_path / "bars.runs").iterdir())
    assert kept_run(tmp_path / "bars.study", of[odd].key).name.startswith(f"{odd:04d}-")
    begun = len(small.started(tmp_path))
    assert run(small, tmp_path, plan).kept == () and len(small.started(tmp_path)) == begun


def test_runs_are_kept_here_when_another_machine_evaluates(small, tmp_path):
    made = []

    def elsewhere_then_here():
        made.append(small.SmallBackend(tmp_path))
        made[-1].writes_here = len(made) > 1
        return made[-1]

    plan = small.make_plan(tmp_path, keep={"runs": {"best": 1, "worst": 0, "suspicious": 0, "every": 3}})
    summary = vary(plan, tmp_path / "bars.study", backend=elsewhere_then_here)
    assert len(made) == 2 and made[0].closed and len(summary.kept) == 1
    assert [path.name[:4] for path in (tmp_path / "bars.runs").iterdir()] == [f"{summary.best[0].number:04d}"]


def test_fault_of_what_evaluates_stops_the_study_and_it_goes_on_later(small, tmp_path):
    small.faults(tmp_path, n6="scheduler gone")
    with pytest.raises(StudyStopped, match=r"the scheduler is gone\. \d+ points? (is|are) done .*; the same"):
        run(small, tmp_path, slots=1)
    with Record.open(tmp_path / "bars.study") as record:
        assert record.progress().finished >= 1
    small.faults(tmp_path)
    assert run(small, tmp_path).done == 12
    assert max(Counter(numbers_started(small, tmp_path)).values()) == 1


def test_second_driver_is_told_and_stops(small, tmp_path):
    plan = small.make_plan(tmp_path)
    with Record.create(tmp_path / "bars.study", plan), pytest.raises(RecordHeldError, match="another driver"):
        run(small, tmp_path, plan)
    assert not small.started(tmp_path)


def test_log_has_times_and_its_failure_stops_nothing(small, tmp_path):
    small.faults(tmp_path, n3="fails once", n4="killed 1")
    run(small, tmp_path, log=tmp_path / "bars.log")
    lines = (tmp_path / "bars.log").read_text().splitlines()
    assert all(line[:2] == "20" and line[10] == "T" and line[25:27] == "  " for line in lines)
    assert sum("variant 3 failed (mesh: no attempt" in line for line in lines) == 1
    assert sum("variant 4 was ended from outside (SIGKILL)" in line for line in lines) == 1
    assert sum(" agrees, " in line or " suspicious, " in line for line in lines if " variant " in line) == 12
    assert "every point is done" in lines[-1]
    heard = []
    summary = run(small, tmp_path, record="more.study", log="/dev/full", listener=heard.append)
    assert summary.done == 12
    assert sum("/dev/full cannot be written" in h.text for h in heard if isinstance(h, Happening)) == 1
