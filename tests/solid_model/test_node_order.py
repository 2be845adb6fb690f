"""The solid model works on nodes in order along the part; its results stand on the mesh that was given."""

from __future__ import annotations

import numpy as np
from solid_help import box_part
from solver_help import BUDGET, TIP, WALL, B, H, L, bent_mesh, gap, solution

from fem.solid.model import build_model
from fem.solid.node_order import in_order
from fem.solid.solve import solve_solid
from fem.solid.stress import nodal_stress


def test_the_mesh_in_order_is_the_same_mesh() -> None:
    mesh = bent_mesh()
    ordered, number = in_order(mesh)
    assert (np.diff(ordered.nodes[0]) >= 0).all() and (np.diff(mesh.nodes[0]) < 0).any()
    assert np.array_equal(ordered.nodes[:, number], mesh.nodes)
    assert np.array_equal(ordered.nodes[:, ordered.tets], mesh.nodes[:, mesh.tets])
    assert np.array_equal(ordered.nodes[:, ordered.boundary], mesh.nodes[:, mesh.boundary])
    for name, facets in mesh.facets.items():
        assert np.array_equal(ordered.nodes[:, ordered.facets[name]], mesh.nodes[:, facets])
    assert (np.diff(in_order(ordered)[1]) == 1).all()  # nothing changes a second time


def test_results_stand_on_the_mesh_that_was_given() -> None:
    part, mesh = box_part(L, B, H, [WALL], [TIP]), bent_mesh()
    result = solve_solid(part, mesh, BUDGET, solver="cholesky")
    model = build_model(part, mesh)
    u = solution(model, "cholesky").u.T.reshape(-1, mesh.nodes.shape[1], 3).transpose(0, 2, 1)
    stress, spread, _ = nodal_stress(model, u)
    assert result.mesh is mesh
    assert gap(result.u, u) < 1e-9
    assert gap(result.stress, stress) < 1e-9
    assert gap(result.stress_error, spread) < 1e-9
    for peak in result.peaks:
        assert np.array_equal(mesh.nodes[:, peak.node], peak.position)
        k = result.cases.index(peak.case)
        assert result.von_mises[k, peak.node] == peak.value
        assert np.abs(result.principal[k, :, peak.node]).max() == abs(peak.principal)
        greatest, least = result.principal[k, [0, 2], peak.node]
        assert result.tresca[k, peak.node] == greatest - least
