"""Compile every kernel in advance, so that no run of a check has to wait for it unannounced."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from time import perf_counter

from fem.solid.kernels.cache import base_folder, is_warm, set_warm

__all__ = ["SECONDS", "is_warm", "warm_up"]

SECONDS = 60
"""What compiling all of them takes, measured on one processor; from the kept code it is two or three seconds."""


def warm_up(tell: Callable[[str], None]) -> None:
    """Solve a tiny part in all the ways there are, which compiles what is not kept yet. May be repeated.

    Parameters
    ----------
    tell
        Called with a sentence before and after.
    """
    from fem.solid.kernels.tiny import tiny_mesh, tiny_part
    from fem.solid.solve import solve_solid
    from geometry.budget import Budget

    begun = perf_counter()
    tell(
        "the solver's kernels are compiled"
        + ("" if is_warm() else f", once, about {SECONDS} s" if base_folder() else f", about {SECONDS} s in every run: "
           "no folder can be written in which to keep them (name one in NUMBA_CACHE_DIR)")
    )  # fmt: skip
    mesh, part = tiny_mesh(), tiny_part()
    one = replace(part, cases=part.cases[1:2], vibration=None, buckling=())
    solve_solid(part, mesh, Budget(threads=1), solver="cholesky")
    solve_solid(part, mesh, Budget(threads=1), solver="multigrid")
    solve_solid(one, mesh, Budget(threads=1), solver="multigrid")
    set_warm()
    tell(f"the solver's kernels are ready after {perf_counter() - begun:.0f} s")
