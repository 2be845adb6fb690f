"""The child process: a copy of the template of `geometry.process` that does one job, in a folder, and ends.

Reads ``job.json``; writes ``arrays.npz``, then ``answer.json`` (last, so that its presence means success), and
``log.txt`` with everything the kernel printed.
"""

from __future__ import annotations

import json
import os
import socket
from pathlib import Path
from typing import Any


def prepare() -> None:
    """Load what every job needs. gmsh is loaded, not initialised: a job begins with an untouched kernel."""
    import numpy.lib.npyio

    import mesher.gmsh_outlines
    import mesher.gmsh_solid

    assert numpy.lib.npyio is not None and mesher.gmsh_outlines is not None and mesher.gmsh_solid is not None


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


def serve(order: dict[str, Any], data: socket.socket) -> int:
    """Do the job in the folder ``order["folder"]``; returns the exit status."""
    data.close()
    room = Path(order["folder"])
    os.chdir(room)
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
