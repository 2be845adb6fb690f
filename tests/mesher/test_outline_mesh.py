"""Section outlines become curved triangles that meet the outline exactly and are numbered as in scikit-fem."""

from __future__ import annotations

import math
import time
from collections.abc import Sequence

import numpy as np
import pytest
from skfem import Basis, ElementTriP2, MeshTri2

from geometry.outline import Arc, Edge, Line, Outline, Point
from geometry.problem import MeshError
from mesher import OutlineMesh, mesh_outlines, outline_mesher, outline_to_skfem
from mesher.child import ChildResult, run_child


def _loop(points: Sequence[Point]) -> tuple[Edge, ...]:
    return tuple(Line(a, b) for a, b in zip(points, [*points[1:], points[0]], strict=True))


def _circle(radius: float, ccw: bool = True) -> tuple[Edge, ...]:
    a, b = (radius, 0.0), (-radius, 0.0)
    return (Arc(a, b, (0.0, 0.0), ccw), Arc(b, a, (0.0, 0.0), ccw))


RECTANGLE = Outline(_loop([(-25, -50), (25, -50), (25, 50), (-25, 50)]))
ANNULUS = Outline(_circle(50.0), (_circle(40.0, ccw=False),))
EL = Outline(_loop([(0, 0), (60, 0), (60, 10), (10, 10), (10, 60), (0, 60)]))
FILLETED_EL = Outline(
    (
        Line((0, 0), (60, 0)),
        Line((60, 0), (60, 10)),
        Line((60, 10), (18, 10)),
        Arc((18, 10), (10, 18), (18, 18), ccw=False),
        Line((10, 18), (10, 60)),
        Line((10, 60), (0, 60)),
        Line((0, 60), (0, 0)),
    )
)


@pytest.fixture(scope="module")
def meshes() -> dict[str, OutlineMesh]:
    outlines = {
        "rectangle": (RECTANGLE, 12.5),
        "annulus": (ANNULUS, 5.0),
        "el": (EL, 5.0),
        "filleted": (FILLETED_EL, 5.0),
    }
    made = mesh_outlines([o for o, _ in outlines.values()], [h for _, h in outlines.values()])
    return dict(zip(outlines, made, strict=True))


NAMES = ["rectangle", "annulus", "el", "filleted"]


@pytest.mark.parametrize("name", NAMES)
def test_numbering_is_scikit_fems(meshes: dict[str, OutlineMesh], name: str) -> None:
    mesh = meshes[name]
    theirs, ours = MeshTri2(mesh.nodes, mesh.tris[:3]), outline_to_skfem(mesh)
    assert np.array_equal(theirs.dofs.element_dofs, mesh.tris)
    assert np.array_equal(ours.dofs.element_dofs, mesh.tris)
    assert np.array_equal(ours.facets, theirs.facets) and np.array_equal(ours.t2f, theirs.t2f)
    basis = Basis(ours, ElementTriP2(), intorder=4)
    assert np.abs(basis.doflocs - mesh.nodes).max() < 1e-12 * np.abs(mesh.nodes).max()
    assert basis.dx.min() > 0
    assert basis.dx.sum() == pytest.approx(mesh.area, rel=1e-12)


EXACT = {
    "rectangle": (5000.0, 1e-12),
    "annulus": (math.pi * 900.0, 1e-5),
    "el": (1100.0, 1e-12),
    "filleted": (1100.0 + 64.0 * (1 - math.pi / 4), 1e-5),
}


@pytest.mark.parametrize("name", NAMES)
def test_areas(meshes: dict[str, OutlineMesh], name: str) -> None:
    exact, tolerance = EXACT[name]
    assert meshes[name].area == pytest.approx(exact, rel=tolerance)


def test_boundary_nodes_lie_on_their_circle_and_know_it(meshes: dict[str, OutlineMesh]) -> None:
    mesh = meshes["annulus"]
    radius = np.hypot(*mesh.nodes[:, mesh.boundary])
    assert np.abs(radius[:, mesh.loop == 0] - 50.0).max() < 1e-9
    assert np.abs(radius[:, mesh.loop == 1] - 40.0).max() < 1e-9
    upper = mesh.nodes[1, mesh.boundary[2]] > 0
    assert np.array_equal(mesh.edge == 0, np.where(mesh.loop == 0, upper, ~upper))


@pytest.mark.parametrize("name", NAMES)
def test_boundary_is_complete_and_has_the_material_on_its_left(meshes: dict[str, OutlineMesh], name: str) -> None:
    mesh = meshes[name]
    theirs = MeshTri2(mesh.nodes, mesh.tris[:3])
    assert mesh.boundary.shape[1] == len(theirs.boundary_facets())
    # Green's theorem along the curved boundary, exact for parabolas with two Gauss points or more.
    x, w = np.polynomial.legendre.leggauss(3)
    x, w = (x + 1) / 2, w / 2
    values = np.array([(1 - x) * (1 - 2 * x), x * (2 * x - 1), 4 * x * (1 - x)])
    slopes = np.array([4 * x - 3, 4 * x - 1, 4 - 8 * x])
    points, tangents = (np.einsum("cib,iq->cbq", mesh.nodes[:, mesh.boundary], a) for a in (values, slopes))
    area = (points[0] * tangents[1] - points[1] * tangents[0]) @ w / 2
    assert area.sum() == pytest.approx(mesh.area, rel=1e-12)
    ends = [mesh.boundary[:2, mesh.loop == k] for k in range(int(mesh.loop.max()) + 1)]
    assert all(np.array_equal(np.sort(start), np.sort(end)) for start, end in ends)


def test_finer_at_reentrant_corners(meshes: dict[str, OutlineMesh]) -> None:
    mesh = meshes["el"]
    lengths = np.linalg.norm(np.diff(mesh.nodes[:, mesh.boundary[:2]], axis=1)[:, 0], axis=0)
    touches = (mesh.nodes[:, mesh.boundary[:2]] == 10.0).all(axis=0).any(axis=0)
    assert touches.sum() == 2
    assert lengths[touches].max() < 2.0
    assert np.median(lengths) > 2.5


def test_two_layers_through_the_wall(meshes: dict[str, OutlineMesh]) -> None:
    mesh = meshes["annulus"]  # size is half the wall
    radius = np.hypot(*mesh.nodes[:, : mesh.tris[:3].max() + 1])
    between = (radius > 41.0) & (radius < 49.0)
    assert between.sum() >= 0.4 * (mesh.loop == 0).sum()


def test_the_same_every_time_alone_or_in_company(meshes: dict[str, OutlineMesh]) -> None:
    started = time.monotonic()
    (alone,) = mesh_outlines([ANNULUS], [5.0])
    assert time.monotonic() - started < 20.0
    assert alone.nodes.tobytes() == meshes["annulus"].nodes.tobytes()
    assert alone.tris.tobytes() == meshes["annulus"].tris.tobytes()


def test_faults_are_told() -> None:
    assert mesh_outlines([], []) == []
    with pytest.raises(MeshError, match="1 outlines, but 2 sizes"):
        mesh_outlines([RECTANGLE], [1.0, 2.0])
    with pytest.raises(MeshError, match="positive length"):
        mesh_outlines([RECTANGLE], [0.0])
    clockwise = Outline(_loop([(-25, 50), (25, 50), (25, -50), (-25, -50)]))
    with pytest.raises(MeshError, match="counter-clockwise"):
        mesh_outlines([clockwise], [25.0])
    bow_tie = Outline(_loop([(0, 0), (50, 0), (0, 50), (50, 60)]))
    with pytest.raises(MeshError, match=r"cross near \(\d+\.?\d*, \d+\.?\d*\) mm"):
        mesh_outlines([bow_tie], [25.0])
    gap = Outline((Line((0, 0), (50, 0)), Line((50, 0), (50, 50)), Line((50, 50), (1, 1))))
    with pytest.raises(MeshError, match=r"loop 0 is open between \(1, 1\) and \(0, 0\)"):
        mesh_outlines([gap], [25.0])
    outside = Outline(_loop([(0, 0), (50, 0), (50, 50), (0, 50)]), (_circle(10.0, ccw=False),))
    with pytest.raises(MeshError, match="cross near"):
        mesh_outlines([outside], [25.0])


def test_a_wall_far_too_thin_is_refused_with_the_number_at_once() -> None:
    started = time.perf_counter()
    thin = Outline(_circle(50.0), (_circle(49.99, ccw=False),))
    with pytest.raises(MeshError, match=r"100 mm would need about \d+ triangles of 0\.006 mm, and at most \d+"):
        mesh_outlines([thin], [0.006])
    assert time.perf_counter() - started < 2.0


def test_a_section_is_not_blamed_when_its_mesher_was_killed(monkeypatch: pytest.MonkeyPatch) -> None:
    def run(job: object, seconds: float, memory: float) -> ChildResult:
        return run_child({"task": "fault:killed"}, seconds, memory)

    monkeypatch.setattr(outline_mesher, "run_child", run)
    with pytest.raises(MeshError, match="SIGKILL.*run again") as caught:
        mesh_outlines([RECTANGLE], [10.0])
    assert "loops" not in str(caught.value)
