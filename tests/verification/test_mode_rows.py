"""Rows of REFERENCES group E, from the text of a spec through CAD, mesh and both models to the judge."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from math import pi

import pytest
from chain import bar_text, end_force, rectangle, solved

from studies.check.result import Pair
from studies.judge import judge

E, RHO = 210000.0, 7.85e-9
EI_WEAK = E * 30 * 20**3 / 12  # of the bar 20 x 30
FREE_WALL = '[supports.wall]\non = "bar.start"\ncoupling = "average"\nhold = ["x", "y", "z", "rx", "ry", "rz"]\n'
"""Holds the mean motion only: the section may swell and warp, as beam theory has it."""
MASS = RHO * 600.0 * 1000.0


def _tip_mass(ratio: float) -> str:
    return (f'[loads.tip]\non = "bar.end"\npoint = ["1000 mm", "0 mm", "0 mm"]\ncoupling = "average"\n'
            f'mass = "{1000 * ratio * MASS:.12g} kg"\n')  # fmt: skip


@dataclass(frozen=True)
class Row:
    """The least positive values of one study against published ones."""

    name: str
    text: str
    quantity: str
    reference: tuple[float, ...]


COLUMN = bar_text(rectangle(30, 20), "1000 mm", FREE_WALL + end_force(x=-1000.0)
                  + "[vibration]\nmodes = 2\n[buckling.all]\nmodes = 1\n")  # fmt: skip
ROWS = (
    Row("E2 cantilever 20 x 30", COLUMN, "natural_frequency", (16.7103, 25.0655)),
    Row("E6 cantilever column", COLUMN, "buckling_factor", (0.25 * pi**2 * EI_WEAK / 1e6 / 1000.0,)),
    Row("E3 tip mass as heavy as the beam",
        bar_text(rectangle(30, 20), "1000 mm", FREE_WALL + _tip_mass(1.0) + "[vibration]\nmodes = 1\n"),
        "natural_frequency", (1.557298 / (2 * pi) * (EI_WEAK / (MASS * 1000.0**3)) ** 0.5,)),
    Row("E10 lateral buckling of a blade",
        bar_text(rectangle(60, 5), "1000 mm", FREE_WALL + end_force(z=-100.0) + "[buckling.all]\nmodes = 1\n"),
        "buckling_factor", (6.359,)),
)  # fmt: skip


_solved = cache(solved)
"""Two rows are of one bar."""


QUICK = COLUMN
"""The bar of E2 and E6; the others take 7 and 10 s each."""


@pytest.mark.parametrize("row", [
    pytest.param(row, id=row.name, marks=() if row.text == QUICK else pytest.mark.heavy) for row in ROWS
])
def test_row(row: Row) -> None:
    s = _solved(row.text, 0.05)
    assert s.beam_result is not None
    pairs = judge(s.part, s.solid, s.mesh, s.solid_result, s.beam_result).pairs
    mine: list[Pair] = [p for p in pairs if p.key.quantity == row.quantity]
    assert {p.judgement for p in mine} <= {"agrees", "explained"}, [p.look_at for p in mine]
    # both signs of a factor are found
    for values in ([p.solid for p in mine], [p.beam for p in mine]):
        assert None not in values
        least = sorted(v for v in values if v is not None and v > 0)[: len(row.reference)]
        assert least == pytest.approx(row.reference, rel=1e-2)
