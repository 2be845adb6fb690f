"""The tables of a record, and how an older one becomes today's.

A record is a file of SQLite that any of its tools reads. `results` is the table to read: one row a point of a plan,
one column a varied value and a kept figure, all in N, mm, MPa, t, s, rad, K. The layout is told by ``application_id``
(`APPLICATION`) and ``user_version`` (`VERSION`); a change of it adds one to the version and a step to `STEPS`.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Callable, Iterable, Mapping
from typing import NamedTuple

APPLICATION = 0x48414348
VERSION = 1

TABLES = {
    "study": """CREATE TABLE study (
        id INTEGER PRIMARY KEY, title TEXT NOT NULL UNIQUE, key TEXT NOT NULL, name TEXT NOT NULL, plan TEXT NOT NULL,
        part TEXT NOT NULL, varied TEXT NOT NULL, made TEXT NOT NULL, seal BLOB NOT NULL)""",
    "points": """CREATE TABLE points (
        study INTEGER NOT NULL, number INTEGER NOT NULL, key TEXT NOT NULL, given TEXT NOT NULL, numbers TEXT NOT NULL,
        seal BLOB NOT NULL, PRIMARY KEY (study, number)) WITHOUT ROWID""",
    "choices": """CREATE TABLE choices (
        study INTEGER NOT NULL, number INTEGER NOT NULL, name TEXT NOT NULL, value,
        PRIMARY KEY (study, number, name)) WITHOUT ROWID""",
    "left_out": """CREATE TABLE left_out (
        study INTEGER NOT NULL, number INTEGER NOT NULL, given TEXT NOT NULL, reason TEXT NOT NULL, seal BLOB NOT NULL,
        PRIMARY KEY (study, number)) WITHOUT ROWID""",
    "variants": """CREATE TABLE variants (
        id INTEGER PRIMARY KEY, key TEXT NOT NULL UNIQUE, shape_key TEXT NOT NULL, spec TEXT NOT NULL, fullest TEXT,
        status TEXT NOT NULL, judgement TEXT NOT NULL, fine INTEGER NOT NULL, stage TEXT NOT NULL,
        reason TEXT NOT NULL, safer_mesh INTEGER NOT NULL, first_reason TEXT NOT NULL, unknowns INTEGER NOT NULL,
        seconds REAL, peak_memory REAL, worker TEXT NOT NULL, attempts INTEGER NOT NULL, recorded TEXT NOT NULL,
        outcome BLOB NOT NULL, seal BLOB NOT NULL)""",
    "figures": """CREATE TABLE figures (
        variant INTEGER NOT NULL, name TEXT NOT NULL, solid REAL, beam REAL, unit TEXT NOT NULL,
        judgement TEXT NOT NULL, PRIMARY KEY (variant, name)) WITHOUT ROWID""",
    "limits": """CREATE TABLE limits (
        variant INTEGER NOT NULL, place INTEGER NOT NULL, name TEXT NOT NULL, quantity TEXT NOT NULL, given REAL,
        found REAL, unit TEXT NOT NULL, verdict TEXT NOT NULL, margin REAL, reason TEXT NOT NULL,
        PRIMARY KEY (variant, place)) WITHOUT ROWID""",
    "events": """CREATE TABLE events (
        id INTEGER PRIMARY KEY, study INTEGER, time TEXT NOT NULL, what TEXT NOT NULL, seal BLOB NOT NULL)""",
    "columns": """CREATE TABLE columns (
        name TEXT PRIMARY KEY, what TEXT NOT NULL, source TEXT NOT NULL, unit TEXT NOT NULL, label TEXT NOT NULL,
        seal BLOB NOT NULL) WITHOUT ROWID""",
}
"""Each as SQLite keeps it; `variants.seal` covers the figures and limits of the variant too.

`given` and `numbers` of a point are JSON lists in the order of `study.varied`; `choices` holds the same for the view,
which must not need the JSON functions: SQLite can be built without them, or not trust them in a view.
"""

STEPS: dict[int, Callable[[sqlite3.Connection], None]] = {}
"""What brings a record from a version to the next one."""


class Column(NamedTuple):
    """One column of `results` beyond the `FIXED` ones.

    `what` is ``varied``, ``figure`` (the solid model's), ``beam`` (the beam model's) or ``margin`` (share of a limit
    that is left); `source` the name in the plan.
    """

    name: str
    what: str
    source: str
    unit: str
    label: str


FIXED = {
    "study": "s.title", "number": "p.number", "status": "coalesce(v.status, 'waiting')", "judgement": "v.judgement",
    "fine": "v.fine", "stage": "v.stage", "reason": "v.reason", "safer_mesh": "v.safer_mesh", "unknowns": "v.unknowns",
    "key": "p.key",
}
"""Columns of `results` that every record has. Nothing in it depends on the machine, the workers or their order."""

ORDER = ("varied", "figure", "beam", "margin")
ENDINGS = {"varied": "", "figure": "", "beam": "_beam", "margin": "_margin"}


def named(columns: Iterable[Column]) -> list[Column]:
    """The same columns in a fixed order, each with a name of its own (SQLite takes ``A`` and ``a`` for one)."""
    taken, found = {name.casefold() for name in FIXED}, []
    once = {(column.what, column.source): column for column in columns}
    for column in sorted(once.values(), key=lambda c: (ORDER.index(c.what), c.source)):
        wish = name = column.source + ENDINGS[column.what]
        number = 2
        while name.casefold() in taken:
            name, number = f"{wish}_{number}", number + 1
        taken.add(name.casefold())
        found.append(column._replace(name=name))
    return found


def results_view(columns: Iterable[Column]) -> str:
    """The SQL of the view `results`."""
    parts = [f'{source} AS "{name}"' for name, source in FIXED.items()]
    parts += [f"{_source(column)} AS {quoted(column.name)}" for column in columns]
    return ("CREATE VIEW results AS SELECT " + ", ".join(parts) + " FROM points p JOIN study s ON s.id = p.study "
            "LEFT JOIN variants v ON v.key = p.key ORDER BY p.study, p.number")


def _source(column: Column) -> str:
    name = "'" + column.source.replace("'", "''") + "'"
    if column.what == "varied":
        return f"(SELECT c.value FROM choices c WHERE c.study = p.study AND c.number = p.number AND c.name = {name})"
    if column.what == "margin":
        return f"(SELECT l.margin FROM limits l WHERE l.variant = v.id AND l.name = {name} LIMIT 1)"
    which = "solid" if column.what == "figure" else "beam"
    return f"(SELECT f.{which} FROM figures f WHERE f.variant = v.id AND f.name = {name})"


def quoted(name: str) -> str:
    """A name as SQL takes it."""
    return '"' + name.replace('"', '""') + '"'


def make_tables(db: sqlite3.Connection) -> None:
    """Make the tables of an empty record."""
    db.execute("PRAGMA auto_vacuum = 0")
    db.execute("BEGIN")
    db.execute(f"PRAGMA application_id = {APPLICATION}")
    db.execute(f"PRAGMA user_version = {VERSION}")
    for sql in TABLES.values():
        db.execute(sql)
    db.execute(results_view([]))
    db.execute("COMMIT")


def upgrade(db: sqlite3.Connection, version: int = VERSION,
            steps: Mapping[int, Callable[[sqlite3.Connection], None]] | None = None) -> int:
    """Bring an older record to `version` in one transaction; returns the version that it had."""
    (found,) = db.execute("PRAGMA user_version").fetchone()
    if found < version:
        db.execute("BEGIN IMMEDIATE")
        try:
            for number in range(found, version):
                (STEPS if steps is None else steps)[number](db)
            db.execute(f"PRAGMA user_version = {version}")
            db.execute("COMMIT")
        except BaseException:
            db.execute("ROLLBACK")
            raise
    return int(found)
