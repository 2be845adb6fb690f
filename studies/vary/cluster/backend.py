"""The driver's side of a cluster: a `Backend` whose groups are tasks of Dask, each for one process of a worker.

Dask is asked to repeat nothing. Every task is bound to one worker, and says which process of it is meant; so when that
process ends Dask has nowhere to run the task again, and the driver alone decides that it is. All of this side's state
belongs to one thread, which runs Dask's event loop.
"""

from __future__ import annotations

import asyncio
import json
import queue
import threading
import uuid
from collections import deque
from collections.abc import Callable, Coroutine, Sequence
from concurrent.futures import CancelledError
from contextlib import suppress
from dataclasses import dataclass, field
from typing import Any

from geometry.budget import available_threads
from studies.vary.cluster import worker as remote
from studies.vary.cluster.address import Address, Tls, context_of, knock
from studies.vary.cluster.answers import TOPIC, read_end, write_group
from studies.vary.outcome import Outcome
from studies.vary.run.backend import BackendLost, Hear
from studies.vary.run.local import LocalBackend
from studies.vary.work import Ended, Order

LOOK = 0.5
"""Seconds between two looks at which workers there are."""

BEAT = 5.0
"""Seconds between two words to every worker that the driver is there still."""

CONNECT, ANSWER, REPORT = 6.0, 5.0, 120.0
"""Seconds that the scheduler may take to let the driver in and to answer later, and a worker to load Haunch."""

FIRST = 5.0
"""Seconds that the driver waits for the workers to be ready, before it gives out the first group."""

PATIENCE = 5.0
"""Seconds without a connection to the scheduler after which it is gone; three answers that fail are as much."""


@dataclass(eq=False)
class _Group:
    """Orders submitted together."""

    orders: Sequence[Order]
    hear: Hear
    name: str = field(default_factory=lambda: uuid.uuid4().hex)
    open: set[int] = field(default_factory=set)
    """Places that have not been heard of."""

    def __post_init__(self) -> None:
        self.open = set(range(len(self.orders)))

    def end(self, place: int, end: Outcome | Ended | BackendLost) -> None:
        """Tell an end; what comes late, or twice, is not told."""
        if place in self.open:
            self.open.discard(place)
            self.hear(place, end)

    def end_rest(self, signal: str, what: str = "") -> None:
        """Nothing is known about the others, and they are to be run again."""
        for place in sorted(self.open):
            self.end(place, Ended(self.orders[place].variant.key, signal, what))


@dataclass(eq=False)
class _Worker:
    """One process of the cluster that has been accepted."""

    address: str
    process: str
    machine: str
    threads: int
    busy: int = 0
    gone: asyncio.Event = field(default_factory=asyncio.Event)

    @property
    def free(self) -> int:
        return 0 if self.gone.is_set() else self.threads - self.busy


class ClusterBackend:
    """Evaluates on the workers of a Dask scheduler; they may come and go. Orders with a run folder are evaluated on
    this machine, where the folder is wanted.

    Parameters
    ----------
    local_workers
        Of this machine, for orders with a run folder; 0: one for each core.
    tell
        Told in plain words which workers come, go and are refused; in the thread of the driver.

    Raises
    ------
    BackendLost
        The scheduler cannot be reached. Where it is lost later, or every worker that it has is refused at the start,
        each order's `Hear` is told so.
    """

    writes_here = True

    def __init__(self, address: Address, tls: Tls, local_workers: int, memory: int,
                 tell: Callable[[str], None]) -> None:
        self._address, self._tell, self._id = address, tell, uuid.uuid4().hex
        self._local_workers, self._memory = local_workers or available_threads(), memory
        self._local: LocalBackend | None = None
        self._notes: queue.SimpleQueue[str] = queue.SimpleQueue()
        self._threads = 0
        self._workers: dict[str, _Worker] = {}
        self._looking_at: set[str] = set()
        self._refused: dict[str, str] = {}
        self._waiting: deque[_Group] = deque()
        self._groups: dict[str, _Group] = {}
        self._tasks: set[asyncio.Task[None]] = set()
        self._lost: BackendLost | None = None
        self._closed = False
        self._client: Any = None
        if address.scheme == "tcp":
            knock(address, None)  # before all of Dask is loaded
        self._security = _security(tls)
        if address.scheme == "tls":
            knock(address, context_of(tls, self._security))
        self._loop: asyncio.AbstractEventLoop | None = None
        self._ready: queue.SimpleQueue[BaseException | None] = queue.SimpleQueue()
        self._thread = threading.Thread(target=self._run, name="cluster", daemon=True)
        self._thread.start()
        fault = self._ready.get()
        if fault is not None:
            self._thread.join(ANSWER)
            raise fault
        self._tell_notes()

    # What the driver calls, in its own thread.

    @property
    def slots(self) -> int:
        """See `Backend`. Never zero: with no worker there is one group that waits for one."""
        self._tell_notes()
        return max(self._threads, 1, 0 if self._local is None else self._local_workers)

    def submit(self, orders: Sequence[Order], hear: Hear) -> None:
        """See `Backend`."""
        for chosen, here in ((True, True), (False, False)):
            places = [k for k, order in enumerate(orders) if (order.run_folder is not None) is chosen]
            if not places:
                continue
            part = [orders[k] for k in places]
            if here:
                self._on_this_machine().submit(part, self._at(places, hear))
            else:
                self._call(self._take, _Group(part, self._at(places, hear)))

    def close(self) -> None:
        """See `Backend`."""
        self._closed = True
        with suppress(RuntimeError):  # the loop is closed already
            self._call(self._stop)
        if self._local is not None:
            self._local.close()
        self._thread.join(2 * ANSWER)

    def _at(self, places: Sequence[int], hear: Hear) -> Hear:
        """Hears a part of a submission, until this is closed."""
        return lambda place, end: None if self._closed else hear(places[place], end)

    def _call(self, do: Callable[..., Any], *arguments: Any) -> None:
        assert self._loop is not None
        self._loop.call_soon_threadsafe(do, *arguments)

    def _on_this_machine(self) -> LocalBackend:
        if self._local is None:
            self._local = LocalBackend(self._local_workers, self._memory)
        return self._local

    def _tell_notes(self) -> None:
        while not self._notes.empty():
            self._tell(self._notes.get())

    # What follows runs in the thread of the event loop.

    def _run(self) -> None:
        with suppress(BaseException):  # told to `_ready`, or to everyone who waits
            asyncio.run(self._main())

    async def _main(self) -> None:
        self._loop, self._over = asyncio.get_running_loop(), asyncio.Event()
        self._met = asyncio.Event()
        try:
            await self._connect()
            self._start(self._first_look())
            with suppress(TimeoutError):
                await asyncio.wait_for(self._met.wait(), FIRST)
        except BaseException as error:  # noqa: BLE001 - raised again in the driver's thread
            await self._leave()
            self._ready.put(error)
            return
        self._ready.put(None)
        try:
            await self._watch()
        except Exception as error:  # noqa: BLE001 - nobody may wait for ever
            self._lose(BackendLost(f"the connection to {self._address} failed ({type(error).__name__}: {error})"))
        await self._over.wait()
        await self._leave()

    async def _connect(self) -> None:
        from distributed import Client

        from studies.vary.cluster.quiet import be_quiet

        be_quiet()
        client = Client(str(self._address), asynchronous=True, security=self._security, timeout=CONNECT,
                        set_as_default=False, name="haunch")
        try:
            self._client = await asyncio.wait_for(client, CONNECT + 1.0)
        except Exception as error:
            with suppress(Exception, asyncio.CancelledError):
                await asyncio.wait_for(client._close(fast=True), 1.0)
            other = "tls" if self._address.scheme == "tcp" else "tcp"
            raise BackendLost(
                f"something listens at {self._address}, but it does not answer as a Dask scheduler does "
                f"({type(error).__name__}). Is the port that of the scheduler, not of its web page or of a worker? "
                f"Was it started for {other}://?") from error
        self._client.subscribe_topic(TOPIC, self._hear_event)

    def _hear_event(self, event: tuple[float, Any]) -> None:
        """A worker tells an end at once."""
        with suppress(ValueError, KeyError, TypeError):  # of somebody else's
            plain = json.loads(event[1])
            group = self._groups.get(plain["group"])
            if group is not None:
                group.end(plain["place"], read_end(plain))

    async def _first_look(self) -> None:
        """Meet the workers that are there, all at once."""
        with suppress(Exception):  # told by `_watch`
            cores = await self._cores()
            await asyncio.gather(*(self._meet(address, threads) for address, threads in cores.items()))
        self._met.set()
        if self._refused and not self._workers:
            self._lose(BackendLost("; ".join(self._refused.values())))
        elif not self._workers:
            self._notes.put(f"the scheduler {self._address} has no worker yet: the study waits for the first one, "
                            f"started with: dask worker {self._address}")

    async def _cores(self) -> dict[str, int]:
        found: dict[str, int] = await asyncio.wait_for(self._client.nthreads(), ANSWER)
        return found

    async def _watch(self) -> None:
        """Follow which workers there are, until everything is over or the scheduler is gone."""
        failed, away, beaten = 0, 0.0, 0.0
        clock = asyncio.get_running_loop().time
        while self._lost is None:
            with suppress(TimeoutError):
                await asyncio.wait_for(self._over.wait(), LOOK)
                return
            if self._client.status != "running":
                away = away or clock()
                if clock() - away > PATIENCE or self._client.status == "closed":
                    break
                continue
            away = 0.0
            try:
                cores = await self._cores()
            except Exception:  # noqa: BLE001 - whatever Dask makes of a scheduler that does not answer
                failed += 1
                if failed == 3:
                    break
                continue
            failed = 0
            self._compare(cores)
            if clock() - beaten > BEAT:
                beaten = clock()
                self._start(self._beat())
        if self._lost is None:
            self._lose(BackendLost(
                f"the scheduler {self._address} is gone: it was ended, or the network is down. Start it again with its "
                "workers, or leave out --on to go on on this machine alone"))

    def _compare(self, cores: dict[str, int]) -> None:
        """Workers that have come, and that have gone."""
        for address in [*self._workers]:
            if address not in cores:
                self._dismiss(address)
        for address in [*self._refused]:
            if address not in cores:
                del self._refused[address]
        for address, threads in cores.items():
            if address not in self._workers and address not in self._refused and address not in self._looking_at:
                self._start(self._meet(address, threads))

    async def _meet(self, address: str, threads: int) -> None:
        """Ask a worker what it is, and accept or refuse it."""
        self._looking_at.add(address)
        try:
            # Imported here: it loads the models.
            mine = await asyncio.to_thread(remote.versions)
            asked = json.dumps({"driver": self._id, "versions": mine, "threads": threads})
            answer = await self._ask(address, remote.report, asked, REPORT)
            if isinstance(answer, BaseException):
                if address in await self._cores():
                    self._refuse(address, f"it cannot load Haunch ({_fault(answer)}). Install on "
                                          f"every machine what is installed here: Haunch {mine['haunch']}")
                return
            told = json.loads(answer)
            if differing := _differing(told["versions"], mine):
                self._refuse(address, f"its numbers would not be comparable: {differing}. Install the same versions "
                                      "on every machine")
            elif told["fault"]:
                self._refuse(address, told["fault"])
            else:
                self._workers[address] = _Worker(address, told["process"], told["machine"], threads)
                self._count()
                self._notes.put(f"worker {address} on {told['machine']} takes part, with "
                                f"{threads} variant{'s' if threads != 1 else ''} at a time")
        finally:
            self._looking_at.discard(address)
        self._assign()

    async def _ask(self, address: str, function: Callable[[str], str], text: str, seconds: float) -> Any:
        """Call a function in a worker's process, beside its tasks; what it gives, or the exception."""
        try:
            answers = await asyncio.wait_for(self._client.run(function, text, workers=[address], on_error="return"),
                                             seconds)
            return answers.get(address, ConnectionError("it did not answer"))
        except Exception as error:  # noqa: BLE001 - whatever Dask makes of a worker that does not answer
            return error

    def _refuse(self, address: str, why: str) -> None:
        self._refused[address] = f"worker {address} is refused: {why}"
        self._notes.put(self._refused[address])

    def _dismiss(self, address: str) -> None:
        """A worker has gone: what it had is to be run again."""
        worker = self._workers.pop(address)
        worker.gone.set()
        self._count()
        left = "" if self._workers else "; there is no other: the study waits for one"
        self._notes.put(f"worker {address} on {worker.machine} is gone{left}")

    def _count(self) -> None:
        self._threads = sum(worker.threads for worker in self._workers.values())

    async def _beat(self) -> None:
        """Tell every worker that the driver is there; one whose process is another one now is a new worker."""
        async def one(worker: _Worker) -> None:
            answer = await self._ask(worker.address, remote.beat, self._id, ANSWER)
            if isinstance(answer, str) and answer != worker.process and self._workers.get(worker.address) is worker:
                self._dismiss(worker.address)

        await asyncio.gather(*(one(worker) for worker in [*self._workers.values()]))

    def _take(self, group: _Group) -> None:
        if self._lost is not None:
            self._end_lost(group)
            return
        self._waiting.append(group)
        self._assign()

    def _assign(self) -> None:
        """Give what waits to workers that are free, the freest first."""
        while self._waiting and (worker := max(self._workers.values(), key=lambda w: w.free, default=None)):
            if worker.free <= 0 or self._over.is_set():
                return
            group = self._waiting.popleft()
            self._groups[group.name] = group
            worker.busy += 1
            self._start(self._evaluate(worker, group))

    def _start(self, work: Coroutine[Any, Any, None]) -> None:
        task = asyncio.get_running_loop().create_task(work)
        self._tasks.add(task)
        task.add_done_callback(self._tasks.discard)

    async def _evaluate(self, worker: _Worker, group: _Group) -> None:
        """One group on one worker."""
        text = write_group(group.orders, driver=self._id, group=group.name, process=worker.process,
                           threads=str(worker.threads))
        try:
            future = self._client.submit(remote.evaluate, text, key=f"haunch-{group.name}", workers=[worker.address],
                                         allow_other_workers=False, pure=False, retries=0)
            answer = asyncio.ensure_future(_result(future))
            gone = asyncio.ensure_future(worker.gone.wait())
            await asyncio.wait({answer, gone}, return_when=asyncio.FIRST_COMPLETED)
            gone.cancel()
            if answer.done():
                await self._take_answer(worker, group, answer.result())
            else:
                answer.cancel()
            future.release()
        except Exception:  # noqa: BLE001 - the connection is going; `_watch` will tell
            await self._away()
        finally:
            worker.busy -= 1
            self._groups.pop(group.name, None)
        if self._over.is_set():
            return
        if self._lost is not None:
            self._end_lost(group)
        else:
            group.end_rest("its worker is gone", worker.address)
            self._assign()

    async def _take_answer(self, worker: _Worker, group: _Group, answer: str | BaseException) -> None:
        if isinstance(answer, BaseException):
            await self._take_nothing(worker, group, answer)
            return
        told = json.loads(answer)
        for place, plain in enumerate(told.get("ends", ())):
            group.end(place, read_end(plain))
        if fault := told.get("fault"):
            if self._workers.get(worker.address) is worker:
                self._dismiss(worker.address)
                self._refuse(worker.address, fault)
            group.end_rest("its worker failed", fault)
        elif "refused" in told and self._workers.get(worker.address) is worker:
            self._dismiss(worker.address)

    async def _take_nothing(self, worker: _Worker, group: _Group, error: BaseException) -> None:
        """Dask gave no answer. Either the worker has ended, or the scheduler is no use at all."""
        if isinstance(error, asyncio.CancelledError | CancelledError):
            await self._away(1.0)
            group.end_rest("the connection was lost for a moment")
        elif await self._ask(worker.address, remote.beat, self._id, ANSWER) == worker.process:
            self._lose(BackendLost(f"the scheduler {self._address} does not pass the work on to its workers "
                                   f"({_fault(error)}). Is Haunch installed where the scheduler runs, in the same "
                                   "version as here?"))
        elif self._workers.get(worker.address) is worker:
            self._dismiss(worker.address)

    async def _away(self, seconds: float = PATIENCE + 2 * LOOK) -> None:
        """Something went wrong with the connection: wait until it is known whether the scheduler is gone."""
        end = asyncio.get_running_loop().time() + seconds
        while self._lost is None and not self._over.is_set() and asyncio.get_running_loop().time() < end:
            await asyncio.sleep(0.1)

    def _lose(self, error: BackendLost) -> None:
        """The scheduler is gone: everyone who waits is told."""
        self._lost = error
        for group in [*self._waiting, *self._groups.values()]:
            self._end_lost(group)
        self._waiting.clear()

    def _end_lost(self, group: _Group) -> None:
        assert self._lost is not None
        for place in sorted(group.open):
            group.end(place, self._lost)

    def _stop(self) -> None:
        self._over.set()

    async def _leave(self) -> None:
        """Have the workers end what they have of ours, and take leave."""
        if self._client is None:
            return
        if self._lost is None:
            await asyncio.gather(*(self._ask(address, remote.stop, self._id, 2.0) for address in self._workers))
        for task in [*self._tasks]:
            task.cancel()
        with suppress(Exception, asyncio.CancelledError):
            await asyncio.wait_for(self._client._close(fast=self._lost is not None), 2.0)


async def _result(future: Any) -> str | BaseException:
    """What a task gave, or why it gave nothing."""
    try:
        answer: str = await future
        return answer
    except asyncio.CancelledError as error:
        if (task := asyncio.current_task()) is not None and task.cancelling():
            raise
        return error
    except Exception as error:  # noqa: BLE001 - whatever Dask makes of a worker that has ended
        return error


def _security(tls: Tls) -> Any:
    """Dask's security settings: these files, or its own configuration where there are none."""
    from distributed.security import Security

    if not tls:
        return Security()
    return Security(require_encryption=True, tls_ca_file=tls.ca, tls_client_cert=tls.cert,
                    tls_client_key=tls.key or None)


def _fault(error: BaseException) -> str:
    """Dask turns exceptions that cannot cross into an `Exception` of their text."""
    return str(error) if type(error) is Exception else f"{type(error).__name__}: {error}"


def _differing(theirs: dict[str, str], mine: dict[str, str]) -> str:
    """``gmsh 4.14.0 there, 4.15.0 here``, for everything that differs."""
    words = {"results": "the version of Haunch's results", "haunch": "Haunch"}
    return ", ".join(f"{words.get(name, name)} {theirs.get(name, 'unknown')} there, {mine.get(name, 'unknown')} here"
                     for name in {**mine, **theirs} if theirs.get(name) != mine.get(name))
