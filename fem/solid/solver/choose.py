"""Which solver suits a part: by the number of unknowns and by how bulky its mesh is."""

from __future__ import annotations

from typing import Literal

from fem.solid.solver import Choice

LEAST = 20_000
"""Unknowns from which the iterative solver takes less time in a bulky part. Measured on a cantilever 4:1:1, seconds of
processor, direct against iterative: 7776 unknowns 0.5 and 0.16, 55 488 4.6 and 0.9. Below it the direct one is kept for
its certainty: what there is to gain is a fraction of a second."""
BULKY = 1.9
"""Nodes for each node of the surface from which a mesh counts as bulky. One layer of elements has 1.5, two 2.3; three
by three along a bar 2.0. Measured: where it is 2.0 to 2.3 the iterative solver takes a quarter to a half of the direct
one's time, in plates of one layer as long, and in flat elements it may stall."""

Solvers = Literal["cholesky", "multigrid"]


def choose(free: int, nodes: int, surface_nodes: int, choice: Choice) -> tuple[Solvers, str]:
    """The solver and the reason for it, a sentence, of a mesh with `free` unknowns on the held motions."""
    if choice != "auto":
        return choice, "It was asked for."
    ratio = nodes / max(surface_nodes, 1)
    if free < LEAST:
        return "cholesky", f"A direct solver, as the model is small: {free} unknowns, fewer than {LEAST}."
    bulk = f"{ratio:.1f} nodes for each on the surface"
    if ratio < BULKY:
        return "cholesky", f"A direct solver, as the part is thin: {bulk}, fewer than {BULKY}, and {free} unknowns."
    return "multigrid", f"An iterative solver, as the part is bulky and the model large: {bulk} and {free} unknowns."
