"""A force per length on a face, as a traction even across the face's width."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from fem.solid.frame import Frame
from fem.solid.region import Region
from fem.solid.shape import Array, facet_points
from geometry.part import LineLoad
from geometry.problem import SolveError
from mesher.named_mesh import NamedMesh

_SAMPLES = 400


def area_density(mesh: NamedMesh, region: Region, frame: Frame, at: Array) -> Array:
    """(s,) area of the region's surface for a length along the member, dA/dx in mm, at stations `at`.

    Each flat corner triangle cut at x gives its segment's length over the sine between its normal and x.
    """
    corners = frame.local(mesh.nodes[:, region.facets[:3]])  # (3, 3 corners, k)
    order = np.argsort(corners[0], axis=0)
    x, y, z = (np.take_along_axis(corners[i], order, axis=0) for i in range(3))
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0], axis=0)
    normal /= np.linalg.norm(normal, axis=0)
    sine = np.sqrt(np.clip(1.0 - normal[0] ** 2, 1e-12, None))
    out = np.zeros(at.size)
    span = x[2] - x[0]
    with np.errstate(divide="ignore", invalid="ignore"):
        t = np.where(span > 0, (x[1] - x[0]) / span, 0.0)
    longest = np.hypot(y[0] + t * (y[2] - y[0]) - y[1], z[0] + t * (z[2] - z[0]) - z[1]) / sine
    for k, station in enumerate(at):
        before = (x[0] <= station) & (station < x[1])
        after = (x[1] <= station) & (station < x[2])
        part = np.zeros(x.shape[1])
        part[before] = (station - x[0][before]) / (x[1] - x[0])[before]
        part[after] = (x[2][after] - station) / (x[2] - x[1])[after]
        out[k] = (part * longest).sum()
    return out


def line_traction(
    mesh: NamedMesh, region: Region, load: LineLoad, frame: Frame
) -> tuple[Callable[[Array, Array], Array], Array, Array]:
    """Traction of a line load, and its declared force (N) and moment about the global origin (N mm).

    The traction is q(x) over dA/dx; two factors in each direction (constant and linear in x) make the resultant and
    its first moment along the member exact on the mesh. The declared moment takes the load at the middle of the face's
    width.

    Raises
    ------
    SolveError
        When the region does not lie between the load's stations, or the factors move the load by more than 2 %.
    """
    x_nodes = frame.local(mesh.nodes[:, region.nodes])[0]
    if abs(x_nodes.min() - load.start) > 1e-3 * frame.length or abs(x_nodes.max() - load.end) > 1e-3 * frame.length:
        raise SolveError(
            f"The line load {load.name!r} runs from {load.start:.6g} to {load.end:.6g} mm, but its region "
            f"lies between {x_nodes.min():.6g} and {x_nodes.max():.6g} mm."
        )
    length = load.end - load.start
    at = load.start + length * (np.arange(_SAMPLES) + 0.5) / _SAMPLES
    density = area_density(mesh, region, frame, at)
    first, last = np.array(load.first, float), np.array(load.last, float)
    _, points, normals = facet_points(mesh.nodes, region.facets)
    dA = np.linalg.norm(normals, axis=0)

    def shares(position: Array) -> tuple[Array, Array]:
        x = frame.local(position)[0]
        return (x - load.start) / length, 1.0 / np.interp(x, at, density)

    s, inverse = shares(points)
    moments = [float((s**k * inverse * dA).sum()) for k in range(3)]
    basis = np.array([[moments[0] - moments[1], moments[1]], [moments[1] - moments[2], moments[2]]])
    target = length * np.array([(first + last) / 2, first / 6 + last / 3])
    ends = np.linalg.solve(basis, target)  # corrected first and last, (2, 3)
    largest = max(np.abs(first).max(), np.abs(last).max(), 1e-300)
    moved = float(np.abs(ends - np.array([first, last])).max() / largest)
    if moved > 0.02:
        raise SolveError(
            f"The line load {load.name!r} cannot be spread over its face: the intensity would change by "
            f"{100 * moved:.1f} %. The face may have large openings; load two stretches instead."
        )

    def traction(position: Array, _: Array) -> Array:
        s, inverse = shares(position)
        shape = (3, *[1] * s.ndim)
        return np.asarray((ends[0].reshape(shape) * (1 - s) + ends[1].reshape(shape) * s) * inverse)

    middle = _middle_line(mesh, region, frame, at)
    q = first[:, None] * (1 - (at - load.start) / length) + last[:, None] * (at - load.start) / length
    moment = np.cross(middle, q, axis=0).sum(axis=1) * length / _SAMPLES
    return traction, length * (first + last) / 2, moment


def _middle_line(mesh: NamedMesh, region: Region, frame: Frame, at: Array) -> Array:
    """(3, s) middle of the face's width at stations, global, by linear fit of the region's two sides."""
    local = frame.local(mesh.nodes[:, region.facets[:3]])
    out = np.empty((3, at.size))
    pairs = ((0, 1), (1, 2), (2, 0))
    for k, x in enumerate(at):
        cut = []
        for i, j in pairs:
            a, b = local[:, i], local[:, j]
            crossing = (a[0] - x) * (b[0] - x) <= 0
            crossing &= a[0] != b[0]
            t = (x - a[0][crossing]) / (b[0] - a[0])[crossing]
            cut.append(a[1:, crossing] + t * (b[1:, crossing] - a[1:, crossing]))
        points = np.concatenate(cut, axis=1)
        if not points.size:
            raise SolveError(f"The region {region.name!r} is interrupted at {x:.6g} mm.")
        out[0, k] = x
        out[1:, k] = (points.min(axis=1) + points.max(axis=1)) / 2
    return frame.origin[:, None] + frame.axes.T @ out
