"""Places of greatest von Mises stress: where, how much, on which faces, and whether the value can converge."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
from scipy.spatial import cKDTree

from fem.solid.model import SolidModel
from fem.solid.result import CaseStress, PeakPlace
from fem.solid.shape import TET_EDGES, Array
from mesher.named_mesh import NamedMesh

COUNT = 8
REACH = 2.0
"""Influence of a place without a converged value, in local element sizes: common practice, no source."""
MERGE = 2.0
"""Maxima nearer than this many local element sizes are one place."""


def node_sizes(mesh: NamedMesh) -> Array:
    """(n,) mean length of the element edges at each node, mm (a mid-edge node counts half edges' corners)."""
    ends = mesh.nodes[:, mesh.tets[TET_EDGES]]
    length = np.linalg.norm(ends[:, :, 0] - ends[:, :, 1], axis=0)  # (6, m)
    mean = np.broadcast_to(length.mean(axis=0), mesh.tets.shape)
    n = mesh.nodes.shape[1]
    count = np.bincount(mesh.tets.ravel(), minlength=n)
    return np.asarray(np.bincount(mesh.tets.ravel(), weights=mean.ravel(), minlength=n) / np.maximum(count, 1))


def region_rim(mesh: NamedMesh, region: str) -> Array:
    """(3, k) nodes on the edge of a region: on its facets and on other boundary facets too."""
    own = mesh.facets[region]
    key = {tuple(t) for t in np.sort(own[:3], axis=0).T.tolist()}
    other = np.array([tuple(t) not in key for t in np.sort(mesh.boundary[:3], axis=0).T.tolist()], dtype=bool)
    nodes = np.intersect1d(own, mesh.boundary[:, other])
    return mesh.nodes[:, nodes]


def singular_places(model: SolidModel, sharp_edges: Sequence[tuple[str, Array]]) -> list[tuple[str, Array]]:
    """(reason, points (3, k)) where the exact stress is unbounded."""
    out = []
    for support in model.part.supports:
        out.append((f"rim of the held region {support.on} (support {support.name}): the exact stress is unbounded",
                    region_rim(model.mesh, support.on)))
    for load in model.part.loads:
        if getattr(load, "coupling", "") == "rigid":
            on = str(getattr(load, "on", ""))
            out.append((f"rim of the rigid region {on} (load {load.name}): the exact stress is unbounded",
                        region_rim(model.mesh, on)))
    for label, points in sharp_edges:
        out.append((f"sharp re-entrant edge {label}: the exact stress is unbounded", np.asarray(points).T))
    return [(reason, points) for reason, points in out if points.size]


def singular_nodes(mesh: NamedMesh, places: list[tuple[str, Array]], sizes: Array) -> np.ndarray:
    """(n,) index of the nearest singular place within reach of each node, -1 where there is none."""
    out, best = np.full(mesh.nodes.shape[1], -1), np.full(mesh.nodes.shape[1], np.inf)
    for k, (_, points) in enumerate(places):
        # the rim is given by points: its nodes lie up to half an element apart
        distance, _ = cKDTree(points.T).query(mesh.nodes.T)
        within = (distance <= REACH * sizes) & (distance < best)
        out[within], best[within] = k, distance[within]
    return out


def local_maxima(mesh: NamedMesh, values: Array) -> np.ndarray:
    """Nodes (sorted, greatest first) whose value no node of their elements exceeds."""
    highest = np.zeros(values.size)
    of_element = values[mesh.tets].max(axis=0)
    np.maximum.at(highest, mesh.tets.ravel(), np.broadcast_to(of_element, mesh.tets.shape).ravel())
    nodes = np.flatnonzero((values >= highest) & (values > 0))
    return nodes[np.argsort(-values[nodes], kind="stable")]


def peak_places(model: SolidModel, von_mises: Array, principal: Array, places: list[tuple[str, Array]],
                near: np.ndarray, sizes: Array) -> Iterator[PeakPlace]:
    """The highest local maxima of each case, those near each other merged into the greatest; at least the greatest
    established one is among them."""
    mesh = model.mesh
    for k, case in enumerate(model.part.cases):
        chosen: list[int] = []
        for node in local_maxima(mesh, von_mises[k]):
            established = near[node] < 0
            has_one = any(near[i] < 0 for i in chosen)
            if len(chosen) >= COUNT and (has_one or not established):
                if has_one:
                    break
                continue
            apart = np.linalg.norm(mesh.nodes[:, chosen] - mesh.nodes[:, [node]], axis=0)
            same = [near[i] == near[node] for i in chosen]
            if not ((apart < MERGE * sizes[node]) & np.array(same, dtype=bool)).any():
                chosen.append(int(node))
        for node in chosen:
            p = principal[k, :, node]
            regions = tuple(sorted(name for name, f in mesh.facets.items() if (f == node).any()))
            faces = tuple(sorted({int(i) for i in mesh.face_index[(mesh.boundary == node).any(axis=0)]}))
            x, y, z = map(float, mesh.nodes[:, node])
            yield PeakPlace(case.name, float(von_mises[k, node]), (x, y, z), node, regions, faces, bool(near[node] < 0),
                            places[near[node]][0] if near[node] >= 0 else "", float(p[np.abs(p).argmax()]))


def case_stresses(model: SolidModel, von_mises: Array, near: np.ndarray) -> Iterator[CaseStress]:
    """Largest stress and yield factor of each case, established and everywhere."""
    strength = model.part.material.yield_strength
    for k, case in enumerate(model.part.cases):
        established = float(von_mises[k, near < 0].max(initial=0.0))
        everywhere = float(von_mises[k].max(initial=0.0))
        factors = [strength / s if strength is not None and s > 0 else None for s in (established, everywhere)]
        yield CaseStress(case.name, established, everywhere, *factors)
