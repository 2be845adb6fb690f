"""One meshing job in a child process of its own, bounded in time and memory.

The mesh kernel is a process-wide singleton that can crash, hang or eat the memory. Each job therefore has a
process of its own, a copy of a template that has loaded the kernel and never used it (`geometry.process`), so that
nothing of an earlier job, not even the state of a random generator, reaches the next one. The job goes in as JSON and
raw bytes, arrays come back as `.npz` without pickle, all in a temporary folder.
"""

from __future__ import annotations

import json
import tempfile
import threading
import time
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from geometry.endings import ended_from_outside, signal_name, told_from_outside
from geometry.process import Job, LentTemplate, Template, TemplateFailure, shared_template

Ending = Literal["refused", "time", "memory", "crash", "killed", "stopped"]

_ADDRESS_SPACE_MARGIN = 1024
"""MiB of address space allowed above the memory limit: libraries map far more than they touch."""


class ChildFailure(Exception):
    """The child gave no result.

    ``ending``: ``refused`` (the kernel or a check raised an exception), ``time``, ``memory``, ``crash``,
    ``killed`` (by a signal from outside) or ``stopped``.
    ``kind`` is the name of the child's exception, ``facts`` what it told about it, ``log`` the kernel's output.
    """

    def __init__(
        self, ending: Ending, message: str, log: str, kind: str = "", facts: Mapping[str, Any] | None = None
    ) -> None:
        super().__init__(message)
        self.ending: Ending = ending
        self.log = log
        self.kind = kind
        self.facts = dict(facts or {})


@dataclass(frozen=True, slots=True)
class ChildResult:
    """Answer (JSON), arrays, the kernel's output, and the seconds and peak MiB it took."""

    answer: dict[str, Any]
    arrays: dict[str, NDArray[Any]]
    log: str
    seconds: float
    peak_memory: float


def mesh_template() -> Template | LentTemplate:
    """The process that has the mesh kernel loaded; `Template.start` begins to load it without waiting."""
    return shared_template("mesher._worker")


def run_child(
    job: Mapping[str, Any],
    seconds: float,
    memory: float,
    files: Mapping[str, bytes] | None = None,
    stop: threading.Event | None = None,
    template: Template | LentTemplate | None = None,
) -> ChildResult:
    """Run one job of `mesher._worker` and wait for it.

    Parameters
    ----------
    job
        JSON-like; ``job["task"]`` names the task (see `mesher._worker`).
    seconds
        Wall-clock limit, from the start of the job's process (loading the kernel comes before, once). When it is
        over, the child and whatever it started are killed.
    memory
        Limit of the child's resident memory, MiB.
    files
        Further files for the child's folder, by name.
    stop
        Set from another thread, it ends the child at once.
    template
        Where the kernel is loaded; this process's own if left out.

    Raises
    ------
    ChildFailure
        No result: exception in the child, time limit, memory limit, a crash, or `stop`.
    """
    with tempfile.TemporaryDirectory(prefix="haunch-mesh-") as folder:
        room = Path(folder)
        for name, content in (files or {}).items():
            (room / name).write_bytes(content)
        limits = {"address_space": int(memory) + _ADDRESS_SPACE_MARGIN}
        (room / "job.json").write_text(json.dumps({**job, "limits": limits}), encoding="utf-8")
        try:
            cancelled = stop.is_set if stop is not None else lambda: False
            process = (template or mesh_template()).submit({"folder": folder}, cancelled)
        except TemplateFailure as failure:
            if cancelled():
                raise ChildFailure("stopped", "stopped on request", "") from None
            raise _not_started(failure, memory) from failure
        started = time.monotonic()
        with process:
            code, ending, peak = _watch(process, started + seconds, memory, stop)
        return _collect(room, code, ending, time.monotonic() - started, peak, seconds, memory)


def _watch(
    process: Job, deadline: float, memory: float, stop: threading.Event | None
) -> tuple[int, Ending | None, float]:
    """Wait for the end; returns the exit status, why the child must be killed (None: it ended by itself) and the peak
    MiB seen."""
    peak = 0.0
    while True:
        if (code := process.wait(0.02)) is not None:
            return code, None, peak
        if stop is not None and stop.is_set():
            return 0, "stopped", peak
        resident = _resident(process)
        peak = max(peak, resident)
        if resident > memory:
            return 0, "memory", peak
        if time.monotonic() > deadline:
            return 0, "time", peak


def _resident(process: Job) -> float:
    """Resident memory of a process, MiB; 0 where the system does not tell (the address limit still holds)."""
    return process.resident()


def _not_started(failure: TemplateFailure, memory: float) -> ChildFailure:
    if killer := ended_from_outside(failure.code or 0):
        return ChildFailure("killed", told_from_outside("the mesh process", killer, memory), "")
    return ChildFailure("crash", f"the mesh process could not be started ({failure}; exit code {failure.code})", "")


def _collect(
    room: Path, code: int, ending: Ending | None, spent: float, peak: float, seconds: float, memory: float
) -> ChildResult:
    log_file = room / "log.txt"
    log = log_file.read_text(encoding="utf-8", errors="replace") if log_file.exists() else ""
    if ending == "time":
        raise ChildFailure("time", f"stopped at its time limit of {seconds:.4g} s", log)
    if ending == "memory":
        raise ChildFailure("memory", f"stopped at its memory limit of {memory:.4g} MiB ({peak:.4g} MiB in use)", log)
    if ending == "stopped":
        raise ChildFailure("stopped", "stopped on request", log)
    answer_file = room / "answer.json"
    if code != 0 or not answer_file.exists():
        if killer := ended_from_outside(code):
            raise ChildFailure("killed", told_from_outside("the mesh process", killer, memory), log)
        how = f"signal {signal_name(code)}" if code < 0 else f"exit code {code}"
        raise ChildFailure("crash", f"the mesh process crashed ({how})", log)
    answer = json.loads(answer_file.read_text(encoding="utf-8"))
    if "error" in answer:
        error = answer["error"]
        out_of_memory = error["kind"] == "MemoryError" or "bad_alloc" in error["message"]
        raise ChildFailure(
            "memory" if out_of_memory else "refused", error["message"], log, error["kind"], error["facts"]
        )
    with np.load(room / "arrays.npz", allow_pickle=False) as stored:
        arrays = {name: stored[name] for name in stored.files}
    return ChildResult(answer, arrays, log, spent, max(peak, answer.get("peak_memory", 0.0)))
