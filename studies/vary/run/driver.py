"""The loop that takes variants from a plan, has them evaluated, and writes every outcome into the record."""

from __future__ import annotations

import queue
import threading
import time
from collections import Counter
from collections.abc import Callable, Collection, Iterable
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from studies.vary.outcome import Outcome
from studies.vary.run.attempts import Attempts, Ticket, told
from studies.vary.run.backend import Backend
from studies.vary.run.keeping import at_once, new_run
from studies.vary.run.progress import FAILED, Happening, Listener, Tally
from studies.vary.run.schedule import Pool
from studies.vary.variant import Variant
from studies.vary.work import Ended, Order

if TYPE_CHECKING:
    from studies.record import Writer
    from studies.vary.plan import Plan
    from studies.vary.plan.plan import LeftOut

READ_AHEAD = 256
"""Points read before the first is evaluated, so that those of one shape are found together."""

MOST_WAITING = 4096
"""Variants held ready; the rest of the plan is read as they go."""

TICK = 0.5
"""Seconds at most between two looks at whether to stop."""


@dataclass(slots=True)
class _Group:
    """Tickets submitted together, and how many of them are still out."""

    tickets: list[Ticket]
    out: int


@dataclass(frozen=True, slots=True)
class _End:
    """How one order ended."""

    group: _Group
    ticket: Ticket
    end: Outcome | Ended | BaseException


@dataclass(frozen=True, slots=True)
class _ReadAll:
    """The plan was read to its end, or could not be."""

    left_out: list[LeftOut]
    fault: BaseException | None


class Driver:
    """One call's work on one study. Only the thread that calls `run` touches the record.

    Parameters
    ----------
    make_backend
        Called once, when there is something to evaluate.
    redo, redo_numbers
        Keys and numbers of points whose outcome in the record is to be replaced.
    """

    def __init__(self, plan: Plan, record: Writer, make_backend: Callable[[], Backend], tell: Listener,
                 stop: threading.Event, redo: Collection[str] = (), redo_numbers: Collection[int] = ()) -> None:
        self._plan, self._record, self._tell = plan, record, tell
        self._make_backend = make_backend
        self._backend: Backend | None = None
        self._stop, self.stopped_by = stop, ""
        self._redo, self._redo_numbers = set(redo), set(redo_numbers)
        self._inbox: queue.SimpleQueue[Variant | _End | _ReadAll | None] = queue.SimpleQueue()
        self._pool, self._attempts = Pool(), Attempts(plan.run.safer_mesh)
        self._groups = self._under_way = 0
        self._reading, self._closing = True, False
        finished = {key: word for key, word in record.words().items() if key not in self._redo}
        self._taken = set(finished)  # keys that need no evaluation any more, or wait for it
        self.tally = Tally(plan.count())
        self.tally.known(finished)
        self._unwritten: list[Variant] = []
        self._read = 0
        self.kept: list[Path] = []
        self.left_out: Counter[str] = Counter()  # where points fail to be variants -> how many

    def ask_to_stop(self, why: str) -> None:
        """Take nothing more and end what is under way. Called by signals too."""
        self.stopped_by = self.stopped_by or why
        self._stop.set()
        self._inbox.put(None)

    def run(self) -> None:
        """Evaluate what the plan has and the record has not."""
        reader = threading.Thread(target=self._read_plan, name="plan", daemon=True)
        reader.start()
        try:
            self._work()
        finally:
            self._closing = True
            reader.join()

    def keep(self, tickets: Iterable[Ticket], make_backend: Callable[[], Backend]) -> None:
        """Evaluate variants once more, for their run folders; the record is left as it is. `make_backend` is for those
        that write on this machine, where the present one does not."""
        if self._backend is not None and not self._backend.writes_here:
            self._backend.close()
            self._backend = None
        self._make_backend = make_backend
        for ticket in tickets:
            self._pool.put(ticket)
        self._work()

    def close(self) -> None:
        """End everything that is under way."""
        self._closing = True
        if self._backend is not None:
            self._backend.close()

    def _read_plan(self) -> None:
        left_out: list[LeftOut] = []
        fault: BaseException | None = None
        try:
            for point in self._plan.points():
                if isinstance(point, Variant):
                    self._inbox.put(point)
                else:
                    left_out.append(point)
                    self.tally.left_out = len(left_out)
                while len(self._pool) > MOST_WAITING and not self._closing:
                    time.sleep(TICK)
                if self._closing:
                    return
        except BaseException as error:  # noqa: BLE001 - raised again in the thread that runs the study
            fault = error
        self._inbox.put(_ReadAll(left_out, fault))

    def _work(self) -> None:
        while not self._stop.is_set():
            self._dispatch()
            if not (self._reading or self._under_way or len(self._pool)):
                return
            self._take_what_has_come(self._patience())
            self._tell(self.tally.progress(self._under_way))
        self._take_what_has_come(0.0)
        self.stopped_by = self.stopped_by or "the caller"

    def _patience(self) -> float:
        """Seconds to wait for something to happen: less when a variant may be tried again before."""
        earliest = self._pool.next_time() if self._free() and not self._reading else None
        return TICK if earliest is None else min(TICK, max(0.01, earliest - time.monotonic()))

    def _free(self) -> bool:
        return self._backend is None or self._groups < self._backend.slots

    def _dispatch(self) -> None:
        if not len(self._pool):
            return
        if self._backend is None:  # its processes load their kernels while the plan is read
            self._backend = self._make_backend()
        if self._reading and self._read < READ_AHEAD:
            return
        while self._free() and (tickets := self._pool.take(self._backend.slots, self._reading)):
            group = _Group(tickets, len(tickets))
            self._groups += 1
            self._under_way += len(tickets)
            self._backend.submit([self._order(ticket) for ticket in tickets], self._hearer(group))

    def _order(self, ticket: Ticket) -> Order:
        run, variant = self._plan.run, ticket.variant
        folder = ticket.run_folder
        if not folder and not ticket.recorded and self._backend is not None and self._backend.writes_here \
                and at_once(variant.number, self._plan.keep.every):
            folder = ticket.run_folder = str(new_run(self._record.path, variant))
        return Order(variant, self._plan.keep.names, run.seconds, run.memory, ticket.safer, folder or None,
                     spec_name=self._plan.part_name)

    def _hearer(self, group: _Group) -> Callable[[int, Outcome | Ended | BaseException], None]:
        return lambda place, end: self._inbox.put(_End(group, group.tickets[place], end))

    def _take_what_has_come(self, patience: float) -> None:
        """Wait for the first thing that comes, take all that is there, and see that it is on disk."""
        try:
            item = self._inbox.get(timeout=patience) if patience else self._inbox.get_nowait()
            while True:
                if isinstance(item, Variant):
                    self._take_variant(item)
                elif isinstance(item, _End):
                    self._take_end(item)
                elif isinstance(item, _ReadAll):
                    self._take_whole_plan(item)
                item = self._inbox.get_nowait()
        except queue.Empty:
            self._write_points()

    def _take_variant(self, variant: Variant) -> None:
        self._read += 1
        self._unwritten.append(variant)
        self.tally.point(variant.key)
        if variant.number in self._redo_numbers and self.tally.forget(variant.key):
            self._redo.add(variant.key)
            self._taken.discard(variant.key)
        if variant.key not in self._taken:
            self._taken.add(variant.key)
            self._pool.put(Ticket(variant))

    def _write_points(self) -> None:
        if self._unwritten:
            points, self._unwritten = self._unwritten, []
            self._record.set_points(points)

    def _take_whole_plan(self, end: _ReadAll) -> None:
        if end.fault is not None:
            raise end.fault
        self._write_points()
        self._reading = False
        self.tally.whole_plan(self._read, len(end.left_out))
        self.left_out.update(point.rule for point in end.left_out)
        self._record.set_left_out((point.number, point.values, point.reason) for point in end.left_out)

    def _take_end(self, item: _End) -> None:
        self._under_way -= 1
        item.group.out -= 1
        self._groups -= item.group.out == 0
        ticket, end, again = item.ticket, item.end, ""
        if isinstance(end, Outcome):
            outcome = self._attempts.finished(ticket, end)
            again = f"failed ({told(end)}); it is tried once more on a safer mesh"
        elif isinstance(end, Ended):
            outcome = self._attempts.ended(ticket, end.signal)
            again = f"was ended from outside ({end.signal}); it is run again as it was"
        else:
            raise end
        if outcome is None:
            self._tell(Happening("again", f"variant {ticket.variant.number} {again}", ticket.variant.number))
            self._pool.put(ticket)
        elif ticket.recorded:
            self._take_kept(ticket, outcome)
        else:
            self._take_outcome(ticket, outcome)

    def _take_outcome(self, ticket: Ticket, outcome: Outcome) -> None:
        variant, key = ticket.variant, ticket.variant.key
        before = self._record.outcome(key) if outcome.status == "failed" and key in self._redo else None
        if before is not None and before.status == "finished":
            self.tally.outcome(key, before.judgement or FAILED)
            self._tell(Happening("note", f"variant {variant.number} failed this time ({told(outcome)}); what it had "
                                         "finished with before stays in the record", variant.number))
            return
        self._record.add(variant, outcome, replace=key in self._redo)
        self.tally.outcome(key, outcome.judgement or FAILED)
        if ticket.run_folder and outcome.status == "finished":
            self.kept.append(Path(ticket.run_folder))
        text = _finished_words(outcome) if outcome.status == "finished" else f"failed ({told(outcome)})"
        self._tell(Happening(outcome.status, f"variant {variant.number} {text}", variant.number))

    def _take_kept(self, ticket: Ticket, outcome: Outcome) -> None:
        number = ticket.variant.number
        if outcome.status == "finished":
            self.kept.append(Path(ticket.run_folder))
            self._tell(Happening("note", f"kept the run of variant {number} in {ticket.run_folder}", number))
        else:
            self._tell(Happening("note", f"the run of variant {number} could not be kept ({told(outcome)})", number))


def _finished_words(outcome: Outcome) -> str:
    missed = [f"{held.name} {held.verdict}" for held in outcome.limits if held.verdict != "met"]
    limits = ", ".join(missed) or ("every limit met" if outcome.limits else "no limits")
    text = f"{outcome.judgement}, {limits}"
    text += ", on a safer mesh" if outcome.safer_mesh else ""
    return f"{text}, {outcome.seconds['wall']:.2f} s" if "wall" in outcome.seconds else text
