"""Is the record whole? Looked at once, when it is opened: a wrong figure read in silence is worse than a refusal."""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterator
from itertools import groupby
from operator import itemgetter
from pathlib import Path
from typing import Any

from studies.record.errors import damaged, told
from studies.record.schema import TABLES, Column, named, results_view
from studies.record.seal import choice, seal

Row = tuple[Any, ...]
SEALED = ("study", "points", "left_out", "events", "columns")
"""Tables whose last column is the seal of the others."""


def refuse_damaged(db: sqlite3.Connection, path: Path) -> None:
    """Raise `RecordDamagedError` when anything in the record differs from what was written.

    The structure of the file is checked by SQLite, the content by the seal of each row, all on one state of a record
    that may be written meanwhile.
    """
    with told(path):
        inside = db.in_transaction
        if not inside:
            db.execute("BEGIN")
        try:
            found = next(faults(db), None)
        finally:
            if not inside:
                db.execute("ROLLBACK")
    if found is not None:
        raise damaged(path, found)


def faults(db: sqlite3.Connection) -> Iterator[str]:
    """What is wrong in the record, in words."""
    known = dict(db.execute("SELECT name, sql FROM sqlite_master").fetchall())
    yield from (f"the table {name} is missing or another" for name, sql in TABLES.items() if known.get(name) != sql)
    for (what,) in db.execute("PRAGMA integrity_check(1)"):
        if what != "ok":
            yield str(what).replace("\n", " ")
    for table in SEALED:
        yield from (f"a row of {table} ({row[0]}, {row[1]}) has been changed"
                    for row in db.execute(f"SELECT * FROM {table}") if seal(row[:-1]) != row[-1])
    columns = [Column(*row) for row in db.execute("SELECT name, what, source, unit, label FROM columns")]
    if set(named(columns)) != set(columns) or known.get("results") != results_view(named(columns)):
        yield "the view results is missing or another"
    yield from (f"variant {row[0]} ({row[1]}) has been changed" for row, more in variants(db)
                if not variant_whole(row, *more))
    yield from _choice_faults(db)


def variants(db: sqlite3.Connection) -> Iterator[tuple[Row, tuple[list[Row], list[Row]]]]:
    """Each row of variants with its rows of figures and of limits."""
    figures = _Groups(db.execute("SELECT * FROM figures ORDER BY variant, name"))
    limits = _Groups(db.execute("SELECT * FROM limits ORDER BY variant, place"))
    for row in db.execute("SELECT * FROM variants ORDER BY id"):
        yield row, (figures.of(row[0]), limits.of(row[0]))


def variant_whole(row: Row, figures: list[Row], limits: list[Row]) -> bool:
    """Are the rows of a variant as they were written?"""
    return bool(seal(row[:-1], *(f[1:] for f in figures), *(h[2:] for h in limits)) == row[-1])


class _Groups:
    """Rows sorted by their first cell, given out one group after the other."""

    def __init__(self, rows: Iterator[Row]) -> None:
        self._groups = groupby(rows, key=itemgetter(0))
        self._next: tuple[int, list[Row]] | None = None

    def of(self, number: int) -> list[Row]:
        while self._next is None or self._next[0] < number:
            try:
                place, rows = next(self._groups)
            except StopIteration:
                return []
            self._next = place, list(rows)
        return self._next[1] if self._next[0] == number else []


def _choice_faults(db: sqlite3.Connection) -> Iterator[str]:
    """`choices` says again what `points` says."""
    names = {study: [v[0] for v in json.loads(varied)] for study, varied in db.execute("SELECT id, varied FROM study")}
    found = groupby(db.execute("SELECT * FROM choices ORDER BY study, number"), key=itemgetter(0, 1))
    for study, number, given, numbers in db.execute(
            "SELECT study, number, given, numbers FROM points ORDER BY study, number"):
        if study not in names:
            yield f"the study of point {number} is missing"
            return
        if not names[study]:
            continue
        wanted = {name: choice(*pair) for name, *pair in zip(names[study], json.loads(given), json.loads(numbers),
                                                             strict=True)}
        place, rows = next(found, (None, iter(())))
        if place != (study, number) or {row[2]: row[3] for row in rows} != wanted:
            yield f"the values of point {number} have been changed"
            return
    if next(found, None) is not None:
        yield "there are values of a point that is none"
