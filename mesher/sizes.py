"""How fine the mesh must be: from accuracy and the solid's size hints to element sizes.

A P2 mesh with elements of size h has stress errors of order h^2 and displacement errors of order h^3 or better,
so sizes at stress raisers go with the square root of the accuracy and sizes elsewhere with its cube root. At the rim
of a hole in a plate under tension (diameter to width 0.3, thickness 0.1 to 0.6 of the width) the recovered stress was
measured too low by up to 0.35 (h / r)^2 of itself: the count around a hole keeps that within about half the accuracy.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict, dataclass
from math import pi
from typing import Any

from numpy import interp

from geometry.named_solid import NamedSolid, SizeHint
from geometry.problem import MeshError

REFERENCE_ACCURACY = 0.02
LEAST_ACCURACY, MOST_ACCURACY = 0.001, 0.2  # as in the spec
RAISERS = ("hole", "fillet", "step", "rim")

_ALONG = ("root", "corner", "edge", "toe")
"""First words of the labels of roundings that run along the member: they follow the stress, they do not raise it."""


@dataclass(frozen=True, slots=True)
class Sizes:
    """Sizes of one attempt, mm.

    Attributes
    ----------
    bulk
        Where nothing asks for less.
    slope
        Growth of the size for each mm away from a place that asks for less.
    turn
        Elements around a full turn of a curved face that raises no stress; a rounding gets two thirds of that.
    faces
        Size at a face, by its index.
    roundings
        Faces that are roundings along the member.
    """

    bulk: float
    slope: float
    turn: float
    faces: Mapping[int, float]
    roundings: tuple[int, ...] = ()

    def as_json(self) -> dict[str, Any]:
        """JSON-like, keys of `faces` as text."""
        return {**asdict(self), "faces": {str(k): v for k, v in self.faces.items()}, "roundings": [*self.roundings]}

    @classmethod
    def from_json(cls, data: Mapping[str, Any]) -> Sizes:
        """The inverse of `as_json`."""
        faces = {int(k): float(v) for k, v in data["faces"].items()}
        roundings = tuple(int(i) for i in data["roundings"])
        return cls(float(data["bulk"]), float(data["slope"]), float(data["turn"]), faces, roundings)


def elements_around(accuracy: float) -> float:
    """Elements around a hole (full turn): 36 at 2 %, 51 at 1 %, 23 at 5 %."""
    return min(max(36.0 * (REFERENCE_ACCURACY / accuracy) ** 0.5, 16.0), 120.0)


def bulk_factor(accuracy: float) -> float:
    """Sizes away from stress raisers, as a factor on those for 2 %."""
    return min(max((accuracy / REFERENCE_ACCURACY) ** (1.0 / 3.0), 0.3), 1.3)


def sizes_for(solid: NamedSolid, accuracy: float, factor: float = 1.0) -> Sizes:
    """Sizes for a solid, all times `factor`.

    Raises
    ------
    MeshError
        `accuracy` outside 0.001 to 0.2, or a hint that names a face the solid does not have.
    """
    if not LEAST_ACCURACY <= accuracy <= MOST_ACCURACY:
        raise MeshError(
            f"accuracy: given {accuracy:.4g}; allowed {LEAST_ACCURACY:g} to {MOST_ACCURACY:g}"
            f" ({100 * LEAST_ACCURACY:g} % to {100 * MOST_ACCURACY:g} %)"
        )
    around, coarse = elements_around(accuracy), bulk_factor(accuracy)
    # 2 V / A is the thickness of a plate, half the side of a square bar, half the diameter of a round one.
    thickness = 2.0 * solid.volume / solid.area
    # Walls: one layer. A compact section, whose least dimension is well above 2 V / A: three elements across.
    share = interp(solid.least_wall / thickness, [1.2, 1.67], [1.2, 0.6])
    bulk = float(share) * thickness * coarse
    if solid.least_wall > 0 and not any(h.kind == "wall" for h in solid.hints):
        bulk = min(bulk, 1.6 * solid.least_wall * coarse)
    faces: dict[int, float] = {}
    roundings = sorted({i for hint in solid.hints if _runs_along(hint) for i in hint.faces})
    for hint in solid.hints:
        size = _hint_size(hint, around, coarse)
        for face in hint.faces:
            if not 0 <= face < len(solid.faces):
                raise MeshError(f"size hint {hint.label!r} names face {face}; the solid has {len(solid.faces)} faces")
            faces[face] = min(size, bulk, faces.get(face, bulk))
    return Sizes(bulk * factor, 0.4, 12.0, {k: v * factor for k, v in sorted(faces.items())}, tuple(roundings))


def _runs_along(hint: SizeHint) -> bool:
    return hint.kind in ("fillet", "rim") and hint.label.split()[:1] != [] and hint.label.split()[0] in _ALONG


def _hint_size(hint: SizeHint, around: float, coarse: float) -> float:
    """Size at the faces of one hint, mm."""
    if hint.kind == "wall" or _runs_along(hint):
        return 1.2 * hint.thickness * coarse if hint.thickness > 0 else float("inf")
    if hint.kind not in RAISERS:
        raise MeshError(f"size hint {hint.label!r}: kind {hint.kind!r}; allowed: {', '.join(RAISERS)}, wall")
    two_layers = hint.thickness / 2 * coarse if hint.thickness > 0 else float("inf")
    if hint.radius <= 0:
        return two_layers
    # A rounded outer edge bends what stress there is; it does not raise it.
    on_circle = 2 * pi * hint.radius / (around * 0.55 if hint.kind == "rim" else around)
    # In a sheet the field around a large hole is plane: more than 2.5 times as fine would buy nothing.
    return max(min(two_layers, on_circle), on_circle / 2.5)
