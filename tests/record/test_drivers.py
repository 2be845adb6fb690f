"""Drivers and readers in processes of their own on one record."""

from __future__ import annotations

import os
import random
import signal
import sqlite3
import subprocess
import sys
import time
from collections.abc import Iterator
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from pathlib import Path
from types import SimpleNamespace

import pandas
import pytest

from studies.record import Record, RecordBusyError, RecordError, RecordHeldError
from studies.record.lock import Lock

HERE = Path(__file__).parent


@contextmanager
def driver(path: Path, *words: object) -> Iterator[subprocess.Popen[str]]:
    """A driver that has opened the record."""
    command = [sys.executable, str(HERE / "writing.py"), str(path), *map(str, words)]
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True) as run:
        try:
            assert run.stdout.readline() == "open\n"
            yield run
        finally:
            run.kill()


def test_the_second_driver_is_told_who_the_first_is(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    with driver(path, "hold", 0) as first:
        for way in (lambda: Record.resume(path, study.plan()), lambda: Record.create(path, study.plan())):
            with pytest.raises(RecordHeldError, match=rf"driver \(process {first.pid} on \S+, since 20") as error:
                way()
            assert "--record" in str(error.value)
        Record.open(path).close()  # a reader may
    with Record.resume(path, study.plan()) as record:  # the first one was killed: its lock went with it
        assert record.add(study.variant(1), study.outcome(1))
        with pytest.raises(RecordHeldError, match=f"process {os.getpid()}"):
            Record.resume(path, study.plan())
        link = tmp_path / "other.study"
        link.symlink_to(path)
        with pytest.raises(RecordHeldError):
            Record.resume(link, study.plan())
    assert sorted(p.name for p in tmp_path.iterdir()) == ["arm.study", "other.study"]


def _counts(path: Path, counter: Path, times: int) -> int:
    """Add one to the number in a file `times` times, each under the lock of its own."""
    for _ in range(times):
        while True:
            try:
                lock = Lock(path)
                break
            except RecordHeldError:
                time.sleep(0.0005)
        counter.write_text(str(int(counter.read_text()) + 1))
        lock.release()
    return times


def test_the_lock_has_one_holder_at_a_time(tmp_path: Path) -> None:
    """Four processes take it and give it up, which removes its file, as fast as they can."""
    path, counter = tmp_path / "arm.study", tmp_path / "counter"
    counter.write_text("0")
    children = []
    for _ in range(4):
        if (child := os.fork()) == 0:
            os._exit(0 if _counts(path, counter, 150) else 1)
        children.append(child)
    assert [os.waitpid(child, 0)[1] for child in children] == [0] * 4
    assert counter.read_text() == "600"


def test_a_forked_child_does_not_keep_the_lock_of_a_killed_driver(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    with driver(path, "fork", 0) as first:
        time.sleep(0.2)
        first.kill()
        os.waitpid(first.pid, 0)
        with Record.resume(path, study.plan()) as record:
            assert record.add(study.variant(1), study.outcome(1))
        path.with_suffix(".stop").touch()  # ends the child


def test_reading_while_a_driver_writes(tmp_path: Path, study: SimpleNamespace) -> None:
    path, seen = tmp_path / "arm.study", []
    with driver(path, 1, 10**6, 0.01) as run:
        while len(seen) < 12:
            told = int(run.stdout.readline())
            with sqlite3.connect(f"file:{path}?mode=ro", uri=True) as db:
                table = pandas.read_sql("select * from results", db)
            db.close()
            with Record.open(path) as record:  # checks the whole file, too, while it is written
                assert len(record.table()) >= len(table)
            assert len(table) >= told
            assert list(table["number"]) == list(range(1, len(table) + 1))
            for row in table.itertuples():
                if row.status == "finished":
                    assert row.mass == study.outcome(row.number).figures["mass"].solid
            seen.append(len(table))
    assert len(set(seen)) > 3 and seen == sorted(seen)


def test_pandas_in_another_process_reads_it_as_it_is(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    with Record.create(path, study.plan()) as record:
        for number in (1, 2, 3):
            record.add(study.variant(number), study.outcome(number))
        code = ("import sqlite3, sys, pandas; db = sqlite3.connect(sys.argv[1]);"
                "print(pandas.read_sql('select number, root_depth, mass, fine from results', db).to_csv(index=False))")
        read = subprocess.run([sys.executable, "-c", code, str(path)], capture_output=True, text=True, check=True,
                              timeout=60).stdout.split()
        assert record.add(study.variant(4), study.outcome(4))  # the reader has left nothing locked
    assert read[0] == "number,root_depth,mass,fine"
    numbers = [float(cell) for cell in read[3].split(",")]
    assert numbers == [3.0, study.variant(3).numbers["root_depth"], study.outcome(3).figures["mass"].solid, 1.0]


def test_a_reader_in_the_writers_process_gives_no_lock_up(tmp_path: Path, study: SimpleNamespace) -> None:
    """Else another process would take the write-ahead log for a leftover, and remove it."""
    path = tmp_path / "arm.study"
    with Record.create(path, study.plan()) as record:
        record.add(study.variant(1), study.outcome(1))
        Record.open(path).close()
        code = "import sqlite3, sys; db = sqlite3.connect(sys.argv[1]); db.execute('select * from study'); db.close()"
        subprocess.run([sys.executable, "-c", code, str(path)], check=True, timeout=60)
        assert path.with_name("arm.study-wal").exists()
        assert record.add(study.variant(2), study.outcome(2))
    with Record.open(path) as record:
        assert len(record.words()) == 2


def test_a_forked_child_that_closes_the_record_harms_nothing(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    with Record.create(path, study.plan()) as record:
        record.add(study.variant(1), study.outcome(1))
        assert study.in_child(record.close) == "None"
        assert path.with_name("arm.study-wal").exists() and path.with_name("arm.study.lock").exists()
        assert record.add(study.variant(2), study.outcome(2))
        with pytest.raises(RecordHeldError):
            Record.resume(path, study.plan())
    with Record.open(path) as record:
        assert len(record.words()) == 2


def killed_again_and_again(path: Path, study: SimpleNamespace, kills: int) -> None:
    """SIGKILL a driver in the middle of its commits; what it had told must be there, each once, and right."""
    rng, number = random.Random(7), 1
    for _ in range(kills):
        with driver(path, number, 10**6) as run:
            for _ in range(rng.randrange(1, 5)):
                run.stdout.readline()
            time.sleep(rng.random() * 0.008)  # a commit takes a few milliseconds
            run.send_signal(signal.SIGKILL)
            told = [int(line) for line in run.stdout.read().split() if line.isdigit()]
            number = max([number, *told])
        with Record.open(path) as record:
            table = record.table()
            assert len(table) >= number
            assert [row["number"] for row in table] == list(range(1, len(table) + 1))
            assert len({row["key"] for row in table}) == len(table)
            assert all(row["status"] != "waiting" for row in table)  # a point and its outcome come together
            for row in table:
                assert record.outcome(row["key"]) == study.outcome(row["number"])
        number = len(table) + 1


def test_a_killed_driver_loses_nothing_short(tmp_path: Path, study: SimpleNamespace) -> None:
    killed_again_and_again(tmp_path / "arm.study", study, 5)


@pytest.mark.heavy
def test_fifty_killed_drivers_lose_nothing(tmp_path: Path, study: SimpleNamespace) -> None:
    killed_again_and_again(tmp_path / "arm.study", study, 50)


def test_another_program_that_holds_the_record_is_told(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    with Record.create(path, study.plan()) as record:
        record._db.execute("PRAGMA busy_timeout = 50")
        other = sqlite3.connect(path, isolation_level=None)
        other.execute("BEGIN IMMEDIATE")
        with pytest.raises(RecordBusyError, match="another program"):
            record.add(study.variant(1), study.outcome(1))
        other.execute("ROLLBACK")
        other.close()
        assert record.add(study.variant(1), study.outcome(1))


@pytest.mark.parametrize("which", ["arm.study", "arm.study-wal"])
def test_a_record_removed_under_its_driver_is_told(tmp_path: Path, study: SimpleNamespace, which: str) -> None:
    path = tmp_path / "arm.study"
    with Record.create(path, study.plan()) as record:
        record.add(study.variant(1), study.outcome(1))
        (tmp_path / which).rename(tmp_path / "elsewhere")
        with pytest.raises(RecordError, match="moved or removed"):
            record.add(study.variant(2), study.outcome(2))
        (tmp_path / "elsewhere").rename(tmp_path / which)
        assert record.add(study.variant(2), study.outcome(2))
    with Record.open(path) as record:
        assert len(record.words()) == 2


def test_threads_of_one_driver_may_add_at_once(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    with Record.create(path, study.plan()) as record, ThreadPoolExecutor(4) as pool:
        added = list(pool.map(lambda k: record.add(study.variant(k // 2), study.outcome(k // 2)), range(2, 62)))
    assert sum(added) == 30 + 4  # each came twice, and the four failures gave way to the second time
    with Record.open(path) as record:
        assert [row["number"] for row in record.table()] == list(range(1, 31))
