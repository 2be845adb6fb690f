"""The shapes that are timed, each a part spec with a size of mesh for every step of the ladder of sizes.

All are of one steel bar's kind: held at one end, a force of 1000 N (three directions), two moments and the weight as
the six load cases. The spec goes through Haunch's own reader, solid builder and mesher; `cells` gives a structured
mesh of the same box instead.
"""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass, field

SIZES = ("tiny", "small", "medium", "large")
"""About 8000, 73 000, 426 000 and 1 600 000 unknowns."""

_SPEC = """
title    = "benchmark"
accuracy = "2 %"

[material]
name    = "steel"
E       = "210 GPa"
nu      = 0.3
density = "7850 kg/m^3"

[members.bar]
from    = ["0 mm", "0 mm", "0 mm"]
to      = ["{length} mm", "0 mm", "0 mm"]
section = {section}
{more}

[supports.wall]
on   = "bar.start"
hold = "all"

[loads.down]
on    = "bar.end"
force = ["0 N", "0 N", "-1000 N"]

[loads.side]
on    = "bar.end"
force = ["0 N", "1000 N", "0 N"]

[loads.pull]
on    = "bar.end"
force = ["1000 N", "0 N", "0 N"]

[loads.bend]
on     = "bar.end"
moment = ["0 N m", "20 N m", "0 N m"]

[loads.twist]
on     = "bar.end"
moment = ["20 N m", "0 N m", "0 N m"]

[cases.down]
down = 1.0

[cases.side]
side = 1.0

[cases.pull]
pull = 1.0

[cases.bend]
bend = 1.0

[cases.twist]
twist = 1.0

[cases.weight]
self_weight = 1.0
"""

FIRST_CASE = "down"
"""The case of the runs with one right-hand side, and of every rival."""


@dataclass(frozen=True, slots=True)
class Shape:
    """One shape.

    Attributes
    ----------
    about
        What it stands for.
    length
        mm.
    section, more
        TOML: the section's table, and further words of the member.
    cells
        Size -> cells along x, y, z of a structured mesh; empty: Haunch's mesher.
    factors
        Size -> factor on the sizes of the mesher's first attempt, found by trial.
    """

    name: str
    about: str
    length: float
    section: str
    more: str = ""
    cells: Mapping[str, tuple[int, int, int]] = field(default_factory=dict)
    factors: Mapping[str, float] = field(default_factory=dict)

    @property
    def spec(self) -> str:
        return _SPEC.format(length=self.length, section=self.section, more=self.more)

    @property
    def sizes(self) -> tuple[str, ...]:
        """Sizes that this shape has, in rising order."""
        return tuple(size for size in SIZES if size in self.cells or size in self.factors)

    def file(self, size: str) -> str:
        """Name of the file of one mesh: another one when the spec or the size has changed."""
        told = f"{self.spec} {self.cells.get(size)} {self.factors.get(size)}"
        return f"{self.name.replace(' ', '-')}-{size}-{hashlib.sha256(told.encode()).hexdigest()[:8]}.npz"


_BOX = '{ shape = "rectangle", depth = "100 mm", width = "100 mm" }'
_HOLES = """
[[members.bar.holes]]
name     = "web"
through  = "web"
at       = "120 mm"
count    = 3
pitch    = "180 mm"
diameter = "40 mm"
"""
_FOOT = """
[[members.bar.stations]]
at    = "40 mm"
depth = "140 mm"
width = "120 mm"

[[members.bar.stations]]
at    = "40 mm"
depth = "70 mm"
width = "60 mm"
shoulder_fillet = "10 mm"
"""

SHAPES = {
    shape.name: shape
    for shape in (
        Shape(
            "box",
            "bulky cantilever 4:1:1, structured mesh",
            400,
            _BOX,
            cells={"tiny": (16, 4, 4), "small": (34, 9, 9), "medium": (64, 16, 16), "large": (100, 25, 25)},
        ),
        Shape("free box", "the same box, meshed freely", 400, _BOX, factors={"small": 0.385, "medium": 0.21}),
        Shape(
            "foot",
            "short thick bracket with a wide foot and a filleted shoulder",
            160,
            '{ shape = "rectangle", depth = "140 mm", width = "120 mm" }',
            _FOOT,
            factors={"small": 1.25, "medium": 0.5},
        ),
        Shape(
            "I",
            "I section with root fillets and three holes through its web",
            600,
            '{ shape = "I", depth = "120 mm", width = "80 mm", web = "8 mm", flange = "10 mm", root_radius = "10 mm" }',
            _HOLES,
            factors={"small": 1.16, "medium": 0.44},
        ),
        Shape(
            "channel",
            "thin channel, walls of 3 mm",
            240,
            '{ shape = "channel", depth = "80 mm", width = "40 mm", web = "3 mm", flange = "3 mm" }',
            factors={"small": 1.35, "medium": 0.56},
        ),
        Shape(
            "strip",
            "slender strip, length over depth 170",
            1700,
            '{ shape = "rectangle", depth = "10 mm", width = "20 mm" }',
            factors={"small": 1.05, "medium": 0.54},
        ),
        Shape(
            "plate",
            "flat plate, length over thickness 80",
            320,
            '{ shape = "rectangle", depth = "4 mm", width = "240 mm" }',
            factors={"small": 1.45, "medium": 0.6},
        ),
    )
}
