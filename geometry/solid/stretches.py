"""Dimensions along a member: the stretches between stations, each linear from end to end."""

from __future__ import annotations

import itertools
from collections.abc import Mapping
from dataclasses import dataclass

from geometry.part import Member, Station
from geometry.problem import SolidError

Dims = Mapping[str, float]


@dataclass(frozen=True, slots=True)
class Stretch:
    """A piece of a member whose dimensions vary linearly.

    Attributes
    ----------
    start, end
        Distances from the start of the member, mm.
    first, last
        Dimensions (mm) at its two ends.
    step
        A step lies at its start.
    shoulder
        Radius at that step, mm (0: sharp).
    """

    start: float
    end: float
    first: Dims
    last: Dims
    step: bool = False
    shoulder: float = 0.0

    def at(self, x: float) -> dict[str, float]:
        """Dimensions (mm) at distance `x` from the start of the member."""
        t = (x - self.start) / (self.end - self.start)
        return {name: (1.0 - t) * self.first[name] + t * self.last[name] for name in self.first}


def _grouped(member: Member, length: float) -> list[tuple[float, list[Station]]]:
    groups: list[tuple[float, list[Station]]] = []
    for station in sorted(member.stations, key=lambda s: s.at):
        if not -1e-9 * length <= station.at <= length * (1 + 1e-9):
            raise SolidError(
                f"members.{member.name}: a station at {station.at:g} mm lies off the member (0 to {length:g} mm)."
            )
        if groups and abs(station.at - groups[-1][0]) <= 1e-9 * length:
            groups[-1][1].append(station)
        else:
            groups.append((station.at, [station]))
    for at, group in groups:
        if len(group) > 2:
            raise SolidError(f"members.{member.name}: {len(group)} stations at {at:g} mm; a step has two.")
    return groups


def stretches_of(member: Member, length: float) -> list[Stretch]:
    """The stretches of `member`, from its start to its end.

    A dimension varies linearly from the last place that names it to the next that does, and stays constant
    after the last one. Two stations at one place are a step.

    Raises
    ------
    SolidError
        A station lies off the member, or more than two share a place.
    """
    base = dict(member.section.dims)
    groups = _grouped(member, length)
    unknown = {name for _, group in groups for station in group for name in station.dims} - set(base)
    if unknown:
        raise SolidError(
            f"members.{member.name}: stations vary {', '.join(sorted(unknown))}, which the {member.section.shape} "
            "section does not name; name it in the section too (a free outline cannot vary)."
        )
    # Knots of each dimension: (place, value arriving, value leaving).
    knots: dict[str, list[tuple[float, float, float]]] = {name: [(0.0, v, v)] for name, v in base.items()}
    for at, group in groups:
        for name in {**group[0].dims, **group[-1].dims}:
            known = knots[name]
            arriving = group[0].dims.get(name, known[-1][2])
            leaving = group[-1].dims.get(name, arriving)
            if at <= known[-1][0] + 1e-9 * length:
                known[-1] = (known[-1][0], arriving, leaving)
            else:
                known.append((at, arriving, leaving))
    places = sorted({0.0, length, *(at for at, _ in groups if 1e-9 * length < at < length * (1 - 1e-9))})
    steps = {at: group[1].shoulder_fillet for at, group in groups if len(group) == 2 and 0.0 < at < length}
    return [
        Stretch(
            a,
            b,
            {name: _value(ks, a, length, leaving=True) for name, ks in knots.items()},
            {name: _value(ks, b, length, leaving=False) for name, ks in knots.items()},
            a in steps,
            steps.get(a, 0.0),
        )
        for a, b in itertools.pairwise(places)
    ]


def _value(knots: list[tuple[float, float, float]], x: float, length: float, leaving: bool) -> float:
    """Value of one dimension at `x`, on the far side of a step there when `leaving`."""
    tiny = 1e-9 * length
    before = [k for k in knots if k[0] <= x + tiny]
    after = [k for k in knots if k[0] > x + tiny]
    if not before:
        return knots[0][1]
    at, arriving, left = before[-1]
    if abs(at - x) <= tiny:
        return left if leaving else arriving
    if not after:
        return left
    nxt = after[0]
    return left + (nxt[1] - left) * (x - at) / (nxt[0] - at)
