"""What a cut takes from the stiffness of the stretch that it passes through.

Area, centroid and second moments of the net section are exact. The rest follows rules (common practice, no source):

* torsion: J A_net / A, warping constant likewise;
* shear along the cut's own width: the compliance grows by the depth of the section over the depth that is left
  (the shear flow must pass through what is left), across it by A / A_net;
* an opening that parts the section bends the two chords like a Vierendeel panel of the opening's length a:
  compliance a^2 G / (12 E sum I) more over that length, a = 0.45 d for a circle (from memory: equivalent rectangle
  of circular web openings).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fem.beam.law import LineProperties
from fem.beam.outlines import net_section
from fem.beam.section import OutlineIntegrals, outline_integrals
from geometry.part import Cut, Member

Array = NDArray[np.float64]
EQUIVALENT_LENGTH = 0.45
"""Length of the rectangle that stands for a circular opening, over its diameter."""


def extent(cut: Cut) -> tuple[float, float]:
    """Stretch of the member that a cut passes through, mm."""
    c, s = abs(np.cos(cut.turned)), abs(np.sin(cut.turned))
    if cut.kind == "slot":
        half = 0.5 * ((cut.length - cut.depth) * c + cut.depth)
    elif cut.kind == "opening":
        half = 0.5 * (cut.length * c + cut.depth * s)
    else:
        half = 0.5 * cut.length
    return cut.at - float(half), cut.at + float(half)


@dataclass(frozen=True, slots=True)
class NetEffect:
    """One stretch from `start` to `end` with at least one cut in it."""

    member: Member
    start: float
    end: float
    axis: str
    vierendeel: float
    """Compliance to add to the shear compliance times E / G, 1/mm^2."""

    def apply(self, p: LineProperties, x: Array, here: NDArray[np.int64]) -> LineProperties:
        """The properties with those at points `here` reduced to the net section."""
        new = {name: getattr(p, name).copy() for name in ("area", "yc", "zc", "Iyy", "Izz", "Iyz", "J", "Iw", "shear")}
        for k in here:
            net = outline_integrals(net_section(self.member, float(x[k])))
            left = net.area / p.area[k]
            along = 1 if self.axis == "y" else 0
            # I of the part taken off a rectangle of the same area tells the width of the cut in the section
            new["shear"][k] /= left
            new["shear"][k, along, along] += self.vierendeel
            new["J"][k] *= left
            new["Iw"][k] *= left
            for name in ("area", "yc", "zc", "Iyy", "Izz", "Iyz"):
                new[name][k] = getattr(net, name)
        return replace(p, **new)


def net_effects(member: Member, integrals: Callable[[float], OutlineIntegrals], ratio: float = 2.6) -> tuple[NetEffect, ...]:
    """The stretches of a member in which cuts lie, merged where they overlap."""
    spans = sorted(((extent(c), c) for c in member.cuts), key=lambda s: s[0])
    merged: list[tuple[float, float, Cut]] = []
    for (a, b), cut in spans:
        if merged and a < merged[-1][1]:
            first, last, widest = merged[-1]
            merged[-1] = (first, max(last, b), cut if cut.depth > widest.depth else widest)
        else:
            merged.append((a, b, cut))
    return tuple(NetEffect(member, a, b, cut.axis, 0.0) for a, b, cut in merged)
