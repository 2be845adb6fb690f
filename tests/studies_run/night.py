"""Real studies of a small bar through the command line, for the heavy tests: started, killed at random, watched."""

from __future__ import annotations

import os
import random
import signal
import sqlite3
import subprocess
import sys
import time
from collections import Counter
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

ROOT = Path(__file__).parents[2]
SPEC = ROOT / "tests" / "spec" / "cantilever.toml"

PLAN = """
title = "Bars"
part = "bar.toml"
[vary]
depth = {{ from = "36 mm", to = "50 mm", steps = {steps} }}
push = {pushes}
[aim]
least = "mass"
[keep]
runs = {{ best = 0, worst = 0, suspicious = 0 }}
"""


def make_room(room: Path, shapes: int, pushes: int) -> Path:
    """A plan of `shapes` bars, each under `pushes` loads; returns its path."""
    spec = SPEC.read_text().replace('"-300 N"', '"-push"')
    spec = spec.replace('reach = "800 mm"', 'reach = "120 mm"\npush = "300 N"')
    (room / "bar.toml").write_text('accuracy = "20 %"\n' + spec)
    loads = [f"{300 + 10 * k} N" for k in range(pushes)]
    (room / "bars.toml").write_text(PLAN.format(steps=shapes - 1, pushes=str(loads).replace("'", '"')))
    (room / "tmp").mkdir(exist_ok=True)
    return room / "bars.toml"


def start(room: Path, *more: str, workers: int = 2) -> subprocess.Popen[str]:
    """`haunch vary` in a process of its own."""
    environment = {**os.environ, "PYTHONPATH": str(ROOT), "TMPDIR": str(room / "tmp")}
    words = ["vary", "bars.toml", "--workers", str(workers), "--log", "log", *more]
    return subprocess.Popen([sys.executable, "-m", "studies.cli", *words], cwd=room, env=environment, text=True,
                            stdout=subprocess.PIPE, stderr=subprocess.STDOUT, start_new_session=True)


def results(record: Path) -> list[tuple[Any, ...]]:
    """The whole table of a record."""
    with sqlite3.connect(f"file:{record}?mode=ro", uri=True) as db:
        return db.execute("SELECT * FROM results").fetchall()


def finished(record: Path) -> dict[str, str]:
    """Key -> time of recording, of the finished variants."""
    try:
        with sqlite3.connect(f"file:{record}?mode=ro", uri=True) as db:
            return dict(db.execute("SELECT key, recorded FROM variants WHERE status = 'finished'"))
    except sqlite3.OperationalError:  # there is none yet
        return {}


def children(pid: int) -> list[int]:
    """Process ids of the children of all threads of a process."""
    found = []
    for task in Path(f"/proc/{pid}/task").glob("*/children"):
        try:
            found += [int(child) for child in task.read_text().split()]
        except OSError:
            continue
    return found


def name_of(pid: int) -> tuple[int, str] | None:
    """The process id with the time at which it began, so that a later process of that number is not taken for it."""
    try:
        text = Path(f"/proc/{pid}/stat").read_text().rpartition(")")[2].split()
    except OSError:
        return None
    return None if text[0] == "Z" else (pid, text[19])


@dataclass
class Killer:
    """Kills at random jobs, templates and drivers of one study, and starts the driver again.

    Attributes
    ----------
    safe
        Finished variants as they were in the record when a driver was killed: key -> time of recording.
    orphans
        Processes that outlived their driver by more than five seconds.
    """

    room: Path
    seed: int
    killed: Counter[str] = field(default_factory=Counter)
    safe: dict[str, str] = field(default_factory=dict)
    lost: list[str] = field(default_factory=list)
    orphans: list[int] = field(default_factory=list)

    def work(self, kills: int, seconds: float = 3600.0) -> bool:
        """Kill until `kills` in all; returns whether the study was over before (or `seconds` were)."""
        chance, deadline = random.Random(self.seed + self.killed.total()), time.monotonic() + seconds
        driver = start(self.room)
        while self.killed.total() < kills and time.monotonic() < deadline:
            time.sleep(chance.uniform(0.3, 2.5))
            if driver.poll() is not None:
                print(driver.communicate()[0])
                return True
            templates = children(driver.pid)
            jobs = [job for template in templates for job in children(template)]
            kind = chance.choices(["job", "template", "driver"], [0.62, 0.2, 0.18])[0]
            if not jobs:  # the kernels are being loaded
                continue
            if kind == "driver":
                driver = self._kill_driver(driver, [*templates, *jobs])
            else:
                os.kill(chance.choice(jobs if kind == "job" else templates), signal.SIGKILL)
            self.killed[kind] += 1
        driver.send_signal(signal.SIGTERM)
        driver.communicate(timeout=60)
        assert driver.returncode == 130
        return False

    def _kill_driver(self, driver: subprocess.Popen[str], others: list[int]) -> subprocess.Popen[str]:
        names = [name for pid in others if (name := name_of(pid)) is not None]
        driver.kill()
        driver.communicate()
        deadline = time.monotonic() + 5.0
        while (left := [pid for pid, began in names if name_of(pid) == (pid, began)]) and time.monotonic() < deadline:
            time.sleep(0.05)
        self.orphans += left
        self._compare()
        return start(self.room)

    def _compare(self) -> None:
        now = finished(self.room / "bars.study")
        self.lost += [key for key, time in self.safe.items() if now.get(key) != time]
        self.safe = now

    def end(self) -> str:
        """Let the study end undisturbed; returns what it says."""
        driver = start(self.room)
        said = driver.communicate(timeout=1800)[0]
        assert driver.returncode == 0, said
        self._compare()
        return said


def finished_lines(room: Path) -> Counter[str]:
    """Number of the variant -> how often the log says that it was finished."""
    lines = (room / "log").read_text().splitlines()
    return Counter(line.split(" variant ")[1].split()[0] for line in lines
                   if " variant " in line and ("every limit met" in line or " missed, " in line))
