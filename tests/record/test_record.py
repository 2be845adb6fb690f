"""The narrow way: make, add, read, go on."""

from __future__ import annotations

from pathlib import Path

import pytest

from studies.record import Record, RecordError
from studies.record.writer import make


def test_what_was_added_is_read_back(tmp_path: Path, study) -> None:
    path = tmp_path / "arm.study"
    with Record.create(path, study.plan()) as record:
        record.set_points(map(study.variant, range(1, 11)))
        record.set_left_out([(11, {"root_depth": "9 mm"}, "slope")])
        for number in (3, 7, 1):
            assert record.add(study.variant(number), study.outcome(number))
    with Record.open(path) as record:
        for number in (1, 3, 7):
            assert record.outcome(study.key_of(number)) == study.outcome(number)
            assert record.spec(study.key_of(number)) == study.variant(number).data
        assert record.outcome(study.key_of(2)) is None
        assert record.finished_keys() == {study.key_of(1), study.key_of(3)}
        assert [point.number for point, _ in record.failed()] == [7]
        table = record.table()
        assert [row["number"] for row in table] == list(range(1, 11))
        assert table[2]["root_depth"] == study.variant(3).numbers["root_depth"] and table[2]["hold"] == "all"
        assert table[2]["mass"] == study.outcome(3).figures["mass"].solid
        assert table[2]["mass_beam"] == study.outcome(3).figures["mass"].beam
        assert table[2]["tip_margin"] == study.outcome(3).limits[0].margin
        assert table[6]["status"] == "failed" and table[6]["reason"] == "no mesh at 7" and table[6]["mass"] is None
        assert table[1]["status"] == "waiting"
        told = record.progress()
        assert (told.points, told.finished, told.failed, told.waiting, told.left_out, told.fine) == (10, 2, 1, 7, 1, 2)
        assert record.study().plan_text == study.plan().text
        wanted = [(study.key_of(3), 1.5, 100.5, "1", 1, 60003, 0)]
        assert record._rows("SELECT key, seconds, peak_memory, worker, attempts, unknowns, safer_mesh FROM variants "
                            "WHERE key = ?", study.key_of(3)) == wanted
        assert record._rows("SELECT name, solid, beam, unit, f.judgement FROM figures f JOIN variants v ON "
                            "v.id = f.variant WHERE key = ?", study.key_of(3)) == [
            (name, *kept) for name, kept in sorted(study.outcome(3).figures.items())]
        assert record._rows("SELECT l.name, quantity, given, found, unit, verdict, margin, l.reason FROM limits l JOIN "
                            "variants v ON v.id = l.variant WHERE key = ?", study.key_of(3)) == [
            tuple(held) for held in study.outcome(3).limits]
    assert [p.name for p in tmp_path.iterdir()] == ["arm.study"]  # nothing is left beside it


def test_it_goes_on_where_it_was(tmp_path: Path, study) -> None:
    path = tmp_path / "arm.study"
    with Record.create(path, study.plan()) as record:
        record.add(study.variant(1), study.outcome(1))
    with Record.resume(path, study.plan()) as record:
        assert record.finished_keys() == {study.key_of(1)}
        assert not record.add(study.variant(1), study.outcome(1))  # never twice
        assert record.add(study.variant(2), study.outcome(2))
    with Record.open(path) as record:
        assert [row["number"] for row in record.table()] == [1, 2]


def test_making_one_twice_is_refused(tmp_path: Path, study) -> None:
    path = tmp_path / "arm.study"
    Record.create(path, study.plan()).close()
    before = path.read_bytes()
    with pytest.raises(RecordError, match="exists already"):
        Record.create(path, study.plan())
    assert path.read_bytes() == before


def test_a_record_whose_driver_was_killed_while_making_it(tmp_path: Path, study) -> None:
    path = tmp_path / "arm.study"
    (tmp_path / ".arm.study.new").write_bytes(b"half of a rec")
    Record.create(path, study.plan()).close()
    assert [p.name for p in tmp_path.iterdir()] == ["arm.study"]
    path.unlink()
    make(path)  # it has its name, and no study yet
    with pytest.raises(RecordError, match="no study yet"):
        Record.open(path)
    with Record.resume(path, study.plan()) as record:
        assert record.add(study.variant(1), study.outcome(1))
    with Record.open(path) as record:
        assert record.title == study.plan().title
