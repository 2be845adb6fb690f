"""Rounding single corners of a free outline."""

from __future__ import annotations

from collections.abc import Mapping

from fem.beam.outlines.loops import Corner, OutlineError, rounded_polygon
from geometry.outline import Edge, Line


def round_vertex(loop: tuple[Edge, ...], radii: Mapping[int, float]) -> tuple[Edge, ...]:
    """`loop` with the corner at the start of edge i rounded by ``radii[i]`` (mm).

    Both sides of such a corner must be straight; raises `OutlineError` otherwise, or when they are too short.
    """
    edges: list[Edge | None] = list(loop)
    arcs: dict[int, Edge] = {}
    for i, radius in radii.items():
        before, after = edges[i - 1], edges[i]
        if not isinstance(before, Line) or not isinstance(after, Line):
            y, z = loop[i].start
            raise OutlineError(f"the edge at ({y:g}, {z:g}) mm lies beside an arc and cannot be given a radius.")
        corner = rounded_polygon([Corner(*before.start), Corner(*before.end, radius), Corner(*after.end)])
        arc = next(e for e in corner if not isinstance(e, Line))
        edges[i - 1], edges[i], arcs[i] = Line(before.start, arc.start), Line(arc.end, after.end), arc
    rounded: list[Edge] = []
    for i, edge in enumerate(edges):
        if i in arcs:
            rounded.append(arcs[i])
        assert edge is not None
        if edge.start != edge.end:
            rounded.append(edge)
    return tuple(rounded)
