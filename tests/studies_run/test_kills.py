"""Heavy: real studies through the command line. One hundred random kills; five hundred variants in a row."""

from __future__ import annotations

import os
import sys
import time
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parent))
import night

pytestmark = pytest.mark.heavy


def test_hundred_random_kills_lose_nothing(tmp_path):
    """Jobs, templates and drivers are killed. No finished variant is lost or computed twice, no process outlives its
    driver, and the table is that of an undisturbed run, bit for bit."""
    room, whole = tmp_path / "killed", tmp_path / "whole"
    for each in (room, whole):
        each.mkdir()
        night.make_room(each, 100, 2)
    killer = night.Killer(room, seed=1)
    assert not killer.work(100), f"the study was over after {killer.killed}"
    killer.end()
    assert killer.killed.total() == 100 and min(killer.killed.values()) >= 5
    assert not killer.lost and not killer.orphans
    assert len(killer.safe) == 200 and max(night.finished_lines(room).values()) == 1
    undisturbed = night.start(whole)
    undisturbed.communicate(timeout=1800)
    assert night.results(room / "bars.study") == night.results(whole / "bars.study")
    assert not list((room / "tmp").iterdir())


def test_five_hundred_variants(tmp_path):
    """All finish, the driver does not grow, nothing is left behind."""
    night.make_room(tmp_path, 50, 10)
    driver = night.start(tmp_path)
    held = []
    while driver.poll() is None:
        time.sleep(2.0)
        try:
            pages = int(Path(f"/proc/{driver.pid}/statm").read_text().split()[1])
            handles = len(list(Path(f"/proc/{driver.pid}/fd").iterdir()))
        except OSError:
            break
        resident = pages * os.sysconf("SC_PAGE_SIZE") / 2**20
        held.append((len(night.finished(tmp_path / "bars.study")), resident, handles))
    said = driver.communicate()[0]
    assert driver.returncode == 0, said
    assert len(night.finished(tmp_path / "bars.study")) == 500
    early = [each for each in held if 50 <= each[0] <= 100]
    late = [each for each in held if each[0] >= 450]
    assert max(each[1] for each in late) < max(each[1] for each in early) + 20.0  # MiB
    assert max(each[2] for each in late) <= max(each[2] for each in early) + 4
    assert not list((tmp_path / "tmp").iterdir())
