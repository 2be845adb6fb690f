"""The solid, built in a child process that is bounded in time and memory.

The CAD kernel holds the interpreter's lock for seconds and can crash or hang; in a process of its own it can
do neither harm to the run, and the beam model is solved meanwhile. The process is a copy of a template that has the
kernel loaded (`geometry.process`). The part goes in and the solid comes back over a socket between the two processes;
nothing is written to a file.
"""

from __future__ import annotations

import contextlib
import os
import pickle
import socket
import threading
import time
from collections.abc import Sequence
from typing import Any

from geometry.budget import Budget
from geometry.endings import ended_from_outside, signal_name, told_from_outside
from geometry.named_solid import NamedSolid
from geometry.part import Part
from geometry.problem import HaunchError, SolidError
from geometry.process import Job, LentTemplate, Template, TemplateFailure, shared_template

ADDRESS_SPACE_MARGIN = 6144
"""MiB of address space above the memory limit: the CAD kernel's libraries map far more than they touch."""
LEAST_SECONDS = 60.0


def cad_template() -> Template | LentTemplate:
    """The process that has the CAD kernel loaded; `Template.start` begins to load it without waiting."""
    return shared_template("studies.check.solid_child")


class SolidChild:
    """A solid being built. Use as a context manager: leaving it ends the child in any case."""

    def __init__(self, part: Part, budget: Budget, template: Template | LentTemplate | None = None) -> None:
        self._budget = budget
        self._seconds = max(budget.seconds, LEAST_SECONDS)
        self._template = template or cad_template()
        self._template.start()
        self._answers: list[bytes] = []
        self._fault: TemplateFailure | None = None
        self._code: int | None = None
        self._deadline: float | None = None
        self._over, self._meshable = threading.Event(), threading.Event()
        self._left = threading.Event()
        # In a thread: the kernel may still be loading, and the socket must be drained while the caller works.
        self._talk = threading.Thread(target=self._converse, args=(pickle.dumps(part),), name="solid", daemon=True)
        self._talk.start()

    def __enter__(self) -> SolidChild:
        return self

    def __exit__(self, *_: object) -> None:
        self._left.set()
        self._talk.join(timeout=10)

    def _converse(self, question: bytes) -> None:
        try:
            job = self._template.submit({"address_space": self._budget.memory + ADDRESS_SPACE_MARGIN},
                                        self._left.is_set)
        except TemplateFailure as fault:
            self._fault = fault
            self._end()
            return
        with job:
            self._deadline = time.monotonic() + self._seconds
            talk = threading.Thread(target=self._exchange, args=(job, question), daemon=True)
            talk.start()
            while (code := job.wait(0.05)) is None and time.monotonic() < self._deadline and not self._left.is_set():
                pass
            self._code = code
            if code is not None:
                talk.join(timeout=60.0)  # what it sent before it ended
        self._end()

    def _end(self) -> None:
        self._over.set()
        self._meshable.set()

    def _exchange(self, job: Job, question: bytes) -> None:
        with contextlib.suppress(OSError):  # the child is gone: `result` says so
            job.data.sendall(len(question).to_bytes(8, "big") + question)
            held = bytearray()
            while piece := job.data.recv(1 << 20):
                held += piece
                while len(held) >= 8 and len(held) >= (end := 8 + int.from_bytes(held[:8], "big")):
                    self._answers.append(bytes(held[8:end]))
                    del held[:end]
                    self._meshable.set()

    def meshable(self) -> tuple[NamedSolid, float]:
        """Wait for the solid as `build_solid` gives it early: ready to be meshed, and not yet whole. As `result`."""
        self._meshable.wait()
        kind, solid, seconds = _read_answer(self._answers[:1])
        return (solid, seconds) if kind == "early" else self.result()

    def result(self) -> tuple[NamedSolid, float]:
        """Wait for the solid; returns it with the seconds it took.

        Raises `SolidError`: the builder's own, or that the child crashed or met its time limit.
        """
        self._over.wait()
        code = self._fault.code if self._fault is not None else self._code
        if code is None:
            raise SolidError(f"building the solid took longer than {self._seconds:g} s and was "
                             "stopped; look for a very small radius or a cut that only grazes the part")
        kind, content, seconds = _read_answer(self._answers[-1:])
        if kind not in ("solid", "error"):
            if killer := ended_from_outside(code):
                raise SolidError(told_from_outside("the CAD process that builds the solid", killer,
                                                   self._budget.memory) + "; nothing was written")
            how = f"signal {signal_name(code)}" if code < 0 else f"exit code {code}"
            raise SolidError(f"the CAD kernel crashed ({how}) while it built the solid; nothing was written. "
                             "Leave out edge radii and shoulder fillets one by one to find the one at fault, "
                             f"or allow more than {self._budget.memory} MiB of memory")
        if kind == "solid":
            return content, seconds
        raise SolidError(content)


def _read_answer(answers: Sequence[bytes]) -> tuple[str, Any, float]:
    return pickle.loads(answers[0]) if answers else ("", None, 0.0)  # noqa: S301 - from our own child, over a socket


def prepare() -> None:
    """In the template: load what every job needs, and build one plain solid, always the same: what the kernel sets up
    at its first use (tables of STEP and more, a fifth of the time of a job) is then there."""
    from geometry.part import Cut, Material, Member, Section, Station
    from geometry.solid import build_solid

    dims = {"depth": 40.0, "width": 30.0, "web": 4.0, "flange": 5.0, "root_radius": 4.0}
    hole = Cut("h", "h", "hole", "y", "web", 50.0, 0.0, 8.0, 8.0)
    member = Member("m", (0.0, 0.0, 0.0), (100.0, 0.0, 0.0), (0.0, 0.0, 1.0), 0.0, Section("I", dims),
                    stations=(Station(100.0, {"depth": 30.0}),), cuts=(hole,))
    build_solid(Part("", Material("", 1.0, 0.3, 1.0, 0.0, 1.0, 1.0, "", ""), (member,), (), (), ()))


def serve(order: dict[str, int], data: socket.socket) -> int:
    """In the job's process: read a part from the socket, answer with the solid or the reason why not."""
    import resource

    resource.setrlimit(resource.RLIMIT_AS, (order["address_space"] * 2**20,) * 2)
    resource.setrlimit(resource.RLIMIT_CORE, (0, 0))
    size = int.from_bytes(_read(data, 8), "big")
    part: Part = pickle.loads(_read(data, size))  # noqa: S301 - from our own parent, over a socket
    started = time.perf_counter()
    try:
        from geometry.solid import build_solid

        whole = build_solid(part, lambda solid: _send(data, ("early", solid, time.perf_counter() - started)))
        answer: tuple[str, object, float] = ("solid", whole, time.perf_counter() - started)
    except HaunchError as error:
        answer = ("error", str(error), 0.0)
    except Exception as error:  # noqa: BLE001 - handed to the parent, which raises it
        answer = ("error", f"the solid builder failed ({type(error).__name__}: {error})", 0.0)
    _send(data, answer)
    return 0


def _send(data: socket.socket, answer: tuple[str, object, float]) -> None:
    content = pickle.dumps(answer)
    data.sendall(len(content).to_bytes(8, "big") + content)


def _read(data: socket.socket, size: int) -> bytes:
    held = bytearray()
    while len(held) < size:
        piece = data.recv(size - len(held))
        if not piece:
            os._exit(70)
        held += piece
    return bytes(held)
