"""What the terminal shows: the stages while they run, then a short table and the judgement."""

from __future__ import annotations

from collections.abc import Sequence

from rich.box import SIMPLE_HEAD
from rich.console import Console
from rich.markup import escape
from rich.progress import Progress, SpinnerColumn, TaskID, TextColumn, TimeElapsedColumn
from rich.table import Table

from studies.check.result import CheckResult, Pair
from studies.check.stages import Event
from studies.report.studied import ENVELOPE_HEAD, MODE_HEAD, buckling_cases, envelope_rows, mode_rows
from studies.report.tables import (
    headlines,
    marked,
    name_of,
    number,
    readable,
    remainder,
    shown_unit,
    suspicious,
    verdict,
)

MOST_SUSPICIOUS = 8
PLAIN_WIDTH = 132
TITLES = {"spec": "read the spec", "solid": "build the solid", "mesh": "mesh it", "beam": "solve the beam model",
          "solve": "solve the solid model", "compare": "compare", "write": "write the run folder"}


def make_console() -> Console:
    """Console on standard output; wide and without colour when that is not a terminal."""
    console = Console(highlight=False)
    return console if console.is_terminal else Console(highlight=False, width=PLAIN_WIDTH, no_color=True)


class StageView:
    """A listener that shows each stage: a moving line in a terminal, a plain line at its end elsewhere."""

    def __init__(self, console: Console) -> None:
        self._console = console
        self._notes: dict[str, str] = {}
        self._tasks: dict[str, TaskID] = {}
        self._progress: Progress | None = None
        if console.is_terminal:
            self._progress = Progress(SpinnerColumn(finished_text=" "), TextColumn("{task.description}"),
                                      TimeElapsedColumn(), TextColumn("{task.fields[note]}", style="dim"),
                                      console=console)

    def __enter__(self) -> StageView:
        if self._progress is not None:
            self._progress.start()
        return self

    def __exit__(self, *_: object) -> None:
        if self._progress is not None:
            self._progress.stop()

    def __call__(self, event: Event) -> None:
        """Show one event."""
        if event.text:
            self._notes[event.stage] = event.text
        note = escape(self._notes.get(event.stage, ""))
        if self._progress is not None:
            if event.stage not in self._tasks:
                self._tasks[event.stage] = self._progress.add_task(f"{TITLES[event.stage]:22s}", total=1, note=note)
            self._progress.update(self._tasks[event.stage], completed=1 if event.kind == "end" else 0, note=note)
        elif event.kind == "wait":
            self._console.print(f"{TITLES[event.stage]:22s} {'':8s}    {note}", soft_wrap=True)
        elif event.kind == "end":
            self._console.print(f"{TITLES[event.stage]:22s} {event.seconds:8.2f} s  {note}".rstrip(), soft_wrap=True)


def print_result(console: Console, result: CheckResult) -> None:
    """The headline figures of each case, the limits, what is suspicious, and the judgement."""
    console.print()
    console.print(f"[bold]{escape(result.title or result.spec_name)}[/]", soft_wrap=True)
    for case in [*result.cases, ""]:
        pairs = headlines(result, case)
        if pairs:
            console.print(_pair_table(f"case {case}" if case else "whole part", pairs))
    for travel in result.travels:
        console.print(_table(f"case {travel.case}: {travel.load} travels, {len(travel.positions)} positions "
                             "(@ first axle, mm)", ENVELOPE_HEAD[:-1], [r[:-1] for r in envelope_rows(result, travel)]))
    if rows := mode_rows(result, "natural_frequency"):
        console.print(_table("natural frequencies", MODE_HEAD[:9], [row[:9] for row in rows]))
    for case in buckling_cases(result):
        rows = mode_rows(result, "buckling_factor", case)
        console.print(_table(f"buckling factors, case {case}", MODE_HEAD[:9], [row[:9] for row in rows]))
    if result.limits:
        console.print(_limit_table(result))
    _print_suspicious(console, result)
    for check in result.checks:
        if not check.ok:
            console.print(f"! check failed: {escape(check.name)}: {check.value:.3g}, allowed {check.allowed:.3g}. "
                          f"{escape(check.text)}", soft_wrap=True)
    console.print(f"[bold]{escape(verdict(result))}[/]", soft_wrap=True)
    console.print(f"Accuracy {100 * result.accuracy:g} %: requested, not verified.")
    if result.solver is not None and result.solver.reason:
        console.print(escape(f"Solver: {result.solver.name} ({result.solver.reason.rstrip('.')})."), soft_wrap=True)
    for text in result.cautions:
        if not text.startswith("Accuracy"):
            console.print(escape(text), soft_wrap=True)


def _pair_table(title: str, pairs: list[Pair]) -> Table:
    table = Table(title=escape(title), title_justify="left", title_style="bold", box=SIMPLE_HEAD, pad_edge=False)
    table.add_column("figure")
    table.add_column("unit")
    for head in ("solid", "beam", "difference", "allowed"):
        table.add_column(head, justify="right")
    table.add_column("judgement")
    for pair in pairs:
        table.add_row(escape(name_of(pair.key)), shown_unit(pair.unit), number(pair.solid, pair.unit),
                      number(pair.beam, pair.unit), number(pair.difference, pair.unit),
                      number(pair.band, pair.unit) if pair.difference is not None else "-", marked(pair.judgement))
    return table


def _table(title: str, head: Sequence[str], rows: Sequence[Sequence[str]]) -> Table:
    """A table whose columns of numbers stand to the right."""
    table = Table(title=escape(title), title_justify="left", title_style="bold", box=SIMPLE_HEAD, pad_edge=False)
    numbers = {"solid", "beam", "difference", "allowed", "correlation", *ENVELOPE_HEAD[2:6]}
    for word in head:
        table.add_column(word, justify="right" if word in numbers else "left")
    for row in rows:
        table.add_row(*map(escape, row))
    return table


def _limit_table(result: CheckResult) -> Table:
    table = Table(title="limits", title_justify="left", title_style="bold", box=SIMPLE_HEAD, pad_edge=False)
    for head in ("limit", "given", "found", "case", "place", "verdict"):
        table.add_column(head, justify="right" if head in ("given", "found") else "left")
    for limit in result.limits:
        word = marked(limit.verdict) + (f": {limit.reason}" if limit.reason and limit.verdict != "met" else "")
        table.add_row(escape(limit.name), readable(limit.given, limit.unit), readable(limit.found, limit.unit),
                      escape(limit.case or "-"), escape(limit.place or "-"), escape(word))
    return table


def _print_suspicious(console: Console, result: CheckResult) -> None:
    pairs = suspicious(result)
    for pair in pairs[:MOST_SUSPICIOUS]:
        case = f"case {pair.key.case}, " if pair.key.case else ""
        console.print(escape(f"! {case}{name_of(pair.key)}: solid {readable(pair.solid, pair.unit)}, beam "
                             f"{readable(pair.beam, pair.unit)}; {readable(remainder(pair), pair.unit)} unexplained, "
                             f"{readable(pair.band, pair.unit)} allowed. {pair.look_at}"), soft_wrap=True)
    if len(pairs) > MOST_SUSPICIOUS:
        console.print(f"! {len(pairs) - MOST_SUSPICIOUS} more suspicious figures in result.json", soft_wrap=True)
