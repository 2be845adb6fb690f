"""Frequencies and buckling factors with one, two and three threads: the same search, whatever shares its work."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest
from eigen_help import MEAN_WALL, WALL
from solid_help import box_mesh, box_part

from fem.solid import solve_solid
from fem.solid.result import SolidResult
from fem.solid.solver import Choice
from geometry.budget import Budget
from geometry.part import Buckling, RegionLoad, RemotePoint, Vibration
from mesher.named_mesh import NamedMesh

THREADS = (1, 2, 3)
SIZE = (200.0, 20.0, 30.0)
PUSH = RegionLoad("push", "arm.end", (-1000.0, 0.0, 100.0))
ENGINE = RemotePoint("engine", "arm.top", (100.0, 0.0, 60.0), "average", force=(0.0, 0.0, -1.0), mass=1e-3)


@pytest.fixture(scope="module")
def mesh() -> NamedMesh:
    return box_mesh(*SIZE, (16, 2, 3))


def solved(mesh: NamedMesh, threads: int, choice: Choice, backend: str, mean: bool, free: bool) -> SolidResult:
    part = box_part(*SIZE, [MEAN_WALL if mean else WALL], [PUSH, ENGINE])
    part = replace(part, vibration=Vibration(4, free), buckling=(Buckling("all", modes=3),))
    return solve_solid(part, mesh, Budget(threads=threads), backend=backend, solver=choice)


@pytest.mark.parametrize(
    ("choice", "backend", "mean", "free"),
    [
        pytest.param("multigrid", "lu", False, False, marks=pytest.mark.heavy),
        ("multigrid", "lu", True, False),
        pytest.param("multigrid", "lu", False, True, marks=pytest.mark.heavy),
        ("cholesky", "lu", False, False),
    ],
)
def test_modes_are_the_same_to_the_last_bit(
    mesh: NamedMesh, choice: Choice, backend: str, mean: bool, free: bool
) -> None:
    """Values, shapes, residuals, shares, kinds and what the checks say; without MKL, whose sums change their order."""
    results = [solved(mesh, threads, choice, backend, mean, free) for threads in THREADS]
    for one, other in pairwise(results):
        for found, again in ((one.vibration, other.vibration), (one.buckling, other.buckling)):
            assert len(found) == len(again) >= 3
            for a, b in zip(found, again, strict=True):
                assert (a.value, a.residual, a.kind, a.section_share) == (b.value, b.residual, b.kind, b.section_share)
                assert np.array_equal(a.displacement, b.displacement) and np.array_equal(a.rotation, b.rotation)
        assert np.array_equal(one.vibration_shapes, other.vibration_shapes)
        assert np.array_equal(one.buckling_shapes, other.buckling_shapes)
        assert one.checks == other.checks
        assert one.backend == other.backend


@pytest.mark.parametrize("choice", ["multigrid", pytest.param("cholesky", marks=pytest.mark.heavy)])
def test_modes_with_mkl_differ_by_rounding(mesh: NamedMesh, choice: Choice) -> None:
    """Its sums change their order with the threads, so that values that are met to 1e-6 or better move by less."""
    pytest.importorskip("pypardiso")
    results = [solved(mesh, threads, choice, "auto", False, False) for threads in THREADS]
    for one, other in pairwise(results):
        for found, again in ((one.vibration, other.vibration), (one.buckling, other.buckling)):
            assert [a.value for a in found] == pytest.approx([b.value for b in again], rel=1e-9)
            assert [a.kind for a in found] == [b.kind for b in again]
