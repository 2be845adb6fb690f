"""The host of a study's work: three templates, and at most so many variants at a time in copies of them."""

from __future__ import annotations

import contextlib
import dataclasses
import os
import select
import socket
import threading
import time
from collections.abc import Callable, Iterator, Sequence
from itertools import count
from pathlib import Path
from typing import Any

from geometry.endings import ended_from_outside, signal_name
from geometry.process import Job, Template, TemplateFailure
from studies.vary.outcome import Outcome
from studies.vary.work import frames
from studies.vary.work.order import Ended, Order
from studies.vary.work.room import Room, remove
from studies.vary.work.variant_job import CAD, MESH

MODELS = "studies.vary.work.variant_job"
KERNELS = {CAD: "CAD", MESH: "mesh", MODELS: "solver"}
POLL = 0.05
"""Seconds between two looks at time and memory."""


class Host:
    """Evaluates variants in child processes. Use as a context manager; leaving it ends all work.

    Any thread may ask; at most `workers` jobs run at a time, the others wait. Each job is one process with one thread,
    and waits while one of its own two helpers (CAD, mesh) works.

    Parameters
    ----------
    workers
        Jobs at a time.
    memory
        Most MiB that the processes of one variant may hold; an order that allows more is cut to it. None: what the
        orders say.
    models, cad, mesh
        Modules of the templates (tests plant faults by giving others).
    """

    def __init__(self, workers: int = 1, memory: int | None = None, *, models: str = MODELS, cad: str = CAD,
                 mesh: str = MESH) -> None:
        self.workers, self.memory = workers, memory
        self.templates: tuple[Template, ...] = ()
        """Of the models, CAD and mesh, while the host is open."""
        self._modules = models, cad, mesh
        self._free = threading.BoundedSemaphore(workers)
        self._closing = threading.Event()
        self._clients = count(1)
        self._idle = threading.Condition()
        self._running = 0
        self._room: Room | None = None
        self.worker = f"{socket.gethostname()}:{os.getpid()}"

    def __enter__(self) -> Host:
        self._room = Room()
        self.templates = tuple(Template(module, self._room.path) for module in self._modules)
        for template in self.templates:
            template.start()
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def close(self) -> None:
        """End all work: what is under way gives `Ended`. Safe to call twice, and from any thread."""
        self._closing.set()
        if self._room is None:
            return
        with self._idle:
            self._idle.wait_for(lambda: not self._running, 30.0)
            room, self._room = self._room, None
        for template in self.templates:
            template.close()
        if room is not None:
            room.close()

    @property
    def folder(self) -> Path | None:
        """With what the jobs keep for a moment; None while the host is not open."""
        return None if self._room is None else self._room.path

    def evaluate(self, order: Order) -> Outcome | Ended:
        """Evaluate one variant and wait for it."""
        return next(iter(self.evaluate_group([order])))

    def evaluate_group(self, orders: Sequence[Order], cancelled: Callable[[], bool] = lambda: False
                       ) -> Iterator[Outcome | Ended]:
        """Evaluate variants one after the other in one worker; gives what became of each, in their order, as it comes.

        Those that follow one another with one shape share the solid and the mesh, those with one matrix its factor.
        The numbers are those of single evaluations. A variant that takes its process down is failed by itself; the
        others go on in a new one. Once `cancelled` says so, the rest is `Ended` as if the host had been closed.
        """
        while not self._free.acquire(timeout=POLL):
            if self._closing.is_set() or cancelled():
                yield from (Ended(order.variant.key, "closed") for order in orders)
                return
        try:
            left = list(orders)
            while left:
                size = next((k for k, order in enumerate(left) if not order.shares_with(left[0])), len(left))
                done = 0
                for end in self._job(left[:size], cancelled):
                    done += 1
                    yield end
                left = left[done:]
        finally:
            self._free.release()

    def _job(self, orders: Sequence[Order], cancelled: Callable[[], bool]) -> Iterator[Outcome | Ended]:
        """One job; gives at least one end, and none for the orders that a new job has to take up."""
        with self._idle:
            room = None if self._closing.is_set() or cancelled() else self._room
            self._running += room is not None
        if room is None:
            yield from (Ended(order.variant.key, "closed") for order in orders)
            return
        client = f"{os.getpid()}-{next(self._clients)}"
        folder = room.path / client
        try:
            if fault := _made(folder):
                yield from (Ended(order.variant.key, fault, "the temporary files") for order in orders)
            else:
                yield from _Watch(self, orders, client, str(folder), cancelled).ends()
        finally:
            for template in self.templates[1:]:
                template.kill_client(client)
            remove(folder)
            with self._idle:
                self._running -= 1
                self._idle.notify_all()

    def start_job(self, client: str) -> tuple[Job, dict[str, Callable[[], int | None]]]:
        """A job of the models' template that has been lent the other two; with how those have ended, by module.

        Raises `TemplateFailure`.
        """
        job = self.templates[0].submit({"client": client}, self._closing.is_set, client)
        try:
            controls, endings = zip(*(template.lend() for template in self.templates[1:]), strict=True)
            try:
                socket.send_fds(job.data, [b"."], [control.fileno() for control in controls])
            finally:
                for control in controls:
                    control.close()
        except BaseException as error:
            job.close()
            if isinstance(error, OSError):
                raise TemplateFailure(f"a job could not be started ({error})", job.wait(0.0)) from error
            raise
        return job, dict(zip((CAD, MESH), endings, strict=True))

    @property
    def closing(self) -> bool:
        """Whether the host is being closed."""
        return self._closing.is_set()


@dataclasses.dataclass
class _Watch:
    """Watches one job: what it tells, the time and memory that it takes, and how it ends."""

    host: Host
    orders: Sequence[Order]
    client: str
    folder: str
    cancelled: Callable[[], bool]
    stage: str = "spec"
    done: int = 0
    peak: float = 0.0
    processes: tuple[int, ...] = ()
    began: float = 0.0
    inbox: frames.Inbox = dataclasses.field(default_factory=frames.Inbox)

    @property
    def order(self) -> Order:
        return self.orders[self.done]

    @property
    def memory(self) -> int:
        return min(self.order.memory, self.host.memory or self.order.memory)

    def ends(self) -> Iterator[Outcome | Ended]:
        try:
            job, endings = self.host.start_job(self.client)
        except TemplateFailure as failure:
            yield from self._not_started(failure)
            return
        self.began = time.monotonic()
        with job:
            with contextlib.suppress(OSError):  # gone already: told below
                orders = [dataclasses.replace(order, memory=self.memory).to_json() for order in self.orders]
                frames.send(job.data, {"orders": orders, "folder": self.folder, "memory": self.memory})
            over = ""
            while not over:
                messages, closed = self._hear(job)
                for message in messages:
                    end = self._end_in(message, endings)
                    if isinstance(end, Outcome):
                        yield end
                        if self.done == len(self.orders):
                            return
                    elif end is not None:
                        yield from self._ended(end)
                        return
                over = "closed" if self.host.closing or self.cancelled() else self._over(job)
                if closed and not over:
                    break
            if over == "closed":
                yield from self._ended(Ended("", "closed"))
            elif over:
                yield from self._failed(over)
            else:
                yield from self._died(job)

    def _hear(self, job: Job) -> tuple[list[Any], bool]:
        """Messages that have come, after at most `POLL` seconds; and whether no more will."""
        if not select.select([job.data], [], [], POLL)[0]:
            return [], False
        try:
            piece = job.data.recv(1 << 20)
        except OSError:
            return [], True
        return list(self.inbox.take(piece)), not piece

    def _end_in(self, message: dict[str, Any], endings: dict[str, Callable[[], int | None]]) -> Outcome | Ended | None:
        """What a message tells of the present order's end."""
        if "stage" in message:
            self.stage = message["stage"]
        elif "process" in message:
            self.processes = (*self.processes[-3:], message["process"])
        elif "outcome" in message:
            outcome = Outcome.from_json(message["outcome"])
            return self._complete(outcome)
        elif "ended" in message:
            name, module = message["ended"], message["module"]
            if not module:
                return Ended(self.order.variant.key, name, "the temporary files")
            if name == "lost":
                code = _ended_soon(endings[module])
                if code is not None and not ended_from_outside(code):
                    reason = f"crash: the process that loads the {KERNELS[module]} kernel {_how(code)}"
                    return self._complete(self._fault(reason))
                name = signal_name(code) if code else "SIGKILL"
            return Ended(self.order.variant.key, name, f"the {KERNELS[module]} process")
        return None

    def _complete(self, outcome: Outcome) -> Outcome:
        now = time.monotonic()
        outcome = dataclasses.replace(outcome, peak_memory=round(self.peak, 1), worker=self.host.worker,
                                      seconds={**outcome.seconds, "wall": now - self.began})
        self.began, self.peak, self.processes, self.stage = now, 0.0, (), "spec"
        self.done += 1
        return outcome

    def _over(self, job: Job) -> str:
        """Why the job has to be ended now; empty where it may go on."""
        templates = [template.pid for template in self.host.templates]
        resident = job.resident() + sum(_resident(pid, templates) for pid in self.processes)
        self.peak = max(self.peak, resident)
        if resident > self.memory:
            return (f"memory limit: the variant's processes held {resident:.0f} MiB of the {self.memory} MiB that are "
                    "allowed. Allow more, or ask for less accuracy")
        if time.monotonic() - self.began > self.order.seconds:
            return (f"time limit: {self.order.seconds:g} s were over. Allow more, or look for a very small radius or a "
                    "cut that only grazes the part")
        return ""

    def _died(self, job: Job) -> Iterator[Outcome | Ended]:
        """The job has ended, or closed its socket, without a word."""
        code = job.wait(5.0)
        if self.host.closing:
            yield from self._ended(Ended("", "closed"))
        elif code is not None and (name := ended_from_outside(code)):
            yield from self._ended(Ended("", name, "the solver process"))
        else:
            yield from self._failed(f"crash: the process of the variant {_how(code)}. Run it alone to see more")

    def _not_started(self, failure: TemplateFailure) -> Iterator[Outcome | Ended]:
        code = failure.code
        if self.host.closing:
            yield from self._ended(Ended("", "closed"))
        elif code is None:  # short of processes or memory, or far too slow
            yield from self._ended(Ended("", "not started", str(failure)))
        elif name := ended_from_outside(code):
            yield from self._ended(Ended("", name, "the process that loads the solver"))
        else:
            yield from self._failed(f"crash: {failure} ({_how(code)})")

    def _ended(self, end: Ended) -> Iterator[Ended]:
        for order in self.orders[self.done:]:
            yield dataclasses.replace(end, key=order.variant.key)

    def _failed(self, reason: str) -> Iterator[Outcome]:
        """The present order has failed; with it the others, where what they share was being made."""
        stage = self.stage
        shared = stage in ("solid", "mesh") and self.done == 0
        yield self._complete(self._fault(reason))
        while shared and self.done < len(self.orders):
            self.stage = stage
            yield self._complete(self._fault(reason))

    def _fault(self, reason: str) -> Outcome:
        return Outcome(self.order.variant.key, "failed", stage=self.stage, reason=reason, safer_mesh=self.order.safer)


def _made(folder: Path) -> str:
    """Make a folder; why it could not be made."""
    try:
        folder.mkdir()
    except OSError as error:
        return error.strerror or str(error)
    return ""


def _ended_soon(ended: Callable[[], int | None]) -> int | None:
    deadline = time.monotonic() + 2.0
    while (code := ended()) is None and time.monotonic() < deadline:
        time.sleep(0.01)
    return code


def _how(code: int | None) -> str:
    if code is None:
        return "did not answer"
    return f"ended by {signal_name(code)}" if code < 0 else f"ended with exit status {code}"


def _resident(pid: int, parents: Sequence[int | None]) -> float:
    """Resident memory of a process, MiB; 0 where it has gone, or its number is another's by now."""
    try:
        with open(f"/proc/{pid}/stat", encoding="utf-8", errors="replace") as stat:
            fields = stat.read().rpartition(")")[2].split()
        own = int(fields[1]) in parents
        return int(fields[21]) * os.sysconf("SC_PAGE_SIZE") / 2**20 if own else 0.0
    except (OSError, IndexError, ValueError):
        return 0.0
