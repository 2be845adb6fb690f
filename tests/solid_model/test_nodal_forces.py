"""Nodal forces kept by what the loads touch, against dense sums; many cases in turns against each alone."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from solid_help import box_mesh, box_part

from fem.solid import solve_solid
from fem.solid.factor import TooLarge
from fem.solid.load import surface_vector
from fem.solid.mass import node_integrals
from fem.solid.model import SolidModel, build_model, thermal_vector
from fem.solid.nodal_forces import AT_ONCE, rows_of, turns
from fem.solid.reaction import reactions
from fem.solid.solver import Choice
from geometry.budget import Budget
from geometry.part import BodyLoad, Case, Part, Pressure, StripLoad, Support, TemperatureLoad
from mesher.named_mesh import NamedMesh

SIZE = (210.0, 20.0, 30.0)
WALL = Support("wall", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0})
LOADS = (
    BodyLoad("weight", (0.0, 10.0, -9810.0)),
    Pressure("wind", "arm.left", 0.3),
    TemperatureLoad("heat", 40.0),
    StripLoad("two axles", "arm.top", (60.0, 100.0), 50.0, (1.0, 2.0, -90.0)),
)


@pytest.fixture(scope="module")
def mesh() -> NamedMesh:
    return box_mesh(*SIZE, (7, 2, 3))


def mixed(mesh: NamedMesh) -> SolidModel:
    rng = np.random.default_rng(5)
    cases = [Case(f"c{k}", dict(zip([load.name for load in LOADS], rng.normal(size=4), strict=True))) for k in range(3)]
    cases.append(Case("cold", {"wind": 1.0, "two axles": -2.0}))
    return build_model(box_part(*SIZE, [WALL], LOADS, cases), mesh)


def crossing(positions: int) -> Part:
    loads = [StripLoad(f"t@{x:.4g}", "arm.top", (float(x),), 9.0, (0.0, 5.0, -100.0))
             for x in np.linspace(20.0, 190.0, positions)]  # fmt: skip
    heat, weight = TemperatureLoad("heat", 30.0), BodyLoad("weight", (0.0, 0.0, -9810.0))
    cases = [Case(load.name, {load.name: 1.0 + k, "weight": 1.0, "heat": float(k % 3 == 2)})
             for k, load in enumerate(loads)]  # fmt: skip
    return box_part(*SIZE, [WALL], [heat, weight, *loads], cases)


def test_forces_of_cases_are_the_dense_sums(mesh: NamedMesh) -> None:
    model, n = mixed(mesh), mesh.nodes.shape[1]
    shares, m = node_integrals(model.groups)[:, :1], model.part.material
    vectors = np.zeros((4, n, 3))
    vectors[0] = m.density * shares * model.loads["weight"].force_per_mass
    for k, name in ((1, "wind"), (3, "two axles")):
        for piece in model.loads[name].pieces:
            surface_vector(mesh, piece, vectors[k])
    assert model.load_vectors.toarray() == pytest.approx(vectors.reshape(4, -1), rel=1e-14, abs=0)
    assert model.load_vectors[3].nnz < 3 * n / 4  # what the load touches
    mechanical = np.tensordot(model.factors, vectors, axes=1)
    thermal = model.change[:, None, None] * m.expansion * thermal_vector(mesh, model.groups, m.E, m.nu)
    scale = np.abs(mechanical).max()
    u = np.random.default_rng(1).standard_normal((3, n))
    for k in range(4):
        assert model.mechanical[k] == pytest.approx(mechanical[k], abs=1e-14 * scale)
        assert model.thermal[k] == pytest.approx(thermal[k], rel=1e-14, abs=1e-300)
        assert model.mechanical.work(k, u) == pytest.approx(float((mechanical[k] * u.T).sum()), rel=1e-10)
    total = (mechanical + thermal).reshape(4, -1).T
    assert model.forces() == pytest.approx(total, abs=1e-14 * np.abs(total).max())
    for some in (slice(1, 3), slice(3, 4)):
        assert np.array_equal(model.forces(some), model.forces()[:, some])
    assert len(model.mechanical) == 4


def test_rows_of_nothing() -> None:
    assert rows_of([], 5).shape == (0, 15)
    rows = rows_of([(np.zeros(0, np.int64), np.zeros((0, 3))), (np.array([3]), np.array([[1.0, 2.0, 3.0]]))], 5)
    assert np.array_equal(rows.toarray().reshape(2, 5, 3)[1, 3], [1.0, 2.0, 3.0]) and rows.nnz == 3


def test_turns_cover_all_cases_once() -> None:
    for cases in (0, 1, AT_ONCE, AT_ONCE + 1, 50):
        covered = np.concatenate([np.zeros(0, int), *(np.arange(cases)[some] for some in turns(cases))])
        assert np.array_equal(covered, np.arange(cases))
        assert all(0 < some.stop - some.start <= AT_ONCE for some in turns(cases))


@pytest.mark.parametrize("choice", ["cholesky", "multigrid"])
def test_many_cases_equal_each_alone(mesh: NamedMesh, choice: Choice) -> None:
    part = crossing(2 * AT_ONCE + 2)
    together = solve_solid(part, mesh, Budget(threads=1), solver=choice)
    assert [c for c in together.checks if not c.ok] == []
    for k in (0, AT_ONCE - 1, AT_ONCE, 2 * AT_ONCE + 1):
        alone = solve_solid(replace(part, cases=part.cases[k : k + 1]), mesh, Budget(threads=1), solver=choice)
        for name in ("u", "stress", "stress_error", "von_mises", "principal", "tresca"):
            one, all_ = getattr(alone, name)[0], getattr(together, name)[k]
            assert np.abs(one - all_).max() <= 1e-5 * np.abs(one).max(), name
        for name in ("strain_energy", "external_work", "energy_error"):
            assert getattr(together, name)[k] == pytest.approx(getattr(alone, name)[0], rel=1e-5)
        case = part.cases[k].name
        mine = {f.key: f.value for f in together.figures if f.key.case == case}
        for figure in alone.figures:
            if figure.key.quantity == "reaction_force" and figure.key.case == case:
                assert mine[figure.key] == pytest.approx(figure.value, rel=1e-6, abs=1e-3)
        assert [p.node for p in alone.peaks] == [p.node for p in together.peaks if p.case == case]


def test_reactions_in_turns_are_stiffness_times_motion_less_forces(mesh: NamedMesh) -> None:
    model, n = build_model(crossing(AT_ONCE + 2), mesh), mesh.nodes.shape[1]
    u = np.random.default_rng(2).standard_normal((AT_ONCE + 2, 3, n))
    found = reactions(model, u, np.zeros((0, AT_ONCE + 2)))
    for k in range(AT_ONCE + 2):
        expected = (model.K @ u[k].T.ravel()).reshape(n, 3) - model.mechanical[k] - model.thermal[k]
        assert found.nodal[k] == pytest.approx(expected, abs=1e-13 * np.abs(expected).max())


def test_results_that_would_not_fit_are_refused_with_the_number(mesh: NamedMesh) -> None:
    part, n = crossing(40), mesh.nodes.shape[1]
    need = 40 * n * 112 / 2**20
    told: list[str] = []
    with pytest.raises(TooLarge, match=f"40 load cases at {n} nodes take about {need:.0f} MiB .* fewer cases"):
        solve_solid(part, mesh, Budget(threads=1, memory=int(need)), told.append)
    assert told == ["assemble"]
