"""A scheduler and its workers as processes of their own, started by the commands of the documentation."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from collections.abc import Callable, Sequence
from pathlib import Path
from types import TracebackType

from geometry.problem import HaunchError

ROOT = Path(__file__).parents[2]
PLANTED = Path(__file__).parent / "planted"


def until(true: Callable[[], object], seconds: float = 60.0) -> None:
    """Wait until something is so."""
    deadline = time.monotonic() + seconds
    while not true():
        assert time.monotonic() < deadline, "it did not happen"
        time.sleep(0.02)


class Cluster:
    """A scheduler on a port that the system chooses. Leaving it ends everything that it started."""

    def __init__(self, room: Path, *tls: str, preload: str = "") -> None:
        room.mkdir(parents=True, exist_ok=True)
        self.room, self._tls = room, tls
        self._all: list[subprocess.Popen[bytes]] = []
        self.workers: list[subprocess.Popen[bytes]] = []
        (room / "tmp").mkdir(exist_ok=True)
        file = room / "scheduler.json"
        file.unlink(missing_ok=True)
        host = "tls://127.0.0.1" if tls else "127.0.0.1"
        self.scheduler = self._start("scheduler", "--host", host, "--port", "0", "--dashboard-address", "127.0.0.1:0",
                                     "--scheduler-file", str(file), *(["--preload", preload] if preload else []))
        until(lambda: (file.exists() and file.stat().st_size) or self.scheduler.poll() is not None)
        self.address: str = json.loads(file.read_text())["address"]

    def _start(self, what: str, *words: str, **environment: str) -> subprocess.Popen[bytes]:
        path = os.pathsep.join([str(ROOT), str(PLANTED)])
        env = {**os.environ, "PYTHONPATH": path, "TMPDIR": str(self.room / "tmp"), "DASK_CONFIG": str(self.room),
               **environment}
        log = self.room / f"{what}-{len(self._all)}.log"
        with log.open("wb") as said:
            process = subprocess.Popen([sys.executable, "-m", "dask", what, *self._tls, *words], cwd=self.room,
                                       env=env, stdin=subprocess.DEVNULL, stdout=said, stderr=subprocess.STDOUT)
        self._all.append(process)
        return process

    def worker(self, preload: str | Sequence[str] = (), threads: int = 1, nanny: bool = False, **environment: str
               ) -> subprocess.Popen[bytes]:
        """One more worker; `preload` names planted modules."""
        preload = (preload,) if isinstance(preload, str) else preload
        words = [word for name in preload for word in ("--preload", name)]
        worker = self._start("worker", self.address, "--nthreads", str(threads), "--no-dashboard", "--nanny" if nanny
                             else "--no-nanny", "--host", "127.0.0.1", "--local-directory", str(self.room / "dask"),
                             *words, **{"ROOM": str(self.room), "WAIT": "0", **environment})
        self.workers.append(worker)
        return worker

    def __enter__(self) -> Cluster:
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, _: TracebackType | None) -> None:
        for process in self._all:
            if process.poll() is None:
                process.kill()
        for process in self._all:
            process.wait()
        if error is not None:
            for log in sorted(self.room.glob("*.log")):
                print(f"--- {log.name}\n{log.read_text()[-3000:]}")

    def said(self, what: str) -> list[str]:
        """What each ``worker`` or ``scheduler`` has written."""
        return [log.read_text() for log in sorted(self.room.glob(f"{what}-*.log"))]

    def end_scheduler(self) -> None:
        self.scheduler.send_signal(signal.SIGKILL)
        self.scheduler.wait()


def started(room: Path) -> list[tuple[int, int]]:
    """(process of the job, number) of every start."""
    if not (room / "started").exists():
        return []
    return [(int(pid), int(number)) for pid, number in map(str.split, (room / "started").read_text().splitlines())]


def told(do: Callable[[], object]) -> str:
    """The words of the error that it raises, and that it is one for a person, within 15 seconds."""
    began = time.monotonic()
    try:
        do()
    except HaunchError as error:
        assert time.monotonic() - began < 15.0
        return str(error)
    raise AssertionError("no error")
