"""A point, a variant, an event as rows of the database."""

from __future__ import annotations

import json
import sqlite3
import zlib
from collections.abc import Iterable
from datetime import datetime
from operator import itemgetter
from typing import Any

from studies.record.schema import Column, named, results_view
from studies.record.seal import choice, number, seal, text
from studies.record.whole import Row
from studies.vary.outcome import Outcome
from studies.vary.variant import Variant


def now() -> str:
    """Local time with its offset."""
    return datetime.now().astimezone().isoformat(" ", "seconds")


def plain_json(plain: Any) -> str:
    """Compact JSON, ASCII only."""
    return json.dumps(plain, separators=(",", ":"))


def put_event(db: sqlite3.Connection, study: int, what: str) -> None:
    """Write an event with its time."""
    ((number,),) = db.execute("SELECT coalesce(max(id), 0) + 1 FROM events").fetchall()
    row = (number, study, now(), text(what))
    db.execute("INSERT INTO events VALUES (?, ?, ?, ?, ?)", (*row, seal(row)))


def point_row(study: int, names: list[str], variant: Variant) -> Row:
    """The row of `points` of a variant; `names` is what the study varies."""
    given = [variant.values.get(name) for name in names]
    numbers = [number(variant.numbers.get(name)) for name in names]
    row = (study, variant.number, variant.key, plain_json(given), plain_json(numbers))
    return (*row, seal(row))


def put_point(db: sqlite3.Connection, names: list[str], row: Row) -> None:
    """Write a row of `points`, in place of the one with its number, and its row of `choices` for each varied name."""
    study, place, _, given, numbers, _ = row
    db.execute("INSERT OR REPLACE INTO points VALUES (?, ?, ?, ?, ?, ?)", row)
    db.executemany("INSERT OR REPLACE INTO choices VALUES (?, ?, ?, ?)",
                   [(study, place, name, choice(*pair))
                    for name, *pair in zip(names, json.loads(given), json.loads(numbers), strict=True)])


def columns_of(outcome: Outcome) -> list[Column]:
    """The columns that the table needs for an outcome; a failed one needs none."""
    found: list[Column] = []
    if outcome.status == "failed":
        return found
    for name, kept in outcome.figures.items():
        found += [Column("", what, text(name), text(kept.unit), "") for what in ("figure", "beam")]
    return found + [Column("", "margin", text(held.name), "", text(held.quantity)) for held in outcome.limits]


def put_columns(db: sqlite3.Connection, new: Iterable[Column]) -> None:
    """Add columns to `results`."""
    old = [Column(*row) for row in db.execute("SELECT name, what, source, unit, label FROM columns")]
    columns = named([*new, *old])
    db.execute("DELETE FROM columns")
    db.executemany("INSERT INTO columns VALUES (?, ?, ?, ?, ?, ?)", [(*row, seal(row)) for row in columns])
    db.execute("DROP VIEW results")
    db.execute(results_view(columns))


def put_variant(db: sqlite3.Connection, place: int | None, attempts: int, variant: Variant, outcome: Outcome) -> None:
    """Write the rows of one variant, `place` being the number that it has already."""
    if place is None:
        ((place,),) = db.execute("SELECT coalesce(max(id), 0) + 1 FROM variants").fetchall()
    figures, limits = rows_of(outcome)
    row = (place, variant.key, variant.shape_key, plain_json(variant.data),
           None if variant.fullest is None else plain_json(variant.fullest), outcome.status, outcome.judgement,
           int(outcome.fine), text(outcome.stage), text(outcome.reason), int(outcome.safer_mesh),
           text(outcome.first_reason), int(outcome.unknowns), number(outcome.seconds.get("wall")),
           number(outcome.peak_memory), text(outcome.worker), attempts, now(),
           zlib.compress(plain_json(outcome.to_json()).encode("ascii"), 6))
    db.execute("DELETE FROM figures WHERE variant = ?", (place,))
    db.execute("DELETE FROM limits WHERE variant = ?", (place,))
    db.execute(f"INSERT OR REPLACE INTO variants VALUES ({', '.join('?' * 20)})", (*row, seal(row, *figures, *limits)))
    put_rows(db, place, figures, limits)


def put_rows(db: sqlite3.Connection, place: int, figures: Iterable[Row], limits: Iterable[Row]) -> None:
    """Write what `rows_of` gave for the variant with the number `place`."""
    db.executemany("INSERT INTO figures VALUES (?, ?, ?, ?, ?, ?)", [(place, *figure) for figure in figures])
    db.executemany("INSERT INTO limits VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?)",
                   [(place, k, *limit) for k, limit in enumerate(limits)])


def rows_of(outcome: Outcome) -> tuple[list[Row], list[Row]]:
    """The rows of figures and of limits of an outcome, without the variant's number and the limit's place."""
    figures: list[Row] = [(text(name), number(kept.solid), number(kept.beam), text(kept.unit), text(kept.judgement))
                          for name, kept in outcome.figures.items()]
    limits: list[Row] = [(text(h.name), text(h.quantity), number(h.given), number(h.found), text(h.unit),
                          text(h.verdict), number(h.margin), text(h.reason)) for h in outcome.limits]
    return sorted(figures, key=itemgetter(0)), limits
