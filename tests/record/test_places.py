"""Where a record cannot be: each told in clear words, and what is there is left alone."""

from __future__ import annotations

import os
import shutil
import sqlite3
import tempfile
from collections.abc import Iterator
from pathlib import Path
from types import SimpleNamespace

import pytest

from studies.record import Record, RecordError
from studies.record.place import is_network, kind_of, refuse_network


@pytest.fixture
def open_folder() -> Iterator[Path]:
    """A folder that every user may enter (pytest's own are private)."""
    folder = Path(tempfile.mkdtemp())
    folder.chmod(0o755)
    yield folder
    folder.chmod(0o755)
    shutil.rmtree(folder)


def reads(path: Path, study: SimpleNamespace) -> bool:
    with Record.open(path) as record:
        return record.outcome(study.key_of(1)) == study.outcome(1)


MOUNTS = r"""22 27 0:21 / /proc rw,relatime - proc proc rw
27 1 254:0 / / rw,relatime shared:1 - ext4 /dev/vda rw,discard
40 27 0:40 / /data rw,relatime shared:5 master:2 - nfs4 server:/export/home rw,vers=4.2,addr=10.0.0.1
41 27 0:41 / /srv/My\040Data rw - cifs //server/data rw,vers=3.1.1
42 27 0:42 / /mnt/far rw,nosuid - fuse.sshfs me@host:/data rw,user_id=0
43 27 0:43 / /mnt rw - tmpfs tmpfs rw
44 27 0:44 / /mnt/shared rw - 9p share rw,trans=virtio
45 40 254:1 / /data/me/scratch rw - xfs /dev/vdb rw
46 27 0:46 / /over rw - nfs server:/x rw
47 46 254:2 / /over rw - ext4 /dev/vdc rw
48 27 0:48 / /pool rw - lustre mds@tcp:/pool rw
49 27 0:49 / /win rw - fuseblk /dev/sdb1 rw
50 27 0:50 / /layer rw - overlay overlay rw,lowerdir=/a
"""
"""Lines as proc(5) describes them."""


@pytest.mark.parametrize(("path", "kind", "network"), [
    ("/var/tmp/a.study", "ext4", False),
    ("/data/me/a.study", "nfs4", True),
    ("/data/me/scratch/a.study", "xfs", False),
    ("/datas/a.study", "ext4", False),
    ("/srv/My Data/a.study", "cifs", True),
    ("/mnt/a.study", "tmpfs", False),
    ("/mnt/far/deep/er/a.study", "fuse.sshfs", True),
    ("/mnt/shared/a.study", "9p", True),
    ("/over/a.study", "ext4", False),  # a local disk mounted over the network drive
    ("/pool/a.study", "lustre", True),
    ("/win/a.study", "fuseblk", False),
    ("/layer/a.study", "overlay", False),
])
def test_network_drives_are_known(path: str, kind: str, network: bool) -> None:
    assert kind_of(Path(path), MOUNTS) == kind
    assert is_network(kind) is network
    if network:
        with pytest.raises(RecordError, match=rf"network drive \({kind}\), which is refused: .*locks(.|\n)*--record"):
            refuse_network(Path(path), MOUNTS)
    else:
        refuse_network(Path(path), MOUNTS)


def test_the_place_of_the_tests_is_known(tmp_path: Path) -> None:
    assert kind_of(tmp_path) != ""
    assert kind_of(Path("/proc/self/status")) == "proc"
    assert kind_of(Path("/dev/shm")) in ("tmpfs", "devtmpfs", "overlay")


def test_a_network_drive_is_refused_and_a_resting_record_on_it_is_read(
        tmp_path: Path, study: SimpleNamespace, monkeypatch: pytest.MonkeyPatch) -> None:
    """A list of mounts in which the folder of the test is one; the files are real."""
    path, log = tmp_path / "arm.study", tmp_path / "arm.study-wal"
    with Record.create(path, study.plan()) as record:
        record.add(study.variant(1), study.outcome(1))
        busy = log.read_bytes()
    mounts = tmp_path / "mountinfo"
    mounts.write_text(f"1 0 0:1 / / rw - ext4 x rw\n2 1 0:2 / {tmp_path} rw - nfs4 server:/x rw\n")
    monkeypatch.setattr("studies.record.place.MOUNTS", mounts)
    with pytest.raises(RecordError, match="network drive"):
        Record.create(tmp_path / "new.study", study.plan())
    with pytest.raises(RecordError, match="network drive"):
        Record.resume(path, study.plan())
    with Record.open(path) as record:
        assert record.outcome(study.key_of(1)) == study.outcome(1)
    assert sorted(p.name for p in tmp_path.iterdir()) == ["arm.study", "mountinfo"]
    log.write_bytes(busy)
    with pytest.raises(RecordError, match="not closed by its driver(.|\n)*network drive(.|\n)*Copy it"):
        Record.open(path)


def test_a_file_that_is_no_record_is_left_alone(tmp_path: Path, study: SimpleNamespace) -> None:
    text, empty, other = tmp_path / "notes.txt", tmp_path / "empty", tmp_path / "other.db"
    text.write_text("my notes\n" * 1000)
    empty.touch()
    db = sqlite3.connect(other)
    db.execute("CREATE TABLE mine (x)")
    db.commit()
    db.close()
    for path in (text, empty, other):
        before = path.read_bytes()
        for way in (lambda: Record.open(path), lambda: Record.resume(path, study.plan())):  # noqa: B023
            with pytest.raises(RecordError, match="no record of Haunch(.|\n)*--record"):
                way()
        with pytest.raises(RecordError, match="exists already"):
            Record.create(path, study.plan())
        assert path.read_bytes() == before
    assert sorted(p.name for p in tmp_path.iterdir()) == ["empty", "notes.txt", "other.db"]


def test_folders(tmp_path: Path, study: SimpleNamespace) -> None:
    for way in (Record.open, lambda path: Record.create(path, study.plan())):
        with pytest.raises(RecordError, match="is a folder"):
            way(tmp_path)
        with pytest.raises(RecordError, match="does not exist: make it"):
            way(tmp_path / "none" / "arm.study")
    with pytest.raises(RecordError, match="there is no record"):
        Record.open(tmp_path / "arm.study")
    with pytest.raises(RecordError, match="there is no record"):
        Record.resume(tmp_path / "arm.study", study.plan())
    assert not list(tmp_path.iterdir())


def test_names_with_every_kind_of_letter(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "a b?mode=memory#%41'\"é.study"
    with Record.create(path, study.plan()) as record:
        record.add(study.variant(1), study.outcome(1))
    with Record.open(path) as record:
        assert len(record.words()) == 1
    assert [p.name for p in tmp_path.iterdir()] == [path.name]


def test_a_second_name_is_refused(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    Record.create(path, study.plan()).close()
    os.link(path, tmp_path / "same.study")
    with pytest.raises(RecordError, match="hard link"):
        Record.resume(path, study.plan())


def test_a_log_without_its_record_is_not_mixed_with_a_new_one(tmp_path: Path, study: SimpleNamespace) -> None:
    path, log = tmp_path / "arm.study", tmp_path / "arm.study-wal"
    with Record.create(path, study.plan()) as record:
        record.add(study.variant(1), study.outcome(1))
        busy = log.read_bytes()
    path.unlink()
    log.write_bytes(busy)
    with pytest.raises(RecordError, match="no longer beside it"):
        Record.create(path, study.plan())
    assert log.read_bytes() == busy and not path.exists()


def test_a_read_only_file(open_folder: Path, study: SimpleNamespace) -> None:
    path = open_folder / "arm.study"
    with Record.create(path, study.plan()) as record:
        record.add(study.variant(1), study.outcome(1))
    open_folder.chmod(0o777)
    path.chmod(0o444)
    before = path.read_bytes()
    told = study.in_child(lambda: Record.resume(path, study.plan()), ordinary=True)
    assert told.startswith("RecordError") and "read-only" in told and "--record" in told
    assert study.in_child(lambda: reads(path, study), ordinary=True) == "True"
    assert path.read_bytes() == before


def test_a_read_only_folder(open_folder: Path, study: SimpleNamespace) -> None:
    path, log = open_folder / "arm.study", open_folder / "arm.study-wal"
    with Record.create(path, study.plan()) as record:
        record.add(study.variant(1), study.outcome(1))
        base, busy = path.read_bytes(), log.read_bytes()
        # while its owner writes it, others may read it
        open_folder.chmod(0o555)
        for file in open_folder.iterdir():
            file.chmod(0o444)
        assert study.in_child(lambda: reads(path, study), ordinary=True) == "True"
        open_folder.chmod(0o755)
        for file in open_folder.iterdir():
            file.chmod(0o644)
    open_folder.chmod(0o555)
    for way in (lambda: Record.resume(path, study.plan()), lambda: Record.create(open_folder / "new", study.plan())):
        told = study.in_child(way, ordinary=True)
        assert told.startswith("RecordError") and "may not be written in" in told and "--record" in told
    assert study.in_child(lambda: reads(path, study), ordinary=True) == "True"
    # left open by a killed driver
    open_folder.chmod(0o755)
    path.write_bytes(base)
    log.write_bytes(busy)
    open_folder.chmod(0o555)
    told = study.in_child(lambda: Record.open(path), ordinary=True)
    assert told.startswith("RecordError") and "not closed by its driver" in told and "Copy it" in told
    assert log.read_bytes() == busy
