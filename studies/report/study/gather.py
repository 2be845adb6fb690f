"""A study's data out of its record and the folder of its kept runs."""

from __future__ import annotations

import math
import os
import time
import tomllib
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any
from urllib.parse import quote

from geometry.problem import HaunchError
from geometry.spec.text.units import UNITS
from studies.record import Point, Record, Study
from studies.report.study.counts import alike
from studies.report.study.data import Axis, LeftOut, Row, Sampling, StudyData
from studies.vary.outcome import Outcome
from studies.vary.run.keeping import DIGITS, runs_folder

if TYPE_CHECKING:
    from studies.vary.plan import Plan

MOST_PICTURES = 8
MOST_NOTES = 10


def study_data(record: Record, out: Path) -> StudyData:
    """Everything that the page shows of the record's study; links are relative to the folder of the page `out`.

    Raises
    ------
    RecordError
        The record cannot be read.
    """
    study = record.study()
    plan, notes = _plan(study)
    points, found = record.points(), {}
    for point, outcome in record.outcomes():
        found[point.number] = outcome
    axes = _axes(study, plan, points)
    runs = _kept_runs(record.path)
    figure, unit, most = _aim(plan, found.values())
    rows = tuple(_row(point, found.get(point.number), plan, figure, runs, out) for point in points)
    return StudyData(
        title=study.title, plan=study.name, record=record.path.name, sampling=_sampling(plan, points, axes),
        axes=axes, rows=rows, aim=plan.aim.text if plan is not None else figure, aim_unit=unit, most=most,
        left_out=_left_out(record), tolerances=_tolerances(study), started=study.made.partition(".")[0],
        written=time.strftime("%Y-%m-%d %H:%M"), seconds=_seconds(found.values()),
        notes=(*notes, *_events(record)),
    )


def _plan(study: Study) -> tuple[Plan | None, tuple[str, ...]]:
    """The plan as the record keeps it; without it (a plan made in Python, or by another version) the mass is ranked."""
    if not study.plan_text:
        return None, ("The record keeps no text of the plan: variants are ranked by mass.",)
    from studies.vary.plan import plan_from_data

    try:
        data = tomllib.loads(study.plan_text)
        if study.part_text:
            data["part"] = tomllib.loads(study.part_text)
        return plan_from_data(data, ".", study.name, text=study.plan_text, allow_many=True), ()
    except (HaunchError, tomllib.TOMLDecodeError, RecursionError) as error:
        first = str(error).strip().splitlines()[0] if str(error).strip() else type(error).__name__
        return None, (f"The plan in the record cannot be read by this version ({first}): variants are ranked by mass.",)


def _axes(study: Study, plan: Plan | None, points: list[Point]) -> tuple[Axis, ...]:
    """Numbers are shown in the unit in which the plan writes them."""
    first = points[0].numbers if points else {}
    axes = []
    for varied in study.varied:
        told = plan.varied.get(varied.name) if plan is not None else None
        unit = told.written_in if told is not None else varied.unit
        factor = 1.0 / UNITS[unit].value if told is not None and unit in UNITS else 1.0
        numeric = told.numeric if told is not None else varied.name in first
        axes.append(Axis(varied.name, unit, factor, numeric))
    return tuple(axes)


def _aim(plan: Plan | None, outcomes: Any) -> tuple[str, str, bool]:
    """Figure (empty for a formula), base unit, and whether more is better."""
    units = {name: kept.unit for outcome in outcomes for name, kept in outcome.figures.items()}
    if plan is None:
        figure = "mass" if "mass" in units or not units else next(iter(units))
        return figure, units.get(figure, "1"), False
    figure = plan.aim.text if plan.aim.text in units else ""
    return figure, units.get(figure, plan.aim.unit or "1"), plan.aim.sense == "most"


def _row(point: Point, outcome: Outcome | None, plan: Plan | None, figure: str, runs: Mapping[str, Path],
         out: Path) -> Row:
    aim = None
    if outcome is not None and outcome.status == "finished":
        values = {name: kept.beam if kept.solid is None else kept.solid for name, kept in outcome.figures.items()}
        aim = plan.aim.value(values, point.numbers) if plan is not None else values.get(figure)
    folder = runs.get(point.key[:DIGITS])
    return Row(point.number, point.values, point.numbers, outcome, None if aim is None or math.isnan(aim) else aim,
               _link(folder, out) + "/" if folder is not None else "", _pictures(folder, out))


def _kept_runs(record: Path) -> dict[str, Path]:
    """Beginning of a key -> its run folder; one look at the folder for all."""
    try:
        return {path.name.rpartition("-")[2]: path for path in sorted(runs_folder(record).iterdir()) if path.is_dir()}
    except OSError:
        return {}


def _pictures(folder: Path | None, out: Path) -> tuple[str, ...]:
    if folder is None:
        return ()
    return tuple(_link(path, out) for path in sorted(folder.glob("*.png"))[:MOST_PICTURES])


def _link(path: Path, out: Path) -> str:
    return quote(Path(os.path.relpath(path.absolute(), out.absolute().parent)).as_posix())


def chosen_pictures(data: StudyData, number: int, record: Path) -> dict[str, bytes]:
    """Part and stress of a variant whose run was kept, for the page itself: caption -> PNG."""
    row = next(row for row in data.rows if row.number == number)
    folder = _kept_runs(record).get(row.outcome.key[:DIGITS]) if row.outcome is not None else None
    found: dict[str, bytes] = {}
    for pattern, caption in (("part.png", "the part"), ("stress-*.png", "its stress")):
        for path in sorted(folder.glob(pattern))[:1] if folder is not None else ():
            try:
                found[f"Variant {number}: {caption}"] = path.read_bytes()
            except OSError:
                continue  # the link to it says the rest
    return found


def _left_out(record: Record) -> tuple[LeftOut, ...]:
    groups: dict[str, tuple[str, list[int]]] = {}
    for left in record.left_out():
        groups.setdefault(alike(left.reason), (left.reason, []))[1].append(left.number)
    found = [LeftOut(text, len(numbers), tuple(numbers[:5])) for text, numbers in groups.values()]
    return tuple(sorted(found, key=lambda left: -left.count))


def _sampling(plan: Plan | None, points: list[Point], axes: tuple[Axis, ...]) -> Sampling:
    if plan is not None:
        return plan.sampling.method if all(point.number <= plan.count() for point in points) else "searched"
    counts = [len({str(point.values.get(axis.name)) for point in points}) for axis in axes]
    return "grid" if math.prod(counts) <= 2 * len(points) else "latin hypercube"


def _tolerances(study: Study) -> dict[str, str]:
    try:
        told = tomllib.loads(study.plan_text).get("tolerances", {})
    except (tomllib.TOMLDecodeError, RecursionError):
        return {}
    if not isinstance(told, dict):
        return {}
    return {name: ", ".join(f"{word} {text}" for word, text in value.items()) if isinstance(value, dict)
            else f"± {value}" for name, value in told.items()}


def _seconds(outcomes: Any) -> float:
    """Time on the clock of all variants, each counted once."""
    each = {outcome.key: outcome.seconds.get("wall", 0.0) for outcome in outcomes}
    return float(sum(each.values()))


def _events(record: Record) -> tuple[str, ...]:
    lines = [f"{when}: {what.splitlines()[0].rstrip(':') if what else ''}" for when, what in record.events()]
    more = len(lines) - MOST_NOTES
    return (*lines[:MOST_NOTES], *((f"{more} more events are in the record.",) if more > 0 else ()))
