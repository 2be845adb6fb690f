"""The study of a plan in a record: found, or written, or refused."""

from __future__ import annotations

import sqlite3
from collections.abc import Mapping
from pathlib import Path
from typing import Protocol

from studies.record.errors import RecordError
from studies.record.reader import Varied
from studies.record.rows import now, plain_json, put_columns, put_event
from studies.record.schema import Column
from studies.record.seal import seal, text


class VariedLike(Protocol):
    """What the record reads of one varied thing."""

    @property
    def label(self) -> str: ...
    @property
    def unit(self) -> str: ...


class PlanLike(Protocol):
    """What the record reads of a plan."""

    @property
    def title(self) -> str: ...
    @property
    def name(self) -> str: ...
    @property
    def text(self) -> str: ...
    @property
    def part_text(self) -> str: ...
    @property
    def key(self) -> str: ...
    @property
    def varied(self) -> Mapping[str, VariedLike]: ...


def _shared(changed: bool) -> str:
    return ("the points of the plan as it was give way to those of the plan as it is; for both give one another title"
            if changed else "both studies are then in this file")


def join(db: sqlite3.Connection, path: Path, plan: PlanLike, share: bool) -> None:
    """Find the study of `plan` in the record, or write it."""
    titles = dict(db.execute("SELECT title, key FROM study").fetchall())
    title = text(plan.title)
    if titles.get(title) == plan.key:
        return
    if titles and not share:
        what = (f"another plan of the study {title!r} (the plan was changed)" if title in titles
                else "another study: " + ", ".join(map(repr, titles)))
        raise RecordError(f"the record {path} is that of {what}.\n"
                          f"  1. keep them apart: --record {path.with_name(path.stem + '-2' + path.suffix)}\n"
                          f"  2. use its finished variants again: --share ({_shared(title in titles)})")
    varied = [Varied(text(name), text(v.label), text(v.unit)) for name, v in plan.varied.items()]
    db.execute("BEGIN IMMEDIATE")
    if title in titles:
        _leave_old_plan(db, title)
    ids = dict(db.execute("SELECT title, id FROM study").fetchall())
    study = ids.get(title, max(ids.values(), default=0) + 1)
    row = (study, title, *map(text, (plan.key, plan.name, plan.text, plan.part_text)), plain_json(varied), now())
    db.execute("INSERT OR REPLACE INTO study VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?)", (*row, seal(row)))
    put_columns(db, [Column("", "varied", v.name, v.unit, v.label) for v in varied])
    db.execute("COMMIT")


def _leave_old_plan(db: sqlite3.Connection, title: str) -> None:
    """A changed plan takes the place of the old one, whose text is kept as an event; variants stay."""
    ((study, plan),) = db.execute("SELECT id, plan FROM study WHERE title = ?", (title,)).fetchall()
    put_event(db, study, f"the plan was changed; it was:\n{plan}")
    for table in ("points", "choices", "left_out"):
        db.execute(f"DELETE FROM {table} WHERE study = ?", (study,))
