"""``haunch export``."""

from __future__ import annotations

import argparse
from pathlib import Path

from geometry.problem import HaunchError
from studies.cli.arguments import Commands, command


def register(commands: Commands[argparse.ArgumentParser]) -> None:
    """Add the command."""
    export = command(commands, "export", "write the table of a study as CSV or Parquet, finished or not", _export)
    export.add_argument("record", metavar="RECORD", help="file that `haunch vary` wrote")
    export.add_argument("file", metavar="FILE", help="FILE.csv or FILE.parquet; N, mm, MPa, t, s, rad, K throughout")
    export.add_argument("--replace", action="store_true", help="overwrite FILE")
    export.add_argument("--study", metavar="TITLE", help="of several studies in the record the one with this title; "
                                                         "the last one if left out")


def _export(options: argparse.Namespace) -> int:
    from studies.record import Record, export_csv, export_parquet

    file = Path(options.file)
    writers = {".csv": export_csv, ".parquet": export_parquet}
    if file.suffix not in writers:
        raise HaunchError(f"{file} is neither a .csv nor a .parquet file; name it FILE.csv or FILE.parquet")
    if file.exists() and not options.replace:
        raise HaunchError(f"{file} exists already; choose another name, or give --replace")
    with Record.open(options.record, options.study) as record:
        writers[file.suffix](record, file, options.replace)
        progress = record.progress()
    print(f"{progress.finished + progress.failed} of {progress.points} points are in {file}")
    return 0
