"""How a child process ended: by a fault of its own, or ended from outside."""

from __future__ import annotations

import signal

_FROM_OUTSIDE = ("SIGKILL", "SIGTERM", "SIGINT", "SIGHUP", "SIGQUIT", "SIGXCPU")


def ended_from_outside(code: int) -> str:
    """Name of the signal by which a process (return code -signal) was ended from outside; empty for its own faults.

    The system ends processes by SIGKILL when memory runs out, by SIGXCPU when a limit of time is over.
    """
    name = signal_name(code)
    return name if name in _FROM_OUTSIDE else ""


def signal_name(code: int) -> str:
    """Name of the signal in a return code of -signal; empty when it ended by itself."""
    if code >= 0:
        return ""
    try:
        return signal.Signals(-code).name
    except ValueError:  # real-time signals have no name
        return f"signal {-code}"


def told_from_outside(what: str, name: str, memory: float) -> str:
    """The message for a process that was ended from outside by the signal `name` with `memory` MiB allowed."""
    return (
        f"{what} was ended from outside ({name}): by hand, by a limit of memory or time, or by the system short of"
        f" memory. Nothing is known to be wrong with the part: run again, and if it is ended again, free memory or"
        f" raise --memory (now {memory:.4g} MiB)"
    )
