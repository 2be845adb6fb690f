"""The child process: ``python -m mesher._worker FOLDER`` does the job in that folder and ends.

Reads ``job.json``; writes ``arrays.npz``, then ``answer.json`` (last, so that its presence means success), and
``log.txt`` with everything the kernel printed.
"""

from __future__ import annotations

import ctypes
import json
import os
import signal
import sys
import threading
from pathlib import Path
from typing import Any


def _die_with_parent() -> None:
    """End at once when the parent is gone: it holds the other end of standard input."""

    def wait_for_end() -> None:
        while os.read(0, 4096):
            pass
        os._exit(70)

    threading.Thread(target=wait_for_end, daemon=True).start()
    if sys.platform == "linux":  # the kernel's own way also works while a library holds the interpreter lock
        ctypes.CDLL(None).prctl(1, signal.SIGKILL)  # 1: PR_SET_PDEATHSIG


def _limit_memory(address_space: int) -> None:
    import resource

    size = address_space * 2**20
    resource.setrlimit(resource.RLIMIT_AS, (size, size))
    resource.setrlimit(resource.RLIMIT_CORE, (0, 0))


def _redirect_output(path: Path) -> None:
    # By descriptor, not by sys.stdout: the kernels print from C.
    target = os.open(path, os.O_WRONLY | os.O_CREAT | os.O_APPEND)
    os.dup2(target, 1)
    os.dup2(target, 2)
    os.close(target)


def _do(job: dict[str, Any], room: Path) -> tuple[dict[str, Any], dict[str, Any]]:
    task = job["task"]
    if task == "outlines":
        from mesher.gmsh_outlines import mesh_all

        return mesh_all(job)
    if task == "solid":
        from mesher.gmsh_solid import mesh_brep

        return mesh_brep(job, room / "solid.brep")
    from mesher._faults import provoke

    return provoke(job)


def main(folder: str) -> int:
    room = Path(folder)
    _die_with_parent()
    job = json.loads((room / "job.json").read_text(encoding="utf-8"))
    _limit_memory(job["limits"]["address_space"])
    _redirect_output(room / "log.txt")
    import numpy as np

    try:
        answer, arrays = _do(job, room)
        np.savez(room / "arrays.npz", **arrays)
    except Exception as error:  # noqa: BLE001 - handed to the parent, which raises it again with the attempt's name
        facts = getattr(error, "facts", {})
        answer = {"error": {"kind": type(error).__name__, "message": str(error), "facts": facts}}
    part = room / "answer.part"
    part.write_text(json.dumps(answer), encoding="utf-8")
    part.rename(room / "answer.json")
    return 0


if __name__ == "__main__":
    code = main(sys.argv[1])
    sys.stdout.flush()
    os._exit(code)  # no teardown: the kernels' destructors have nothing left to do, and can crash
