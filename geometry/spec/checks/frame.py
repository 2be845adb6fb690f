"""Axes of a member for the checks of the spec (the two models work theirs out alone)."""

from __future__ import annotations

import math

from geometry.part import Member, Vector


def cross(a: Vector, b: Vector) -> Vector:
    """Vector product."""
    return (a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0])


def dot(a: Vector, b: Vector) -> float:
    """Scalar product."""
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2]


def size(a: Vector) -> float:
    """Length of a vector."""
    return math.sqrt(dot(a, a))


def scaled(a: Vector, factor: float) -> Vector:
    """A vector times a number."""
    return (a[0] * factor, a[1] * factor, a[2] * factor)


def plus(a: Vector, b: Vector) -> Vector:
    """Sum of two vectors."""
    return (a[0] + b[0], a[1] + b[1], a[2] + b[2])


def line_direction(member: Member) -> Vector:
    """Unit vector of the member's x; NaN when it has no length."""
    along = plus(member.end, scaled(member.start, -1.0))
    length = size(along)
    return scaled(along, 1.0 / length) if length > 0.0 else (math.nan,) * 3


def axes_of(member: Member) -> tuple[Vector, Vector, Vector]:
    """Unit vectors x, y, z of the member: x along the line, z = `up` made square, both turned by `roll`."""
    x = line_direction(member)
    z = plus(member.up, scaled(x, -dot(member.up, x)))
    z = scaled(z, 1.0 / size(z)) if size(z) > 0.0 else (math.nan,) * 3
    y = cross(z, x)
    c, s = math.cos(member.roll), math.sin(member.roll)
    return x, plus(scaled(y, c), scaled(z, s)), plus(scaled(z, c), scaled(y, -s))
