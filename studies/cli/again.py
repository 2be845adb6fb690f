"""``haunch again``."""

from __future__ import annotations

import argparse
import dataclasses
import tomllib
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

from geometry.budget import available_threads
from geometry.problem import HaunchError
from studies.cli.arguments import Commands, command, whole

if TYPE_CHECKING:
    from studies.record import Point


def register(commands: Commands[argparse.ArgumentParser]) -> None:
    """Add the command."""
    again = command(commands, "again", "check one variant of a record alone, with a whole run folder", _again)
    again.add_argument("record", metavar="RECORD", help="file that `haunch vary` wrote; it is only read")
    again.add_argument("number", metavar="NUMBER", type=whole(1, 10**9), help="of the variant")
    again.add_argument("--out", metavar="DIR", help="run folder to write; RECORD-NUMBER.run in the current folder if "
                                                    "left out")
    again.add_argument("--spec", metavar="FILE", help="also write the variant's spec to FILE, for `haunch check FILE`")
    again.add_argument("--replace", action="store_true", help="overwrite a finished run or spec of that name")
    again.add_argument("--study", metavar="TITLE", help="of several studies in the record the one with this title; "
                                                        "the last one if left out")
    again.add_argument("--no-pictures", dest="pictures", action="store_false", help="draw no PNG pictures")
    again.add_argument("--threads", metavar="N", type=whole(1, 1024), default=available_threads(),
                       help="threads to use (%(default)s)")
    again.add_argument("--memory", metavar="MiB", type=whole(256, 10**8), default=4096,
                       help="memory that meshing and solving may take (4096)")


def _again(options: argparse.Namespace) -> int:
    point, data, made = _variant(options.record, options.study, options.number)
    from geometry.spec.read import part_from_data
    from studies.cli.check import checked_run
    from studies.cli.screen import make_console
    from studies.vary.work.toml import dumps

    values = ", ".join(f"{name} = {value}" for name, value in point.values.items())
    head = [f"# Variant {point.number} of {Path(options.record).name}: {values}", *([f"# {made}"] if made else [])]
    text = "\n".join([*head, dumps(data)])
    if made:
        make_console().print(made, soft_wrap=True, markup=False)
    if options.spec is not None:
        _write_spec(Path(options.spec), text, options.replace)
    part = dataclasses.replace(part_from_data(data), source_text=text)
    out = options.out or f"{Path(options.record).stem}-{point.number}.run"
    return checked_run(part, out, options.replace, options.pictures, options.threads, options.memory)


def _variant(path: str, study: str | None, number: int) -> tuple[Point, dict[str, Any], str]:
    """The point, the tables of its spec, and what of it is not as drawn."""
    from studies.record import Record

    with Record.open(path, study) as record:
        points = {point.number: point for point in record.points()}
        if number not in points:
            reason = next((left.reason for left in record.left_out() if left.number == number), None)
            last = max(points, default=0)
            raise HaunchError(f"point {number} is no variant, it was left out: {reason}" if reason is not None else
                              f"the record {path} has no variant {number}; its numbers go up to {last}")
        data = record.spec(points[number].key)
        if data is None:
            raise HaunchError(f"variant {number} waits to be evaluated: `haunch vary` goes on with the study")
        return points[number], data, _made(record.study().plan_text, data)


def _made(plan_text: str, data: Mapping[str, Any]) -> str:
    """Where the plan has tolerances: that this is the part at least material, and which dimensions that means."""
    plan = tomllib.loads(plan_text)
    names = plan.get("tolerances", {})
    if not names or plan.get("sampling", {}).get("method") == "as made":
        return ""
    found = ", ".join(f"{name} = {data['parameters'][name]}" for name in names if name in data.get("parameters", {}))
    return ("The plan has tolerances: this is the part at least material"
            f"{f' ({found})' if found else ''}; the mass in the study is that at most material")


def _write_spec(file: Path, text: str, replace: bool) -> None:
    try:
        with file.open("w" if replace else "x", encoding="utf-8") as spec:
            spec.write(text)
    except FileExistsError:
        raise HaunchError(f"{file} exists already; choose another name, or give --replace") from None
    except OSError as error:
        raise HaunchError(f"cannot write {file}: {error.strerror}") from error
