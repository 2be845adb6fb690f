"""Both solvers against each other and against scikit-fem's plain condensation, for every kind of support."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.sparse.linalg as spla
from skfem import Basis, ElementTetP2, ElementVector, LinearForm, MeshTet2, asm, condense
from skfem.models.elasticity import lame_parameters, linear_elasticity
from solid_help import box_part, structured_box
from solver_help import ALL, BUDGET, SIX, TIP, WALL, B, H, L, bent_mesh, gap, right_hand_sides, solution, straight_mesh

from fem.solid import solve_solid
from fem.solid.factor import pardiso_available
from fem.solid.model import build_model
from fem.solid.solver import Choice
from fem.solid.system import HeldSystem
from geometry.budget import Budget
from geometry.part import BodyLoad, Case, RegionLoad, Support, TemperatureLoad
from mesher.named_mesh import NamedMesh

BACKENDS = ["lu", pytest.param("pardiso", marks=pytest.mark.skipif(not pardiso_available(), reason="no MKL"))]


@pytest.mark.parametrize("make", [straight_mesh, bent_mesh])
@pytest.mark.parametrize("backend", BACKENDS)
def test_both_solvers_equal_scikit_fems_plain_solve(make, backend: str) -> None:  # type: ignore[no-untyped-def]
    mesh = make()
    part = box_part(L, B, H, [WALL], [BodyLoad("weight", (0.0, 3e8, -1e9))])
    model = build_model(part, mesh)
    # the same mesh in scikit-fem's hands; its own numbering is matched by position
    box = MeshTet2(*_skfem_arrays(mesh))
    basis = Basis(box, ElementVector(ElementTetP2()), intorder=4)
    K = asm(linear_elasticity(*lame_parameters(210000.0, 0.3)), basis)
    load = 7.85e-9 * np.array([0.0, 3e8, -1e9])
    f = asm(LinearForm(lambda v, w: load[0] * v[0] + load[1] * v[1] + load[2] * v[2]), basis)
    held = basis.get_dofs(lambda x: x[0] < 1e-6)
    K_free, f_free, u, free = condense(K, f, D=held)
    u[free] = spla.spsolve(K_free.tocsc(), f_free)
    points = basis.doflocs[:, ::3]
    place = np.lexsort(np.round(mesh.nodes, 6))[np.argsort(np.lexsort(np.round(points, 6)))]
    assert np.abs(mesh.nodes[:, place] - points).max() < 1e-9
    exact = np.zeros((mesh.nodes.shape[1], 3))
    exact[place] = u.reshape(-1, 3)
    sign = np.sign((exact.ravel() * right_hand_sides(model)[:, 0]).sum())
    for choice in ("cholesky", "multigrid"):
        assert gap(solution(model, choice, backend).u[:, 0], sign * exact.ravel()) < 1e-6


def _skfem_arrays(mesh: NamedMesh) -> tuple[np.ndarray, np.ndarray]:
    box = structured_box(L, B, H, (6, 2, 3))
    x, y, z = box.doflocs
    if np.abs(mesh.nodes - box.doflocs).max() > 1e-9:
        wave = 1 + 0.15 * np.sin(np.pi * x / L)
        y, z = y * wave, z * wave
    return np.array([x, y, z]), box.t


SUPPORTS = {
    "face": [WALL],
    "rigid": [Support("wall", "arm.start", SIX, "rigid")],
    "rigid hinge": [Support("a", "arm.start", {**ALL, "rx": 0.0, "rz": 0.0}, "rigid"),
                    Support("b", "arm.end", {"z": 0.0}, "average")],
    "average": [Support("wall", "arm.start", SIX, "average")],
    "normals": [Support("a", "arm.start", {"normal": 0.0}), Support("b", "arm.left", {"normal": 0.0}),
                Support("c", "arm.bottom", {"normal": 0.0})],
    "prescribed": [Support("wall", "arm.start", {"x": 0.0, "y": 0.02, "z": -0.05})],
    "prescribed mean": [Support("wall", "arm.start", {**SIX, "z": 0.3, "ry": 1e-3}, "average")],
    "prescribed rigid": [Support("wall", "arm.start", {**SIX, "z": 0.3, "ry": 1e-3}, "rigid")],
    "face and rigid": [WALL, Support("side", "arm.bottom", {"normal": 0.0})],
}  # fmt: skip


@pytest.mark.parametrize("kind", SUPPORTS)
def test_the_solvers_agree_for_every_kind_of_support(kind: str) -> None:
    loads = [RegionLoad("tip", "arm.end", TIP.force, coupling="rigid" if kind == "face and rigid" else "surface"),
             TemperatureLoad("heat", 40.0)]  # fmt: skip
    cases = [Case("tip", {"tip": 1.0}), Case("heat", {"heat": 1.0}), Case("nothing", {})]
    model = build_model(box_part(L, B, H, SUPPORTS[kind], loads, cases), straight_mesh())
    a, b = solution(model, "cholesky"), solution(model, "multigrid")
    for case in range(3):
        size = max(np.abs(a.u[:, case]).max(), 1e-9 * np.abs(a.u).max())
        assert np.abs(b.u[:, case] - a.u[:, case]).max() < 1e-6 * size
    if not any(kind.startswith(word) for word in ("prescribed",)):
        assert not a.u[:, 2].any() and not b.u[:, 2].any()  # a case of zeros gives exact zeros
    force = max(1.0, np.abs(a.mean_forces).max(initial=0.0))
    assert b.mean_forces == pytest.approx(a.mean_forces, abs=1e-5 * force)
    assert max(a.gauge, b.gauge) < 1e-5


@pytest.mark.parametrize("choice", ["cholesky", "multigrid"])
def test_free_expansion_leaves_no_force(choice: Choice) -> None:
    """The exact answer is zero: of what full restraint would give, a thousand millionth is allowed. Iterated as near as
    a case without heat, 2e-7 of it stayed in the reaction."""
    part = box_part(L, B, H, SUPPORTS["average"], [TemperatureLoad("heat", 40.0)], [Case("heat", {"heat": 1.0})])
    result = solve_solid(part, straight_mesh(), BUDGET, solver=choice)
    assert result.backend.startswith(choice)
    stress = part.material.E * part.material.expansion * 40.0
    force, moment = stress * B * H, stress * B * H * L
    sizes = {"section_force": force, "section_moment": moment, "reaction_force": force, "reaction_moment": moment}
    seen = set()
    for figure in result.figures:
        if figure.key.quantity in sizes:
            seen.add(figure.key.quantity)
            assert abs(figure.value) < 1e-9 * sizes[figure.key.quantity]
    assert seen == set(sizes)
    assert np.abs(result.stress).max() < 1e-7 * stress


def test_right_hand_sides_at_once_equal_one_by_one() -> None:
    model = build_model(box_part(L, B, H, [WALL], [TIP]), straight_mesh())
    rng = np.random.default_rng(4)
    for choice in ("cholesky", "multigrid"):
        system = HeldSystem(model.K, model.constraints, model.mesh, BUDGET, choice)  # type: ignore[arg-type]
        rhs = rng.normal(size=(system.free, 11)) * 10.0 ** np.arange(-8, 3)  # sizes far apart; more than go together
        rhs[:, 5] = 0.0
        together = system.inverse(rhs)
        for k in range(11):
            alone = system.inverse(rhs[:, [k]])
            assert np.abs(together[:, [k]] - alone).max() <= 1e-6 * np.abs(alone).max()
        assert not together[:, 5].any()
        system.close()


@pytest.mark.parametrize("choice", ["cholesky", "multigrid"])
def test_the_result_does_not_depend_on_threads(choice: Choice) -> None:
    """The loops are the same to the last bit; MKL sums in another order, which is rounding."""
    model = build_model(box_part(L, B, H, [WALL], [TIP]), straight_mesh((10, 3, 4)))
    one = solution(model, choice, budget=Budget(threads=1))
    two = solution(model, choice, budget=Budget(threads=2))
    assert gap(two.u, one.u) < 1e-8
