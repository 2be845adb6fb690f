"""What a run may use. Passed along, never global."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Budget:
    """Threads, memory (MiB), seconds for each meshing attempt, and the seed of anything random."""

    threads: int = 2
    memory: int = 4096
    seconds: float = 120.0
    seed: int = 0
