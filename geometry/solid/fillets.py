"""Radii on edges: built, checked, and refused with the largest radius that would fit."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

from OCP.BRepFilletAPI import BRepFilletAPI_MakeFillet

from geometry.problem import SolidError
from geometry.solid.edges import EdgeMark
from geometry.solid.kernel import one_solid, volume_of

TRIES = 9
BAND = 0.6
"""A fillet's volume may differ by this part from area times length of edge (ends, curved edges)."""


def fillet_area(angle: float, radius: float) -> float:
    """Area (mm^2) between an edge and its radius where the normal turns by `angle` (rad)."""
    turn = abs(angle)
    return radius * radius * (math.tan(0.5 * turn) - 0.5 * turn)


def fillet_volume(marks: Sequence[EdgeMark], radius: float) -> float:
    """Volume (mm^3) that radii on these edges add (re-entrant) or take away (outer), to first order."""
    return sum(math.copysign(fillet_area(m.angle, radius), -m.angle) * m.length for m in marks)


def filleted(solid: Any, marks: Sequence[EdgeMark], radius: float, what: str) -> tuple[Any, float]:
    """`solid` with `radius` on the edges of `marks`, and the volume it gained.

    Raises
    ------
    SolidError
        The radius does not fit; the message says on which edges, and the largest that would.
    """
    if not marks:
        raise SolidError(f"{what}: there is no edge for its radius of {radius:g} mm.")
    made = _attempt(solid, marks, radius)
    if made is not None:
        return made
    fits = _largest(solid, marks, radius)
    where = ", ".join(
        f"({m.points[0][0]:.4g}, {m.points[0][1]:.4g}, {m.points[0][2]:.4g}) to "
        f"({m.points[-1][0]:.4g}, {m.points[-1][1]:.4g}, {m.points[-1][2]:.4g})"
        for m in marks[:3]
    ) + (f" and {len(marks) - 3} more" if len(marks) > 3 else "")
    advice = f"the largest that fits is about {fits:.3g} mm" if fits > 0.0 else "no smaller radius was found that fits"
    raise SolidError(
        f"{what}: a radius of {radius:g} mm does not fit on {len(marks)} edges, {where} (member axes, mm); {advice}."
    )


def _attempt(solid: Any, marks: Sequence[EdgeMark], radius: float) -> tuple[Any, float] | None:
    """The filleted solid and its gain in volume, or None where the kernel fails or returns something wrong."""
    try:
        maker = BRepFilletAPI_MakeFillet(solid)
        for mark in marks:
            maker.Add(radius, mark.edge)
        maker.Build()
        if not maker.IsDone():
            return None
        made = one_solid(maker.Shape(), "fillet")
    except Exception:  # noqa: BLE001 - the kernel raises a dozen unrelated types; every one means "did not fit"
        return None
    gain = volume_of(made)[0] - volume_of(solid)[0]
    expected = fillet_volume(marks, radius)
    size = sum(fillet_area(m.angle, radius) * m.length for m in marks)
    if abs(gain - expected) > BAND * size + 1e-9 * volume_of(solid)[0]:
        return None
    return made, gain


def _largest(solid: Any, marks: Sequence[EdgeMark], radius: float) -> float:
    """Largest radius that fits, by bisection with a bounded number of tries; 0 when none did."""
    low, high = 0.0, radius
    for _ in range(TRIES):
        middle = 0.5 * (low + high)
        if _attempt(solid, marks, middle) is not None:
            low = middle
        else:
            high = middle
    return low
