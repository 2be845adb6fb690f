"""Which workers there are: met when they come, asked what they are, accepted or refused, missed when they are gone."""

from __future__ import annotations

import asyncio
import json
import queue
from collections.abc import Callable, Coroutine
from typing import Any

from studies.vary.cluster import worker as remote
from studies.vary.cluster.parts import Worker

BEAT = 5.0
"""Seconds between two words to every worker that the driver is there still."""

ANSWER, REPORT = 5.0, 120.0
"""Seconds that scheduler and workers may take to answer, and a worker to load Haunch."""

Start = Callable[[Coroutine[Any, Any, None]], None]


class Roster:
    """The workers of one driver's study. Everything runs in the thread of the event loop.

    Parameters
    ----------
    driver
        Name of this driver.
    start, assign
        Start a task of the event loop; give work to those that are free.

    Attributes
    ----------
    client
        Of Dask, once it is connected.
    workers, refused
        By address: the ones that take part; why others do not.
    notes
        What is to be told.
    threads
        Variants that the workers can have at a time.
    """

    def __init__(self, driver: str, start: Start, assign: Callable[[], None], notes: queue.SimpleQueue[str]) -> None:
        self.client: Any = None
        self._id, self._start, self._assign, self.notes = driver, start, assign, notes
        self.workers: dict[str, Worker] = {}
        self.refused: dict[str, str] = {}
        self.threads = 0
        self._looking_at: set[str] = set()
        self._beaten = 0.0

    async def cores(self) -> dict[str, int]:
        found: dict[str, int] = await asyncio.wait_for(self.client.nthreads(), ANSWER)
        return found

    async def meet_all(self) -> None:
        """Meet the workers that are there, all at once."""
        cores = await self.cores()
        await asyncio.gather(*(self._meet(address, threads) for address, threads in cores.items()))

    def look(self, cores: dict[str, int]) -> None:
        """Go by what the scheduler has now: address -> threads."""
        self._compare(cores)
        now = asyncio.get_running_loop().time()
        if now - self._beaten > BEAT:
            self._beaten = now
            self._start(self._beat())

    def _compare(self, cores: dict[str, int]) -> None:
        """Workers that have come, and that have gone."""
        for address in [*self.workers]:
            if address not in cores:
                self.dismiss(address)
        for address in [*self.refused]:
            if address not in cores:
                del self.refused[address]
        for address, threads in cores.items():
            if address not in self.workers and address not in self.refused and address not in self._looking_at:
                self._start(self._meet(address, threads))

    async def _meet(self, address: str, threads: int) -> None:
        """Ask a worker what it is, and accept or refuse it."""
        self._looking_at.add(address)
        try:
            # Imported here: it loads the models.
            mine = await asyncio.to_thread(remote.versions)
            asked = json.dumps({"driver": self._id, "versions": mine, "threads": threads})
            answer = await self.ask(address, remote.report, asked, REPORT)
            if isinstance(answer, BaseException):
                if address in await self.cores():
                    self.refuse(address, f"it cannot load Haunch ({fault_words(answer)}). Install on "
                                          f"every machine what is installed here: Haunch {mine['haunch']}")
                return
            told = json.loads(answer)
            if differing := _differing(told["versions"], mine):
                self.refuse(address, f"its numbers would not be comparable: {differing}. Install the same versions "
                                      "on every machine")
            elif told["fault"]:
                self.refuse(address, told["fault"])
            else:
                self.workers[address] = Worker(address, told["process"], told["machine"], threads)
                self._count()
                self.notes.put(f"worker {address} on {told['machine']} takes part, with "
                                f"{threads} variant{'s' if threads != 1 else ''} at a time")
        finally:
            self._looking_at.discard(address)
        self._assign()

    async def ask(self, address: str, function: Callable[[str], str], text: str, seconds: float) -> Any:
        """Call a function in a worker's process, beside its tasks; what it gives, or the exception."""
        try:
            answers = await asyncio.wait_for(self.client.run(function, text, workers=[address], on_error="return"),
                                             seconds)
            return answers.get(address, ConnectionError("it did not answer"))
        except Exception as error:  # noqa: BLE001 - whatever Dask makes of a worker that does not answer
            return error

    def refuse(self, address: str, why: str) -> None:
        self.refused[address] = f"worker {address} is refused: {why}"
        self.notes.put(self.refused[address])

    def dismiss(self, address: str) -> None:
        """A worker has gone: what it had is to be run again."""
        worker = self.workers.pop(address)
        worker.gone.set()
        self._count()
        left = "" if self.workers else "; there is no other: the study waits for one"
        self.notes.put(f"worker {address} on {worker.machine} is gone{left}")

    def _count(self) -> None:
        self.threads = sum(worker.threads for worker in self.workers.values())

    async def _beat(self) -> None:
        """Tell every worker that the driver is there; one whose process is another one now is a new worker."""
        async def one(worker: Worker) -> None:
            answer = await self.ask(worker.address, remote.beat, self._id, ANSWER)
            if isinstance(answer, str) and answer != worker.process and self.workers.get(worker.address) is worker:
                self.dismiss(worker.address)

        await asyncio.gather(*(one(worker) for worker in [*self.workers.values()]))


def fault_words(error: BaseException) -> str:
    """Dask turns exceptions that cannot cross into an `Exception` of their text."""
    return str(error) if type(error) is Exception else f"{type(error).__name__}: {error}"


def _differing(theirs: dict[str, str], mine: dict[str, str]) -> str:
    """``gmsh 4.14.0 there, 4.15.0 here``, for everything that differs."""
    words = {"results": "the version of Haunch's results", "haunch": "Haunch"}
    return ", ".join(f"{words.get(name, name)} {theirs.get(name, 'unknown')} there, {mine.get(name, 'unknown')} here"
                     for name in {**mine, **theirs} if theirs.get(name) != mine.get(name))
