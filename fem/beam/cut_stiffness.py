"""What a cut takes from the stiffness of the stretch that it passes through.

Area, centroid and second moments of the net section are exact. The rest follows rules (common practice, no source):

* torsion: J A_net / A, warping constant likewise;
* shear along the width of the cut: the compliance grows by the section's size that way over the size that is left
  (the shear flow must pass through what is left), across it by A / A_net;
* an opening that parts the section bends the two chords like a Vierendeel panel of length a: the ends move by
  V a^3 / (12 E sum I) against one another, I of each chord about its own centroid; a is the length of an opening and
  0.45 d of a circle (from memory: rectangle that stands for a circular web opening).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fem.beam.law import LineProperties
from fem.beam.outlines import net_section
from fem.beam.outlines.net_sections import chord, notch_depth
from fem.beam.section import OutlineIntegrals, outline_integrals
from geometry.part import Cut, Member

Array = NDArray[np.float64]
Integrals = Callable[[float], tuple[OutlineIntegrals, OutlineIntegrals]]
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
    """One stretch from `start` to `end` with at least one cut in it.

    `vierendeel` is the shear compliance that bending of the chords adds (yy, zz), 1/mm^2.
    """

    member: Member
    start: float
    end: float
    cuts: tuple[Cut, ...]
    vierendeel: tuple[float, float]

    def apply(self, p: LineProperties, x: Array, here: NDArray[np.int64], at_x: Integrals) -> LineProperties:
        """The properties with those at points `here` reduced to the net section.

        `at_x` gives the exact integrals without and with the cuts at one x.
        """
        new = {name: getattr(p, name).copy() for name in ("area", "yc", "zc", "Iyy", "Izz", "Iyz", "J", "Iw", "shear")}
        for k in here:
            at = float(x[k])
            gross, net = at_x(at)
            left = net.area / p.area[k]
            e = gross.extremes
            size = (float(e[3, 0] - e[2, 0]), float(e[0, 1] - e[1, 1]))
            new["shear"][k, 0, 1] /= left
            new["shear"][k, 1, 0] /= left
            for along in (0, 1):
                taken = sum(_width(c, at) for c in self.cuts if (c.axis == "z") == (along == 0))
                grown = 1.0 / left if taken == 0.0 else size[along] / max(size[along] - taken, 0.05 * size[along])
                new["shear"][k, along, along] = p.shear[k, along, along] * grown + self.vierendeel[along]
            new["J"][k] *= left
            new["Iw"][k] *= left
            for name in ("area", "yc", "zc", "Iyy", "Izz", "Iyz"):
                new[name][k] = getattr(net, name)
        return replace(p, **new)


def _width(cut: Cut, x: float) -> float:
    """What a cut takes across the member at `x`, mm."""
    if cut.kind == "notch":
        return notch_depth(cut, x)
    taken = chord(cut, x)
    return 0.0 if taken is None else taken[1] - taken[0]


def net_effects(member: Member, nu: float) -> tuple[NetEffect, ...]:
    """The stretches of a member in which cuts lie, merged where they overlap."""
    merged: list[tuple[float, float, tuple[Cut, ...]]] = []
    for (a, b), cut in sorted(((extent(c), c) for c in member.cuts), key=lambda s: s[0]):
        if merged and a < merged[-1][1]:
            first, last, cuts = merged[-1]
            merged[-1] = (first, max(last, b), (*cuts, cut))
        else:
            merged.append((a, b, (cut,)))
    return tuple(NetEffect(member, a, b, cuts, _vierendeel(member, a, b, cuts, nu)) for a, b, cuts in merged)


def _vierendeel(member: Member, a: float, b: float, cuts: tuple[Cut, ...], nu: float) -> tuple[float, float]:
    """Compliance (yy, zz) that bending of the chords adds over the stretch, 1/mm^2."""
    added = [0.0, 0.0]
    for cut in cuts:
        pieces = net_section(member, cut.at)
        if cut.kind == "notch" or len(pieces) < 2 or cut.through not in ("all", "web"):
            continue
        own = [outline_integrals(p) for p in pieces]
        along = 0 if cut.axis == "z" else 1
        total = sum(o.Izz if along == 0 else o.Iyy for o in own)
        first, last = extent(cut)
        panel = {"hole": EQUIVALENT_LENGTH * cut.length,
                 "slot": last - first - (1.0 - EQUIVALENT_LENGTH) * cut.depth}.get(cut.kind, last - first)
        added[along] += panel**3 / (12.0 * total) / (2.0 * (1.0 + nu)) / (b - a)
    return added[0], added[1]
