"""In which order variants are evaluated: those of one shape together, for they share a solid and a mesh."""

from __future__ import annotations

import time
from collections import OrderedDict, deque

from studies.vary.run.attempts import Ticket

MOST_TOGETHER = 8
"""Variants of one shape in one order. More would save little (the eighth of a mesh) and would be lost together when
the driver is killed."""


class Pool:
    """Variants that wait.

    First come those to be tried on a safer mesh (their outcome is soon known, whatever it is), then the new ones, then
    those that were ended from outside: one that always is stops none of the others.
    """

    def __init__(self) -> None:
        self._safer, self._new, self._ended, self._alone = _Queue(), _Queue(), _Queue(), _Queue()
        self._order = (self._safer, self._new, self._ended, self._alone)

    def __len__(self) -> int:
        return sum(queue.count for queue in self._order)

    def put(self, ticket: Ticket) -> None:
        """A new variant, or one for another attempt."""
        if ticket.endings == 0:
            (self._safer if ticket.safer else self._new).put(ticket)
        else:
            (self._alone if ticket.alone else self._ended).put(ticket)

    def take(self, slots: int, reading: bool) -> list[Ticket]:
        """Variants of one shape to be evaluated together; empty when none may be tried yet.

        Towards the end (`reading`: more will come) groups are made smaller, so that all `slots` have work.
        """
        for queue in self._order:
            most = 1 if queue in (self._safer, self._alone) else MOST_TOGETHER
            if not reading:
                most = max(1, min(most, -(-queue.count // (2 * slots))))
            if taken := queue.take(most):
                return taken
        return []

    def next_time(self) -> float | None:
        """When the next of those that have to wait may be tried (``time.monotonic``); None when nothing waits."""
        return min((ticket.not_before for queue in self._order for ticket in queue.waiting()), default=None)


class _Queue:
    """Tickets by shape; shapes in the order in which they came."""

    def __init__(self) -> None:
        self._shapes: OrderedDict[str, deque[Ticket]] = OrderedDict()
        self.count = 0

    def put(self, ticket: Ticket) -> None:
        self._shapes.setdefault(ticket.variant.shape_key, deque()).append(ticket)
        self.count += 1

    def waiting(self) -> list[Ticket]:
        return [ticket for tickets in self._shapes.values() for ticket in tickets]

    def take(self, most: int) -> list[Ticket]:
        now = time.monotonic()
        for shape, tickets in self._shapes.items():
            ready: list[Ticket] = []
            early: list[Ticket] = []
            while tickets and len(ready) < most:
                ticket = tickets.popleft()
                (ready if ticket.not_before <= now else early).append(ticket)
            tickets.extendleft(reversed(early))
            if not tickets:
                del self._shapes[shape]
            if ready:
                self.count -= len(ready)
                return ready
        return []
