"""A study on a cluster of real processes; bars worked out by hand take the place of the models."""

from __future__ import annotations

import os
import re
import signal
import subprocess
import sys
import threading
import time
from collections import Counter
from pathlib import Path

import pytest
from small_cluster import ROOT, Cluster, started, until

from studies.record import Record
from studies.vary.run import StudyStopped, vary

pytestmark = pytest.mark.skipif(sys.platform != "linux", reason="looks into /proc")


def _check(record: Path, count: int = 12) -> None:
    """Every bar is there with its own figures."""
    with Record.open(record) as opened:
        assert opened.progress().finished == count
        for point in opened.points():
            outcome = opened.outcome(point.key)
            assert outcome is not None
            depth, width = point.numbers["depth"], point.numbers["width"]
            assert outcome.figures["mass"].solid == depth * width * 1e-6
            assert outcome.figures["deflection"].solid == 4e6 / (width * depth**3)


def _finished(log: Path) -> Counter[str]:
    """How often the log tells that a variant was finished and is in the record."""
    text = log.read_text() if log.exists() else ""
    return Counter(re.findall(r"variant (\d+) agrees", text))


PLAN = """
title = "Bars"
part = "bar.toml"
[vary]
depth = { from = "36 mm", to = "46 mm", steps = 5 }
width = ["18 mm", "22 mm"]
[aim]
least = "mass"
[keep]
runs = { best = 0, worst = 0, suspicious = 0 }
"""


def _driver(room: Path, *words: str) -> subprocess.Popen[str]:
    """`haunch vary` in a process of its own."""
    (room / "bars.toml").write_text(PLAN)
    return subprocess.Popen([sys.executable, "-m", "studies.cli", "vary", "bars.toml", "--log", "log", *words],
                            cwd=room, text=True, env={**os.environ, "PYTHONPATH": str(ROOT)}, stdout=subprocess.PIPE,
                            stderr=subprocess.PIPE)


def test_a_worker_is_killed_then_the_scheduler_and_the_study_goes_on_here(small, tmp_path):
    """What the worker had is run again, and nothing else. Without the scheduler the command says what happened, shows
    nothing of Dask's own and ends with 3; the record is whole, and nothing in it is evaluated or recorded twice."""
    small.make_plan(tmp_path)
    log = tmp_path / "log"
    with Cluster(tmp_path) as cluster:
        rooms = [tmp_path / name for name in ("first", "second")]
        for room in rooms:
            room.mkdir()
            cluster.worker("bars", WAIT="0.5", ROOM=str(room))
        until(lambda: all("Registered to" in text for text in cluster.said("worker")))
        driver = _driver(tmp_path, "--on", cluster.address)
        until(lambda: len(_finished(log)) >= 2)
        many = len(started(rooms[0]))
        until(lambda: len(started(rooms[0])) > many)  # and so in the midst of one
        cluster.workers[0].kill()
        safe = set(_finished(log))
        until(lambda: "its worker is gone" in log.read_text())
        many = len(_finished(log))
        until(lambda: len(_finished(log)) >= many + 2)
        cluster.end_scheduler()
        began = time.monotonic()
        out, err = driver.communicate(timeout=60)
        assert time.monotonic() - began < 15.0
    done = len(_finished(log))
    assert driver.returncode == 3 and 4 <= done < 12
    assert re.fullmatch(
        f"haunch: the scheduler {cluster.address} is gone: it was ended, or the network is down. Start it again with "
        f"its workers, or leave out --on to go on on this machine alone. {done} points are done and in "
        rf"\S*bars.study; the same command goes on where this one stopped:\n  haunch vary bars.toml --log log --on "
        rf"{cluster.address}\n", err), err
    assert "distributed" not in out and "Traceback" not in out and "is gone; it is run again" not in out
    starts = Counter(number for room in rooms for _, number in started(room))
    ended = re.findall(r"variant (\d+) was ended from outside \(its worker is gone", log.read_text())
    again = {int(number) for number in ended}
    assert again and not again & {int(number) for number in safe}
    assert {number for number, often in starts.items() if often > 1} <= again and max(starts.values()) <= 2

    before = {int(number) for number in _finished(log)}
    (tmp_path / "here").mkdir()
    summary = vary(small.make_plan(tmp_path), tmp_path / "bars.study", log=log,
                   backend=lambda: small.SmallBackend(tmp_path / "here", 2))
    assert (summary.done, summary.reused, summary.evaluated) == (12, done, 12 - done)
    assert not before & {number for _, _, number, _ in small.started(tmp_path / "here")}
    _check(tmp_path / "bars.study")


@pytest.mark.heavy
def test_stop_ends_the_work_on_the_cluster(small, tmp_path):
    with Cluster(tmp_path) as cluster:
        cluster.worker("bars", WAIT="30", threads=2)
        stop = threading.Event()

        def ask() -> None:
            until(lambda: len(started(tmp_path)) == 2)
            stop.set()

        asking = threading.Thread(target=ask)
        asking.start()
        summary = vary(small.make_plan(tmp_path), tmp_path / "bars.study", on=cluster.address, stop=stop)
        asking.join()
        assert summary.interrupted and summary.done == 0
        until(lambda: not any(_alive(pid) for pid, _ in started(tmp_path)), 10.0)
        assert len(started(tmp_path)) == 2 and cluster.workers[0].poll() is None


def _alive(pid: int) -> bool:
    try:
        return Path(f"/proc/{pid}/stat").read_text().rpartition(")")[2].split()[0] != "Z"
    except OSError:
        return False


@pytest.mark.heavy
def test_what_a_killed_driver_has_left_is_ended(small, tmp_path):
    """No word from it for as long as the lease: the variant under way is ended, and the worker is free."""
    small.make_plan(tmp_path)
    with Cluster(tmp_path) as cluster:
        cluster.worker(("bars", "short_lease"), WAIT="60")
        driver = _driver(tmp_path, "--on", cluster.address)
        until(lambda: started(tmp_path))
        driver.send_signal(signal.SIGKILL)
        driver.wait()
        until(lambda: not any(_alive(pid) for pid, _ in started(tmp_path)), 10.0)
        assert cluster.workers[0].poll() is None and len(started(tmp_path)) == 1


@pytest.mark.heavy
def test_all_workers_may_go_and_come_back(small, tmp_path):
    """The study waits, and says so."""
    said: list[str] = []
    with Cluster(tmp_path) as cluster:
        def disturb() -> None:
            until(lambda: any("has no worker yet" in text for text in said))
            first = cluster.worker("bars", WAIT="0.3")
            until(lambda: started(tmp_path))
            first.kill()
            until(lambda: any("there is no other" in text for text in said))
            cluster.worker("bars")

        disturber = threading.Thread(target=disturb)
        disturber.start()
        summary = vary(small.make_plan(tmp_path), tmp_path / "bars.study", on=cluster.address,
                       listener=lambda what: said.append(getattr(what, "text", "")))
        disturber.join()
    assert summary.done == 12
    _check(tmp_path / "bars.study")


@pytest.mark.heavy
def test_lost_in_python(small, tmp_path):
    with Cluster(tmp_path) as cluster:
        until_gone = threading.Timer(3.0, cluster.end_scheduler)
        until_gone.start()
        with pytest.raises(StudyStopped, match=r"the scheduler .* is gone.* 0 points are done"):
            vary(small.make_plan(tmp_path), tmp_path / "bars.study", on=cluster.address)
        until_gone.join()
