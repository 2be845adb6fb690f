"""The rules, and whether a part keeps them."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from geometry.part import Member, Part
from geometry.spec.checks.profile import length_of
from geometry.spec.words.fields import SIZE, OfKind
from studies.vary.plan.reading import Reading
from studies.vary.plan.shop.corners import inner_corners
from studies.vary.plan.shop.room import Room, chain, gap, ring, rooms_of, same_wall
from studies.vary.plan.shop.walls import walls
from studies.vary.plan.words import ShopSpec

JUST = 1.0 - 1e-9
"""A rule that is met but for rounding is met."""


@dataclass(frozen=True)
class Shop:
    """What the shop can make, mm (`edge_distance`: in diameters); None: no such rule."""

    least_wall: float | None = None
    tool_radius: float | None = None
    edge_distance: float | None = None

    def broken(self, part: Part) -> tuple[str, str] | None:
        """Rule and reason of the first rule that the part breaks, or None."""
        for member in part.members:
            for rule, reason in self._faults(member):
                return f"shop.{rule}", reason
        return None

    def _faults(self, member: Member) -> Iterator[tuple[str, str]]:
        if self.least_wall is not None:
            for what, size in [*walls(member), *_left_by_cuts(member)]:
                if size < self.least_wall * JUST:
                    yield "least_wall", f"{what} is {size:.6g} mm thick; at least {self.least_wall:g} mm"
        if self.tool_radius is not None:
            for what, radius in inner_corners(member):
                if radius < self.tool_radius * JUST:
                    yield "tool_radius", f"{what} has a radius of {radius:.6g} mm; at least {self.tool_radius:g} mm"
        if self.edge_distance is not None:
            for what, distance, diameter in _edge_distances(member):
                if distance < self.edge_distance * diameter * JUST:
                    yield "edge_distance", (f"{what} is {distance:.6g} mm away, {distance / diameter:.3g} diameters; "
                                            f"at least {self.edge_distance:g}")  # fmt: skip


def read_shop(reading: Reading, spec: ShopSpec) -> Shop:
    """`[shop]` in numbers; keeps problems."""
    wall = reading.number("shop.least_wall", spec.least_wall, SIZE) if spec.least_wall is not None else None
    tool = reading.number("shop.tool_radius", spec.tool_radius, SIZE) if spec.tool_radius is not None else None
    edge = None
    if spec.edge_distance is not None:
        edge = reading.number("shop.edge_distance", spec.edge_distance, OfKind("number", above=0.0))
    return Shop(wall, tool, edge)


def _left_by_cuts(member: Member) -> Iterator[tuple[str, float]]:
    """What each cut leaves beside it: to free edges and ends of the member, and to other cuts of its wall."""
    rooms = rooms_of(member)
    for i, room in enumerate(rooms):
        for edge, distance in _to_edges(member, room):
            yield f"what {room.cut.name} leaves to the {edge}", distance - room.radius
        for other in rooms[:i]:
            if same_wall(room.cut, other.cut):
                left = gap(ring(room.points), ring(other.points)) - room.radius - other.radius
                yield f"what {other.cut.name} and {room.cut.name} leave between them", left


def _to_edges(member: Member, room: Room) -> Iterator[tuple[str, float]]:
    """Distance of a cut's core (a hole's middle) from each free edge of its wall, and from the ends, mm."""
    for edge in room.edges:
        yield edge.name, gap(ring(room.points), chain(edge.points))
    yield "start", min(x for x, _ in room.points)
    yield "end", length_of(member) - max(x for x, _ in room.points)


def _edge_distances(member: Member) -> Iterator[tuple[str, float, float]]:
    for room in rooms_of(member):
        if room.cut.kind == "hole":
            for edge, distance in _to_edges(member, room):
                yield f"the {edge} beside {room.cut.name}", distance, room.cut.depth
