"""The connection to a scheduler, with a thread of its own that runs Dask's event loop; all state belongs to it.

Dask is asked to repeat nothing. Every task is bound to one worker, and says which process of it is meant; so when that
process ends Dask has nowhere to run the task again, and the driver alone decides that it is.
"""

from __future__ import annotations

import asyncio
import json
import queue
import threading
import uuid
from collections import deque
from collections.abc import Callable, Coroutine
from concurrent.futures import CancelledError
from contextlib import suppress
from typing import Any

from studies.vary.cluster import worker as remote
from studies.vary.cluster.address import Address, Tls, context_of, knock
from studies.vary.cluster.answers import TOPIC, read_end, write_group
from studies.vary.cluster.parts import Group, Worker
from studies.vary.cluster.roster import ANSWER, Roster, fault_words
from studies.vary.run.backend import BackendLost

LOOK = 0.5
"""Seconds between two looks at which workers there are."""

CONNECT = 6.0
"""Seconds that the scheduler may take to let the driver in."""

FIRST = 5.0
"""Seconds that the driver waits for the workers to be ready, before it gives out the first group."""

PATIENCE = 5.0
"""Seconds without a connection to the scheduler after which it is gone; three answers that fail are as much."""


class Link:
    """Gives groups to the workers of a scheduler. Raises `BackendLost` where it cannot be reached.

    Attributes
    ----------
    notes
        Which workers have come, gone or been refused, in words.
    """

    def __init__(self, address: Address, tls: Tls) -> None:
        self._address, self._id = address, uuid.uuid4().hex
        self.notes: queue.SimpleQueue[str] = queue.SimpleQueue()
        self._waiting: deque[Group] = deque()
        self._groups: dict[str, Group] = {}
        self._tasks: set[asyncio.Task[None]] = set()
        self._lost: BackendLost | None = None
        self._client: Any = None
        self._roster = Roster(self._id, self._start, self._assign, self.notes)
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

    # For any thread.

    @property
    def threads(self) -> int:
        """Variants that the workers can have at a time."""
        return self._roster.threads

    def take(self, group: Group) -> None:
        """Have a group evaluated; it hears of its ends in the thread of the event loop."""
        self._call(self._take, group)

    def close(self) -> None:
        """End all that the workers have of this driver's, and the connection."""
        with suppress(RuntimeError):  # the loop is closed already
            self._call(self._over.set)
        self._thread.join(2 * ANSWER)

    def _call(self, do: Callable[..., Any], *arguments: Any) -> None:
        assert self._loop is not None
        self._loop.call_soon_threadsafe(do, *arguments)

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
                await asyncio.wait_for(client.close(), 1.0)
            other = "tls" if self._address.scheme == "tcp" else "tcp"
            raise BackendLost(
                f"something listens at {self._address}, but it does not answer as a Dask scheduler does "
                f"({type(error).__name__}). Is the port that of the scheduler, not of its web page or of a worker? "
                f"Was it started for {other}://?") from error
        self._client.subscribe_topic(TOPIC, self._hear_event)
        self._roster.client = self._client

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
            await self._roster.meet_all()
        self._met.set()
        if self._roster.refused and not self._roster.workers:
            self._lose(BackendLost("; ".join(self._roster.refused.values())))
        elif not self._roster.workers:
            self.notes.put(f"the scheduler {self._address} has no worker yet: the study waits for the first one, "
                           f"started with: dask worker {self._address}")

    async def _watch(self) -> None:
        """Follow which workers there are, until everything is over or the scheduler is gone."""
        failed, away = 0, 0.0
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
                cores = await self._roster.cores()
            except Exception:  # noqa: BLE001 - whatever Dask makes of a scheduler that does not answer
                failed += 1
                if failed == 3:
                    break
                continue
            failed = 0
            self._roster.look(cores)
        if self._lost is None:
            self._lose(BackendLost(
                f"the scheduler {self._address} is gone: it was ended, or the network is down. Start it again with its "
                "workers, or leave out --on to go on on this machine alone"))

    def _take(self, group: Group) -> None:
        if self._lost is not None:
            group.end_lost(self._lost)
            return
        self._waiting.append(group)
        self._assign()

    def _assign(self) -> None:
        """Give what waits to workers that are free, the freest first."""
        while self._waiting and (worker := max(self._roster.workers.values(), key=lambda w: w.free, default=None)):
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

    async def _evaluate(self, worker: Worker, group: Group) -> None:
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
            group.end_lost(self._lost)
        else:
            group.end_rest("its worker is gone", worker.address)
            self._assign()

    async def _take_answer(self, worker: Worker, group: Group, answer: str | BaseException) -> None:
        if isinstance(answer, BaseException):
            await self._take_nothing(worker, group, answer)
            return
        told = json.loads(answer)
        for place, plain in enumerate(told.get("ends", ())):
            group.end(place, read_end(plain))
        if fault := told.get("fault"):
            if self._roster.workers.get(worker.address) is worker:
                self._roster.dismiss(worker.address)
                self._roster.refuse(worker.address, fault)
            group.end_rest("its worker failed", fault)
        elif "refused" in told and self._roster.workers.get(worker.address) is worker:
            self._roster.dismiss(worker.address)

    async def _take_nothing(self, worker: Worker, group: Group, error: BaseException) -> None:
        """Dask gave no answer. Either the worker has ended, or the scheduler is no use at all."""
        if isinstance(error, asyncio.CancelledError | CancelledError):
            await self._away()
            if self._lost is None:
                group.end_rest("the connection was lost for a moment")
        elif await self._roster.ask(worker.address, remote.beat, self._id, ANSWER) == worker.process:
            self._lose(BackendLost(f"the scheduler {self._address} does not pass the work on to its workers "
                                   f"({fault_words(error)}). Is Haunch installed where the scheduler runs, in the same "
                                   "version as here?"))
        elif self._roster.workers.get(worker.address) is worker:
            self._roster.dismiss(worker.address)

    async def _away(self) -> None:
        """Something went wrong with the connection: wait until it is known whether the scheduler is gone."""
        end = asyncio.get_running_loop().time() + PATIENCE + 2 * LOOK
        while self._lost is None and not self._over.is_set() and asyncio.get_running_loop().time() < end:
            await asyncio.sleep(0.1)

    def _lose(self, error: BackendLost) -> None:
        """The scheduler is gone: everyone who waits is told."""
        self._lost = error
        for group in [*self._waiting, *self._groups.values()]:
            group.end_lost(self._lost)
        self._waiting.clear()

    async def _leave(self) -> None:
        """Have the workers end what they have of ours, and take leave."""
        if self._client is None:
            return
        if self._lost is None:
            await asyncio.gather(*(self._roster.ask(address, remote.stop, self._id, 2.0)
                                   for address in self._roster.workers))
        for task in [*self._tasks]:
            task.cancel()
        with suppress(Exception, asyncio.CancelledError):
            await asyncio.wait_for(self._client.close(), 2.0)


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
