"""One job in a process of its own, bounded in time and memory; what it found out before it ended is never lost.

The child writes one line of JSON for each fact as soon as it knows it, so that a job that is stopped, or fails at a
late stage, still gives what it had.
"""

from __future__ import annotations

import importlib
import json
import os
import signal
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable, Mapping
from contextlib import suppress
from dataclasses import dataclass
from pathlib import Path
from typing import Any

ROOT = Path(__file__).resolve().parents[3]
HERE = Path(__file__).resolve().parents[1]

TASKS = {
    "mesh": "solver_timing.jobs:mesh",
    "warm": "solver_timing.haunch:warm",
    "haunch": "solver_timing.haunch:run",
    "assemble": "solver_timing.rivals:assemble",
    "lu": "solver_timing.rivals:lu",
    "pardiso": "solver_timing.rivals:pardiso",
    "amg": "solver_timing.rivals:amg",
    "sweep": "solver_timing.throughput:sweep",
}
Tell = Callable[..., None]


@dataclass(frozen=True, slots=True)
class Outcome:
    """What a job told, and ``failure``: empty, or why it did not come to its end."""

    facts: dict[str, Any]
    failure: str
    seconds: float


@dataclass(slots=True)
class Running:
    """A job under way."""

    process: subprocess.Popen[bytes]
    room: tempfile.TemporaryDirectory[str]
    begun: float
    seconds: float
    memory: float

    def wait(self) -> Outcome:
        """Wait for its end, or end it where it passes its bounds."""
        failure = ""
        try:
            while self.process.poll() is None:
                if time.monotonic() - self.begun > self.seconds:
                    failure = f"not within {self.seconds:.0f} s"
                elif _resident(self.process.pid) > self.memory:
                    failure = f"not within {self.memory:.0f} MiB"
                if failure:
                    break
                time.sleep(0.05)
        finally:
            self.end()
        spent = time.monotonic() - self.begun
        room = Path(self.room.name)
        facts: dict[str, Any] = {}
        with suppress(FileNotFoundError):
            for line in (room / "facts.jsonl").read_text(encoding="utf-8").splitlines():
                with suppress(json.JSONDecodeError):  # the last line of a job that was stopped may be torn
                    facts.update(json.loads(line))
        if not failure and self.process.returncode != 0:
            last = (room / "log.txt").read_text(encoding="utf-8", errors="replace").strip().splitlines()[-1:]
            failure = f"failed ({self.process.returncode}): {' '.join(last) or 'no word of why'}"
        with suppress(OSError):
            self.room.cleanup()
        return Outcome(facts, failure, spent)

    def end(self) -> None:
        """End the job and whatever it started."""
        if self.process.poll() is None:
            with suppress(ProcessLookupError):
                os.killpg(self.process.pid, signal.SIGKILL)
        self.process.wait()


def start(task: str, job: Mapping[str, Any], threads: int, seconds: float, memory: float) -> Running:
    """Begin a job of `TASKS` with a number of threads, within `seconds` and `memory` (MiB, resident)."""
    room = tempfile.TemporaryDirectory(prefix="solver-time-")
    folder = Path(room.name)
    (folder / "job.json").write_text(json.dumps({"task": task, "threads": threads, **job}), encoding="utf-8")
    names = ("OMP_NUM_THREADS", "MKL_NUM_THREADS", "OPENBLAS_NUM_THREADS", "NUMBA_NUM_THREADS")
    path = os.pathsep.join([str(ROOT), str(HERE), os.environ.get("PYTHONPATH", "")]).rstrip(os.pathsep)
    env = {**os.environ, **{name: str(threads) for name in names}, "KMP_BLOCKTIME": "0", "PYTHONPATH": path}
    with open(folder / "log.txt", "wb") as log:
        process = subprocess.Popen(
            [sys.executable, "-P", "-m", "solver_timing.child", str(folder)],
            stdin=subprocess.DEVNULL,
            stdout=log,
            stderr=log,
            env=env,
            start_new_session=True,
        )
    return Running(process, room, time.monotonic(), seconds, memory)


def _resident(pid: int) -> float:
    """Resident MiB of a process; 0 where the system does not tell."""
    try:
        with open(f"/proc/{pid}/statm", encoding="ascii") as stat:
            return int(stat.read().split()[1]) * os.sysconf("SC_PAGE_SIZE") / 2**20
    except (OSError, IndexError, ValueError):
        return 0.0


def main(folder: str) -> None:
    room = Path(folder)
    job = json.loads((room / "job.json").read_text(encoding="utf-8"))
    if sys.platform == "linux":  # nothing goes on when the benchmark itself is ended
        import ctypes

        ctypes.CDLL(None).prctl(1, signal.SIGKILL)  # 1: PR_SET_PDEATHSIG
    with open(room / "facts.jsonl", "a", encoding="utf-8") as file:

        def tell(**facts: Any) -> None:
            file.write(json.dumps(facts) + "\n")
            file.flush()

        module, name = TASKS[job["task"]].split(":")
        getattr(importlib.import_module(module), name)(job, tell)


if __name__ == "__main__":
    main(sys.argv[1])
