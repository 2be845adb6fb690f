"""What runs in the template of both models (`geometry.process.template`), and in each copy of it.

A job is lent the host's CAD and mesh templates over its data socket, reads its orders, and answers with the stage it is
at, the processes it has started, and an outcome for each order in turn. When a process that it needs is ended from
outside it says so and ends: nothing is known about the variant then.
"""

from __future__ import annotations

import os
import signal
import socket
import sys
import tempfile
import threading
from collections.abc import Callable, Mapping
from typing import Any

from geometry.process import Job, LentTemplate, TemplateFailure, share_lent
from studies.vary.work import frames
from studies.vary.work.room import is_full

CAD, MESH = "studies.check.solid_child", "mesher._worker"
"""Modules of the other two templates, in the order in which they are lent."""
ADDRESS_SPACE_MARGIN = 2048
"""MiB of address space above what the template has and the memory limit: a second line, behind the host's watch."""


class _Told(LentTemplate):
    """Tells the host of each process, and starts none after one was ended from outside."""

    def __init__(self, module: str, control: socket.socket, client: str, tell: Callable[[Any], None]) -> None:
        super().__init__(module, control, client)
        self._tell = tell

    def submit(self, job: Mapping[str, Any], cancelled: Callable[[], bool] = lambda: False) -> Job:
        if self.ended():  # by no fault of the job: another attempt would give another mesh
            raise TemplateFailure("a process was ended from outside before", -signal.SIGKILL)
        started = super().submit(job, cancelled)
        self._tell({"process": started.pid})
        return started

    def ended(self) -> str:
        """The signal by which one of its processes was ended from outside, ``lost`` where the template has gone."""
        if self.lost:
            return "lost"
        return next((name for job in self.jobs if (name := job.ended_by())), "")


_PLAIN = {
    "title": "plain", "material": "S235",
    "members": {"bar": {"from": ["0 mm", "0 mm", "0 mm"], "to": ["100 mm", "0 mm", "0 mm"],
                        "section": {"shape": "rectangle", "depth": "20 mm", "width": "10 mm"}}},
    "supports": {"wall": {"on": "bar.start", "hold": "all"}},
    "loads": {"tip": {"on": "bar.end", "force": ["0 N", "0 N", "-10 N"]}},
    "cases": {"only": {"tip": 1.0}},
}


def prepare() -> None:
    """Load both models, the judge and the solver's kernels, and solve a tiny part: what is set up at first use is then
    there for every job."""
    import gc

    from fem.solid.factor import pardiso_available
    from fem.solid.kernels.warm import warm_up
    from geometry.spec.read import part_from_data
    from studies.check.run import versions
    from studies.vary.work import evaluate

    assert evaluate is not None
    part_from_data(_PLAIN)
    pardiso_available()
    warm_up(lambda text: None)
    versions()
    gc.collect()
    gc.freeze()  # or each job copies the pages of what it only looks at


def serve(order: dict[str, Any], data: socket.socket) -> int:
    """In the job's process: evaluate the orders that come over the socket."""
    lock = threading.Lock()

    def tell(message: Any) -> None:
        with lock:
            frames.send(data, message)

    _, handles, _, _ = socket.recv_fds(data, 1, 2)
    lent = [_Told(module, socket.socket(fileno=handle), order["client"], tell)
            for module, handle in zip((CAD, MESH), handles, strict=True)]
    for template in lent:
        share_lent(template)
    asked = frames.receive(data)
    _limit(asked["memory"])
    os.environ["TMPDIR"] = tempfile.tempdir = asked["folder"]
    _evaluate(asked["orders"], lent[0], lent[1], tell)
    return 0


def _evaluate(orders: list[dict[str, Any]], cad: _Told, mesh: _Told, tell: Callable[[Any], None]) -> None:
    from fem.solid.kept import KeptSystem
    from studies.check.threads import dense_products_in_one_thread
    from studies.vary.work.evaluate import Workshop, evaluate
    from studies.vary.work.order import Order

    workshop = Workshop(cad, mesh, lambda stage: tell({"stage": stage}), kept=KeptSystem() if orders[1:] else None)
    with dense_products_in_one_thread():
        for plain in orders:
            outcome = evaluate(Order.from_json(plain), workshop)
            for template in (cad, mesh):
                if ended := template.ended():
                    tell({"ended": ended, "module": template.module})
                    return
            if outcome.status == "failed" and outcome.stage != "write" and _no_space(outcome.reason):
                tell({"ended": "disk full", "module": ""})
                return
            tell({"outcome": outcome.to_json()})


def _no_space(reason: str) -> bool:
    """Whether the disk of the temporary files was full: no fault of the variant."""
    return "No space left" in reason or "quota exceeded" in reason or is_full(tempfile.gettempdir())


def _limit(memory: int) -> None:
    import resource

    resource.setrlimit(resource.RLIMIT_CORE, (0, 0))
    if sys.platform != "linux":
        return
    with open("/proc/self/statm", encoding="ascii") as statm:
        used = int(statm.read().split()[0]) * os.sysconf("SC_PAGE_SIZE")
    size = used + (memory + ADDRESS_SPACE_MARGIN) * 2**20
    resource.setrlimit(resource.RLIMIT_AS, (size, size))

