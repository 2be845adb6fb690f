"""Strips of a travelling load: statics, the beam's influence line, sums, holes and ends."""

from __future__ import annotations

import numpy as np
import pytest
from skfem import MeshTet, MeshTet2
from solid_help import box_mesh, box_part, box_regions, named_mesh, structured_box

from fem.figure import FigureKey
from fem.solid import SolidResult, solve_solid
from fem.solid.load import SolidLoad, solid_loads, surface_vector
from geometry.budget import Budget
from geometry.part import Case, Cut, RegionLoad, StripLoad, Support
from geometry.problem import SolveError
from mesher.named_mesh import NamedMesh

BUDGET = Budget(threads=1)
ALL = {"x": 0.0, "y": 0.0, "z": 0.0}
L, B, H = 210.0, 20.0, 30.0
FORCE = (30.0, -20.0, -100.0)
WALL = Support("wall", "arm.start", ALL)


def vector(mesh: NamedMesh, load: StripLoad, **more: object) -> tuple[np.ndarray, SolidLoad]:
    """Nodal forces (n, 3) of a strip load on the box's member."""
    part = box_part(L, B, H, [WALL], [load], **more)
    solid = solid_loads(part, mesh)[load.name]
    return sum(surface_vector(mesh, piece) for piece in solid.pieces), solid


def resultant(mesh: NamedMesh, f: np.ndarray) -> np.ndarray:
    """(6,) force and moment about the origin."""
    return np.r_[f.sum(axis=0), np.cross(mesh.nodes.T, f).sum(axis=0)]


def table(result: SolidResult) -> dict[FigureKey, float]:
    return {f.key: f.value for f in result.figures}


@pytest.fixture(scope="module")
def box() -> NamedMesh:
    return box_mesh(L, B, H, (7, 2, 3))


@pytest.mark.parametrize(
    ("centres", "length", "middles"),
    [
        ((100.0,), 8.0, (100.0,)),  # within one row of facets (30 mm long)
        ((88.0,), 25.0, (88.0,)),  # over an edge of the mesh
        ((60.0,), 60.0, (60.0,)),  # from edge to edge exactly
        ((50.0, 121.3, 180.0), 11.0, (50.0, 121.3, 180.0)),
        ((2.0,), 10.0, (3.5,)),  # passes the start: 7 mm are left
        ((213.0,), 10.0, (209.0,)),  # passes the end: 2 mm are left
    ],
)
def test_a_strip_has_its_declared_force_at_its_middle(
    box: NamedMesh, centres: tuple[float, ...], length: float, middles: tuple[float, ...]
) -> None:
    f, solid = vector(box, StripLoad("t", "arm.top", centres, length, FORCE))
    force = np.array(FORCE)
    moment = sum(np.cross([x, 0.0, H / 2], force) for x in middles)
    size = len(centres) * 100.0
    assert resultant(box, f)[:3] == pytest.approx(len(centres) * force, abs=1e-12 * size)
    assert resultant(box, f)[3:] == pytest.approx(moment, abs=1e-12 * size * L)
    assert solid.force == pytest.approx(len(centres) * force, abs=1e-12 * size)
    assert solid.moment == pytest.approx(moment, abs=1e-12 * size * L)
    # nothing beyond the facets that the strip touches
    pushed = box.nodes[:, np.abs(f).max(axis=1) > 0]
    assert pushed[2].min() > H / 2 - 1e-9
    assert pushed[0].min() > min(middles) - length - 30.0 and pushed[0].max() < max(middles) + length + 30.0


def test_an_even_strip_over_whole_facets_is_the_integral_of_shape_functions(box: NamedMesh) -> None:
    # of a strip between mesh lines the quadratic triangle's even load: corners nothing, each mid-edge a third
    f, _ = vector(box, StripLoad("t", "arm.top", (60.0,), 60.0, (0.0, 0.0, -100.0)))
    facets = box.facets["arm.top"]
    inside = facets[:, np.abs(box.nodes[0][facets[:3]].mean(axis=0) - 60.0) < 30.0]
    expected = np.zeros(box.nodes.shape[1])
    np.add.at(expected, inside[3:].ravel(), -100.0 / inside.shape[1] / 3)
    assert f[:, 2] == pytest.approx(expected, abs=1e-12 * 100)


def test_two_strips_are_the_sum_of_one_each(box: NamedMesh) -> None:
    both, _ = vector(box, StripLoad("t", "arm.top", (70.0, 95.0), 8.0, FORCE))
    each = [vector(box, StripLoad("t", "arm.top", (x,), 8.0, FORCE))[0] for x in (70.0, 95.0)]
    assert both == pytest.approx(each[0] + each[1], abs=1e-12 * 100)


def influence_case(box: NamedMesh) -> tuple[SolidResult, list[float], list[StripLoad]]:
    at = [40.0, 83.0, 121.3, 165.0, 195.0]
    loads = [StripLoad(f"t@{x:g}", "arm.top", (x,), 12.0, FORCE) for x in at]
    loads.append(StripLoad("two", "arm.top", (83.0, 165.0), 12.0, FORCE))
    cases = [Case(load.name, {load.name: 1.0}) for load in loads]
    return solve_solid(box_part(L, B, H, [WALL], loads, cases), box, BUDGET), at, loads


@pytest.fixture(scope="module")
def travelled(box: NamedMesh) -> tuple[SolidResult, list[float], list[StripLoad]]:
    return influence_case(box)


def test_checks_hold_and_reactions_balance(travelled: tuple[SolidResult, list[float], list[StripLoad]]) -> None:
    result, at, _ = travelled
    assert [c for c in result.checks if not c.ok] == []
    assert {c.name for c in result.checks} >= {"load two: force", "load two: moment"}
    found = table(result)
    for x in at:
        reaction = [found[FigureKey(f"t@{x:g}", "wall", "reaction_force", c)] for c in "xyz"]
        turned = [found[FigureKey(f"t@{x:g}", "wall", "reaction_moment", c)] for c in "xyz"]
        assert reaction == pytest.approx([-v for v in FORCE], abs=1e-7)
        assert turned == pytest.approx(-np.cross([x, 0.0, H / 2], FORCE), abs=1e-5)


def test_section_forces_jump_across_the_strip_by_its_force(
    travelled: tuple[SolidResult, list[float], list[StripLoad]],
) -> None:
    result, _, loads = travelled
    found = table(result)
    axes = (("section_force", "N"), ("section_force", "Vy"), ("section_force", "Vz"),
            ("section_moment", "T"), ("section_moment", "My"), ("section_moment", "Mz"))  # fmt: skip
    for load in loads:
        for at in L * np.arange(21) / 20:
            expected = np.zeros(6)
            for x in load.centres:  # what of the strip lies beyond the station, at its own middle
                low, high = max(x - load.length / 2, at), x + load.length / 2
                if high > low:
                    force = np.array(FORCE) * (high - low) / load.length
                    expected += np.r_[force, np.cross([(low + high) / 2 - at, 0.0, H / 2], force)]
            place = f"arm@{at:.6g}"
            got = [found[FigureKey(load.name, place, q, c, "member")] for q, c in axes]  # type: ignore[arg-type]
            assert got[:3] == pytest.approx(expected[:3], abs=1e-6), (load.name, at)
            assert got[3:] == pytest.approx(expected[3:], abs=1e-4), (load.name, at)


def test_the_tip_follows_the_beams_influence_line() -> None:
    # tip of a cantilever under a force P at a: P a^2 (3 L - a) / 6 E I and its shear a / k G A (Cowper 0.8497). Held by
    # mean values at the root, which is then free to warp as the beam's.
    length, side, P = 600.0, 20.0, 100.0
    at = [150.0, 300.0, 420.0, 590.0]
    loads = [StripLoad(f"t@{x:g}", "arm.top", (x,), 10.0, (0.0, 0.0, -P)) for x in at]
    cases = [Case(load.name, {load.name: 1.0}) for load in loads]
    six = dict.fromkeys(("x", "y", "z", "rx", "ry", "rz"), 0.0)
    part = box_part(length, side, side, [Support("wall", "arm.start", six, "average")], loads, cases)
    result = solve_solid(part, box_mesh(length, side, side, (20, 1, 2)), BUDGET)
    found, EI, GA = table(result), 210000.0 * side**4 / 12, 0.8497 * 80769.0 * side**2
    for a in at:
        expected = P * (a**2 * (3 * length - a) / (6 * EI) + a / GA)
        assert found[FigureKey(f"t@{a:g}", "arm.end", "displacement", "z")] == pytest.approx(-expected, rel=1e-3)


def test_strip_and_tip_force_are_reciprocal(box: NamedMesh) -> None:
    # Maxwell and Betti, on any mesh: the tip force's work on the strip's motion is the strip's on the tip force's
    strip, tip = StripLoad("t", "arm.top", (88.0,), 25.0, FORCE), RegionLoad("tip", "arm.end", (0.0, 0.0, -70.0))
    part = box_part(L, B, H, [WALL], [strip, tip], [Case("strip", {"t": 1.0}), Case("tip", {"tip": 1.0})])
    result = solve_solid(part, box, BUDGET)
    f, _ = vector(box, strip)
    moved = table(result)[FigureKey("strip", "arm.end", "displacement", "z")]
    assert (f * result.u[1].T).sum() == pytest.approx(-70.0 * moved, rel=1e-9)


def holed(cells: int) -> NamedMesh:
    """The box's upper face with a square window 60 < x < 90, |y| < 5 through the depth."""
    box = structured_box(L, B, H, (7 * cells, 4, 3))
    middle = box.p[:, box.t].mean(axis=1)
    corners = MeshTet(box.p, box.t)
    kept = corners.restrict(np.flatnonzero(~((middle[0] > 60) & (middle[0] < 90) & (np.abs(middle[1]) < 5))))
    rules = {**box_regions(L, B, H), "arm.window": lambda x: (x[0] > 55) & (x[0] < 95) & (np.abs(x[1]) < 5 + 1e-6)
             & (np.abs(x[2]) < H / 2 - 1e-6)}  # fmt: skip
    return named_mesh(MeshTet2.from_mesh(kept), rules)


def test_a_strip_over_a_hole_presses_on_what_is_left_of_the_face() -> None:
    mesh = holed(2)
    cut = Cut("window", "window", "opening", "z", "all", 75.0, 0.0, 30.0, 10.0)
    force = np.array(FORCE)
    f, _ = vector(mesh, StripLoad("t", "arm.top", (88.0,), 12.0, FORCE), cuts=(cut,))
    # 82 to 90: half the width is left; 90 to 94: the whole of it
    middle = (8 * 0.5 * 86 + 4 * 92) / (8 * 0.5 + 4)
    assert resultant(mesh, f) == pytest.approx(np.r_[force, np.cross([middle, 0.0, H / 2], force)], abs=1e-12 * 100 * L)
    hole = (np.abs(mesh.nodes[0] - 75.0) < 15 - 1e-6) & (np.abs(mesh.nodes[1]) < 5 - 1e-6)
    assert not np.abs(f[hole]).any()


def test_a_strip_with_nothing_left_of_it_is_refused(box: NamedMesh) -> None:
    for centre in (-20.0, 216.0):
        with pytest.raises(SolveError, match="nothing is left of that face"):
            vector(box, StripLoad("t", "arm.top", (100.0, centre), 10.0, FORCE))
    mesh = named_mesh(
        structured_box(L, B, H, (7, 2, 3)),
        {**box_regions(L, B, H), "arm.top": lambda x: (x[2] > H / 2 - 1e-6) & ((x[0] < 60) | (x[0] > 90))},
    )
    with pytest.raises(SolveError, match=r"from 70 to 80 mm.*wholly in a cut"):
        vector(mesh, StripLoad("t", "arm.top", (75.0,), 10.0, FORCE))


def test_strips_on_a_round_face_use_its_own_normals_and_area() -> None:
    # a bar of radius 10: half its surface travelled on; even over the area, so at 2 r / pi above the axis
    r, length = 10.0, 60.0
    errors = []
    for turns in (12, 24):
        grid = MeshTet2.from_mesh(
            MeshTet.init_tensor(np.linspace(0, length, 7), np.linspace(3, r, 3), np.linspace(0, np.pi, turns + 1))
        )
        x, radius, angle = grid.doflocs
        mesh = named_mesh(
            MeshTet2(np.array([x, radius * np.cos(angle), radius * np.sin(angle)]), grid.t),
            {"arm.top": lambda p: np.hypot(p[1], p[2]) > 0.95 * r, "arm.start": lambda p: p[0] < 1e-6},
        )
        f, solid = vector(mesh, StripLoad("t", "arm.top", (31.0,), 13.0, (0.0, 0.0, -100.0)))
        assert resultant(mesh, f) == pytest.approx(np.r_[solid.force, solid.moment], abs=1e-12 * 100 * length)
        assert f[:, 2].sum() == pytest.approx(-100.0, abs=1e-10)
        # about y: the z force at x 31; about x: at y 0 by symmetry
        assert solid.moment == pytest.approx([0.0, 31.0 * 100.0, 0.0], abs=0.02 * 100)
        _, solid = vector(mesh, StripLoad("t", "arm.top", (31.0,), 13.0, (100.0, 0.0, 0.0)))
        errors.append(abs(solid.moment[1] / 100.0 - 2 * r / np.pi))
    assert errors[0] < 1e-3 * r
    assert errors[1] < errors[0] / 8


def test_denting_of_a_strip_is_that_of_its_own_stretch() -> None:
    # the light one beyond the heavy one, where that bends nothing
    light = StripLoad("t", "arm.top", (85.0,), 10.0, (0.0, 0.0, -100.0))
    heavy = StripLoad("h", "arm.top", (40.0,), 10.0, (0.0, 0.0, -10000.0))
    cases = [Case("light", {"t": 1.0}), Case("both", {"t": 1.0, "h": 1.0})]
    part = box_part(100.0, 10.0, 20.0, [WALL], [light, heavy], cases)
    alone, along, other = solve_solid(part, box_mesh(100.0, 10.0, 20.0, (20, 2, 4)), BUDGET).denting
    assert (alone.case, along.case, other.case) == ("light", "both", "both")
    assert along.value == pytest.approx(alone.value, rel=0.1)
    assert other.value > 20 * along.value
