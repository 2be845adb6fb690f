"""Whatever evaluates variants for the driver."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Protocol

from geometry.problem import HaunchError
from studies.vary.outcome import Outcome
from studies.vary.work import Ended, Order


class BackendLost(HaunchError):
    """What evaluates is gone for good (a cluster's scheduler, say). The study stops, and goes on later."""


Hear = Callable[[int, "Outcome | Ended | BackendLost | BaseException"], None]
"""Called once for each order of a submission, with its place in it and how it ended; from any thread."""


class Backend(Protocol):
    """Evaluates orders. Decides nothing: an order that was ended from outside is told as `Ended` and not repeated.

    Attributes
    ----------
    slots
        How many submissions it can have at a time and use well. May change while it works.
    writes_here
        It writes run folders into the folders of this machine.
    """

    @property
    def slots(self) -> int: ...

    @property
    def writes_here(self) -> bool: ...

    def submit(self, orders: Sequence[Order], hear: Hear) -> None:
        """Evaluate orders of one shape, without waiting. `hear` is told each end as it comes; a fault that is none of
        an order's own ends the study."""

    def close(self) -> None:
        """End everything at once, work under way included. Nothing is heard afterwards."""
