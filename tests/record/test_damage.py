"""Bytes of the file changed by something else: refused, or harmless; and what is whole can be saved."""

from __future__ import annotations

import random
import sqlite3
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import pytest

from studies.record import Record, RecordDamagedError, RecordError
from studies.record.rescue import rescue

COUNT = 40


_written: list[bytes] = []


def written(path: Path, study: SimpleNamespace) -> bytes:
    """The record, made once."""
    if _written:
        path.write_bytes(_written[0])
        return _written[0]
    with Record.create(path, study.plan()) as record:
        record.set_points(map(study.variant, range(1, COUNT + 2)))
        record.set_left_out([(COUNT + 2, {"root_depth": "9 mm"}, "slope")])
        for number in range(1, COUNT + 1):
            record.add(study.variant(number), study.outcome(number))
        record.note("stopped")
    _written.append(path.read_bytes())
    return _written[0]


def content(record: Record) -> list[Any]:
    """All that a reader gives."""
    return [record.table(), record.points(), list(record.outcomes()), record.left_out(), record.events(),
            record.study(), record.columns(), record.progress(), [record.spec(p.key) for p in record.points()]]


def _changed(whole: bytes, rng: random.Random) -> bytes:
    data = bytearray(whole)
    size = rng.choice((1, 1, 8, 100, 512, 4096))
    at = rng.randrange(len(data) - size)
    data[at:at + size] = rng.choice((bytes(size), rng.randbytes(size), bytes(b ^ 1 for b in data[at:at + size])))
    return bytes(data)


def test_changed_bytes_are_refused_or_harmless(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    whole, rng, refused = written(path, study), random.Random(5), 0
    with Record.open(path) as record:
        right = content(record)
    for _ in range(150):
        path.write_bytes(_changed(whole, rng))
        try:
            with Record.open(path) as record:
                assert content(record) == right
        except RecordError as error:
            assert "--record" in str(error)
            refused += 1
    assert 75 < refused < 150  # many bytes are in use by nothing, or were zero before


def test_a_damaged_record_is_refused_with_the_way_out(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    whole = bytearray(written(path, study))
    at = whole.index(b"no mesh at 21")
    whole[at:at + 2] = b"NO"
    path.write_bytes(whole)
    for way in (lambda: Record.open(path), lambda: Record.resume(path, study.plan())):
        with pytest.raises(RecordDamagedError, match="damaged") as found:
            way()
        assert f"haunch rescue {path} {tmp_path / 'arm-rescued.study'}" in str(found.value)
    assert path.read_bytes() == whole  # left as it is
    saved = rescue(path, tmp_path / "arm-rescued.study")
    assert saved == (COUNT - 1, 1)
    assert path.read_bytes() == whole
    with Record.resume(tmp_path / "arm-rescued.study", study.plan()) as record:
        assert record.finished_keys() | record.failed_keys() == {study.key_of(n) for n in range(1, COUNT + 1)} - {
            study.key_of(21)}
        record.set_points(map(study.variant, range(1, COUNT + 2)))
        assert record.add(study.variant(21), study.outcome(21))
        for number in range(1, COUNT + 1):
            assert record.outcome(study.key_of(number)) == study.outcome(number)


def test_whatever_was_damaged_what_is_saved_is_right(tmp_path: Path, study: SimpleNamespace) -> None:
    path, rng, best, saves = tmp_path / "arm.study", random.Random(6), 0, 0
    whole = written(path, study)
    for k in range(30):
        path.write_bytes(_changed(_changed(whole, rng), rng))
        new = tmp_path / f"new-{k}.study"
        try:
            saved = rescue(path, new)
        except RecordError:
            assert not new.exists()
            continue
        saves += 1
        with Record.resume(new, study.plan()) as record:
            there = record.words()
            assert len(there) == saved.variants
            for number in range(1, COUNT + 1):
                if study.key_of(number) in there:
                    assert record.outcome(study.key_of(number)) == study.outcome(number)
            best += saved.variants
    assert saves > 20 and best > 0.8 * saves * COUNT  # a damaged page costs its own rows


def test_a_shortened_file_is_refused(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    whole = written(path, study)
    for share in (0.3, 0.6, 0.95):
        path.write_bytes(whole[:int(share * len(whole))])
        with pytest.raises(RecordDamagedError):
            Record.open(path)


@pytest.mark.parametrize("change", [
    "UPDATE figures SET solid = 1.0 WHERE variant = 3 AND name = 'mass'",
    "UPDATE choices SET value = 41.5 WHERE number = 3 AND name = 'root_depth'",
    "DELETE FROM figures WHERE variant = 3 AND name = 'mass'",
    "DELETE FROM limits WHERE variant = 3",
    "UPDATE variants SET fine = 1 WHERE id = 2",
    "UPDATE variants SET judgement = 'agrees' WHERE id = 2",
    "UPDATE points SET key = '" + 64 * "0" + "' WHERE number = 3",
    "UPDATE study SET plan = ''",
    "UPDATE columns SET unit = 'kg' WHERE name = 'mass'",
    "DELETE FROM choices WHERE number = 4",
    "INSERT INTO choices VALUES (1, 99, 'hold', 'pin')",
    "DROP VIEW results",
])
def test_a_value_edited_by_hand_is_refused(tmp_path: Path, study: SimpleNamespace, change: str) -> None:
    path = tmp_path / "arm.study"
    written(path, study)
    db = sqlite3.connect(path)
    assert db.execute(change).rowcount
    db.commit()
    db.close()
    with pytest.raises(RecordDamagedError):
        Record.open(path)


def test_a_view_of_ones_own_is_no_damage(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    written(path, study)
    db = sqlite3.connect(path)
    db.execute("CREATE VIEW light AS SELECT number, mass FROM results WHERE mass < 0.01")
    db.commit()
    db.close()
    with Record.resume(path, study.plan()) as record:
        assert record.add(study.variant(COUNT + 1), study.outcome(COUNT + 1))
