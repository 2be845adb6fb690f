"""Starting gmsh so that it leaves the process and the user's files alone. Imported in the child only."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager

import gmsh


@contextmanager
def session() -> Iterator[None]:
    """gmsh without configuration files, signal handler, threads or terminal windows; output goes to the log."""
    gmsh.initialize(readConfigFiles=False, interruptible=False)
    try:
        gmsh.option.setNumber("General.Terminal", 1)  # to the log file: the worker has redirected its output
        gmsh.option.setNumber("General.NoPopup", 1)
        gmsh.option.setNumber("General.NumThreads", 1)
        gmsh.option.setNumber("General.ExpertMode", 1)
        yield
    finally:
        gmsh.finalize()


def kernel_version() -> str:
    """Version of gmsh with that of its CAD kernel, as it stands in a recipe."""
    info = gmsh.option.getString("General.BuildInfo")
    occ = next((part.strip() for part in info.split(";") if "OCC version" in part), "")
    return f"{gmsh.__version__} {occ}".strip()
