"""A group of orders on its way, and a worker's process that takes part."""

from __future__ import annotations

import asyncio
import uuid
from collections.abc import Sequence
from dataclasses import dataclass, field

from studies.vary.outcome import Outcome
from studies.vary.run.backend import BackendLost, Hear
from studies.vary.work import Ended, Order


@dataclass(eq=False)
class Group:
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

    def end_lost(self, error: BackendLost) -> None:
        """The scheduler is gone."""
        for place in sorted(self.open):
            self.end(place, error)

    def end_rest(self, signal: str, what: str = "") -> None:
        """Nothing is known about the others, and they are to be run again."""
        for place in sorted(self.open):
            self.end(place, Ended(self.orders[place].variant.key, signal, what))


@dataclass(eq=False)
class Worker:
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
