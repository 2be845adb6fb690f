"""The driver's side of a cluster: a `Backend` whose groups are tasks of Dask (`studies.vary.cluster.link`)."""

from __future__ import annotations

from collections.abc import Callable, Sequence

from geometry.budget import available_threads
from studies.vary.cluster.address import Address, Tls
from studies.vary.cluster.link import Link
from studies.vary.cluster.parts import Group
from studies.vary.run.backend import Hear
from studies.vary.run.local import LocalBackend
from studies.vary.work import Order


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
        self._tell, self._closed = tell, False
        self._local_workers, self._memory = local_workers or available_threads(), memory
        self._local: LocalBackend | None = None
        self._link = Link(address, tls)
        self._tell_notes()

    @property
    def slots(self) -> int:
        """See `Backend`. Never zero: with no worker there is one group that waits for one."""
        self._tell_notes()
        return max(self._link.threads, 1, 0 if self._local is None else self._local_workers)

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
                self._link.take(Group(part, self._at(places, hear)))

    def close(self) -> None:
        """See `Backend`."""
        self._closed = True
        if self._local is not None:
            self._local.close()
        self._link.close()

    def _at(self, places: Sequence[int], hear: Hear) -> Hear:
        """Hears a part of a submission, until this is closed."""
        return lambda place, end: None if self._closed else hear(places[place], end)

    def _on_this_machine(self) -> LocalBackend:
        if self._local is None:
            self._local = LocalBackend(self._local_workers, self._memory)
        return self._local

    def _tell_notes(self) -> None:
        while not self._link.notes.empty():
            self._tell(self._link.notes.get())
