"""The record of a study: one file of SQLite, one writer, any number of readers.

`Record.create` and `Record.resume` give the `Writer`, `Record.open` a reader.
"""

from studies.record.errors import (
    RecordBusyError,
    RecordDamagedError,
    RecordError,
    RecordFullError,
    RecordHeldError,
)
from studies.record.export import export_csv, export_parquet
from studies.record.reader import LeftOut, Point, Progress, Record, Study
from studies.record.rescue import Rescued, rescue
from studies.record.writer import Writer

__all__ = [
    "LeftOut",
    "Point",
    "Progress",
    "Record",
    "RecordBusyError",
    "RecordDamagedError",
    "RecordError",
    "RecordFullError",
    "RecordHeldError",
    "Rescued",
    "Study",
    "Writer",
    "export_csv",
    "export_parquet",
    "rescue",
]
