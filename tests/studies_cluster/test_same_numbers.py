"""Heavy: real parts on a cluster give the table of one machine, bit for bit, also when workers and scheduler are
killed."""

from __future__ import annotations

import sys
import threading
from pathlib import Path

import pytest
from small_cluster import Cluster, until

from studies.vary.plan import read_plan
from studies.vary.run import StudyStopped, runs_folder, vary

sys.path.append(str(Path(__file__).parents[1] / "studies_run"))
import night

pytestmark = pytest.mark.heavy
SHAPES, PUSHES = 4, 2


@pytest.fixture(scope="module")
def local(tmp_path_factory) -> Path:
    """The record of an undisturbed study on this machine."""
    room = tmp_path_factory.mktemp("local")
    night.make_room(room, SHAPES, PUSHES)
    vary(read_plan(room / "bars.toml"), room / "bars.study", workers=1)
    return room / "bars.study"


def _finished(room: Path) -> int:
    return len(night.finished(room / "bars.study"))


def test_worker_killed_in_mid_study(local, tmp_path):
    night.make_room(tmp_path, SHAPES, PUSHES)
    with Cluster(tmp_path) as cluster:
        cluster.worker(threads=2, nanny=True)
        victim = cluster.worker()
        until(lambda: all("Registered to" in text for text in cluster.said("worker")))
        said: list[str] = []

        def kill() -> None:
            until(lambda: _finished(tmp_path) >= 2, 300.0)
            victim.kill()

        killer = threading.Thread(target=kill)
        killer.start()
        summary = vary(read_plan(tmp_path / "bars.toml"), tmp_path / "bars.study", on=cluster.address,
                       log=tmp_path / "log", listener=lambda what: said.append(getattr(what, "text", "")))
        killer.join()
    assert summary.done == summary.evaluated == SHAPES * PUSHES
    assert any("is gone" in text for text in said)
    assert night.results(tmp_path / "bars.study") == night.results(local)
    assert set(night.finished_lines(tmp_path).values()) == {1}


def test_scheduler_killed_in_mid_study_then_on_this_machine(local, tmp_path):
    night.make_room(tmp_path, SHAPES, PUSHES)
    with Cluster(tmp_path) as cluster:
        cluster.worker()

        def kill() -> None:
            until(lambda: _finished(tmp_path) >= 2, 300.0)
            cluster.end_scheduler()

        killer = threading.Thread(target=kill)
        killer.start()
        with pytest.raises(StudyStopped, match="is gone"):
            vary(read_plan(tmp_path / "bars.toml"), tmp_path / "bars.study", on=cluster.address, log=tmp_path / "log")
        killer.join()
    done = night.finished(tmp_path / "bars.study")
    assert 2 <= len(done) < SHAPES * PUSHES
    vary(read_plan(tmp_path / "bars.toml"), tmp_path / "bars.study", log=tmp_path / "log")
    after = night.finished(tmp_path / "bars.study")
    assert all(after[key] == time for key, time in done.items())
    assert night.results(tmp_path / "bars.study") == night.results(local)
    assert set(night.finished_lines(tmp_path).values()) == {1}


def test_run_folders_are_kept_on_the_drivers_machine(local, tmp_path):
    """The best, and every third as it is evaluated: on this machine, with the numbers of the cluster."""
    plan = night.make_room(tmp_path, SHAPES, PUSHES)
    plan.write_text(plan.read_text().replace("best = 0", "best = 1, every = 3"))
    with Cluster(tmp_path) as cluster:
        cluster.worker()
        vary(read_plan(plan), tmp_path / "bars.study", on=cluster.address)
    assert night.results(tmp_path / "bars.study") == night.results(local)
    runs = sorted(path.name[:4] for path in runs_folder(tmp_path / "bars.study").iterdir())
    assert runs == ["0001", "0004", "0007"]
    assert all((path / "result.json").exists() for path in runs_folder(tmp_path / "bars.study").iterdir())
