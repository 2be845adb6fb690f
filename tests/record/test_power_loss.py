"""The power fails: whatever a disk can leave, every variant told as recorded is there and the record opens."""

from __future__ import annotations

import base64
import importlib.util
import json
import random
import subprocess
import sys
from pathlib import Path
from types import ModuleType, SimpleNamespace
from typing import Any

import pytest

from studies.record import Record

HERE = Path(__file__).parent


def _disk() -> ModuleType:
    found = importlib.util.spec_from_file_location("record_disk", HERE / "disk.py")
    module = importlib.util.module_from_spec(found)
    found.loader.exec_module(module)
    return module


disk = _disk()
reachable = pytest.mark.skipif(disk.library() is None or not hasattr(disk.library(), "sqlite3_vfs_find"),
                               reason="the SQLite of this Python cannot be listened to")


def written(tmp_path: Path, count: int, synchronous: str = "", which: str = "log"
            ) -> tuple[list[list[Any]], dict[str, bytes]]:
    """What the program of `disk` did to its files, and the new record."""
    run = subprocess.run([sys.executable, str(HERE / "disk.py"), str(tmp_path / "arm.study"), str(count), synchronous],
                         capture_output=True, text=True, timeout=120, check=True)
    told = json.loads(run.stdout)
    return told[which], {"arm.study": base64.b64decode(told["start"])}


def lost(log: list[list[Any]], start: dict[str, bytes], cut: int, seed: int, folder: Path,
         study: SimpleNamespace) -> set[int]:
    """Variants that a cut after `cut` lines loses; asserts that the rest is right and the study can go on."""
    folder.mkdir()
    done = disk.after_cut(log, start, cut, folder, random.Random(seed))
    if seed % 2:
        (folder / "arm.study-shm").write_bytes(random.Random(seed).randbytes(32768))  # never synced: any content
    with Record.resume(folder / "arm.study", study.plan()) as record:
        there = record.words()
        for number in done:
            if study.key_of(number) in there:
                assert record.outcome(study.key_of(number)) == study.outcome(number)
        record.set_points([study.variant(10**6)])
        assert record.add(study.variant(10**6), study.outcome(10**6))
    return {number for number in done if study.key_of(number) not in there}


def _cuts(log: list[list[Any]], count: int, rng: random.Random) -> list[int]:
    return sorted(rng.sample(range(1, len(log) + 1), min(count, len(log))))


@reachable
def test_a_cut_at_any_moment_loses_nothing_that_was_recorded(tmp_path: Path, study: SimpleNamespace) -> None:
    log, start = written(tmp_path, 24)
    assert sum(line[0] == "sync" and line[1] == "arm.study" for line in log) >= 3  # checkpoints are among it
    for k, cut in enumerate(_cuts(log, 40, random.Random(1))):
        assert lost(log, start, cut, k, tmp_path / str(k), study) == set(), f"cut after line {cut}, seed {k}"


@reachable
@pytest.mark.heavy
def test_a_cut_after_every_line_of_the_log(tmp_path: Path, study: SimpleNamespace) -> None:
    log, start = written(tmp_path, 60)
    for k, cut in enumerate(range(1, len(log) + 1)):
        for seed in (2 * k, 2 * k + 1):
            folder = tmp_path / f"{k}-{seed}"
            assert lost(log, start, cut, seed, folder, study) == set(), f"cut after line {cut}, seed {seed}"


@reachable
def test_the_simulated_disk_does_lose_what_was_not_synced(tmp_path: Path, study: SimpleNamespace) -> None:
    """The check of the check: without a sync at each commit the same cuts lose variants."""
    log, start = written(tmp_path, 24, "NORMAL")
    losses = [lost(log, start, cut, k, tmp_path / str(k), study)
              for k, cut in enumerate(_cuts(log, 20, random.Random(1)))]
    assert any(losses)


@reachable
def test_a_new_record_is_on_the_disk_before_it_has_its_name(tmp_path: Path) -> None:
    log, _ = written(tmp_path, 1, which="making")
    mine = [what for what, name, *_ in log if name == ".arm.study.new"]
    assert mine.count("write") > 5 and mine[-1] == "sync"


def test_rubbish_behind_the_last_commit_changes_nothing(tmp_path: Path, study: SimpleNamespace) -> None:
    """Copies of the record and its log after each commit, with what lies beyond it in the log cut off, zeroed or
    garbled from a random place on; and the next commit torn."""
    path, rng, states = tmp_path / "arm.study", random.Random(3), []
    log = path.with_name(path.name + "-wal")
    with Record.create(path, study.plan()) as record:
        for number in range(1, 16):
            record.add(study.variant(number), study.outcome(number))
            states.append((path.read_bytes(), log.read_bytes(), number))
        # reading the files has let SQLite's locks go (POSIX), which matters to no other process here
    for k, ((base, whole, number), (_, longer, _)) in enumerate(zip(states, states[1:] + states[-1:], strict=True)):
        for how in ("cut", "zero", "garble"):
            tail = bytearray(longer[len(whole):] or rng.randbytes(5000))
            at = rng.randrange(len(tail))
            tail[at:] = {"cut": b"", "zero": bytes(len(tail) - at), "garble": rng.randbytes(len(tail) - at)}[how]
            folder = tmp_path / f"{k}{how}"
            folder.mkdir()
            (folder / "arm.study").write_bytes(base)
            (folder / "arm.study-wal").write_bytes(whole + tail)
            with Record.open(folder / "arm.study") as record:
                assert [row["number"] for row in record.table()] == list(range(1, number + 1))
                assert all(record.outcome(study.key_of(n)) == study.outcome(n) for n in range(1, number + 1))


def test_a_log_damaged_within_gives_an_earlier_state_never_a_wrong_one(tmp_path: Path, study: SimpleNamespace) -> None:
    """No power cut does this, but a bad disk can: what was recorded after that place is computed again."""
    path, rng, counts = tmp_path / "arm.study", random.Random(4), set()
    log = path.with_name(path.name + "-wal")
    with Record.create(path, study.plan()) as record:
        for number in range(1, 16):
            record.add(study.variant(number), study.outcome(number))
        base, whole = path.read_bytes(), log.read_bytes()
    for k in range(30):
        folder, at = tmp_path / str(k), rng.randrange(40, len(whole) - 64)
        folder.mkdir()
        (folder / "arm.study").write_bytes(base)
        (folder / "arm.study-wal").write_bytes(whole[:at] + rng.randbytes(64) + whole[at + 64:])
        with Record.resume(folder / "arm.study", study.plan()) as record:
            table = record.table()
            assert [row["number"] for row in table] == list(range(1, len(table) + 1))
            assert all(record.outcome(row["key"]) == study.outcome(row["number"]) for row in table)
            counts.add(len(table))
    assert len(counts) > 5
