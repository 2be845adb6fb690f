"""Facts about a part that decide how closely beam and solid can be expected to agree.

All of it is read from the declared part and from the mesh; nothing is taken from either model's answers.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from geometry.part import (
    BearingLoad,
    BodyLoad,
    LineLoad,
    Member,
    Part,
    Pressure,
    RegionLoad,
    RemotePoint,
    StripLoad,
    Support,
)
from mesher.named_mesh import NamedMesh

Array = NDArray[np.float64]


def member_axes(member: Member) -> tuple[Array, Array, float]:
    """Origin (3,), rows x, y, z of the member's axes in global components (3, 3), and its length (mm)."""
    start, end = np.asarray(member.start, float), np.asarray(member.end, float)
    length = float(np.linalg.norm(end - start))
    x = (end - start) / length
    up = np.asarray(member.up, float)
    z = up - (up @ x) * x
    z /= np.linalg.norm(z)
    y = np.cross(z, x)
    c, s = np.cos(member.roll), np.sin(member.roll)
    return start, np.array([x, c * y + s * z, c * z - s * y]), length


@dataclass(frozen=True)
class Zone:
    """A stretch of the member (mm from its start) that something occupies."""

    start: float
    end: float
    what: str

    def distance(self, at: float) -> float:
        """How far a station lies outside the stretch (0 inside), mm."""
        return max(self.start - at, at - self.end, 0.0)

    def gap(self, other: Zone) -> float:
        """Free length between two stretches (0 where they meet), mm."""
        return max(self.start - other.end, other.start - self.end, 0.0)


@dataclass(frozen=True)
class Context:
    """One member of one part, as the judge sees it."""

    part: Part
    mesh: NamedMesh

    @property
    def member(self) -> Member:
        return self.part.members[0]

    @cached_property
    def _axes(self) -> tuple[Array, Array, float]:
        return member_axes(self.member)

    @property
    def length(self) -> float:
        return self._axes[2]

    @property
    def axes(self) -> Array:
        """(3, 3) rows x, y, z of the member's axes in global components."""
        return self._axes[1]

    @property
    def x_axis(self) -> Array:
        """(3,) direction of the member, global."""
        return self._axes[1][0]

    def local(self, points: Array) -> Array:
        """(n, 3) points in member axes from (3, n) global ones."""
        start, axes, _ = self._axes
        return (points.T - start) @ axes.T

    @cached_property
    def size(self) -> tuple[float, float]:
        """Extent of the part along the member's y and z (mm): its width and depth."""
        span = np.ptp(self.local(self.mesh.nodes), axis=0)
        return float(span[1]), float(span[2])

    @property
    def reach_of_disturbance(self) -> float:
        """Distance over which an end effect dies out: the larger of depth and width (Saint-Venant)."""
        return max(self.size)

    @property
    def slenderness(self) -> float:
        """Length over the larger of depth and width."""
        return self.length / max(self.size)

    def region_points(self, region: str) -> Array:
        """(n, 3) nodes of a region in member axes."""
        return self.local(self.mesh.nodes[:, np.unique(self.mesh.facets[region])])

    def zone(self, region: str, what: str) -> Zone:
        x = self.region_points(region)[:, 0]
        return Zone(float(x.min()), float(x.max()), what)

    def _load_regions(self) -> Iterable[tuple[str, str]]:
        for load in self.part.loads:
            if isinstance(load, LineLoad | BodyLoad | StripLoad):
                continue  # spread along the member: no disturbance of its own; strips have zones case by case
            if isinstance(load, RegionLoad | Pressure | BearingLoad | RemotePoint):
                yield load.on, load.name

    @cached_property
    def held_zones(self) -> tuple[Zone, ...]:
        return tuple(self.zone(s.on, f"support {s.name}") for s in self.part.supports)

    @cached_property
    def load_zones(self) -> dict[str, Zone]:
        """Stretch where each concentrated load enters, by its name; faces along most of the member do not count."""
        zones = {name: self.zone(region, f"load {name}") for region, name in self._load_regions()}
        return {name: z for name, z in zones.items() if z.end - z.start < 0.5 * self.length}

    @property
    def loaded_zones(self) -> tuple[Zone, ...]:
        return tuple(self.load_zones.values())

    @cached_property
    def _strip_zones(self) -> dict[str, tuple[Zone, ...]]:
        """Stretches under the axles of a travelling load, by case: it is elsewhere in every one."""
        strips = {load.name: load for load in self.part.loads if isinstance(load, StripLoad)}
        found: dict[str, tuple[Zone, ...]] = {}
        for case in self.part.cases:
            acting = [strips[name] for name, factor in case.factors.items() if name in strips and factor]
            found[case.name] = tuple(Zone(x - 0.5 * s.length, x + 0.5 * s.length, f"load {s.name}")
                                     for s in acting for x in s.centres)
        return found

    def strip_zones(self, case: str) -> tuple[Zone, ...]:
        """Stretches under the axles of the travelling load of a case."""
        return self._strip_zones.get(case, ())

    @cached_property
    def cut_zones(self) -> tuple[Zone, ...]:
        zones = []
        for cut in self.member.cuts:
            half = 0.5 * float(np.hypot(cut.length * np.cos(cut.turned), cut.depth * np.sin(cut.turned)))
            zones.append(Zone(cut.at - half, cut.at + half, f"cut {cut.name}"))
        return tuple(zones)

    @cached_property
    def _steps(self) -> tuple[tuple[Zone, float], ...]:
        found = []
        for a, b in pairwise(self.member.stations):
            if abs(a.at - b.at) < 1e-9:
                dims = {**self.member.section.dims, **a.dims}
                jump = max((abs(v - dims.get(k, v)) for k, v in b.dims.items()), default=0.0)
                found.append((Zone(a.at, a.at, f"step at {a.at:g} mm"), 0.5 * jump))
        return tuple(found)

    @property
    def step_zones(self) -> tuple[Zone, ...]:
        return tuple(zone for zone, _ in self._steps)

    @property
    def step_heights(self) -> tuple[float, ...]:
        """Half the largest change of a dimension at each step, mm."""
        return tuple(height for _, height in self._steps)

    def disturbed_by(self, at: float, case: str = "") -> tuple[str, ...]:
        """What lies within reach of a station, so that plane-section stresses are not expected there in the case."""
        reach = self.reach_of_disturbance
        ends = self.held_zones + self.loaded_zones + self.strip_zones(case)
        near_cut = 0.5 * reach
        found = [z.what for z in ends + self.step_zones if z.distance(at) < reach]
        found += [z.what for z in self.cut_zones if z.distance(at) < near_cut]
        return tuple(dict.fromkeys(found))

    def pressed(self, feature: str, case: str) -> tuple[str, ...]:
        """Axles of a travelling load that stand within reach of a cut or step (``arm.hole1``, ``arm.step@120``)."""
        name = feature.partition(".")[2]
        zones = [z for z in self.cut_zones if z.what == f"cut {name}"]
        if name.startswith("step@"):
            zones = [Zone(float(name[5:]), float(name[5:]), name)]
        near = [s.what for s in self.strip_zones(case) for z in zones if s.gap(z) < self.reach_of_disturbance]
        return tuple(dict.fromkeys(near))

    def inside(self, at: float) -> tuple[str, ...]:
        """What enters or holds the part at the very station, so that a cut there has no one section force."""
        tiny = 1e-6 * self.length
        return tuple(z.what for z in self.held_zones + self.loaded_zones if z.end - z.start > tiny
                     and z.start + tiny < at < z.end - tiny)

    def _held_rows(self, support: Support) -> Array:
        """Rows (k, 6) of the rigid motions that one support holds, its region taken as rigid."""
        points = self.mesh.nodes[:, np.unique(self.mesh.facets[support.on])].T
        centre = points.mean(axis=0)
        frame = np.eye(3) if support.axes == "global" else self._axes[1]
        index = {"x": 0, "y": 1, "z": 2, "rx": 0, "ry": 1, "rz": 2}
        rows = []
        spots = [centre] if support.coupling != "surface" else list(points[:: max(1, len(points) // 40)])
        for freedom in support.held:
            if freedom == "normal":
                normal = _mean_normal(self.mesh, support.on)
                rows += [np.r_[normal, np.cross(p, normal)] for p in spots]
            elif freedom.startswith("r"):
                rows.append(np.r_[np.zeros(3), frame[index[freedom]]])
            else:
                rows += [np.r_[frame[index[freedom]], np.cross(p, frame[index[freedom]])] for p in spots]
        return np.asarray(rows).reshape(-1, 6)

    @cached_property
    def determinate(self) -> bool:
        """True when equilibrium alone gives every reaction: the supports hold just six motions."""
        scale = np.r_[np.ones(3), np.full(3, 1.0 / self.length)]
        ranks = []
        for support in self.part.supports:
            rows = self._held_rows(support) * scale
            ranks.append(int(np.linalg.matrix_rank(rows, tol=1e-6 * np.sqrt(max(len(rows), 1)))) if rows.size else 0)
        return sum(ranks) == 6

    @property
    def prescribed(self) -> bool:
        """True when a support is moved, which loads an indeterminate part without any force."""
        return any(value != 0.0 for s in self.part.supports for value in s.held.values())


def _mean_normal(mesh: NamedMesh, region: str) -> Array:
    a, b, c = (mesh.nodes[:, mesh.facets[region][i]] for i in range(3))
    normal = np.cross(b - a, c - a, axis=0).sum(axis=1)
    size = float(np.linalg.norm(normal))
    return normal / size if size > 0 else normal
