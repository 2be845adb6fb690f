"""What the terminal shows of a study: a line that moves, what happens to single variants, a short table at the end."""

from __future__ import annotations

import contextlib
import os
import sys
import time
from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from pathlib import Path
from types import TracebackType
from typing import TYPE_CHECKING

from rich.box import SIMPLE_HEAD
from rich.console import Console
from rich.markup import escape
from rich.progress import BarColumn, TextColumn
from rich.progress import Progress as Bar
from rich.table import Table

from studies.cli.screen import make_console
from studies.report.tables import MARKS, marked, number, shown_unit
from studies.vary.run.progress import Happening, Progress, duration, in_words, several
from studies.vary.run.summary import Failure, Ranked, Summary

if TYPE_CHECKING:
    from studies.vary.plan import Plan

PLAIN_SECONDS = 15.0
"""Between two lines of counts where the screen is no terminal."""

MOST_REASONS, MOST_COLUMNS = 5, 4


class StudyView:
    """A listener of `vary`: a moving line in a terminal, plain lines elsewhere, nothing when quiet."""

    def __init__(self, quiet: bool = False) -> None:
        self._console, self._quiet = make_console(), quiet
        self._bar: Bar | None = None
        self._last = time.monotonic()
        self._shown: Progress | None = None
        if self._console.is_terminal and not quiet:
            self._bar = Bar(BarColumn(bar_width=24), TextColumn("{task.description}", markup=False),
                            console=self._console, transient=True)
            self._task = self._bar.add_task("reading the plan", total=None)

    def __enter__(self) -> StudyView:
        if self._bar is not None:
            self._bar.start()
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, _: TracebackType | None) -> None:
        if self._bar is not None:
            self._bar.stop()

    def __call__(self, what: Happening | Progress) -> None:
        """Show it. Where nobody listens any more (`haunch vary ... | head`) the study goes on in silence."""
        if self._quiet:
            return
        try:
            self._show(what)
        except (OSError, SystemExit):  # rich ends the program when a pipe is broken
            self._quiet = True
            with contextlib.suppress(OSError, ValueError):
                os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())

    def _show(self, what: Happening | Progress) -> None:
        if isinstance(what, Happening):
            if what.kind != "finished":
                self._console.print(escape(what.text), soft_wrap=True)
        elif self._bar is not None:
            self._bar.update(self._task, total=max(what.points, 1), completed=what.done, description=in_words(what))
        elif time.monotonic() - self._last >= PLAIN_SECONDS:
            self._last = time.monotonic()
            self._console.print(in_words(what), soft_wrap=True, markup=False)


def print_summary(plan: Plan, summary: Summary, record: Path, plan_path: str) -> None:
    """The best variants, what is suspicious, what failed, and what to do next."""
    console = make_console()

    def say(text: str) -> None:
        console.print(escape(text), soft_wrap=True)

    say(f"{several(summary.evaluated, 'variant')} in {duration(summary.seconds)}" + (
        f", {summary.reused} of {summary.points} points from before" if summary.reused else ""))
    if summary.best:
        console.print(_best_table(plan, summary.best, console))
    else:
        for text in _none_fine(summary):
            say(text)
    suspicious = summary.counts.get("suspicious", 0)
    if suspicious:
        say(f"{MARKS['suspicious']} {suspicious} suspicious; the commonest reasons:")
        for reason, count in list(summary.suspicions.items())[:MOST_REASONS]:
            say(f"    {count:5d}  {reason}")
    if summary.failures:
        say(f"x {summary.failed} failed:")
        for text in _failures(summary.failures):
            say(text)
        say(f"    one alone: haunch again {record} {summary.failures[0].number}; "
            f"all once more: haunch vary {plan_path} --record {record} --again failed")
    if summary.safer:
        say(f"{summary.safer} on a safer mesh, for the first attempt failed")
    if summary.left_out:
        say(f"- {several(sum(summary.left_out.values()), 'point')} left out:")
        for reason, count in _commonest(summary.left_out):
            say(f"    {count:5d}  {reason}")
    for path in summary.kept:
        say(f"whole run kept in {path}")
    say(f"The report: haunch report {record}")


def _best_table(plan: Plan, rows: Sequence[Ranked], console: Console) -> Table:
    """As many kept figures as the screen is wide enough for; the varied values, the aim and the judgement always."""
    names = [name for name in rows[0].figures if name != plan.aim.text][:MOST_COLUMNS]
    while True:
        table = _table(plan, rows, names)
        if not names or console.measure(table).minimum <= console.width:
            return table
        names.pop()


def _table(plan: Plan, rows: Sequence[Ranked], names: Sequence[str]) -> Table:
    title = f"the best that meet every limit: {plan.aim.sense} {plan.aim.text}"
    table = Table(title=escape(title), title_justify="left", title_style="bold", box=SIMPLE_HEAD, pad_edge=False)

    def column(head: str, cells: Sequence[str], right: bool = True) -> Sequence[str]:
        least = max(map(len, [*head.split(), *cells]))
        table.add_column(escape(head), justify="right" if right else "left", min_width=least)
        return [escape(cell) for cell in cells]

    def with_unit(head: str, unit: str) -> str:
        return f"{head} ({shown_unit(unit)})" if shown_unit(unit) else head

    columns = [column("variant", [str(row.number) for row in rows])]
    columns += [column(_broken(name), [str(row.values.get(name) or "as it is") for row in rows], right=False)
                for name in plan.varied]
    columns.append(column(with_unit(plan.aim.text, plan.aim.unit), [number(row.aim, plan.aim.unit) for row in rows]))
    for name in names:
        kept = [row.figures.get(name) for row in rows]
        columns.append(column(with_unit(_broken(name), rows[0].figures[name].unit), [
            "-" if k is None else number(k.beam if k.solid is None else k.solid, k.unit) for k in kept]))
    columns.append(column("limit left", ["-" if row.margin is None else f"{100 * row.margin:.3g} %" for row in rows]))
    columns.append(column("judgement", [marked(row.judgement) for row in rows], right=False))
    for cells in zip(*columns, strict=True):
        table.add_row(*cells)
    return table


def _broken(name: str) -> str:
    """A name with spaces for its underscores, so that it can stand in lines as the head of a narrow column."""
    return name.replace("_", " ")


def _none_fine(summary: Summary) -> Iterable[str]:
    yield "No variant meets every limit without anything suspicious."
    row = summary.nearest
    if row is not None and row.margin is not None:
        values = ", ".join(f"{name} = {value}" for name, value in row.values.items())
        yield (f"The nearest is variant {row.number} ({values}): {row.judgement}, its closest limit "
               f"{_margin(row.margin)}")


def _margin(share: float) -> str:
    return f"is missed by {-100 * share:.3g} %" if share < 0 else f"has {100 * share:.3g} % left"


def _failures(rows: Sequence[Failure]) -> Iterable[str]:
    groups: dict[tuple[str, str], list[int]] = defaultdict(list)
    for row in rows:
        groups[row.stage, row.reason].append(row.number)
    for (stage, reason), numbers in sorted(groups.items(), key=lambda item: -len(item[1]))[:MOST_REASONS]:
        shown = ", ".join(map(str, numbers[:8])) + (" ..." if len(numbers) > 8 else "")
        yield f"    {len(numbers):5d}  {stage}: {' '.join(reason.split())} (variant {shown})"
    if len(groups) > MOST_REASONS:
        yield f"           and {len(groups) - MOST_REASONS} other reasons: see the report"


def _commonest(reasons: Mapping[str, int]) -> list[tuple[str, int]]:
    return sorted(reasons.items(), key=lambda item: -item[1])[:MOST_REASONS]


