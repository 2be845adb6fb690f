"""The walls of each shape: where a tool that passes one of them starts and ends, and what it must not meet."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from geometry.problem import SolidError
from geometry.solid.profile import inner_radius

INF = float("inf")


@dataclass(frozen=True, slots=True)
class Wall:
    """One wall of a section, in the shape's own axes, mm.

    Attributes
    ----------
    name
        As `Cut.through` calls it.
    axis
        The direction that a tool through it takes.
    low, high
        The tool's ends along that direction: the wall's two faces, and past its inner face the fillet's height.
    thickness
        mm.
    faces
        The wall's two faces along the axis.
    free
        Range across the tool (z for axis y, y for axis z) that a cut may take.
    barred
        Range across the tool that it must not touch (a wall that stands behind), or None.
    """

    name: str
    axis: Literal["y", "z"]
    low: float
    high: float
    thickness: float
    faces: tuple[float, float]
    free: tuple[float, float] = (-INF, INF)
    barred: tuple[float, float] | None = None


def walls_of(shape: str, d: Mapping[str, float]) -> list[Wall]:
    """Every wall of `shape` with dimensions `d`; none for solid shapes and free outlines."""
    if shape == "I":
        return _i_walls(d)
    if shape == "channel":
        z, t, f, r, b = 0.5 * d["depth"], d["web"], d["flange"], d.get("root_radius", 0.0), (0.0, d["web"])
        return [
            Wall("web", "y", 0.0, t + r, t, (0.0, t), (-z + f, z - f)),
            Wall("top flange", "z", z - f - r, z, f, (z - f, z), barred=b),
            Wall("bottom flange", "z", -z, -z + f + r, f, (-z, -z + f), barred=b),
        ]
    if shape == "angle":
        z, t, r = 0.5 * d["depth"], d["thickness"], d.get("root_radius", 0.0)
        return [
            Wall("upright leg", "y", 0.0, t + r, t, (0.0, t), (-z + t, INF)),
            Wall("bottom leg", "z", -z, -z + t + r, t, (-z, -z + t), (t, INF)),
        ]
    if shape == "tee":
        z, t, f, r = 0.5 * d["depth"], 0.5 * d["web"], d["flange"], d.get("root_radius", 0.0)
        return [
            Wall("web", "y", -t - r, t + r, d["web"], (-t, t), (-INF, z - f)),
            Wall("top flange", "z", z - f - r, z, f, (z - f, z), barred=(-t, t)),
        ]
    if shape == "box":
        z, y, t, r = 0.5 * d["depth"], 0.5 * d["width"], d["wall"], inner_radius(d)
        beside, over = (-z + t, z - t), (-y + t, y - t)
        return [
            Wall("left wall", "y", -y, -y + t + r, t, (-y, -y + t), beside),
            Wall("right wall", "y", y - t - r, y, t, (y - t, y), beside),
            Wall("top wall", "z", z - t - r, z, t, (z - t, z), over),
            Wall("bottom wall", "z", -z, -z + t + r, t, (-z, -z + t), over),
        ]
    if shape == "tube":
        r, t = 0.5 * d["diameter"], d["wall"]
        over = (-r + t, r - t)
        return [
            Wall("left wall", "y", -r, 0.0, t, (-r, -r + t), over),
            Wall("right wall", "y", 0.0, r, t, (r - t, r), over),
            Wall("top wall", "z", 0.0, r, t, (r - t, r), over),
            Wall("bottom wall", "z", -r, 0.0, t, (-r, -r + t), over),
        ]
    return []


def _i_walls(d: Mapping[str, float]) -> list[Wall]:
    z, t, r = 0.5 * d["depth"], 0.5 * d["web"], d.get("root_radius", 0.0)
    top, low = d["flange"], d.get("bottom_flange", d["flange"])
    return [
        Wall("web", "y", -t - r, t + r, d["web"], (-t, t), (-z + low, z - top)),
        Wall("top flange", "z", z - top - r, z, top, (z - top, z), barred=(-t, t)),
        Wall("bottom flange", "z", -z, -z + low + r, low, (-z, -z + low), barred=(-t, t)),
    ]


def walls_through(shape: str, d: Mapping[str, float], through: str, axis: str, what: str) -> list[Wall]:
    """The walls that a cut named `through` passes; empty for ``all``.

    Raises
    ------
    SolidError
        The shape has no such wall, or the tool's axis runs along it.
    """
    if through == "all":
        return []
    known = walls_of(shape, d)
    found = [w for w in known if w.name == through or (through == "flanges" and w.name.endswith("flange"))]
    if not found:
        names = ", ".join(w.name for w in known) or "none"
        raise SolidError(f"{what}: a {shape} has no {through!r}; through: all, or one of its walls ({names}).")
    if any(w.axis != axis for w in found):
        raise SolidError(f"{what}: a tool along {axis} does not pass the {through}; its axis must be {found[0].axis}.")
    return found
