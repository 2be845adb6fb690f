"""``haunch check``."""

from __future__ import annotations

import os
from pathlib import Path
from typing import TYPE_CHECKING

from geometry.budget import Budget

if TYPE_CHECKING:
    from fem.solid.solver import Choice
    from geometry.part import Part


def run_check(part: str, out: str | None, replace: bool, pictures: bool, threads: int, memory: int,
              solver: Choice = "auto") -> int:
    """Check the part of a spec; see `checked_run`."""
    folder = out if out is not None else f"{Path(part).stem}.run"
    return checked_run(part, folder, replace, pictures, threads, memory, solver)


def checked_run(part: Part | str, out: str, replace: bool, pictures: bool, threads: int, memory: int,
                solver: Choice = "auto") -> int:
    """Check one part and print what was found; 0 when it is fine, else 1."""
    os.environ.setdefault("KMP_BLOCKTIME", "0")  # waiting threads sleep: the cores are shared with the child processes
    for name in ("OMP_NUM_THREADS", "MKL_NUM_THREADS", "OPENBLAS_NUM_THREADS", "NUMBA_NUM_THREADS"):
        os.environ.setdefault(name, str(threads))  # read once, when the libraries are loaded
    from studies.check.run import check
    from studies.cli.screen import StageView, make_console, print_result

    folder = Path(out)
    console = make_console()
    with StageView(console) as view:
        result = check(part, folder, Budget(threads=threads, memory=memory), view, replace=replace, pictures=pictures,
                       solver=solver)
    print_result(console, result)
    console.print(f"Everything is in [bold]{folder}[/]: start with summary.md", soft_wrap=True)
    return 0 if result.fine else 1
