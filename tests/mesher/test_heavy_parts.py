"""Real parts at working accuracy: the first attempt succeeds, and the mesh is of the size that was planned for."""

from __future__ import annotations

from types import ModuleType

import pytest

from geometry.budget import Budget
from mesher import mesh_solid

pytestmark = pytest.mark.heavy


@pytest.mark.parametrize("name", ["camera_arm", "tube", "stepped_shaft"])
@pytest.mark.parametrize("accuracy", [0.05, 0.02, 0.01])
def test_first_attempt_succeeds_and_the_estimate_holds(solids: ModuleType, name: str, accuracy: float) -> None:
    solid = getattr(solids, name)()
    mesh = mesh_solid(solid, accuracy, Budget())
    assert mesh.recipe["failed"] == []
    assert mesh.recipe["estimated_nodes"] == pytest.approx(mesh.nodes.shape[1], rel=0.25)
    assert mesh.volume == pytest.approx(solid.volume, rel=2e-4)
    if name == "camera_arm" and accuracy == 0.02:
        # 85 000 unknowns. It was 60 000 until the holes got the elements that their measured rim stress asks for (36
        # around, half the accuracy at the rim: `mesher.sizes`); a third either way tells when sizes move again.
        assert 21_000 <= mesh.nodes.shape[1] <= 38_000
