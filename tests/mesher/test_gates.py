"""The chain of attempts survives faults; gates refuse what may not be used."""

from __future__ import annotations

import threading
import time
from dataclasses import replace
from types import ModuleType

import numpy as np
import pytest

from geometry.budget import Budget
from geometry.named_solid import NamedSolid
from geometry.problem import MeshError
from geometry.spec import PartSpec
from geometry.spec.words.fields import OfKind
from mesher import NamedMesh, mesh_solid
from mesher.assemble import LEAST_QUALITY, MeshRefused, _check_faces, check_quality
from mesher.attempts import CHAIN, Attempt
from mesher.estimate import nodes_within, solver_memory
from mesher.matching import FaceMismatch, match_faces
from mesher.measure import tetrahedron_volumes
from mesher.quality import _jacobians, _lattice, quality_and_volume, scaled_jacobian
from mesher.sizes import LEAST_ACCURACY, MOST_ACCURACY, sizes_for
from mesher.solid_mesher import _least_nodes


def _faulty(fault: str) -> Attempt:
    return replace(CHAIN[0], name=fault, fault=fault)


def test_hanging_and_crashing_attempts_do_not_lose_the_chain(bar: NamedSolid, bar_mesh: NamedMesh) -> None:
    budget = Budget(threads=1, memory=4096, seconds=8.0)
    chain = (_faulty("fault:crash"), _faulty("fault:log"), CHAIN[0])
    mesh = mesh_solid(bar, 0.05, budget, chain=chain)
    assert [(f["attempt"], f["ending"]) for f in mesh.recipe["failed"]] == [
        ("fault:crash", "crash"),
        ("fault:log", "refused"),
    ]
    assert mesh.recipe["mesh"] == bar_mesh.recipe["mesh"]  # earlier attempts leave no trace in the mesh
    quick = replace(budget, seconds=2.0)
    with pytest.raises(MeshError, match="time limit of 2 s"):
        mesh_solid(bar, 0.05, quick, chain=(_faulty("fault:hang"),))


def test_when_every_attempt_fails_the_message_lists_them_and_the_log(bar: NamedSolid, budget: Budget) -> None:
    with pytest.raises(MeshError) as caught:
        mesh_solid(bar, 0.05, budget, chain=(_faulty("fault:crash"), _faulty("fault:log")))
    for text in ("none of the 2", "SIGABRT", "provoked", "the kernel said so", "seconds"):
        assert text in str(caught.value)


def test_a_mesh_over_budget_is_refused_before_meshing(bar: NamedSolid) -> None:
    with pytest.raises(MeshError, match=r"about \d+ nodes \(\d+ unknowns\).*budget is 150 MiB.*coarser"):
        mesh_solid(bar, 0.001, Budget(memory=150))


def test_accuracy_has_the_range_of_the_spec(bar: NamedSolid) -> None:
    field = next(m for m in PartSpec.model_fields["accuracy"].metadata if isinstance(m, OfKind))
    assert (field.least, field.most) == (LEAST_ACCURACY, MOST_ACCURACY)
    assert sizes_for(bar, 0.001).bulk < sizes_for(bar, 0.2).bulk


def test_the_estimate_is_near_the_mesh(bar_mesh: NamedMesh, plate_mesh: NamedMesh, rod_mesh: NamedMesh) -> None:
    for mesh in (bar_mesh, plate_mesh, rod_mesh):
        assert mesh.recipe["estimated_nodes"] == pytest.approx(mesh.nodes.shape[1], rel=0.25)


def test_memory_and_nodes_are_inverse() -> None:
    assert nodes_within(solver_memory(50_000)) == pytest.approx(50_000, rel=1e-4)
    # Forecasts of the direct solver for the tapered I and the tube of `solids.py`.
    assert solver_memory(63_042 / 3) == pytest.approx(223.0, rel=0.45)
    assert solver_memory(124_794 / 3) == pytest.approx(506.0, rel=0.45)
    assert solver_memory(70_191 / 3) == pytest.approx(278.0, rel=0.45)


@pytest.mark.parametrize("accuracy", [0.0, -1.0, 0.0009, 0.5, float("nan")])
def test_accuracy_out_of_range_is_refused(bar: NamedSolid, budget: Budget, accuracy: float) -> None:
    with pytest.raises(MeshError, match=r"allowed 0\.001 to 0\.2"):
        mesh_solid(bar, accuracy, budget)


CORNERS = np.array([[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1]], dtype=float).T
EDGES = ((0, 1), (1, 2), (0, 2), (0, 3), (1, 3), (2, 3))


def _element(corners: np.ndarray) -> np.ndarray:
    return np.hstack([corners, *(corners[:, list(e)].mean(axis=1, keepdims=True) for e in EDGES)])


def test_scaled_jacobian_of_known_elements() -> None:
    index = np.arange(10)[:, None]
    regular = np.array([[1, 1, 1], [-1, 1, -1], [1, -1, -1], [-1, -1, 1]], dtype=float).T
    assert scaled_jacobian(_element(regular), index) == pytest.approx([1.0])
    # Right-angled corner: det 1; the longest three edges that meet have lengths 1, sqrt 2, sqrt 2.
    assert scaled_jacobian(_element(CORNERS), index) == pytest.approx([np.sqrt(2) / 2])
    assert scaled_jacobian(_element(CORNERS[:, [1, 0, 2, 3]]), index) == pytest.approx([-np.sqrt(2) / 2])
    flat = CORNERS.copy()
    flat[2, 3] = 1e-6
    assert abs(scaled_jacobian(_element(flat), index)[0]) < 1e-5


def test_an_element_inverted_by_a_mid_edge_node_is_found_and_refused() -> None:
    nodes, index = _element(CORNERS), np.arange(10)[:, None]
    nodes[0, 4] = 0.2  # past the quarter point: the Jacobian at corner 0 is 4 x 0.2 - 1 < 0
    assert tetrahedron_volumes(nodes, index)[0] > 0  # its volume alone would not tell
    quality = scaled_jacobian(nodes, index)
    assert quality[0] <= 0
    with pytest.raises(MeshRefused, match="1 of 1 elements .*1 of them may be inverted"):
        check_quality(quality, nodes, index)
    nodes[0, 4] = 0.4
    assert scaled_jacobian(nodes, index)[0] > 0.1


def test_no_inverted_element_passes_between_the_sample_points() -> None:
    rng = np.random.default_rng(3)
    base, index = _element(CORNERS), np.arange(10)[:, None]
    from mesher.measure import tetrahedron_gradients

    X = rng.dirichlet(np.ones(4), 20_000).T[:3]
    gradients = tetrahedron_gradients(X)
    for _ in range(60):
        nodes = base.copy()
        nodes[:, 4:] += rng.uniform(-0.16, 0.16, (3, 6))
        F = np.einsum("ci,idq->dcq", nodes, gradients)
        truly_inverted = np.einsum("cq,cq->q", np.cross(F[0], F[1], axis=0), F[2]).min() <= 0
        if truly_inverted:
            assert scaled_jacobian(nodes, index)[0] <= 0


def test_an_element_inverted_between_the_lattice_points_is_found() -> None:
    # Found by search: the Jacobian is positive at all 20 lattice points and falls to -0.07 between them.
    nodes, index = _element(CORNERS), np.arange(10)[:, None]
    nodes[:, 4:] += [
        [0.152, -0.017, 0.096, -0.093, -0.164, 0.183],
        [-0.112, -0.049, 0.195, -0.196, -0.067, -0.009],
        [-0.183, 0.112, 0.109, 0.119, -0.07, -0.185],
    ]
    assert scaled_jacobian(nodes, index)[0] <= 0


def test_the_gate_works_on_a_whole_mesh(bar_mesh: NamedMesh) -> None:
    assert bar_mesh.quality.min() >= LEAST_QUALITY
    assert bar_mesh.quality.max() <= 1.0 + 1e-12
    spoiled = bar_mesh.nodes.copy()
    spoiled[:, bar_mesh.tets[4, 7]] = spoiled[:, bar_mesh.tets[0, 7]]
    with pytest.raises(MeshRefused, match="may be inverted"):
        check_quality(scaled_jacobian(spoiled, bar_mesh.tets), spoiled, bar_mesh.tets)


def test_a_region_of_the_wrong_area_is_named(bar: NamedSolid, bar_mesh: NamedMesh) -> None:
    area = np.array([face.area for face in bar.faces])
    tolerance = np.full(6, 1e-9)
    _check_faces(area, tolerance, bar)
    top = bar.regions["arm.top"][0]
    area[top] *= 1 + 1e-6
    with pytest.raises(MeshRefused, match=rf"face {top} \(region arm.top\): area .* 1 of 6 faces"):
        _check_faces(area, tolerance, bar)


def _mark(tag: int, area: float, centroid: tuple[float, ...], box: tuple[float, ...]) -> dict[str, object]:
    return {"tag": tag, "area": area, "centroid": centroid, "box": box}


def test_faces_of_equal_area_and_centroid_are_told_by_their_boxes() -> None:
    wide = _mark(4, 10.0, (0, 0, 0), (-5, -1, 0, 5, 1, 0))
    tall = _mark(9, 10.0, (0, 0, 0), (-1, -5, 0, 1, 5, 0))
    assert match_faces([tall, wide], [wide, tall], 10.0) == [9, 4]
    with pytest.raises(FaceMismatch, match="2 partners that cannot be told apart"):
        match_faces([wide, tall], [wide, {**wide, "tag": 5}], 10.0)
    other = _mark(5, 10.0, (3, 0, 0), (0, 0, 0, 0, 0, 0))
    with pytest.raises(FaceMismatch, match="two faces .* same partner"):
        match_faces([wide, wide], [wide, other], 10.0)


def test_a_sheet_far_over_budget_is_refused_before_the_kernel_starts(
    solids: ModuleType, monkeypatch: pytest.MonkeyPatch
) -> None:
    def unwanted(*_: object) -> None:
        raise AssertionError("the mesh kernel was started")

    monkeypatch.setattr("mesher.solid_mesher.run_child", unwanted)
    with pytest.raises(MeshError, match=r"about \d{8,} nodes .*budget is 4096 MiB"):
        mesh_solid(solids.bar(1000.0, 0.05, 40.0), 0.08, Budget(memory=4096))


def test_the_early_estimate_never_exceeds_the_kernels(bar: NamedSolid, bar_mesh: NamedMesh, plate: NamedSolid,
                                                      plate_mesh: NamedMesh) -> None:  # fmt: skip
    for solid, mesh in ((bar, bar_mesh), (plate, plate_mesh)):
        early = _least_nodes(solid, sizes_for(solid, 0.05))
        assert 0.1 * mesh.recipe["estimated_nodes"] < early <= mesh.recipe["estimated_nodes"] * (1 + 1e-9)


def test_a_hanging_attempt_ends_at_once_when_asked(bar: NamedSolid) -> None:
    stop = threading.Event()
    threading.Timer(1.0, stop.set).start()
    started = time.perf_counter()
    with pytest.raises(MeshError, match="stopped on request"):
        mesh_solid(bar, 0.05, Budget(seconds=60.0), chain=(_faulty("fault:hang"), CHAIN[0]), stop=stop)
    assert time.perf_counter() - started < 10.0


def test_straight_elements_measured_in_one_point_are_measured_as_in_all(plate_mesh: NamedMesh) -> None:
    nodes, tets = plate_mesh.nodes, plate_mesh.tets
    quality, volume = quality_and_volume(nodes, tets)
    everywhere, _ = _jacobians(np.ascontiguousarray(nodes.T[tets.T].transpose(2, 0, 1)), _lattice()[0])
    np.testing.assert_allclose(quality, everywhere, rtol=0, atol=1e-10)
    np.testing.assert_allclose(volume, tetrahedron_volumes(nodes, tets), rtol=1e-10)
