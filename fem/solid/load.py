"""Loads as tractions on facets, force per volume and free expansion, with the resultant each one must have.

A load knows its traction as a function of position and outward normal, so that it can be integrated over whole
facets (the load vector) and over parts of facets (the section forces). A moment on a region is a traction linear
over its area, which is also how a force-distributing (`average`) coupling acts.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from fem.solid.frame import member_frame
from fem.solid.kernels.mesh_graph import add_facets
from fem.solid.line_traction import line_traction
from fem.solid.piece import SurfacePiece, piece_forces
from fem.solid.region import Region, surface_region
from fem.solid.shape import Array, facet_points
from fem.solid.strip import TravelledFace
from geometry.part import (
    BearingLoad,
    BodyLoad,
    LineLoad,
    Load,
    Part,
    Pressure,
    RegionLoad,
    RemotePoint,
    StripLoad,
    TemperatureLoad,
)
from geometry.problem import SolveError
from mesher.named_mesh import NamedMesh

AXIAL_ALLOWED = 1e-3
"""Part of a bearing load that may seem to lie along the axis of a meshed hole, whose normals give the axis only so
exactly (the spec holds the declared force to the declared axis)."""

@dataclass(frozen=True, slots=True)
class SolidLoad:
    """One load of the part with factor 1.

    `force_per_mass` (3,) acts on all material, `expansion` is the temperature change, K. `force` and `moment` (about
    the global origin) are the *declared* resultant; None where the declaration does not fix it. `arm` (mm) is the
    length that scales the moment check. `push` (N) scales both checks where it is more than the declared force: a
    pressure on a closed surface has next to no resultant.
    """

    name: str
    pieces: tuple[SurfacePiece, ...] = ()
    force_per_mass: Array = field(default_factory=lambda: np.zeros(3))
    change: float = 0.0
    force: Array | None = None
    moment: Array | None = None
    arm: float = 1.0
    push: float = 0.0
    allowed: float = 1e-9
    force_allowed: float = 1e-9


def linear_traction(region: Region, force: Array, moment: Array) -> SurfacePiece:
    """Traction force/A + w x r with the resultant force and moment about the area centroid."""
    turn = np.linalg.solve(region.second, moment)
    even = force / region.area

    def traction(points: Array, normals: Array) -> Array:
        shape = (3, *[1] * (points.ndim - 1))
        arms = points - region.centroid.reshape(shape)
        return even.reshape(shape) + np.cross(turn, arms, axisb=0, axisc=0)

    return SurfacePiece(region.facets, traction)


def pressure_piece(region: Region, value: float) -> SurfacePiece:
    """Pressure against the outward normal."""
    return SurfacePiece(region.facets, lambda points, normals: -value * normals)


def bearing_piece(mesh: NamedMesh, region: Region, force: Array, name: str) -> SurfacePiece:
    """Radial pressure a.m where positive, m the inward normal: cosine over the pushed half.

    The vector a is found so that the resultant is the force; on a round hole it is parallel to the force.

    Raises
    ------
    SolveError
        When the force is not square to the hole's axis.
    """
    _, _, normals = facet_points(mesh.nodes, region.facets)
    dA = np.linalg.norm(normals, axis=0)
    axis = _hole_axis(-normals / dA, dA, force, name, region.name)

    def radial(inward: Array) -> Array:
        # the meshed hole is not quite round: what its normals have along the axis is dropped
        return inward - np.tensordot(axis, inward, axes=1) * axis.reshape(3, *(1,) * (inward.ndim - 1))

    m = radial(-normals / dA)
    a = force.copy()
    for _ in range(50):
        pushed = dA * (np.einsum("i,ikq->kq", a, m) > 0)
        J = np.einsum("ikq,jkq,kq->ij", m, m, pushed)
        new = np.linalg.pinv(J, rcond=1e-6, hermitian=True) @ force
        done = np.linalg.norm(new - a) <= 1e-12 * np.linalg.norm(new)
        a = new
        if done:
            break
    def traction(points: Array, normals: Array) -> Array:
        inward = radial(-normals)
        return np.maximum(np.tensordot(a, inward, axes=1), 0.0) * inward

    return SurfacePiece(region.facets, traction)


def _hole_axis(m: Array, dA: Array, force: Array, name: str, where: str) -> Array:
    """(3,) axis of a hole, the direction that its normals m (3, k, q) have least of, made square to the force.

    Raises `SolveError` when the force is not square to it within the roughness of a meshed hole.
    """
    _, vectors = np.linalg.eigh(np.einsum("ikq,jkq,kq->ij", m, m, dA))
    axis = vectors[:, 0]
    size = float(np.linalg.norm(force))
    if size == 0.0:
        return axis
    along = float(axis @ force)
    if abs(along) > AXIAL_ALLOWED * size:
        raise SolveError(
            f"The bearing load {name!r} has {abs(along):.3g} N along the axis of {where!r} that no radial "
            "pressure can carry. Give a force square to the hole's axis."
        )
    axis = axis - along * force / size**2
    return axis / np.linalg.norm(axis)


def _about_origin(force: Array, moment: Array, at: Array) -> Array:
    return moment + np.cross(at, force)


def _rim_vector_area(mesh: NamedMesh, facets: NDArray[np.int64]) -> Array:
    """Vector area from the facets' curved edges alone (half the loop integral of x cross dx), mm^2."""
    t, w = np.polynomial.legendre.leggauss(4)
    t, w = (t + 1) / 2, w / 2
    shape = np.array([(1 - t) * (1 - 2 * t), t * (2 * t - 1), 4 * t * (1 - t)])
    slope = np.array([4 * t - 3, 4 * t - 1, 4 - 8 * t])
    total = np.zeros(3)
    for a, b, c in ((0, 1, 3), (1, 2, 4), (2, 0, 5)):
        x = mesh.nodes[:, facets[[a, b, c]]]
        total += 0.5 * (
            np.cross(np.einsum("iak,aq->ikq", x, shape), np.einsum("iak,aq->ikq", x, slope), axis=0) * w
        ).sum(axis=(1, 2))
    return total


def solid_loads(part: Part, mesh: NamedMesh) -> dict[str, SolidLoad]:
    """Every load of the part by name; the masses of remote points are added to the body loads."""
    regions: dict[str, Region] = {}
    faces: dict[str, TravelledFace] = {}

    def region(name: str) -> Region:
        if name not in regions:
            regions[name] = surface_region(mesh, name)
        return regions[name]

    def face(name: str) -> TravelledFace:
        if name not in faces:
            member = next(m for m in part.members if name.startswith(m.name + "."))
            faces[name] = TravelledFace(mesh.nodes, region(name), member_frame(member))
        return faces[name]

    remote = [load for load in part.loads if isinstance(load, RemotePoint) and load.mass > 0]
    return {load.name: _solid_load(part, mesh, load, region, face, remote) for load in part.loads}


def _solid_load(
    part: Part,
    mesh: NamedMesh,
    load: Load,
    region: Callable[[str], Region],
    face: Callable[[str], TravelledFace],
    remote: Iterable[RemotePoint],
) -> SolidLoad:
    match load:
        case RegionLoad():
            r, force, moment = region(load.on), np.array(load.force, float), np.array(load.moment, float)
            return SolidLoad(
                load.name,
                (linear_traction(r, force, moment),),
                force=force,
                moment=_about_origin(force, moment, r.centroid),
                arm=_size(mesh, r),
            )
        case RemotePoint():
            r, force = region(load.on), np.array(load.force, float)
            at = np.array(load.point, float)
            total = _about_origin(force, np.array(load.moment, float), at)
            piece = linear_traction(r, force, total - np.cross(r.centroid, force))
            return SolidLoad(
                load.name,
                (piece,),
                force=force,
                moment=total,
                arm=_size(mesh, r) + float(np.linalg.norm(at - r.centroid)),
            )
        case Pressure():
            r = region(load.on)
            return SolidLoad(
                load.name,
                (pressure_piece(r, load.value),),
                force=-load.value * _rim_vector_area(mesh, r.facets),
                arm=_size(mesh, r),
                push=abs(load.value) * r.area,
            )
        case BearingLoad():
            r, force = region(load.on), np.array(load.force, float)
            return SolidLoad(
                load.name,
                (bearing_piece(mesh, r, force, load.name),),
                force=force,
                moment=np.cross(r.centroid, force),
                arm=_size(mesh, r),
                allowed=0.02,
            )
        case LineLoad():
            member = next(m for m in part.members if load.on.startswith(m.name + "."))
            r = region(f"{member.name}.load:{load.name}")
            traction, force, moment = line_traction(mesh, r, load, member_frame(member))
            return SolidLoad(
                load.name,
                (SurfacePiece(r.facets, traction),),
                force=force,
                moment=moment,
                arm=_size(mesh, r),
                allowed=0.02,
            )
        case StripLoad():
            strips, force, moment = face(load.on).strips(load)
            return SolidLoad(load.name, strips, force=force, moment=moment, arm=_size(mesh, region(load.on)))
        case BodyLoad():
            b = np.array(load.force_per_mass, float)
            pieces = []
            for point in remote:
                r, force = region(point.on), point.mass * b
                pieces.append(linear_traction(r, force, np.cross(np.array(point.point) - r.centroid, force)))
            return SolidLoad(load.name, tuple(pieces), force_per_mass=b)
        case TemperatureLoad():
            return SolidLoad(
                load.name,
                change=load.change,
                force=np.zeros(3),
                moment=np.zeros(3),
                arm=float(np.ptp(mesh.nodes, axis=1).max()),
            )


def _size(mesh: NamedMesh, region: Region) -> float:
    return float(np.linalg.norm(np.ptp(mesh.nodes[:, region.nodes], axis=1)))


def surface_vector(mesh: NamedMesh, piece: SurfacePiece, out: Array | None = None) -> Array:
    """(n, 3) consistent nodal forces of a traction, N; added to `out` where it is given."""
    out = np.zeros((mesh.nodes.shape[1], 3)) if out is None else out
    add_facets(piece.facets, piece_forces(mesh.nodes, piece), out)
    return out
