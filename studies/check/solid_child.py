"""The solid, built in a child process that is bounded in time and memory.

The CAD kernel holds the interpreter's lock for seconds and can crash or hang; in a process of its own it can
do neither harm to the run, and the beam model is solved meanwhile. The part goes in and the solid comes back
over pipes between the two processes; nothing is written to a file.
"""

from __future__ import annotations

import contextlib
import ctypes
import os
import pickle
import signal
import subprocess
import sys
import threading
import time
from pathlib import Path

from geometry.budget import Budget
from geometry.endings import ended_from_outside, signal_name, told_from_outside
from geometry.named_solid import NamedSolid
from geometry.part import Part
from geometry.problem import HaunchError, SolidError

ADDRESS_SPACE_MARGIN = 6144
"""MiB of address space above the memory limit: the CAD kernel's libraries map far more than they touch."""


class SolidChild:
    """A solid being built. Use as a context manager: leaving it ends the child in any case."""

    def __init__(self, part: Part, budget: Budget) -> None:
        self._deadline = time.monotonic() + max(budget.seconds, 60.0)
        self._budget = budget
        root = str(Path(__file__).resolve().parents[2])
        path = os.pathsep.join(p for p in (root, os.environ.get("PYTHONPATH", "")) if p)
        self._process = subprocess.Popen(
            [sys.executable, "-P", "-m", "studies.check.solid_child", str(budget.memory + ADDRESS_SPACE_MARGIN)],
            stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=subprocess.DEVNULL,
            env={**os.environ, "PYTHONPATH": path}, start_new_session=True,
        )
        self._answer = b""
        # The pipe must be drained while the caller works, or the child stands still.
        self._talk = threading.Thread(target=self._converse, args=(pickle.dumps(part),), daemon=True)
        self._talk.start()

    def __enter__(self) -> SolidChild:
        return self

    def __exit__(self, *_: object) -> None:
        if self._process.poll() is None:
            with contextlib.suppress(ProcessLookupError):
                os.killpg(self._process.pid, signal.SIGKILL)
        self._process.wait()
        self._talk.join(timeout=10)

    def _converse(self, question: bytes) -> None:
        assert self._process.stdin is not None and self._process.stdout is not None
        with contextlib.suppress(OSError):  # the child is gone: `result` says so
            self._process.stdin.write(len(question).to_bytes(8, "big") + question)
            self._process.stdin.flush()  # left open: its end tells the child that we are gone
            self._answer = self._process.stdout.read()

    def result(self) -> tuple[NamedSolid, float]:
        """Wait for the solid; returns it with the seconds it took.

        Raises `SolidError`: the builder's own, or that the child crashed or met its time limit.
        """
        self._talk.join(timeout=max(self._deadline - time.monotonic(), 0.0))
        if self._talk.is_alive():
            raise SolidError(f"building the solid took longer than {max(self._budget.seconds, 60.0):g} s and was "
                             "stopped; look for a very small radius or a cut that only grazes the part")
        code = self._process.wait()
        if not self._answer:
            if killer := ended_from_outside(code):
                raise SolidError(told_from_outside("the CAD process that builds the solid", killer,
                                                   self._budget.memory) + "; nothing was written")
            how = f"signal {signal_name(code)}" if code < 0 else f"exit code {code}"
            raise SolidError(f"the CAD kernel crashed ({how}) while it built the solid; nothing was written. "
                             "Leave out edge radii and shoulder fillets one by one to find the one at fault, "
                             f"or allow more than {self._budget.memory} MiB of memory")
        kind, content, seconds = pickle.loads(self._answer)  # noqa: S301 - from our own child, over a pipe
        if kind == "solid":
            return content, seconds
        raise SolidError(content)


def _serve(address_space: int) -> int:
    """The child: read a part from standard input, answer with the solid or the reason why not."""
    import resource

    if sys.platform == "linux":  # also while the kernel's libraries are loaded and hold the interpreter's lock
        ctypes.CDLL(None).prctl(1, signal.SIGKILL)  # 1: PR_SET_PDEATHSIG, end with the parent
    resource.setrlimit(resource.RLIMIT_AS, (address_space * 2**20,) * 2)
    resource.setrlimit(resource.RLIMIT_CORE, (0, 0))
    out = os.dup(1)
    os.dup2(2, 1)  # what the kernel prints must not reach the answer
    size = int.from_bytes(_read(8), "big")
    part: Part = pickle.loads(_read(size))  # noqa: S301 - from our own parent, over a pipe
    threading.Thread(target=_end_with_parent, daemon=True).start()
    started = time.perf_counter()
    try:
        from geometry.solid import build_solid

        answer: tuple[str, object, float] = ("solid", build_solid(part), time.perf_counter() - started)
    except HaunchError as error:
        answer = ("error", str(error), 0.0)
    except Exception as error:  # noqa: BLE001 - handed to the parent, which raises it
        answer = ("error", f"the solid builder failed ({type(error).__name__}: {error})", 0.0)
    with os.fdopen(out, "wb") as pipe:
        pipe.write(pickle.dumps(answer))
    return 0


def _read(size: int) -> bytes:
    data = b""
    while len(data) < size:
        piece = os.read(0, size - len(data))
        if not piece:
            os._exit(70)
        data += piece
    return data


def _end_with_parent() -> None:
    while os.read(0, 4096):
        pass
    os._exit(70)


if __name__ == "__main__":
    # No teardown: the kernel's destructors have nothing left to do, and can crash.
    os._exit(_serve(int(sys.argv[1])))
