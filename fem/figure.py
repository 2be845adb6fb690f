"""One number that a model gives, with a key that says which number it is."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, NamedTuple

Quantity = Literal[
    "displacement", "rotation", "reaction_force", "reaction_moment", "section_force", "section_moment",
    "nominal_stress", "notch_stress", "peak_stress", "strain_energy", "mass", "centre_of_mass",
    "natural_frequency", "buckling_factor",
]


class FigureKey(NamedTuple):
    """Two figures with equal keys are the same figure, whichever model gave them.

    Attributes
    ----------
    case
        Load case; empty for what does not depend on one (mass).
    place
        ``arm.end``, a named place, ``arm@120`` (a station, mm, 6 significant digits), a support, a
        cut (``arm.hole1``), or empty for the whole part.
    quantity
        See `Quantity`.
    component
        ``x``, ``y``, ``z`` for vectors; ``N``, ``Vy``, ``Vz``, ``T``, ``My``, ``Mz`` for section forces;
        ``xx@top`` and the like for stresses; ``size`` for a magnitude; empty for a scalar.
    axes
        ``global`` or ``member``.
    """

    case: str
    place: str
    quantity: Quantity
    component: str
    axes: Literal["global", "member"] = "global"


@dataclass(frozen=True, slots=True)
class Figure:
    """A value in N, mm, MPa, t, rad.

    `error` is the model's own statement of its numerical error (same unit), None where it has none.
    `note` names a basis where one is needed (gross or net, source of a factor).
    """

    key: FigureKey
    value: float
    unit: str
    error: float | None = None
    note: str = ""


def station_place(member: str, at: float) -> str:
    """Name of a station: the same text from both models, ``arm@120``."""
    return f"{member}@{at:.6g}"
