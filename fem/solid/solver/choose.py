"""Which solver suits a part: by the number of unknowns and by how bulky its mesh is."""

from __future__ import annotations

from typing import Literal

import numpy as np

from fem.solid.solver import Choice

LEAST = 20_000
"""Unknowns from which the iterative solver takes less time in a bulky part. Measured on a cantilever 4:1:1, seconds of
processor, direct against iterative: 7776 unknowns 0.5 and 0.16, 55 488 4.6 and 0.9. Below it the direct one is kept for
its certainty: what there is to gain is a fraction of a second."""
BULKY = 1.9
"""Nodes for each node of the surface from which a mesh counts as bulky. One layer of elements has 1.5, two 2.3; three
by three along a bar 2.0. Measured: where it is 2.0 to 2.3 the iterative solver takes a quarter to a half of the direct
one's time, in plates of one layer as long, and in flat elements it may stall."""
FEW, FEW_UNKNOWNS, STOCKY = 2, (30_000, 100_000), 10.0
"""Load cases, unknowns and length over breadth within which a thin part is iterated nevertheless: a factor costs more
than the few solutions that it would serve. Measured, seconds of processor for one case, direct against iterative: an
arm with a slotted plate of 49 248 unknowns 1.37 and 0.70 (21 iterations), a channel of 74 000 2.10 and 1.30 (22), a
plate 1.95 and 1.35 (27), an I-beam with holes 1.68 and 1.83 (25, the first
solution of its process, so no gain is shown there); but a strip 85 times as long as broad 1.07 and 2.11.
Six cases take the direct one 1.1 times as long as one, the iterative one 2 to 3 times."""

Solvers = Literal["cholesky", "multigrid"]


def choose(
    free: int, nodes: int, surface_nodes: int, choice: Choice, cases: int | None = None, slender: float = np.inf
) -> tuple[Solvers, str]:
    """The solver and the reason for it, a sentence, of a mesh with `free` unknowns on the held motions.

    cases
        Right-hand sides that are all there will be; None where it is not known or modes are wanted, too.
    slender
        Length of the part over its breadth.
    """
    if choice != "auto":
        return choice, "It was asked for."
    ratio = nodes / max(surface_nodes, 1)
    if free < LEAST:
        return "cholesky", f"A direct solver, as the model is small: {free} unknowns, fewer than {LEAST}."
    bulk = f"{ratio:.1f} nodes for each on the surface"
    if ratio >= BULKY:
        reason = f"An iterative solver, as the part is bulky and the model large: {bulk} and {free} unknowns."
        return "multigrid", reason
    few = cases is not None and cases <= FEW and FEW_UNKNOWNS[0] <= free <= FEW_UNKNOWNS[1]
    if few and slender <= STOCKY:
        return "multigrid", (
            f"An iterative solver, as a factor would serve few load cases ({cases}) and the part is thin, but not "
            f"slender: {bulk}, {slender:.1f} times as long as broad, {free} unknowns."
        )
    return "cholesky", f"A direct solver, as the part is thin: {bulk}, fewer than {BULKY}, and {free} unknowns."
