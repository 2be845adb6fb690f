"""What the beam model gives back."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from fem.figure import Figure
from fem.mode import Mode

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Cause:
    """A reason, known from the spec, why the solid model will differ honestly from the beam model.

    Attributes
    ----------
    case, place, quantity, component
        Which figures it touches; an empty text matches any. A natural frequency or buckling factor is named ``mode 1``
        and so on by the order of the beam's own list (of its case).
    text
        The reason, one sentence.
    difference
        Predicted (solid minus beam), in the figure's unit, signed.
    band
        Half-width of what is left unexplained by `difference`, same unit.
    """

    case: str
    place: str
    quantity: str
    component: str
    text: str
    difference: float
    band: float


@dataclass(frozen=True, slots=True)
class Diagram:
    """Section forces and displacements along the member in one case; member axes, about the declared line.

    Two entries at each inner node (just before and just after it), so that jumps show as they are. All (k,):
    ``x`` mm; ``N, Vy, Vz`` N; ``T, My, Mz`` N mm on the face with outward normal +x; ``B`` bimoment, N mm^2 (0 where
    warping is free of restraint); ``displacement`` (k, 3) of the line, mm; ``rotation`` (k, 3), rad.
    """

    x: Array
    N: Array
    Vy: Array
    Vz: Array
    T: Array
    My: Array
    Mz: Array
    B: Array
    displacement: Array
    rotation: Array


@dataclass(frozen=True, slots=True)
class BeamResult:
    """Figures and diagrams of the beam model.

    Attributes
    ----------
    figures
        See `fem.figure` and the package docstring for the list.
    diagrams
        One a case.
    properties
        (k, 7) x, A, yc, zc, Iyy, Izz, Iyz of the net section at the 21 stations (member axes from the line, second
        moments about the section's own centroid), mm.
    shear_share
        Case -> share of the strain energy that is shear: what a beam without shear flexibility would miss.
    nominal_shear
        Case -> (21, 4) x, shear stress along z and y at the centroid's level, torsion stress (see
        `fem.beam.stress.nominal_shear`), MPa.
    slenderness
        Length over the largest depth.
    causes
        Predicted honest differences from the solid.
    notes
        Why a figure that one might expect is not given.
    vibration, buckling
        Modes, in the order of their size; those of several buckling studies one after the other.
    """

    figures: tuple[Figure, ...]
    diagrams: Mapping[str, Diagram]
    properties: Array
    mass: float
    shear_share: Mapping[str, float]
    nominal_shear: Mapping[str, Array]
    slenderness: float
    causes: tuple[Cause, ...] = ()
    notes: tuple[str, ...] = ()
    seconds: Mapping[str, float] = field(default_factory=dict)
    vibration: tuple[Mode, ...] = ()
    buckling: tuple[Mode, ...] = ()
