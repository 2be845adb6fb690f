"""No room: what was recorded stays, the driver is told, and can add the same variant when there is room again."""

from __future__ import annotations

import shutil
import subprocess
import sys
from pathlib import Path
from types import SimpleNamespace

import pytest

from studies.record import Record, RecordFullError

HERE = Path(__file__).parent


def test_a_full_record_takes_the_variant_when_there_is_room_again(tmp_path: Path, study: SimpleNamespace) -> None:
    path, number = tmp_path / "arm.study", 0
    with Record.create(path, study.plan()) as record:
        (pages,) = record._db.execute("PRAGMA page_count").fetchone()
        record._db.execute(f"PRAGMA max_page_count = {pages + 8}")
        with pytest.raises(RecordFullError, match="Make room in"):
            for number in range(1, 1000):
                record.add(study.variant(number), study.outcome(number))
        assert 3 < number < 999
        assert len(record.words()) == number - 1
        record._db.execute(f"PRAGMA max_page_count = {pages + 1000}")
        assert record.add(study.variant(number), study.outcome(number))
    with Record.open(path) as record:
        assert [row["number"] for row in record.table()] == list(range(1, number + 1))


def _until_full(path: Path, study: SimpleNamespace) -> str:
    done = []
    try:
        with Record.create(path, study.plan()) as record:
            for number in range(1, 10000):
                record.add(study.variant(number), study.outcome(number))
                done.append(number)
    except RecordFullError as error:
        return f"{len(done)} {error}"
    return "never full"


def test_a_limit_on_the_size_of_files(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    told = study.in_child(lambda: _until_full(path, study), largest_file=500_000)
    count = int(told.split()[0])
    assert count > 3 and "cannot be written" in told and "Make room" in told
    with Record.resume(path, study.plan()) as record:
        assert len(record.words()) == count
        assert all(record.outcome(study.key_of(n)) == study.outcome(n) for n in range(1, count + 1))
        assert record.add(study.variant(count + 1), study.outcome(count + 1))


FULL = """
import sys, pathlib, shutil
sys.path.insert(0, sys.argv[1])
import small_study as study
from studies.record import Record, RecordFullError
folder, aside = pathlib.Path(sys.argv[2]), pathlib.Path(sys.argv[3])
path, done = folder / "arm.study", 0
try:
    with Record.create(path, study.P()) as record:
        for number in range(1, 10000):
            record.add(study.variant(number), study.outcome(number))
            done = number
except RecordFullError as error:
    assert "full" in str(error), error
with Record.open(path) as record:  # a reader on the full disk
    assert len(record.words()) == done
for file in folder.iterdir():
    shutil.copy(file, aside)
print(done)
"""


def test_a_disk_that_is_full(tmp_path: Path, study: SimpleNamespace) -> None:
    """A disk of 600 KB of its own, in a space of mounts of its own."""
    disk, aside = tmp_path / "disk", tmp_path / "aside"
    disk.mkdir()
    aside.mkdir()
    script = ('mount -t tmpfs -o size=600k tmpfs "$1" || exit 99; shift; exec "$@"')
    command = ["unshare", "--map-root-user", "--mount", "sh", "-c", script, "sh", str(disk), sys.executable, "-c", FULL,
               str(HERE), str(disk), str(aside)]
    if shutil.which("unshare") is None:
        pytest.skip("no unshare here")
    run = subprocess.run(command, capture_output=True, text=True, timeout=120)
    if run.returncode == 99 or "unshare" in run.stderr:
        pytest.skip(f"a disk may not be mounted here: {run.stderr}")
    assert run.returncode == 0, run.stderr
    count = int(run.stdout)
    assert count > 3
    with Record.resume(aside / "arm.study", study.plan()) as record:
        assert len(record.words()) == count
        assert all(record.outcome(study.key_of(n)) == study.outcome(n) for n in range(1, count + 1))
        assert record.add(study.variant(count + 1), study.outcome(count + 1))
