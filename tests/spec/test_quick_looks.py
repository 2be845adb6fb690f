"""Short cuts of the checks give what the long way gives."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from geometry.problem import SpecError
from geometry.spec import part_from_text
from geometry.spec.checks import cuts

PART = """
material = "S355"
[members.bar]
from = ["0 mm", "0 mm", "0 mm"]
to = ["300 mm", "0 mm", "0 mm"]
section.shape = "I"
section.depth = "{depth} mm"
section.width = "46 mm"
section.web = "6 mm"
section.flange = "6 mm"
section.root_radius = "{root} mm"
stations = [{{ at = "{x} mm", depth = "{dip} mm" }}, {{ at = "{y} mm", depth = "{after} mm", root_radius = "2 mm" }}]
[[members.bar.{kind}]]
through = "{wall}"
at = "{at} mm"
offset = "{off} mm"
{sizes}
[supports.wall]
on = "bar.start"
hold = "all"
[loads.tip]
on = "bar.end"
force = ["0 N", "0 N", "-10 N"]
"""
KINDS = {
    "holes": 'diameter = "{a} mm"', "slots": 'length = "{b} mm"\nwidth = "{a} mm"\nturned = "{turned} deg"',
    "openings": 'length = "{b} mm"\nheight = "{a} mm"\nturned = "{turned} deg"',
}  # fmt: skip


def told(text: str) -> tuple[str, ...]:
    try:
        part_from_text(text)
    except SpecError as error:
        return tuple(map(str, error.problems))
    return ()


def both(text: str) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """What is told with the short cut, and without it."""
    quick = told(text)
    short = cuts._box_fits
    cuts._box_fits = lambda *_: False
    try:
        return quick, told(text)
    finally:
        cuts._box_fits = short


@given(kind=st.sampled_from(sorted(KINDS)), wall=st.sampled_from(["web", "flanges", "top flange"]),
       depth=st.integers(30, 60), dip=st.integers(24, 60), after=st.integers(30, 60), root=st.integers(0, 4),
       x=st.integers(100, 150), y=st.integers(150, 200), at=st.integers(90, 210), off=st.integers(-20, 20),
       a=st.integers(3, 24), b=st.integers(25, 50), turned=st.integers(-90, 90))
def test_a_cut_judged_by_the_rectangle_about_its_rim_is_judged_as_by_its_rim(kind, a, b, turned, **values):
    sizes = KINDS[kind].format(a=a, b=b, turned=turned)
    quick, slow = both(PART.format(kind=kind, sizes=sizes, **values))
    assert quick == slow


@pytest.mark.parametrize(("dip", "wrong"), [(40, False), (29, True)])
def test_a_wall_that_dips_between_the_ends_of_a_hole_is_seen(dip, wrong):
    text = PART.format(kind="holes", sizes='diameter = "14 mm"', wall="web", depth=60, dip=dip, after=60, root=2, x=150,
                       y=200, at=150, off=0)
    quick, slow = both(text)
    assert quick == slow and bool(quick) is wrong
