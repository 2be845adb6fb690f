"""A natural vibration or a buckling shape, in the words that both models share."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

SHAPE_STATIONS = 41
"""Modes are given at x = k L / (SHAPE_STATIONS - 1), so that a shape with several waves can be told from another."""

OTHER_SIGN = 100.0
"""Where all buckling factors asked for have one sign, how many times the least of them one of the other sign is looked
for: set by trial."""


def none_of_other_sign(case: str) -> str:
    """Name of the check that the solid model gives where it looked so far for a factor of the other sign in vain."""
    return f"buckling of {case}: factors of the other sign"


@dataclass(frozen=True, slots=True)
class Mode:
    """One mode of either model.

    Attributes
    ----------
    value
        Natural frequency, Hz, or buckling factor (negative: under the varying loads reversed).
    case
        The load case of a buckling factor; empty for a natural frequency.
    displacement, rotation
        (SHAPE_STATIONS, 3) section means as defined for the figures of the same names, global, at equal steps from the
        member's start to its end. Scaled so that the largest displacement of any point of the section is about 1 mm
        (either model's own way, sign free): only their ratios mean anything.
    kind
        What the shape mostly is: ``bending about y``, ``bending about z`` (member axes), ``bending`` (neither),
        ``torsion``, ``axial``, ``lateral-torsional`` (bending about z with torsion, or the like), ``local`` (the
        section does not keep its shape), in the model's own judgement.
    residual
        |K phi - value ... phi| over |K phi| of what was solved; 0 for a closed form.
    section_share
        Share of the shape (kinetic energy, or mean square displacement where there is no mass) that rigid sections
        with the given motion explain: 1 for the beam by definition; well under 1 where a wall moves by itself.
    mass_share
        (6,) share of the part's mass and moments of inertia (about its centre of mass, global axes) that the mode
        carries; zeros for buckling.
    """

    value: float
    displacement: Array
    rotation: Array
    kind: str
    residual: float = 0.0
    section_share: float = 1.0
    mass_share: Array = field(default_factory=lambda: np.zeros(6))
    case: str = ""
