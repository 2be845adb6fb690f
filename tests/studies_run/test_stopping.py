"""A driver in a process of its own: asked to stop, killed, and with a full disk."""

from __future__ import annotations

import os
import random
import resource
import signal
import time
from collections import Counter
from pathlib import Path
from typing import Any

import pytest

from studies.record import Record, RecordError


def words(room: Path) -> dict[str, str]:
    """What is in the record, read while it may be written."""
    try:
        with Record.open(room / "bars.study", check=False) as record:
            return record.words()
    except RecordError:  # there is none yet
        return {}


def wait_for(room: Path, count: int) -> None:
    deadline = time.monotonic() + 30
    while len(words(room)) < count:
        assert time.monotonic() < deadline
        time.sleep(0.05)


def rows(room: Path) -> list[dict[str, Any]]:
    with Record.open(room / "bars.study") as record:
        return record.table()


def keys_of(small: Any, room: Path, process: int) -> list[str]:
    """Keys of the variants that a driver has started."""
    return [key for driver, key, _, _ in small.started(room) if driver == process]


def test_signals_stop_and_the_same_command_goes_on(small, tmp_path):
    before: set[str] = set()
    for name in ("SIGINT", "SIGTERM", "SIGHUP"):
        one = small.Driver(tmp_path)
        wait_for(tmp_path, len(before) + 3)
        one.kill(signal.Signals[name])
        said = one.said()
        assert one.returncode == 130 and said.endswith(f"of 20 {name}")
        assert not before & set(keys_of(small, tmp_path, one.pid))
        assert len(words(tmp_path)) >= len(before) + 3 and said.startswith(f"{len(words(tmp_path))} of")
        before = set(words(tmp_path))
    last = small.Driver(tmp_path, 0.0)
    assert last.said() == "20 of 20 " and last.returncode == 0 and len(before) < 20
    assert not before & set(keys_of(small, tmp_path, last.pid))


def test_ignored_hang_up_stays_ignored(small, tmp_path):
    """As under nohup."""
    one = small.Driver(tmp_path, 0.05, 1, lambda: signal.signal(signal.SIGHUP, signal.SIG_IGN))
    wait_for(tmp_path, 1)
    one.kill(signal.SIGHUP)
    assert one.said() == "4 of 4 "


def test_full_disk_stops_with_words_and_nothing_is_lost(small, tmp_path):
    """A limit on the size of any file stands for the full disk: the write is refused by the system in the same way."""
    limit = 480 * 1024
    full = small.Driver(tmp_path, 0.0, 14, lambda: resource.setrlimit(resource.RLIMIT_FSIZE, (limit, limit)))
    said = full.said()
    assert full.returncode == 3 and "cannot be written" in said and "the same command goes on" in said
    before = set(words(tmp_path))
    assert 0 < len(before) < 30 and f"{len(before)} points are done" in said
    second = small.Driver(tmp_path, 0.0, 14)
    assert second.said() == "30 of 30 "
    assert not before & set(keys_of(small, tmp_path, second.pid))


def killed_often(small: Any, room: Path, kills: int, seed: int, steps: int) -> Counter[str]:
    """Kill drivers and their children at random, `kills` times; then let the study end.

    What was in the record when a driver was killed is never started again by the next.
    """
    chance, done = random.Random(seed), Counter[str]()
    safe: dict[int, set[str]] = {}
    one = small.Driver(room, 0.2, steps)
    while done.total() < kills:
        time.sleep(chance.uniform(0.05, 0.3))
        assert one.poll() is None, "the study was over before all kills"
        children = [int(pid) for task in Path(f"/proc/{one.pid}/task").glob("*/children")
                    for pid in task.read_text().split()]
        if not children:
            continue
        if chance.random() < 0.75:
            os.kill(chance.choice(children), signal.SIGKILL)
            done["child"] += 1
        else:
            one.kill()
            one.said()
            done["driver"] += 1
            before, killed = set(words(room)), one
            one = small.Driver(room, 0.2, steps)
            safe[one.pid] = before
            assert killed.returncode == -signal.SIGKILL
    assert one.said().startswith(f"{2 * steps + 2} of")
    assert all(not before & set(keys_of(small, room, process)) for process, before in safe.items())
    return done


@pytest.mark.parametrize(("kills", "steps"), [(12, 19), pytest.param(100, 149, marks=pytest.mark.heavy)])
def test_random_kills_lose_nothing(small, tmp_path, kills, steps):
    """As in ``test_kills.py``, with small processes in place of the real work."""
    done = killed_often(small, tmp_path, kills, 1, steps)
    assert done.total() == kills and len(done) == 2
    finished = [line.split("variant ")[1].split()[0] for line in (tmp_path / "log").read_text().splitlines()
                if " deflection " in line or "every limit met" in line]
    assert len(finished) >= 2 * steps and max(Counter(finished).values()) == 1
    (tmp_path / "whole").mkdir()
    small.Driver(tmp_path / "whole", 0.0, steps).said()
    assert rows(tmp_path) == rows(tmp_path / "whole") and len(rows(tmp_path)) == 2 * steps + 2
