"""Variants are made fast enough for a study of ten thousand."""

from __future__ import annotations

import subprocess
import sys
import time
from pathlib import Path

import pytest

MANY = ('[vary]\nroot_depth = { from = "50 mm", to = "72 mm", steps = 124 }\n'
        'tip_depth = { from = "30 mm", to = "40 mm", steps = 9 }\n'
        'bore = ["10 mm", "12 mm", "14 mm", "16 mm"]\n"members.arm.section.flange" = ["6 mm", "8 mm"]\n'
        '[constraints]\nslope = "tip_depth <= root_depth - 10 mm"\n')


def test_points_are_made_when_they_are_asked_for(plan):
    made = plan('[vary]\nroot_depth = { from = "50 mm", to = "70 mm", steps = 9999 }\nbore = ["8 mm", "9 mm"]')
    start = time.process_time()
    assert made.count() == 20000
    first = next(made.variants())
    assert time.process_time() - start < 0.5
    assert first.number == 1


@pytest.mark.heavy
def test_ten_thousand_points_take_less_than_twenty_seconds(plan):
    made = plan(MANY)
    assert made.count() == 10000
    start = time.process_time()
    found = sum(1 for _ in made.points())
    seconds = time.process_time() - start
    print(f"{found} points in {seconds:.1f} s of one core")
    assert found == 10000 and seconds < 20.0


def test_reading_a_plan_loads_no_kernel_and_no_solver():
    code = ("import sys; from studies.vary.plan import read_plan; p = read_plan(sys.argv[1]); next(p.variants()); "
            "print([n for n in ('cadquery', 'OCP', 'gmsh', 'skfem', 'scipy.sparse', 'numba', 'pandas', 'matplotlib') "
            "if n in sys.modules])")
    root = Path(__file__).parents[2]
    done = subprocess.run([sys.executable, "-c", code, str(root / "studies" / "examples" / "camera_arm_plan.toml")],
                          capture_output=True, text=True, timeout=60, check=True, env={"PYTHONPATH": str(root)})
    assert done.stdout.strip() == "[]"
