"""`vary`: one plan, one record, to the end or until stopped."""

from __future__ import annotations

import dataclasses
import threading
import time
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import TYPE_CHECKING

from geometry.budget import available_threads
from geometry.problem import HaunchError, Problem, SpecError
from studies.record import Record, RecordError, Writer
from studies.vary.run.attempts import Ticket
from studies.vary.run.backend import Backend, BackendLost
from studies.vary.run.driver import Driver
from studies.vary.run.keeping import kept_run, new_run
from studies.vary.run.progress import Happening, Listener, Log, in_words, several
from studies.vary.run.signals import heard
from studies.vary.run.summary import MOST_SHOWN, Findings, Summary, to_keep
from studies.vary.variant import Variant

if TYPE_CHECKING:
    from studies.vary.cluster import Tls
    from studies.vary.plan import Plan


class StudyStopped(HaunchError):
    """The study had to stop before its end. What was finished is in the record, and the same call goes on."""


def vary(plan: Plan, record: str | Path, *, workers: int = 0, on: str | None = None, tls: Tls | None = None,
         share: bool = False, again: Iterable[str | int] = (), memory: int | None = None,
         log: str | Path | None = None,
         listener: Listener | None = None, stop: threading.Event | None = None,
         backend: Callable[[], Backend] | None = None) -> Summary:
    """Evaluate every variant of a plan that the record does not hold yet.

    Parameters
    ----------
    plan
        What to evaluate.
    record
        File of the record; made when it is not there, gone on with when it is.
    workers
        Variants evaluated at a time, each on one core; 0: as many as this process has cores.
    on
        Address of a cluster's scheduler, ``tcp://...`` or ``tls://...``; None: this machine (`studies.vary.cluster`).
    tls
        Files for TLS; None: Dask's own configuration.
    share
        The record may hold other studies too; their finished variants are used again.
    again
        What to evaluate although the record has it: numbers of points, or the word ``failed``.
    memory
        MiB that the processes of one variant may hold, in place of the plan's.
    log
        File to which a line is added for everything that happens.
    listener
        Hears each `Happening`, and the `Progress` at least twice a second; in the thread of this call.
    stop
        Set it (from any thread) and the study stops as for Ctrl-C.
    backend
        Makes what evaluates, in place of `workers` and `on`.

    Returns
    -------
    Summary
        `Summary.interrupted` is not empty when it was stopped: by SIGINT, SIGTERM, SIGHUP (heard in the main thread
        only) or `stop`.

    Raises
    ------
    SpecError
        `again` names what the plan does not have, or the address of the cluster is wrong.
    RecordError
        The record cannot be used.
    StudyStopped
        The record could not be written any more, or what evaluates was lost.
    """
    if memory is not None:
        plan = dataclasses.replace(plan, run=dataclasses.replace(plan.run, memory=memory))
    words, numbers = _again(again, plan.count())
    path, started = Path(record), time.monotonic()
    cluster = None if on is None else _cluster(plan, on, tls, workers)

    stop = stop or threading.Event()
    with Log(Path(log) if log else None, listener) as tell:
        new = not path.exists()
        with Record.create(path, plan) if new else Record.resume(path, plan, share) as writer:
            tell(Happening("start", f"{plan.title}: {several(plan.count(), 'point')}; "
                                    f"{'a new record' if new else 'going on with the record'} {path}"))
            for text in plan.notes:
                tell(Happening("note", text))
            redo = {point.key for point, _ in writer.failed()} if "failed" in words else set()
            make = backend or (_backend(plan, workers, tell) if cluster is None else cluster(tell))
            driver = Driver(plan, writer, make, tell, stop, redo, numbers)
            here = backend or _backend(plan, workers, tell)
            with heard(driver.ask_to_stop):
                return _run(driver, plan, writer, tell, started, here)


def _again(again: Iterable[str | int], count: int) -> tuple[set[str], set[int]]:
    words = {word for word in again if isinstance(word, str)}
    numbers = {number for number in again if isinstance(number, int)}
    wrong = [*sorted(words - {"failed"}), *sorted(n for n in numbers if not 1 <= n <= count)]
    if wrong:
        allowed = f"failed, or numbers of points from 1 to {count}"
        raise SpecError([Problem("again", str(each), allowed) for each in wrong])
    return words, numbers


def _backend(plan: Plan, workers: int, tell: Listener) -> Callable[[], Backend]:
    def make() -> Backend:
        from studies.vary.run.local import LocalBackend, compile_kernels

        compile_kernels(lambda text: tell(Happening("note", text)))
        return LocalBackend(workers or available_threads(), plan.run.memory)

    return make


def _cluster(plan: Plan, on: str, tls: Tls | None, workers: int) -> Callable[[Listener], Callable[[], Backend]]:
    """Looks at the address now, before there is a record; what it gives makes the backend."""
    from studies.vary.cluster import cluster

    make = cluster(on, tls, workers=workers, memory=plan.run.memory)
    return lambda tell: lambda: make(lambda text: tell(Happening("note", text)))


def _run(driver: Driver, plan: Plan, writer: Writer, tell: Listener, started: float,
         here: Callable[[], Backend]) -> Summary:
    try:
        driver.run()
        findings = Findings(plan.aim, plan.keep.best, plan.keep.worst, plan.keep.suspicious)
        if not driver.stopped_by:
            _look_through(writer, findings)
            driver.keep(_tickets(plan, writer, findings, tell), here)
    except (RecordError, BackendLost) as error:
        done = driver.tally.done
        points = f"{several(done, 'point')} {'is' if done == 1 else 'are'} done"
        raise StudyStopped(f"{str(error).rstrip('.')}. {points} and in {writer.path}; the same command goes "
                           "on where this one stopped") from error
    finally:
        driver.close()
    progress = driver.tally.progress(0)
    tell(progress)
    summary = Summary(
        record=writer.path, points=progress.points, counts=progress.words, fine=findings.fine,
        left_out=driver.left_out, reused=progress.reused, evaluated=driver.tally.evaluated,
        seconds=time.monotonic() - started, interrupted=driver.stopped_by, best=tuple(findings.best[:MOST_SHOWN]),
        nearest=findings.nearest, suspicions=dict(findings.suspicions.most_common()),
        failures=tuple(findings.failures), safer=findings.safer, kept=tuple(driver.kept))
    if summary.interrupted:
        tell(Happening("stop", f"stopped ({summary.interrupted}); {in_words(progress)}"))
    else:
        tell(Happening("end", f"every point is done; {in_words(progress)}"))
    return summary


def _look_through(writer: Writer, findings: Findings) -> None:
    for point, outcome in writer.outcomes():
        findings.add(point, outcome)


def _tickets(plan: Plan, writer: Writer, findings: Findings, tell: Listener) -> list[Ticket]:
    """Those of the chosen variants whose run folder is not there yet."""
    tickets = []
    for row in to_keep(findings, plan.keep.best):
        if kept_run(writer.path, row.key) is not None:
            continue
        variant = Variant(row.number, row.values, row.numbers, writer.spec(row.key) or {}, row.key, row.key)
        outcome = writer.outcome(row.key)
        first = outcome if outcome is not None and outcome.safer_mesh else None
        tickets.append(Ticket(variant, str(new_run(writer.path, variant)), recorded=True, first=first))
    if tickets:
        tell(Happening("note", f"keeping {several(len(tickets), 'whole run')}: evaluated once more, for the files"))
    return tickets
