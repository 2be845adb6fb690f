"""The rectangular cantilever: exact volume, area, centroid and region areas."""

from __future__ import annotations

import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parent))
from parts import make_part  # noqa: E402

from geometry.solid import build_solid  # noqa: E402


def test_rectangular_cantilever_is_exact() -> None:
    solid = build_solid(make_part("rectangle", {"depth": 60.0, "width": 40.0}, 500.0))
    assert solid.volume == pytest.approx(60 * 40 * 500, rel=1e-12)
    assert solid.area == pytest.approx(2 * (60 * 40 + 60 * 500 + 40 * 500), rel=1e-12)
    assert solid.centroid == pytest.approx((250.0, 0.0, 0.0), abs=1e-9)
    areas = {name: sum(solid.faces[i].area for i in ids) for name, ids in solid.regions.items()}
    assert areas == pytest.approx({
        "arm.start": 2400.0, "arm.end": 2400.0, "arm.top": 20000.0, "arm.bottom": 20000.0,
        "arm.left": 30000.0, "arm.right": 30000.0,
    }, rel=1e-12)
    top = solid.faces[solid.regions["arm.top"][0]]
    assert top.centroid == pytest.approx((250.0, 0.0, 30.0), abs=1e-9)
    assert solid.faces[solid.regions["arm.left"][0]].centroid == pytest.approx((250.0, -20.0, 0.0), abs=1e-9)
