"""Places of greatest von Mises stress: where, how much, on which faces, and whether the value can converge."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray
from scipy.spatial import cKDTree

from fem.solid.kernels.cutting import EDGES, edge_lengths
from fem.solid.kernels.hills import hills, maxima
from fem.solid.kernels.parallel import ranges, run
from fem.solid.model import SolidModel
from fem.solid.result import CaseStress, PeakPlace
from fem.solid.shape import Array
from fem.solid.stress import principal_stresses
from mesher.named_mesh import NamedMesh

COUNT = 8
REACH = 2.0
"""Influence of a place without a converged value, in local element sizes: common practice, no source."""
SADDLE = 0.85
"""Two maxima are one place when the stress between them stays above this part of the lesser one."""
CANDIDATES = 200


def node_sizes(mesh: NamedMesh) -> Array:
    """(n,) mean length of the element edges at each node, mm (a mid-edge node counts half edges' corners)."""
    n = mesh.nodes.shape[1]
    total, count = np.zeros(n), np.zeros(n, dtype=np.int64)
    tets = np.ascontiguousarray(mesh.tets.T, dtype=np.int32)
    edge_lengths(np.ascontiguousarray(mesh.nodes.T), tets, EDGES, total, count)
    return total / np.maximum(count, 1)


def region_rim(mesh: NamedMesh, region: str) -> Array:
    """(3, k) nodes on the edge of a region: on its facets and on other boundary facets too."""

    def keys(facets: NDArray[np.int64]) -> NDArray[np.int64]:
        middles = np.sort(facets[3:], axis=0)  # two mid-edge nodes tell a triangle
        return np.asarray(middles[0] * mesh.nodes.shape[1] + middles[1])

    own = mesh.facets[region]
    other = ~np.isin(keys(mesh.boundary), keys(own))
    shared = np.zeros(mesh.nodes.shape[1], dtype=bool)
    shared[mesh.boundary[:, other]] = True
    return mesh.nodes[:, np.unique(own[shared[own]])]


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
    n = mesh.nodes.shape[1]
    out, best, reach = np.full(n, -1), np.full(n, np.inf), REACH * sizes
    far = 1.001 * float(reach.max())
    for k, (_, points) in enumerate(places):
        # the rim is given by points: its nodes lie up to half an element apart
        low, high = points.min(axis=1) - far, points.max(axis=1) + far
        box = np.flatnonzero(((mesh.nodes >= low[:, None]) & (mesh.nodes <= high[:, None])).all(axis=0))
        distance, _ = cKDTree(points.T).query(mesh.nodes[:, box].T, distance_upper_bound=far)
        within = (distance <= reach[box]) & (distance < best[box])
        out[box[within]], best[box[within]] = k, distance[within]
    return out


@dataclass(frozen=True, slots=True)
class Surface:
    """nodes (s,) of the surface, rising, and which of them are neighbours (CSR, indices into `nodes`): the nodes of one
    half edge of a boundary triangle."""

    nodes: NDArray[np.int64]
    indptr: NDArray[np.int32]
    indices: NDArray[np.int32]


def surface_graph(mesh: NamedMesh) -> Surface:
    """The nodes of the surface and their neighbours."""
    halves = ((0, 3), (3, 1), (1, 4), (4, 2), (2, 5), (5, 0), (3, 4), (4, 5), (5, 3))
    nodes, place = np.unique(mesh.boundary, return_inverse=True)
    place = place.reshape(mesh.boundary.shape)
    rows = np.concatenate([place[i] for i, _ in halves])
    columns = np.concatenate([place[j] for _, j in halves])
    graph = sp.coo_matrix((np.ones(rows.size), (rows, columns)), shape=(nodes.size, nodes.size)).tocsr()
    graph = (graph + graph.T).tocsr()
    return Surface(nodes, graph.indptr.astype(np.int32), graph.indices.astype(np.int32))


def local_maxima(surface: Surface, values: Array, near: NDArray[np.int64]) -> list[int]:
    """Surface nodes whose value no neighbour exceeds, greatest first, one for each hill: at least `COUNT` of them and
    one established, if there are so many. values, near (n,).

    A maximum belongs to the hill of a greater one (of the same kind: established, or at the same singular place) when
    a path on the surface joins them on which the stress stays above `SADDLE` of the lesser one.
    """
    v, kind = np.ascontiguousarray(values[surface.nodes]), np.ascontiguousarray(near[surface.nodes])
    top = np.empty(v.size, dtype=np.bool_)
    maxima(surface.indptr, surface.indices, v, top)
    tops = np.flatnonzero(top)
    candidates = tops[np.argsort(-v[tops], kind="stable")][:CANDIDATES]
    if not candidates.size:
        return []
    order = np.flatnonzero(v >= SADDLE * v[candidates[-1]])
    order = order[np.argsort(-v[order], kind="stable")]
    accepted, parent = np.empty(candidates.size, dtype=np.int64), np.full(v.size, -1)
    count = hills(
        surface.indptr, surface.indices, v, kind, order, candidates, SADDLE, COUNT, parent, accepted
    )  # fmt: skip
    return [int(i) for i in surface.nodes[accepted[:count]]]


def peak_places(
    model: SolidModel,
    von_mises: Array,
    stress: Array,
    places: list[tuple[str, Array]],
    near: NDArray[np.int64],
    threads: int = 1,
) -> Iterator[PeakPlace]:
    """The highest hills of each case, at most `COUNT`, and at least the highest established one."""
    mesh, surface = model.mesh, surface_graph(model.mesh)

    def chosen(k: int, _: int) -> list[int]:
        picked: list[int] = []
        for node in local_maxima(surface, von_mises[k], near):
            if len(picked) < COUNT or (near[node] < 0 and not any(near[i] < 0 for i in picked)):
                picked.append(node)
        return picked

    c = len(model.part.cases)
    peaks = run(chosen, ranges(c, c), threads)
    where = _whereabouts(mesh, sorted({node for nodes in peaks for node in nodes}))
    for k, (case, nodes) in enumerate(zip(model.part.cases, peaks, strict=True)):
        for node, p in zip(nodes, principal_stresses(stress[k : k + 1, :, nodes])[0].T, strict=True):
            regions, faces = where[node]
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


def _whereabouts(mesh: NamedMesh, nodes: list[int]) -> dict[int, tuple[tuple[str, ...], tuple[int, ...]]]:
    """Regions and CAD faces that meet at each node."""
    place = np.full(mesh.nodes.shape[1], -1)
    place[nodes] = np.arange(len(nodes))
    regions: list[set[str]] = [set() for _ in nodes]
    faces: list[set[int]] = [set() for _ in nodes]
    for name, facets in mesh.facets.items():
        at = place[facets]
        for i in np.unique(at[at >= 0]):
            regions[i].add(name)
    at = place[mesh.boundary]
    for i, facet in zip(at[at >= 0], np.nonzero(at >= 0)[1], strict=True):
        faces[i].add(int(mesh.face_index[facet]))
    return {node: (tuple(sorted(r)), tuple(sorted(f))) for node, r, f in zip(nodes, regions, faces, strict=True)}


def case_stresses(model: SolidModel, von_mises: Array, near: np.ndarray) -> Iterator[CaseStress]:
    """Largest stress and yield factor of each case, established and everywhere."""
    strength = model.part.material.yield_strength
    for k, case in enumerate(model.part.cases):
        established = float(von_mises[k, near < 0].max(initial=0.0))
        everywhere = float(von_mises[k].max(initial=0.0))
        factors = [strength / s if strength is not None and s > 0 else None for s in (established, everywhere)]
        yield CaseStress(case.name, established, everywhere, *factors)
