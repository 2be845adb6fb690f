"""Quantities: a value in N, mm, MPa, t, s, rad, K together with its dimension, and the list of units.

There is no units algebra here: a unit is one of the spellings in `UNITS`, and nothing else. That is what
keeps ``"60 Mm"`` from becoming 60 megametres and ``"5 Nm"`` from being read as anything but newton metres.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple


class Dimension(NamedTuple):
    """Exponents of length (mm), mass (t), time (s), temperature (K) and angle (rad)."""

    length: int = 0
    mass: int = 0
    time: int = 0
    temperature: int = 0
    angle: int = 0

    def times(self, other: Dimension, sign: int = 1) -> Dimension:
        """Dimension of a product (``sign`` = 1) or of a quotient (-1)."""
        return Dimension(*(a + sign * b for a, b in zip(self, other, strict=True)))

    def power(self, exponent: int) -> Dimension:
        """Dimension of a whole power."""
        return Dimension(*(a * exponent for a in self))


NUMBER = Dimension()
LENGTH = Dimension(length=1)
AREA = Dimension(length=2)
VOLUME = Dimension(length=3)
SECOND_MOMENT = Dimension(length=4)
MASS = Dimension(mass=1)
TIME = Dimension(time=1)
FREQUENCY = Dimension(time=-1)
TEMPERATURE = Dimension(temperature=1)
ANGLE = Dimension(angle=1)
ACCELERATION = Dimension(length=1, time=-2)
FORCE = Dimension(length=1, mass=1, time=-2)
MOMENT = Dimension(length=2, mass=1, time=-2)
STRESS = Dimension(length=-1, mass=1, time=-2)
LINE_FORCE = Dimension(mass=1, time=-2)
DENSITY = Dimension(length=-3, mass=1)
EXPANSION = Dimension(temperature=-1)
INERTIA = Dimension(length=2, mass=1)


@dataclass(frozen=True, slots=True)
class Quantity:
    """A value in base units (N, mm, MPa, t, s, rad, K) and its dimension."""

    value: float
    dimension: Dimension = NUMBER


@dataclass(frozen=True, slots=True)
class Kind:
    """What a field of the spec holds.

    Attributes
    ----------
    word
        What a person calls it: ``length``.
    dimension
        Its dimension.
    unit
        The base unit it is kept in (text, empty for a plain number).
    example
        A value as it would be written.
    """

    word: str
    dimension: Dimension
    unit: str
    example: str

    @property
    def units(self) -> tuple[str, ...]:
        """Every spelling that may stand in such a field."""
        return tuple(name for name, unit in UNITS.items() if unit.dimension == self.dimension)


KINDS: dict[str, Kind] = {
    kind.word: kind
    for kind in (
        Kind("number", NUMBER, "", "1.5"),
        Kind("length", LENGTH, "mm", "12 mm"),
        Kind("angle", ANGLE, "rad", "30 deg"),
        Kind("force", FORCE, "N", "250 N"),
        Kind("moment", MOMENT, "N mm", "40 N m"),
        Kind("stress", STRESS, "MPa", "160 MPa"),
        Kind("force per length", LINE_FORCE, "N/mm", "2 N/mm"),
        Kind("mass", MASS, "t", "3.5 kg"),
        Kind("density", DENSITY, "t/mm^3", "7850 kg/m^3"),
        Kind("mass moment of inertia", INERTIA, "t mm^2", "0.02 kg m^2"),
        Kind("acceleration", ACCELERATION, "mm/s^2", "9.81 m/s^2"),
        Kind("temperature change", TEMPERATURE, "K", "40 K"),
        Kind("thermal expansion", EXPANSION, "1/K", "12e-6 1/K"),
        Kind("frequency", FREQUENCY, "Hz", "40 Hz"),
        Kind("quantity", NUMBER, "", "12 mm"),  # a parameter: of any dimension
        # Not fields of the spec, but results of arithmetic that messages must be able to name.
        Kind("area", AREA, "mm^2", "120 mm^2"),
        Kind("volume", VOLUME, "mm^3", "800 mm^3"),
        Kind("second moment of area", SECOND_MOMENT, "mm^4", "4e5 mm^4"),
        Kind("time", TIME, "s", "0.2 s"),
    )
}

INCH = 25.4
POUND = 0.45359237e-3  # t
STANDARD_GRAVITY = 9806.65  # mm/s^2
POUND_FORCE = POUND * STANDARD_GRAVITY  # N
DEGREE = 0.017453292519943295

_TABLE: tuple[tuple[Dimension, dict[str, float]], ...] = (
    (LENGTH, {"mm": 1.0, "cm": 10.0, "m": 1e3, "um": 1e-3, "µm": 1e-3, "in": INCH, "ft": 12 * INCH}),
    (AREA, {"mm^2": 1.0, "cm^2": 1e2, "m^2": 1e6, "in^2": INCH**2}),
    (VOLUME, {"mm^3": 1.0, "cm^3": 1e3, "m^3": 1e9, "in^3": INCH**3}),
    (SECOND_MOMENT, {"mm^4": 1.0, "cm^4": 1e4, "in^4": INCH**4}),
    (FORCE, {"N": 1.0, "kN": 1e3, "MN": 1e6, "lbf": POUND_FORCE, "kip": 1e3 * POUND_FORCE}),
    (
        MOMENT,
        {"N mm": 1.0, "N m": 1e3, "kN m": 1e6, "kN mm": 1e3, "Nmm": 1.0, "Nm": 1e3, "kNm": 1e6}
        | {"lbf in": POUND_FORCE * INCH, "lbf ft": POUND_FORCE * 12 * INCH}
        | {"kip in": 1e3 * POUND_FORCE * INCH, "kip ft": 1e3 * POUND_FORCE * 12 * INCH},
    ),
    (
        STRESS,
        {"MPa": 1.0, "GPa": 1e3, "kPa": 1e-3, "Pa": 1e-6, "N/mm^2": 1.0, "N/m^2": 1e-6, "kN/m^2": 1e-3}
        | {"kN/mm^2": 1e3, "kN/cm^2": 10.0}
        | {"psi": POUND_FORCE / INCH**2, "ksi": 1e3 * POUND_FORCE / INCH**2},
    ),
    (
        LINE_FORCE,
        {"N/mm": 1.0, "N/m": 1e-3, "kN/m": 1.0, "kN/mm": 1e3, "lbf/in": POUND_FORCE / INCH}
        | {"lbf/ft": POUND_FORCE / (12 * INCH)},
    ),
    (ANGLE, {"deg": DEGREE, "rad": 1.0, "mrad": 1e-3, "°": DEGREE}),
    (MASS, {"g": 1e-6, "kg": 1e-3, "t": 1.0, "lb": POUND}),
    (DENSITY, {"kg/m^3": 1e-12, "t/m^3": 1e-9, "g/cm^3": 1e-9, "t/mm^3": 1.0, "lb/in^3": POUND / INCH**3}),
    (INERTIA, {"kg m^2": 1e3, "t mm^2": 1.0, "kg mm^2": 1e-3, "lb in^2": POUND * INCH**2}),
    (TIME, {"s": 1.0, "ms": 1e-3}),
    (FREQUENCY, {"Hz": 1.0, "kHz": 1e3}),
    (ACCELERATION, {"m/s^2": 1e3, "mm/s^2": 1.0}),
    (TEMPERATURE, {"K": 1.0}),
    (EXPANSION, {"1/K": 1.0}),
    (NUMBER, {"%": 1e-2}),
)

UNITS: dict[str, Quantity] = {
    name: Quantity(factor, dimension) for dimension, names in _TABLE for name, factor in names.items()
}
"""Every unit that is read, by its spelling; the value is its size in base units."""


def name_of(dimension: Dimension) -> str:
    """What a person calls a dimension: ``length``, ``force per length``; exponents when it has no name."""
    for kind in KINDS.values():
        if kind.dimension == dimension:
            return "plain number" if dimension == NUMBER else kind.word
    symbols = ("mm", "t", "s", "K", "rad")
    return "quantity in " + " ".join(f"{s}^{e}" for s, e in zip(symbols, dimension, strict=True) if e)
