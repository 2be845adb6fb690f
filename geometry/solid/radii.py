"""Shoulder fillets and edge radii: which edges they are on, found by geometry."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from geometry.part import EdgeRadius, Member
from geometry.problem import SolidError
from geometry.solid.body import Piece
from geometry.solid.cuts import Tool
from geometry.solid.eased import NAMES, edge_name
from geometry.solid.edges import SMOOTH, EdgeMark, edge_marks
from geometry.solid.fillets import fillet_area, fillet_volume, filleted
from geometry.solid.regions import TOLERANCE, end_label, on_tool
from geometry.solid.samples import sample_faces


@dataclass(frozen=True, slots=True)
class Radius:
    """A radius that was built: the lines it replaced, (n, 3) points each, member axes, mm.

    `gain` is the volume it added by the kernel, `expected` by area times length, `size` the same without sign.
    """

    label: str
    kind: str
    radius: float
    lines: tuple[NDArray[np.float64], ...]
    gain: float
    expected: float
    size: float


def _built(
    solid: Any, marks: Sequence[EdgeMark], radius: float, what: str, label: str, kind: str
) -> tuple[Any, Radius]:
    made, gain = filleted(solid, marks, radius, what)
    size = sum(fillet_area(m.angle, radius) * m.length for m in marks)
    lines = tuple(m.points for m in marks)
    return made, Radius(label, kind, radius, lines, gain, fillet_volume(marks, radius), size)


def shoulder_fillets(solid: Any, member: Member, pieces: Sequence[Piece]) -> tuple[Any, list[Radius]]:
    """`solid` with the radius of every step on that step's re-entrant edges."""
    done: list[Radius] = []
    for piece in pieces:
        x, radius = piece.stretch.start, piece.stretch.shoulder
        if not piece.stretch.step or radius <= 0.0:
            continue
        marks = [m for m in edge_marks(solid) if m.angle < -SMOOTH and np.all(np.abs(m.points[:, 0] - x) < TOLERANCE)]
        label = f"shoulder at {x:g} mm"
        solid, radius_made = _built(solid, marks, radius, f"members.{member.name}: {label}", label, "fillet")
        done.append(radius_made)
    return solid, done


def edge_radii(
    solid: Any, member: Member, pieces: Sequence[Piece], tools: Sequence[Tool], on_cuts: bool
) -> tuple[Any, list[Radius]]:
    """`solid` with the declared edge radii, either those on cuts' rims or those on the rims of its ends.

    Radii along the member are part of its section (`geometry.solid.eased`).

    Raises
    ------
    SolidError
        A name is not known, has no outer edge, or its radius does not fit.
    """
    cuts = {name for t in tools for name in (t.cut.name, t.cut.group)}
    done: list[Radius] = []
    for wanted in member.edge_radii:
        if edge_name(wanted.edges) or (wanted.edges in cuts) != on_cuts:
            continue
        chosen = _chooser(solid, member, pieces, tools, wanted)
        marks = [m for m in edge_marks(solid) if m.angle > SMOOTH and chosen(m)]
        what = f"members.{member.name}: radius on {wanted.edges}"
        solid, made = _built(solid, marks, wanted.radius, what, f"edge radius {wanted.edges}", "rim")
        done.append(made)
    return solid, done


def _chooser(
    solid: Any, member: Member, pieces: Sequence[Piece], tools: Sequence[Tool], wanted: EdgeRadius
) -> Callable[[EdgeMark], bool]:
    samples = sample_faces(solid)
    length = pieces[-1].stretch.end
    if wanted.edges in ("start", "end"):
        at_end = [end_label(s, length) == wanted.edges for s in samples]
        return lambda m: at_end[m.faces[0]] != at_end[m.faces[1]]
    own = [t for t in tools if wanted.edges in (t.cut.name, t.cut.group)]
    if not own:
        raise SolidError(
            f"members.{member.name}: radius on {wanted.edges!r}: no such edges; allowed: start, end, "
            f"{', '.join(NAMES)}, or a cut ({', '.join(sorted({t.cut.name for t in tools})) or 'none'})."
        )
    inner = [any(on_tool(s, t) for t in own) for s in samples]
    return lambda m: inner[m.faces[0]] != inner[m.faces[1]]
