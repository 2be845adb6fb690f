"""The table of a study for other programs."""

from __future__ import annotations

import os
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

from studies.record.errors import RecordError
from studies.record.reader import Record
from studies.record.schema import FIXED

if TYPE_CHECKING:
    import pandas

WHOLE = ("number", "unknowns")
BOOLEAN = ("fine", "safer_mesh")


def frame(record: Record) -> pandas.DataFrame:
    """`results` of the record's study: one row a point, one column a varied value and a kept figure, in N, mm, MPa,
    t, s, rad, K. Numbers that are not there are empty; `fine` and `safer_mesh` are true, false or empty."""
    import pandas

    rows = record.table()
    names = list(rows[0]) if rows else [*FIXED, *(column.name for column in record.columns())]
    data: dict[str, Any] = {}
    for name in names:
        cells = [row[name] for row in rows]
        kinds = {type(cell) for cell in cells} - {type(None)}
        if name in WHOLE:
            data[name] = pandas.array(cells, dtype="Int64")
        elif name in BOOLEAN:
            data[name] = pandas.array([None if cell is None else bool(cell) for cell in cells], dtype="boolean")
        elif kinds and kinds <= {int, float}:
            data[name] = pandas.array(cells, dtype="Float64")
        else:
            data[name] = pandas.array([None if cell is None else str(cell) for cell in cells], dtype="string")
    return pandas.DataFrame(data, columns=names)


def export_csv(record: Record, path: str | Path, replace: bool = False) -> int:
    """Write the table as CSV (UTF-8, a comma, a point; numbers with all their digits); returns the number of rows.

    Raises `RecordError` when the file exists and `replace` is not set, or cannot be written.
    """
    table = frame(record)
    _write(Path(path), replace, lambda early: table.to_csv(early, index=False, lineterminator="\n"))
    return len(table)


def export_parquet(record: Record, path: str | Path, replace: bool = False) -> int:
    """Write the table as Parquet; returns the number of rows. Raises as `export_csv` does."""
    table = frame(record)
    _write(Path(path), replace, lambda early: table.to_parquet(early, engine="pyarrow", index=False))
    return len(table)


def _write(path: Path, replace: bool, write: Callable[[Path], object]) -> None:
    """The file is whole or not there; an old one stays until the new one is whole."""
    if path.is_dir() or (path.exists() and not replace):
        raise RecordError(f"{path} exists already, and is not overwritten unasked: choose another name, or --replace")
    try:
        descriptor, early = tempfile.mkstemp(prefix=f".{path.name[:100]}.", dir=path.parent)
        try:
            os.fchmod(descriptor, 0o644)
            os.close(descriptor)
            write(Path(early))
            Path(early).rename(path)
        finally:
            Path(early).unlink(missing_ok=True)
    except OSError as error:
        raise RecordError(f"cannot write {path}: {error.strerror or error}; choose another name") from error
