"""What a run may use. Passed along, never global."""

from __future__ import annotations

import os
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Budget:
    """Threads, memory (MiB), seconds for each meshing attempt, and the seed of anything random."""

    threads: int = 2
    memory: int = 4096
    seconds: float = 120.0
    seed: int = 0


def available_threads() -> int:
    """Cores that this process may use: those it is bound to, within the share that its control group allows."""
    bound = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1
    try:
        with open("/sys/fs/cgroup/cpu.max", encoding="ascii") as file:
            quota, period = file.read().split()[:2]
        return max(1, min(bound, -(-int(quota) // int(period))))
    except (OSError, ValueError):  # no control groups, or no limit ("max")
        return max(1, bound)
