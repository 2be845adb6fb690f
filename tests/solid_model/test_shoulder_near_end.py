"""A shoulder closer to an end than two of its radii still has its notch stress."""

from __future__ import annotations

from fem.solid import solve_solid
from geometry.budget import Budget
from geometry.solid import build_solid
from geometry.spec import part_from_text
from mesher import mesh_solid

SPEC = """
material = "S235"
accuracy = "20 %"
[members.bar]
from = ["0 mm", "0 mm", "0 mm"]
to = ["60 mm", "0 mm", "0 mm"]
section = { shape = "rectangle", depth = "30 mm", width = "15 mm" }
stations = [{ at = "2 mm", depth = "30 mm" }, { at = "2 mm", depth = "20 mm", shoulder_fillet = "4 mm" }]
[supports.wall]
on = "bar.start"
hold = "all"
[loads.tip]
on = "bar.end"
force = ["0 N", "0 N", "-100 N"]
[cases.c]
tip = 1.0
"""


def test_a_shoulder_close_to_the_start_has_both_notch_stresses() -> None:
    part, budget = part_from_text(SPEC), Budget(threads=1)
    result = solve_solid(part, mesh_solid(build_solid(part), part.accuracy, budget), budget)
    found = {f.key.component: f.value for f in result.figures if f.key.quantity == "notch_stress"}
    assert set(found) == {"xx@upper", "xx@lower"}
    nominal = 100.0 * 58.0 / (15.0 * 20.0**2 / 6.0)
    assert nominal < found["xx@upper"] < 2.5 * nominal and -2.5 * nominal < found["xx@lower"] < -nominal
