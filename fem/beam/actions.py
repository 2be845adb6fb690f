"""Loads and supports of a part as forces and rows on the freedoms of the beam model.

All vectors are in member axes. A node's freedoms are (ux, uy, uz, rx, ry, rz, chi) of the declared line's point; a
region that is held or loaded as a rigid body and is longer than one node has six freedoms of its own, at its centroid.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from fem.beam.equations import Row
from fem.beam.mesh import BeamMesh
from fem.beam.regions import (
    CutFaces,
    EndFace,
    Face,
    Region,
    linear_load,
    linear_traction,
    rigid_rows,
    wrench,
)
from fem.beam.strip_load import strip_forces
from geometry.part import (
    BearingLoad,
    BodyLoad,
    LineLoad,
    Load,
    Pressure,
    RegionLoad,
    RemotePoint,
    StripLoad,
    Support,
    TemperatureLoad,
)
from geometry.problem import RunError

Array = NDArray[np.float64]
DIRECTIONS = ("x", "y", "z")
KNIFE_EDGE = 0.25
"""A patch shorter than this share of the section's size is held at its middle line only (judgement, no source)."""


@dataclass
class Forces:
    """One load: forces on the freedoms (n,), on the lengths (m, 12), and the free strain (temperature change, K)."""

    freedoms: Array
    lengths: Array
    change: float = 0.0


@dataclass
class Actions:
    """Turns loads into `Forces` and supports into rows; owns the freedoms of rigid regions."""

    mesh: BeamMesh
    rigid_at: dict[str, int] = field(default_factory=dict)
    """Region name -> its first extra freedom."""
    rigid_points: list[Array] = field(default_factory=list)
    ties: list[Row] = field(default_factory=list)
    regions: dict[str, Region] = field(default_factory=dict)

    def __post_init__(self) -> None:
        part = self.mesh.part
        rigid = [s.on for s in part.supports if s.coupling == "rigid"]
        rigid += [v.on for v in part.loads if isinstance(v, RegionLoad | RemotePoint) and v.coupling == "rigid"]
        for name in dict.fromkeys(rigid):
            region = self.region(name)
            if not isinstance(region, EndFace) and not (isinstance(region, CutFaces) and len(set(region.nodes)) == 1):
                self.rigid_at[name] = 7 * len(self.mesh.x) + 6 * len(self.rigid_points)
                self.rigid_points.append(region.centroid)
        for name in dict.fromkeys(rigid):
            self._tie(self.region(name))

    def region(self, name: str) -> Region:
        """The region, worked out once."""
        if name not in self.regions:
            self.regions[name] = self.mesh.region(name)
        return self.regions[name]

    @property
    def freedoms(self) -> int:
        return 7 * len(self.mesh.x) + 6 * len(self.rigid_points)

    def rigid_motions(self) -> Array:
        """(n_freedoms, 6) the part's rigid motions (about the line's start)."""
        out = np.zeros((self.freedoms, 6))
        for i, x in enumerate(self.mesh.x):
            out[7 * i:7 * i + 6] = _moved(np.array([x, 0.0, 0.0]))
        for k, point in enumerate(self.rigid_points):
            out[7 * len(self.mesh.x) + 6 * k:][:6] = _moved(point)
        return out

    # ---- loads

    def forces(self, load: Load) -> Forces:
        """One load with factor 1."""
        zero = Forces(np.zeros(self.freedoms), np.zeros((len(self.mesh.x) - 1, 12)))
        R = self.mesh.axes
        match load:
            case RegionLoad():
                self._on_region(zero, load.on, R @ load.force, R @ load.moment, load.coupling == "rigid")
            case RemotePoint():
                self._remote(zero, load, R @ load.force, R @ load.moment)
            case Pressure():
                self._pressure(zero, load)
            case BearingLoad():
                region = self.region(load.on)
                if not isinstance(region, CutFaces):
                    raise RunError("beam", f"load {load.name}: {load.on} is no hole")
                self._on_region(zero, load.on, R @ load.force, np.zeros(3), False)
            case LineLoad():
                self._line_load(zero, load)
            case StripLoad():
                lengths, c = strip_forces(self.mesh, load)
                zero.lengths[lengths] += c
            case BodyLoad():
                zero.lengths += self.weight(R @ load.force_per_mass)
                for point in self.mesh.part.loads:
                    if isinstance(point, RemotePoint) and point.mass:
                        self._remote(zero, point, point.mass * (R @ load.force_per_mass), np.zeros(3))
            case TemperatureLoad():
                zero.change = load.change
        return zero

    def weight(self, acceleration: Array) -> Array:
        """(m, 12) load per length of `acceleration` (member axes, mm/s^2) on the part's own mass, at the centroid."""
        p = self.mesh.sections.net(self.mesh.gauss)
        q = self.mesh.part.material.density * p.area[:, None] * acceleration
        r = np.column_stack([np.zeros_like(p.yc), p.yc, p.zc])
        return linear_load(np.hstack([q, np.cross(r, q)]).reshape(-1, 2, 6), np.diff(self.mesh.x))

    def _remote(self, out: Forces, load: RemotePoint, force: Array, moment: Array) -> None:
        centre = self.region(load.on).centroid
        arm = self.mesh.axes @ np.subtract(load.point, self.mesh.member.start) - centre
        self._on_region(out, load.on, force, moment + np.cross(arm, force), load.coupling == "rigid")

    def _on_region(self, out: Forces, name: str, force: Array, moment: Array, rigid: bool) -> None:
        """Force and moment about the region's area centroid."""
        region = self.region(name)
        x = self.mesh.x
        if rigid and name in self.rigid_at:
            at = self.rigid_at[name]
            out.freedoms[at:at + 6] += np.concatenate([force, moment])
        elif isinstance(region, EndFace):
            out.freedoms[7 * region.node:7 * region.node + 6] += wrench(force, moment, region.centroid, x[region.node])
        elif isinstance(region, Face):
            out.lengths[region.lengths] += region.spread(force, moment)
        else:
            if rigid or len(set(region.nodes)) == 1:
                k = int(region.nodes[0])
                out.freedoms[7 * k:7 * k + 6] += wrench(force, moment, region.centroid, x[k])
                return
            traction = linear_traction(region.points, region.weight, force, moment)(region.points)
            for k, point, f in zip(region.nodes, region.points, traction * region.weight[:, None], strict=True):
                out.freedoms[7 * k:7 * k + 6] += wrench(f, np.zeros(3), point, x[k])

    def _pressure(self, out: Forces, load: Pressure) -> None:
        region = self.region(load.on)
        if isinstance(region, EndFace):
            self._on_region(out, load.on, -load.value * region.area * region.outward, np.zeros(3), False)
        elif isinstance(region, Face):
            out.lengths[region.lengths] += region.pushed(load.value)
        else:
            what = load.on.partition(".")[2]
            for cut in self.mesh.member.cuts:
                if cut.kind == "notch" and what in (cut.name, cut.group):
                    raise RunError("beam", f"load {load.name}: pressure in a notch is not in the beam model; put a "
                                   "region force on it instead")
            # The pressure on the inner faces of a through cut has no resultant.

    def _line_load(self, out: Forces, load: LineLoad) -> None:
        region = self.region(f"{self.mesh.member.name}.load:{load.name}")
        assert isinstance(region, Face)
        R = self.mesh.axes
        c = np.zeros((len(region.strips), 6))
        for k, (x, s) in enumerate(zip(self.mesh.gauss.reshape(-1, 2)[region.lengths].ravel(), region.strips,
                                       strict=True)):
            if not len(s.points):
                raise RunError("beam", f"load {load.name}: a cut leaves nothing of its face at x = {x:.6g} mm; load "
                               "two stretches instead")
            t = (x - load.start) / (load.end - load.start)
            q = (1.0 - t) * (R @ load.first) + t * (R @ load.last)
            middle = s.weight @ s.points / s.weight.sum()
            c[k] = wrench(q, np.zeros(3), middle, x)
        out.lengths[region.lengths] += linear_load(c.reshape(-1, 2, 6), region.h)

    # ---- supports

    def rows(self, support: Support, changes: Array) -> list[Row]:
        """Rows of one support; `changes` (cases,) is the temperature change of each case."""
        region = self.region(support.on)
        expansion = self.mesh.part.material.expansion * changes
        if support.coupling == "surface":
            return self._surface(support, region, expansion)
        rows = []
        for freedom, value in support.held.items():
            if freedom == "normal":
                raise RunError("beam", f"support {support.name}: `normal` goes with the coupling surface only")
            turning = freedom.startswith("r")
            d = self._direction(support, freedom[-1])
            if support.coupling == "rigid":
                vector = self._rigid_row(support.on, region, d, turning)
            else:
                vector = self._average_row(support.on, d, turning)
            # Free expansion moves the region's centroid across the member.
            free = 0.0 if turning else float(d[1:] @ region.centroid[1:])
            rows.append(Row(vector, value - expansion * free, support.name))
        return rows

    def _direction(self, support: Support, letter: str) -> Array:
        d = np.eye(3)[DIRECTIONS.index(letter)]
        return d if support.axes == "member" else np.asarray(self.mesh.axes @ d)

    def motion_rows(self, name: str, rigid: bool) -> Array:
        """(6, n_freedoms) displacement of a region's centroid and rotation, member axes, as one body or on average."""
        region = self.region(name)
        return np.array([self._rigid_row(name, region, d, turning) if rigid else self._average_row(name, d, turning)
                         for turning in (False, True) for d in np.eye(3)])

    def _rigid_row(self, name: str, region: Region, d: Array, turning: bool) -> Array:
        vector = np.zeros(self.freedoms)
        force, moment = (np.zeros(3), d) if turning else (d, np.zeros(3))
        if name in self.rigid_at:
            vector[self.rigid_at[name]:][:6] = np.concatenate([force, moment])
        else:
            k = region.node if isinstance(region, EndFace) else int(region.nodes[0])  # type: ignore[union-attr]
            vector[7 * k:7 * k + 6] = wrench(force, moment, region.centroid, self.mesh.x[k])
        return vector

    def _average_row(self, name: str, d: Array, turning: bool) -> Array:
        """Mean displacement or rotation along d: by reciprocity the nodal forces of a unit load on the region."""
        unit = Forces(np.zeros(self.freedoms), np.zeros((len(self.mesh.x) - 1, 12)))
        force, moment = (np.zeros(3), d) if turning else (d, np.zeros(3))
        self._on_region(unit, name, force, moment, False)
        vector = unit.freedoms
        for e in np.flatnonzero(np.abs(unit.lengths).any(axis=1)):
            n = 7 if self.mesh.line.warping[e] else 6
            M = self.mesh.line.half[int(e)][1] @ self.mesh.line.half[int(e)][0]
            load = np.append(unit.lengths[e], 0.0)
            f = -np.linalg.solve(M[:n, n:2 * n], M[:n, 2 * n:] @ load)
            vector[7 * e:7 * e + n] += f
            vector[7 * e + 7:7 * e + 7 + n] -= M[n:2 * n, n:2 * n] @ f + M[n:2 * n, 2 * n:] @ load
        return vector

    def _surface(self, support: Support, region: Region, expansion: Array) -> list[Row]:
        """Point-wise hold: what it implies for each section is found from the points of the region there."""
        rows: list[Row] = []
        for node, points, normals in _sites(region):
            free = rigid_rows(points, self.mesh.x[node])
            vectors, values = [], []
            for freedom, value in support.held.items():
                if freedom.startswith("r"):
                    raise RunError("beam", f"support {support.name}: rotations are held by coupling rigid or average")
                if freedom == "normal" and isinstance(region, CutFaces):
                    raise RunError("beam", f"support {support.name}: `normal` is for plane faces")
                d = normals if freedom == "normal" else np.tile(self._direction(support, freedom), (len(points), 1))
                vectors.append(np.einsum("ki,kij->kj", d, free))
                values.append(value - np.outer((d[:, 1:] * points[:, 1:]).sum(axis=1), expansion))
            rows += _reduced(np.vstack(vectors), np.vstack(values), node, self.freedoms, support.name, self.mesh.length)
            axial = any(abs(self._direction(support, f)[0]) > 0.5 for f in support.held if f in DIRECTIONS)
            if isinstance(region, EndFace) and (axial or "normal" in support.held):
                rows.append(self._no_warping(node, support.name, len(expansion)))
        return rows

    def _no_warping(self, node: int, owner: str, cases: int) -> Row:
        vector = np.zeros(self.freedoms)
        vector[7 * node + 6] = 1.0
        return Row(vector, np.zeros(cases), owner)

    def _tie(self, region: Region) -> None:
        """Rows that make a region move as one body; an end face can then not warp."""
        if isinstance(region, EndFace):
            self.ties.append(self._no_warping(region.node, "", 1))
            return
        if region.name not in self.rigid_at:
            return
        at = self.rigid_at[region.name]
        for node, points, _ in _sites(region):
            own = rigid_rows(points, self.mesh.x[node])
            shifted = points.copy()
            body = rigid_rows(shifted - region.centroid, 0.0)
            scale = np.array([1.0] * 3 + [1.0 / self.mesh.length] * 3)
            _, s, vt = np.linalg.svd(own.reshape(-1, 6) * scale, full_matrices=False)
            keep = s > 1e-9 * s[0]
            weights = (np.linalg.pinv(own.reshape(-1, 6) * scale) @ body.reshape(-1, 6))  # section motion per body's
            for v in vt[keep]:
                vector = np.zeros(self.freedoms)
                vector[7 * node:7 * node + 6] = v / scale
                vector[at:at + 6] = -v @ weights
                self.ties.append(Row(vector, np.zeros(1), ""))


def _moved(point: Array) -> Array:
    """(6, 6) motion of a point's six freedoms in the six rigid motions about the origin."""
    out = np.eye(6)
    out[:3] = rigid_rows(point[None], 0.0)[0]
    return out


def _sites(region: Region) -> Sequence[tuple[int, Array, Array]]:
    """(node, points, outward unit normals) of each section that a region touches."""
    if isinstance(region, EndFace):
        return [(region.node, region.corners, np.tile(region.outward, (len(region.corners), 1)))]
    if isinstance(region, Face):
        return _face_sites(region)
    out = []
    for node in sorted(set(region.nodes)):
        points = region.points[region.nodes == node]
        out.append((int(node), points, np.full((len(points), 3), np.nan)))
    return out


def _face_sites(region: Face) -> list[tuple[int, Array, Array]]:
    """Along a face, each section with a neighbouring point on the face before and behind.

    A face held along its length keeps its slope as well. Only a stretch shorter than a quarter of the section's
    size across is held like a knife edge, at its middle.
    """
    first = int(region.lengths[0])
    whole = [k for k, s in enumerate(region.ends) if len(s.points)]  # not where a cut takes the whole width
    size = max(float(np.ptp(region.ends[k].points[:, 1:], axis=0).max()) for k in whole)
    short = float(region.h.sum()) < KNIFE_EDGE * max(size, region.depth)
    which = [whole[len(whole) // 2]] if short else whole
    found = []
    for k in which:
        s = region.ends[k]
        unit = s.normal / np.linalg.norm(s.normal, axis=1, keepdims=True)
        points, normals = s.points, unit
        if not short:
            step = np.array([0.5 * float(region.h.min()), 0.0, 0.0])
            points, normals = np.vstack([points - step, points + step]), np.vstack([unit, unit])
        found.append((first + k, points, normals))
    return found


def _reduced(vectors: Array, values: Array, node: int, freedoms: int, owner: str, length: float) -> list[Row]:
    """Independent rows with the same solutions (least squares where they disagree)."""
    scale = np.array([1.0] * 3 + [1.0 / length] * 3)
    u, s, vt = np.linalg.svd(vectors * scale, full_matrices=False)
    keep = s > 1e-7 * s[0]
    rows = []
    for ui, si, vi in zip(u.T[keep], s[keep], vt[keep], strict=True):
        vector = np.zeros(freedoms)
        vector[7 * node:7 * node + 6] = vi / scale
        rows.append(Row(vector, ui @ values / si, owner))
    return rows
