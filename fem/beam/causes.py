"""Where the beam model knows that a solid will differ honestly, and by how much.

Each cause is computed by solving the beam once more with the assumption changed:

* warping of a solid or closed section is held at a clamped end, which Saint-Venant torsion leaves out: the seventh
  freedom is given to every section;
* a hole in a stressed wall leaves dead corners beside it: for a small round hole the extra compliance is three times
  that of the net section (dilute limit of the effective modulus, E (1 - 3 f); from memory);
* a region on a side face or in a group of holes that moves as a rigid body stiffens only its own face in the solid, but
  the whole section in the beam: the truth lies between that and a region that may deform.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from fem.beam.figures import LineValues
from fem.beam.mesh import BeamMesh
from fem.beam.modes import beam_vibration, buckling_studies
from fem.beam.result import Cause
from fem.figure import Quantity
from fem.mode import Mode
from geometry.part import Part, RegionLoad, RemotePoint
from geometry.problem import SolveError

Array = NDArray[np.float64]
ALIKE = 0.8
"""Least correlation of two shapes that are taken for the same mode."""
LEAST = 1e-3
"""Smallest difference worth naming, as a share of the largest value of that quantity in the case."""

Solver = Callable[[BeamMesh], LineValues]


def find_causes(mesh: BeamMesh, base: LineValues, solve: Solver) -> tuple[Cause, ...]:
    """Causes of honest differences from `base`; `solve` gives the same values of a changed model."""
    scale = _scales(base)
    found: list[Cause] = []
    for text, changed, share, open_share in _variants(mesh):
        try:
            other = solve(changed)
        except SolveError:
            continue  # without this assumption the part is not held: nothing to compare with
        change = other.values - base.values
        for row, case in np.argwhere((np.abs(change) > LEAST * scale) & np.isfinite(change)):
            key, by = base.keys[row], float(change[row, case])
            found.append(Cause(mesh.part.cases[case].name, key.place, key.quantity, key.component, text, share * by,
                               open_share * abs(by)))
    return tuple(found)


def find_mode_causes(mesh: BeamMesh, vibration: Sequence[Mode], buckling: Sequence[Mode]) -> tuple[Cause, ...]:
    """Causes of honest differences of frequencies (Hz) and factors: case of the study, component ``mode 1`` by the
    beam's own order in it."""
    found: list[Cause] = []
    for text, changed, share, open_share in _variants(mesh):
        studies: list[tuple[str, Quantity, Sequence[Mode], Sequence[Mode]]] = []
        try:
            if vibration:
                studies.append(("", "natural_frequency", vibration, beam_vibration(changed.part, changed)))
            if buckling:
                other = buckling_studies(changed.part, changed)[0]
                studies += [(case, "buckling_factor", [m for m in buckling if m.case == case],
                             [m for m in other if m.case == case]) for case in dict.fromkeys(m.case for m in buckling)]
        except SolveError:
            continue  # as in `find_causes`
        for case, quantity, ours, theirs in studies:
            for number, (mode, by) in enumerate(zip(ours, _changes(mesh, ours, theirs), strict=True), 1):
                if abs(by) > LEAST * abs(mode.value):
                    found.append(Cause(case, "", quantity, f"mode {number}", text, share * by, open_share * abs(by)))
    return tuple(found)


def _changes(mesh: BeamMesh, ours: Sequence[Mode], theirs: Sequence[Mode]) -> list[float]:
    """How far each value moves to that of the most similar shape with a value of its sign; 0 without one."""
    size = float(np.ptp(mesh.sections.solved[0].extremes, axis=0).max()) / np.sqrt(12.0)
    a, b = (np.array([np.hstack([m.displacement, size * m.rotation]).ravel() for m in modes])
            for modes in (ours, theirs))
    if not len(b):
        return [0.0] * len(ours)
    alike = (a @ b.T) ** 2 / np.outer((a**2).sum(axis=1), (b**2).sum(axis=1))
    alike *= np.array([[m.value * n.value > 0.0 for n in theirs] for m in ours])
    best = alike.argmax(axis=1)
    return [theirs[j].value - m.value if alike[i, j] > ALIKE else 0.0
            for i, (m, j) in enumerate(zip(ours, best, strict=True))]


def _scales(line: LineValues) -> Array:
    """(k, cases) largest value of each figure's quantity in each case."""
    size = np.abs(line.values)
    quantity = np.array([key.quantity for key in line.keys])
    scale = np.zeros_like(size)
    for name in np.unique(quantity):
        scale[quantity == name] = size[quantity == name].max(axis=0)
    return scale


def _variants(mesh: BeamMesh) -> Iterator[tuple[str, BeamMesh, float, float]]:
    """Text, changed model, the share of the change that is predicted, and the share left open."""
    warping = replace(mesh, warp_everywhere=True)
    middles = 0.5 * (mesh.x[:-1] + mesh.x[1:])
    if (warping.warps(middles) != mesh.warps(middles)).any():
        yield "a clamped or rigid end also holds the warping of a solid or closed section", warping, 1.0, 0.5
    if any(c.kind == "hole" for c in mesh.member.cuts):
        yield ("material beside a hole carries little along the member: its compliance is up to three times the net "
               "section's"), replace(mesh, cut_factor=3.0), 0.5, 0.5
    softer = _not_rigid(mesh.part)
    if softer is not None:
        yield ("a region that moves as one body stiffens its own face, not the whole section as in the beam",
               replace(mesh, part=softer), 0.5, 0.5)


def _not_rigid(part: Part) -> Part | None:
    """The part with rigid couplings of side faces made average; None when there are none."""
    def soft(on: str, coupling: str) -> bool:
        return coupling == "rigid" and on.partition(".")[2] not in ("start", "end")

    supports = tuple(replace(s, coupling="average") if soft(s.on, s.coupling) else s for s in part.supports)
    loads = tuple(replace(v, coupling="average") if isinstance(v, RegionLoad | RemotePoint) and soft(v.on, v.coupling)
                  else v for v in part.loads)
    return None if supports == part.supports and loads == part.loads else replace(part, supports=supports, loads=loads)
