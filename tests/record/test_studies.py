"""Several studies in one record, changed plans, layouts of other versions, values of every kind."""

from __future__ import annotations

import dataclasses
import json
import math
import sqlite3
from pathlib import Path
from types import SimpleNamespace

import pytest

from studies.record import Record, RecordError
from studies.record.opening import open_reader
from studies.record.schema import VERSION, named, upgrade
from studies.record.schema import Column as C
from studies.vary.outcome import Held, Kept, Outcome


def other_plan(study: SimpleNamespace) -> object:
    label = SimpleNamespace(label="web", unit="mm")
    return dataclasses.replace(study.plan(), title="Arm: which web", key="b" * 64,
                               varied={"web": label, "Status": label})


def test_another_study_is_refused_unless_shared(tmp_path: Path, study: SimpleNamespace) -> None:
    path, other = tmp_path / "arm.study", other_plan(study)
    with Record.create(path, study.plan()) as record:
        record.add(study.variant(1), study.outcome(1))
    before = path.read_bytes()
    with pytest.raises(RecordError, match="another study: 'Arm: which depth'(.|\n)*arm-2.study(.|\n)*--share"):
        Record.resume(path, other)
    assert path.read_bytes() == before
    with Record.resume(path, other, share=True) as record:
        assert record.finished_keys() == {study.key_of(1)}  # of all studies: never computed twice
        theirs = dataclasses.replace(study.variant(1), values={"web": "4 mm", "Status": "new"}, numbers={"web": 4.0})
        record.set_points([theirs])
        assert not record.add(theirs, study.outcome(1))
        (row,) = record.table()
        assert (row["study"], row["web"], row["Status_2"], row["root_depth"]) == ("Arm: which web", 4.0, "new", None)
        assert row["mass"] == study.outcome(1).figures["mass"].solid
        assert record.next_number() == 2
    with pytest.raises(RecordError, match="another study"):
        Record.resume(path, dataclasses.replace(study.plan(), title="A third", key="c" * 64))
    with Record.resume(path, study.plan()) as record:  # its own study: without --share again
        assert record.studies() == ["Arm: which depth", "Arm: which web"]
        assert [row["root_depth"] for row in record.table()] == [study.variant(1).numbers["root_depth"]]
    with Record.open(path) as record:
        assert record.title == "Arm: which web" and len(record.points()) == 1
    with Record.open(path, "Arm: which depth") as record:
        assert record.points()[0].values == study.variant(1).values
    with pytest.raises(RecordError, match="no study 'none'; it holds: Arm: which depth, Arm: which web"):
        Record.open(path, "none")
    db = sqlite3.connect(path)
    rows = db.execute("SELECT study, number FROM results").fetchall()
    assert rows == [("Arm: which depth", 1), ("Arm: which web", 1)]
    db.close()


def test_a_changed_plan_keeps_the_variants(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    with Record.create(path, study.plan()) as record:
        record.set_points(map(study.variant, (1, 2, 3)))
        record.add(study.variant(2), study.outcome(2))
    changed = dataclasses.replace(study.plan(), key="d" * 64, text="[vary]\nroot_depth = 2\n")
    with pytest.raises(RecordError, match="plan was changed"):
        Record.resume(path, changed)
    with Record.resume(path, changed, share=True) as record:
        assert record.points() == [] and record.finished_keys() == {study.key_of(2)}
        moved = dataclasses.replace(study.variant(2), number=1)
        record.set_points([moved])
        assert record.table()[0]["status"] == "finished"
        assert study.plan().text in record.events()[0][1]
        assert record.study().plan_text == changed.text


def test_points_take_new_keys_when_versions_change(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    newer = dataclasses.replace(study.variant(1), key="e" * 64)
    with Record.create(path, study.plan()) as record:
        record.add(study.variant(1), study.outcome(1))
        with pytest.raises(RecordError, match="point 1 "):
            record.add(newer, dataclasses.replace(study.outcome(1), key="e" * 64))
        assert len(record.words()) == 1
        record.set_points([newer])
        assert record.table()[0]["status"] == "waiting"  # the old outcome is that of other versions
        assert record.outcome(study.key_of(1)) == study.outcome(1)


def test_a_failed_variant_gives_way_and_a_finished_one_does_not(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    failed = Outcome(key=study.key_of(1), status="failed", stage="solve", reason="time over")
    with Record.create(path, study.plan()) as record:
        assert record.add(study.variant(1), failed)
        assert [(p.number, o.reason) for p, o in record.failed()] == [(1, "time over")]
        assert "mass" not in record.table()[0]
        assert record.add(study.variant(1), study.outcome(1))
        assert record.failed() == [] and record.table()[0]["mass"] is not None
        assert not record.add(study.variant(1), failed)
        assert record.outcome(study.key_of(1)) == study.outcome(1)
        assert record.add(study.variant(1), failed, replace=True)
        assert record.table()[0]["mass"] is None
        ((attempts,),) = record._rows("SELECT attempts FROM variants")
        assert attempts == 3
        with pytest.raises(RecordError, match="was given for"):
            record.add(study.variant(2), study.outcome(1))


def test_the_table_does_not_depend_on_the_order(tmp_path: Path, study: SimpleNamespace) -> None:
    tables = []
    for name, order in (("a", range(1, 21)), ("b", range(20, 0, -1))):
        with Record.create(tmp_path / name, study.plan()) as record:
            record.set_points(map(study.variant, range(1, 21)))
            for number in order:
                outcome = study.outcome(number)
                if number % 3 == 0 and outcome.status == "finished":  # not every variant has every figure
                    outcome = dataclasses.replace(outcome, figures={"frequency": Kept(1.0, 2.0, "1/s", "agrees")})
                record.add(study.variant(number), outcome)
            tables.append(json.dumps(record.table()))
    assert tables[0] == tables[1]


def test_values_of_every_kind(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    figures = {"nan": Kept(math.nan, -0.0, "", "suspicious"), "inf": Kept(math.inf, 5e-324, "", "agrees"),
               'a "b" \'c\' é': Kept(0.1 + 0.2, 1e300, "mm", "agrees"), "Number": Kept(1.0, None, "", "agrees")}
    outcome = Outcome(key=study.key_of(1), status="finished", judgement="suspicious", figures=figures,
                      limits=(Held("Number", "x", 1.0, None, "mm", "not established", None,
                                   "no \x00 \udcff \U0001f600"),),
                      reason="\udc80 bad name", worker="a\nb")
    variant = dataclasses.replace(study.variant(1), values={"root_depth": ["x", "y"], "hold": True}, numbers={})
    with Record.create(path, study.plan()) as record:
        assert record.add(variant, outcome)
    with Record.open(path) as record:
        found = record.outcome(study.key_of(1))
        assert found.figures.keys() == figures.keys() and math.isnan(found.figures["nan"].solid)
        assert found.limits == outcome.limits and found.reason == outcome.reason
        (row,) = record.table()
        assert row["root_depth"] == '["x","y"]' and row["hold"] == "true"
        assert row["nan"] is None and row["inf"] == math.inf and row["inf_beam"] == 5e-324
        assert row['a "b" \'c\' é'] == 0.1 + 0.2 and row["number"] == 1 and row["Number_2"] == 1.0
        assert record.points()[0].values == variant.values


def test_column_names_never_meet() -> None:
    columns = [C("", what, source, "", "") for what, source in (
        ("figure", "mass"), ("varied", "Mass"), ("varied", "mass_beam"), ("beam", "mass"), ("figure", "number"),
        ("margin", "mass"), ("figure", "mass_margin"), ("varied", "number_2"))]
    names = [column.name for column in named(columns)]
    assert len({name.casefold() for name in names} | {"number"}) == len(columns) + 1
    assert named(columns) == named(reversed(columns)) == named(named(columns))


def test_a_newer_layout_is_refused(tmp_path: Path, study: SimpleNamespace) -> None:
    path = tmp_path / "arm.study"
    Record.create(path, study.plan()).close()
    db = sqlite3.connect(path)
    db.execute(f"PRAGMA user_version = {VERSION + 1}")
    db.close()
    before = path.read_bytes()
    for way in (lambda: Record.open(path), lambda: Record.resume(path, study.plan(), share=True)):
        with pytest.raises(RecordError, match=f"newer Haunch .layout {VERSION + 1}; this one knows {VERSION}"):
            way()
    assert path.read_bytes() == before


def test_an_older_layout_is_brought_up_or_left_alone(tmp_path: Path, study: SimpleNamespace,
                                                    monkeypatch: pytest.MonkeyPatch) -> None:
    """The way for later layouts, with steps made up: all of them in one transaction, or none."""
    path = tmp_path / "arm.study"
    with Record.create(path, study.plan()) as record:
        record.add(study.variant(1), study.outcome(1))

    def step(db: sqlite3.Connection) -> None:
        db.execute("CREATE TABLE later (x)")

    def fails(db: sqlite3.Connection) -> None:
        db.execute("CREATE TABLE too_late (x)")
        raise ValueError("in the middle")

    before = path.read_bytes()
    monkeypatch.setattr("studies.record.opening.VERSION", VERSION + 1)
    monkeypatch.setattr("studies.record.opening.upgrade", lambda db: upgrade(db, VERSION + 1, {VERSION: step}))
    reader = open_reader(path)
    assert reader.execute("SELECT count(*) FROM later").fetchone() == (0,)
    assert reader.execute("SELECT number FROM results").fetchone() == (1,)
    reader.close()
    assert path.read_bytes() == before  # a reader upgrades a copy in memory
    db = sqlite3.connect(path, isolation_level=None)
    with pytest.raises(ValueError):
        upgrade(db, VERSION + 2, {VERSION: step, VERSION + 1: fails})
    assert db.execute("SELECT count(*) FROM sqlite_master WHERE name LIKE '%late%'").fetchone() == (0,)
    assert upgrade(db, VERSION + 1, {VERSION: step}) == VERSION
    assert upgrade(db, VERSION + 1, {VERSION: step}) == VERSION + 1
    assert db.execute("SELECT count(*) FROM later").fetchone() == (0,)
    db.close()


SAMPLE = Path(__file__).parent / "old" / "schema-1.study"


def test_a_record_of_layout_1_opens_for_ever(tmp_path: Path, study: SimpleNamespace) -> None:
    """Written once by `write_sample` when layout 1 was new; never to be written again."""
    path = tmp_path / "old.study"
    path.write_bytes(SAMPLE.read_bytes())
    with Record.open(path) as record:
        assert [row["status"] for row in record.table()] == [
            "finished", "finished", "waiting", "finished", "waiting", "waiting", "failed", "waiting"]
        for number in (1, 2, 4, 7):
            assert record.outcome(study.key_of(number)) == study.outcome(number)
            assert record.spec(study.key_of(number)) == study.variant(number).data
        assert [p.values for p in record.points()] == [study.variant(n).values for n in range(1, 9)]
        assert record.table()[3]["deflection"] == 0.25 and record.table()[3]["tip_margin"] == 0.5
        assert record.left_out() == [(9, {"root_depth": "9 mm"}, "slope")]
        assert [what for _, what in record.events()] == ["stopped"]
    with Record.resume(path, study.plan()) as record:
        assert record.add(study.variant(3), study.outcome(3))


def write_sample(study: SimpleNamespace) -> None:
    """Of a new layout: ``old/schema-N.study``, the outcomes being those of `conftest.outcome` at that time."""
    with Record.create(SAMPLE, study.plan()) as record:
        record.set_points(map(study.variant, range(1, 9)))
        record.set_left_out([(9, {"root_depth": "9 mm"}, "slope")])
        for number in (4, 7, 1, 2):
            record.add(study.variant(number), study.outcome(number))
        record.note("stopped")


def test_a_variant_takes_little_room(tmp_path: Path, study: SimpleNamespace) -> None:
    """10 000 variants with a spec of 3 KB, ten figures, four limits, and long cautions: under 300 MB."""
    import random

    rng, path, count = random.Random(1), tmp_path / "arm.study", 100
    with Record.create(path, study.plan()) as record:
        for number in range(1, count + 1):
            data = {"title": "arm", "words": [f"{rng.random():.6f} mm" for _ in range(200)]}
            figures = {f"figure_{k}": Kept(rng.random(), rng.random(), "mm", "agrees") for k in range(10)}
            limits = tuple(Held(f"limit {k}", "displacement", 1.0, rng.random(), "mm", "met", 0.5) for k in range(4))
            cautions = tuple(f"A caution of some length that says {rng.random()} of this variant." for _ in range(8))
            outcome = dataclasses.replace(study.outcome(1), key=study.key_of(number), figures=figures, limits=limits,
                                          cautions=cautions)
            record.add(dataclasses.replace(study.variant(number), data=data), outcome)
    assert path.stat().st_size / count * 10_000 < 100e6
