"""Places of greatest von Mises stress: where, how much, on which faces, and whether the value can converge."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
import scipy.sparse as sp
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from fem.solid.model import SolidModel
from fem.solid.result import CaseStress, PeakPlace
from fem.solid.shape import TET_EDGES, Array
from mesher.named_mesh import NamedMesh

COUNT = 8
REACH = 2.0
"""Influence of a place without a converged value, in local element sizes: common practice, no source."""
SADDLE = 0.85
"""Two maxima are one place when the stress between them stays above this part of the lesser one."""
CANDIDATES = 200


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
        out.append(
            (
                f"rim of the held region {support.on} (support {support.name}): the exact stress is unbounded",
                region_rim(model.mesh, support.on),
            )
        )
    for load in model.part.loads:
        if getattr(load, "coupling", "") == "rigid":
            on = str(getattr(load, "on", ""))
            out.append(
                (
                    f"rim of the rigid region {on} (load {load.name}): the exact stress is unbounded",
                    region_rim(model.mesh, on),
                )
            )
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


def surface_graph(mesh: NamedMesh) -> sp.csr_matrix:
    """(n, n) neighbours on the surface: the nodes of one half edge of a boundary triangle."""
    halves = ((0, 3), (3, 1), (1, 4), (4, 2), (2, 5), (5, 0), (3, 4), (4, 5), (5, 3))
    rows = np.concatenate([mesh.boundary[i] for i, _ in halves])
    columns = np.concatenate([mesh.boundary[j] for _, j in halves])
    n = mesh.nodes.shape[1]
    graph = sp.coo_matrix((np.ones(rows.size), (rows, columns)), shape=(n, n)).tocsr()
    return (graph + graph.T).tocsr()


def local_maxima(graph: sp.csr_matrix, values: Array, near: np.ndarray) -> Iterator[int]:
    """Surface nodes whose value no neighbour exceeds, greatest first, one for each hill.

    A maximum belongs to the hill of a greater one (of the same kind: established, or at the same singular place) when
    a path on the surface joins them on which the stress stays above `SADDLE` of the lesser one.
    """
    owner = np.repeat(np.arange(values.size), np.diff(graph.indptr))
    highest = np.zeros(values.size)
    np.maximum.at(highest, owner, values[graph.indices])
    nodes = np.flatnonzero((values >= highest) & (values > 0) & (np.diff(graph.indptr) > 0))
    accepted: list[int] = []
    for node in nodes[np.argsort(-values[nodes], kind="stable")][:CANDIDATES]:
        rivals = [i for i in accepted if near[i] == near[node]]
        if rivals:
            above = np.flatnonzero(values >= SADDLE * values[node])
            _, label = connected_components(graph[above][:, above], directed=False)
            mine = label[np.searchsorted(above, node)]
            if (label[np.searchsorted(above, rivals)] == mine).any():
                continue
        accepted.append(int(node))
        yield int(node)


def peak_places(
    model: SolidModel, von_mises: Array, principal: Array, places: list[tuple[str, Array]], near: np.ndarray
) -> Iterator[PeakPlace]:
    """The highest hills of each case, at most `COUNT`, and at least the highest established one."""
    mesh = model.mesh
    graph = surface_graph(mesh)
    for k, case in enumerate(model.part.cases):
        chosen: list[int] = []
        for node in local_maxima(graph, von_mises[k], near):
            missing = not any(near[i] < 0 for i in chosen)
            if len(chosen) < COUNT or (missing and near[node] < 0):
                chosen.append(node)
            if len(chosen) >= COUNT and any(near[i] < 0 for i in chosen):
                break
        for node in chosen:
            p = principal[k, :, node]
            regions = tuple(sorted(name for name, f in mesh.facets.items() if (f == node).any()))
            faces = tuple(sorted({int(i) for i in mesh.face_index[(mesh.boundary == node).any(axis=0)]}))
            x, y, z = map(float, mesh.nodes[:, node])
            yield PeakPlace(
                case.name,
                float(von_mises[k, node]),
                (x, y, z),
                node,
                regions,
                faces,
                bool(near[node] < 0),
                places[near[node]][0] if near[node] >= 0 else "",
                float(p[np.abs(p).argmax()]),
            )


def case_stresses(model: SolidModel, von_mises: Array, near: np.ndarray) -> Iterator[CaseStress]:
    """Largest stress and yield factor of each case, established and everywhere."""
    strength = model.part.material.yield_strength
    for k, case in enumerate(model.part.cases):
        established = float(von_mises[k, near < 0].max(initial=0.0))
        everywhere = float(von_mises[k].max(initial=0.0))
        factors = [strength / s if strength is not None and s > 0 else None for s in (established, everywhere)]
        yield CaseStress(case.name, established, everywhere, *factors)
