"""A study of small processes: a `Backend` whose variants take milliseconds and fail as told, for tests of the driver.

Each order is a real child process. What it does is told by its room, a folder: `faults.json` says which numbers fail
and how; `started` gets a line for each start (driver, key, number, safer).
"""

from __future__ import annotations

import contextlib
import json
import os
import queue
import signal
import subprocess
import sys
import tempfile
import threading
import time
import traceback
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import Any

from geometry.problem import HaunchError
from studies.vary.outcome import Held, Kept, Outcome
from studies.vary.plan import Plan, plan_from_data
from studies.vary.run import Backend, BackendLost, vary
from studies.vary.run.backend import Hear
from studies.vary.work import Ended, Order

SPEC = Path(__file__).parents[1] / "spec" / "cantilever.toml"

CHILD = """
echo "$PPID $KEY $NUMBER $SAFER" >> "$ROOM/started"
[ "$WAIT" = 0.0 ] || sleep "$WAIT"
case "$FAULT$SAFER" in
    "always killed"*) kill -9 $$ ;;
    killed*) mark="$ROOM/killed-$NUMBER"; had=$(cat "$mark" 2>/dev/null || :); often=${FAULT#killed }
             if [ ${#had} -lt "$often" ]; then printf x >> "$mark"; kill -9 $$; fi ;;
    crashes*) kill -11 $$ ;;
    spec*) exit 2 ;;
    fails0|fails1|"fails once0") exit 1 ;;
esac
[ -z "$FOLDER" ] || { mkdir -p "$FOLDER"; echo kept > "$FOLDER/summary.md"; }
"""


class SmallBackend:
    """Up to `slots` groups at a time, each order in a process of its own."""

    writes_here = True

    def __init__(self, room: Path, slots: int = 2, seconds: float = 0.0) -> None:
        self.slots, self._room, self._seconds = slots, room, seconds
        self._waiting: queue.SimpleQueue[tuple[Sequence[Order], Hear] | None] = queue.SimpleQueue()
        self.closed = False
        self.groups: list[list[int]] = []
        self._children: set[subprocess.Popen[bytes]] = set()
        for _ in range(slots):
            threading.Thread(target=self._work, daemon=True).start()

    def submit(self, orders: Sequence[Order], hear: Hear) -> None:
        self.groups.append([order.variant.number for order in orders])
        self._waiting.put((orders, hear))

    def _work(self) -> None:
        while (item := self._waiting.get()) is not None:
            orders, hear = item
            for place, order in enumerate(orders):
                try:
                    end: Any = self._evaluate(order)
                except Exception as error:  # noqa: BLE001 - the driver raises it
                    end = error
                if self.closed:
                    return
                hear(place, end)

    def _evaluate(self, order: Order) -> Outcome | Ended | BackendLost:
        variant = order.variant
        file = self._room / "faults.json"
        faults: dict[str, str] = json.loads(file.read_text()) if file.exists() else {}
        fault = faults.get(str(variant.number), "")
        if fault == "scheduler gone":
            return BackendLost("the scheduler is gone")
        told = {"ROOM": str(self._room), "NUMBER": str(variant.number), "KEY": variant.key, "FAULT": fault,
                "SAFER": str(int(order.safer)), "WAIT": str(self._seconds), "FOLDER": order.run_folder or ""}
        child = subprocess.Popen(["/bin/sh", "-c", CHILD], env={"PATH": os.environ["PATH"], **told})
        self._children.add(child)
        code = child.wait()
        self._children.discard(child)
        if code == -signal.SIGKILL:
            return Ended(variant.key, "SIGKILL")
        if code < 0:
            return Outcome(variant.key, "failed", stage="mesh", reason=f"crashed ({code})")
        if code:
            stage = "spec" if code == 2 else "mesh"
            return Outcome(variant.key, "failed", stage=stage, reason="no attempt gave a mesh")
        depth, width = variant.numbers["depth"], variant.numbers["width"]
        return _outcome(variant.key, depth * width * 1e-6, 4e6 / (width * depth**3))

    def close(self) -> None:
        self.closed = True
        for _ in range(self.slots):
            self._waiting.put(None)
        for child in list(self._children):
            child.kill()


def _outcome(key: str, mass: float, deflection: float) -> Outcome:
    """Limit 3 mm of deflection; suspicious where it is below 1.9 mm."""
    margin = 1.0 - deflection / 3.0
    odd = deflection < 1.9
    return Outcome(
        key, "finished", judgement="suspicious" if odd else "agrees", fine=margin >= 0 and not odd,
        figures={"mass": Kept(mass, mass, "t", "agrees"), "deflection": Kept(deflection, deflection, "mm", "agrees")},
        limits=(Held("deflection", "deflection", 3.0, deflection, "mm", "met" if margin >= 0 else "missed", margin),),
        suspicions=(f"displacement z at bar.end in case tip_force: solid {deflection}, beam 0 mm",) if odd else (),
        seconds={"wall": 0.01})


def make_plan(room: Path, vary: Mapping[str, Any] | None = None, **more: Any) -> Plan:
    """A plan of the rectangular cantilever; 12 points and no kept runs unless told otherwise."""
    if not (room / "bar.toml").exists():
        (room / "bar.toml").write_text(SPEC.read_text())
    data = {"title": "Bars", "part": "bar.toml", "aim": {"least": "mass"},
            "keep": {"runs": dict.fromkeys(("best", "worst", "suspicious"), 0)},
            "vary": vary or {"depth": {"from": "36 mm", "to": "46 mm", "steps": 5}, "width": ["18 mm", "22 mm"]},
            **more}
    return plan_from_data(data, room, "bars.toml")


def faults(room: Path, **of: str) -> None:
    """Plant faults: ``n3="fails"``."""
    (room / "faults.json").write_text(json.dumps({name[1:]: fault for name, fault in of.items()}))


def started(room: Path) -> list[tuple[int, str, int, bool]]:
    """(process of the driver, key, number, safer) of every start."""
    if not (room / "started").exists():
        return []
    rows = [line.split() for line in (room / "started").read_text().splitlines()]
    return [(int(driver), key, int(number), safer == "1") for driver, key, number, safer in rows]


class Driver:
    """A driver in a process of its own, a copy of this one; like `subprocess.Popen`."""

    def __init__(self, room: Path, seconds: float = 0.05, steps: int = 9, prepare: Callable[[], object] | None = None,
                 work: Callable[[], tuple[str, int]] | None = None) -> None:
        handle, self._said = tempfile.mkstemp(dir=room)
        self.returncode: int | None = None
        self.pid = os.fork()
        if self.pid == 0:
            code = 70
            try:
                if prepare is not None:
                    prepare()
                os.dup2(handle, 1)
                os.dup2(handle, 2)
                sys.stdout, sys.stderr = (open(k, "w", closefd=False) for k in (1, 2))  # noqa: SIM115
                text, code = drive(room, seconds, steps) if work is None else work()
                print(text, end="", flush=True)
            except BaseException:  # noqa: BLE001 - nothing may return into the test
                os.write(2, traceback.format_exc().encode())
            finally:
                with contextlib.suppress(OSError):
                    sys.stderr.flush()
                os._exit(code)
        os.close(handle)

    def poll(self) -> int | None:
        if self.returncode is None:
            pid, status = os.waitpid(self.pid, os.WNOHANG)
            if pid:
                self.returncode = os.waitstatus_to_exitcode(status)
        return self.returncode

    def kill(self, number: int = signal.SIGKILL) -> None:
        if self.poll() is None:
            os.kill(self.pid, number)

    def said(self, timeout: float = 60.0) -> str:
        """What it printed, after its end."""
        deadline = time.monotonic() + timeout
        while self.poll() is None:
            assert time.monotonic() < deadline, "the driver does not end"
            time.sleep(0.01)
        return Path(self._said).read_text()


def drive(room: Path, seconds: float, steps: int) -> tuple[str, int]:
    """A study of 2 x (`steps` + 1) bars, each for so many `seconds`; what to print, and the exit status."""
    plan = make_plan(room, {"depth": {"from": "36 mm", "to": "46 mm", "steps": steps}, "width": ["18 mm", "22 mm"]})
    try:
        summary = vary(plan, room / "bars.study", backend=lambda: SmallBackend(room, 2, seconds), log=room / "log")
    except HaunchError as error:
        return str(error), 3
    return f"{summary.done} of {summary.points} {summary.interrupted}", 130 if summary.interrupted else 0


def check_is_backend(backend: SmallBackend) -> Backend:
    """For mypy: it is one."""
    return backend

