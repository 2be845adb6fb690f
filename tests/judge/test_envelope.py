"""The envelope names the governing case and place of each extreme."""

from __future__ import annotations

import pytest
from bar import sound

from fem.figure import Figure, FigureKey
from studies.judge.envelope import envelope


def _moment(case: str, place: str, value: float) -> Figure:
    return Figure(FigureKey(case, place, "section_moment", "My", "member"), value, "N mm")


def test_extremes_of_known_figures() -> None:
    solid = [_moment("a", "arm@0", 5.0), _moment("a", "arm@9", -1.0), _moment("b", "arm@0", 7.0),
             _moment("b", "arm@9", -0.5)]
    greatest, least = envelope(solid, [_moment("b", "arm@0", 7.1)])
    assert (greatest.value, greatest.beam, greatest.case, greatest.place) == (7.0, 7.1, "b", "arm@0")
    assert (least.value, least.beam, least.case, least.place) == (-1.0, None, "a", "arm@9")


def test_the_heavier_case_governs_the_bar() -> None:
    _, _, _, solid, beam = sound()
    rows = {(r.quantity, r.component, r.which): r for r in envelope(solid.figures, beam.figures)}
    sag = rows["displacement", "z", "least"]
    assert sag.case == "lifting_with_weight"
    assert sag.place in ("arm.end", "arm@400")
    root = rows["section_moment", "My", "greatest"]
    # P L + w L^2 / 2 (statics), w = 10 x 20 mm^2 of steel
    assert root.value == pytest.approx(100 * 400 + 200 * 7.85e-9 * 9810 * 400**2 / 2, rel=1e-6)
    assert ("rotation", "x", "greatest") not in rows  # nothing beside the bending rotations
