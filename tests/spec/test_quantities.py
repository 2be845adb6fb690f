"""Numbers with units, and arithmetic on parameters."""

from __future__ import annotations

import math
import time

import pytest

from geometry.spec.text.expression import evaluate, evaluate_as
from geometry.spec.text.tokens import ExpressionError
from geometry.spec.text.units import KINDS, LENGTH, UNITS, Quantity

SCOPE = {
    "h": Quantity(40.0, LENGTH),
    "t": Quantity(6.0, LENGTH),
    "m": Quantity(3.0),
    "count": Quantity(4.0),
    "A": Quantity(144.0, KINDS["area"].dimension),
}


@pytest.mark.parametrize(
    ("text", "kind", "value"),
    [
        # The inch is 25.4 mm and the pound 0.45359237 kg exactly (international yard and pound agreement, 1959);
        # standard gravity is 9.80665 m/s^2 (3rd CGPM, 1901). Derived: lbf 4.4482216152605 N, psi 6894.757293168 Pa.
        ("1 in", "length", 25.4),
        ("2 ft", "length", 609.6),
        ("3 um", "length", 0.003),
        ("1.5 m", "length", 1500.0),
        ("1 lbf", "force", 4.4482216152605),
        ("2 kip", "force", 8896.443230521),
        ("1 psi", "stress", 6894.757293168e-6),
        ("1 ksi", "stress", 6.894757293168),
        ("1 GPa", "stress", 1000.0),
        ("1 N/m^2", "stress", 1e-6),
        ("1 kN/cm^2", "stress", 10.0),
        ("1 kN m", "moment", 1e6),
        ("5 Nm", "moment", 5000.0),
        ("1 lbf ft", "moment", 1355.8179483314),
        ("1 kN/m", "force per length", 1.0),
        ("1 lbf/in", "force per length", 0.17512683524647),
        ("7850 kg/m^3", "density", 7.85e-9),
        ("2.7 g/cm^3", "density", 2.7e-9),
        ("1 kg", "mass", 1e-3),
        ("1 lb", "mass", 0.45359237e-3),
        ("1 kg m^2", "mass moment of inertia", 1e3),
        ("9.81 m/s^2", "acceleration", 9810.0),
        ("180 deg", "angle", math.pi),
        ("40 K", "temperature change", 40.0),
        ("12e-6 1/K", "thermal expansion", 12e-6),
        ("2 %", "number", 0.02),
    ],
)
def test_a_unit_has_its_defined_size(text: str, kind: str, value: float) -> None:
    assert evaluate_as(text, KINDS[kind], {}) == pytest.approx(value, rel=1e-13)


def test_every_unit_is_read_as_itself_and_not_as_a_shorter_one() -> None:
    for name, unit in UNITS.items():
        assert evaluate(f"3 {name}", {}) == Quantity(3.0 * unit.value, unit.dimension), name
        if name == "1/K":
            continue  # without a space this is 31 divided by K
        assert evaluate(f"3{name}", {}) == Quantity(3.0 * unit.value, unit.dimension), name


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("h / 2 - 3 mm", 17.0),
        ("h - t - t", 28.0),
        ("h / t / 2 * 3 mm", 10.0),
        ("-(h - 2 * t)", -28.0),
        ("--h", 40.0),
        ("sqrt(A)", 12.0),
        ("A / t", 24.0),
        ("(h + t)^2 / h", 52.9),
        ("h**2/t", 1600.0 / 6.0),
        ("min(h, 1 in, 3 cm)", 25.4),
        ("max(h, t)", 40.0),
        ("abs(t - h)", 34.0),
        ("10 mm * m", 30.0),
        ("20 % * h", 8.0),
        ("h / m", 40.0 / 3.0),
        ("2 m", 2000.0),  # a unit follows a number, whatever the parameters are called
        ("2*m * 1 mm", 6.0),
        ("1\u00a0mm \u2212 .5mm", 0.5),
        ("2 mm \u00d7 3", 6.0),
        ("6 mm²/ 2 mm", 3.0),
    ],
)
def test_arithmetic_follows_the_rules_of_writing(text: str, value: float) -> None:
    assert evaluate_as(text, KINDS["length"], SCOPE) == pytest.approx(value, rel=1e-14)


@pytest.mark.parametrize(
    ("text", "word"),
    [
        ("1,5 mm", "1.5 mm"),
        ("1.000,5 mm", "decimal comma"),
        ("60 Mm", 'did you mean "60 mm"'),
        ("5 yd", "no known unit"),
        ("9**9**9 mm", "power"),
        ("(2*h)^5", "power from 0 to 4"),
        ("h^0.5", "power"),
        ("h^2^2", "one power"),
        ("2 mm^5", "unit"),
        ("3 mm ^ 2", "parentheses"),
        ("h^t", "power"),
        ("1 000 mm", "gaps"),
        ("12", 'Add the unit: "12 mm"'),
        ("-12", 'Add the unit: "-12 mm"'),
        ("h + 3", "Give both a unit"),
        ("h * t", "It is an area"),
        ("30 deg", "It is an angle"),
        ("h + 30 deg", "deg or rad"),
        ("hight", "Declare it"),
        ("H", "Did you mean h"),
        ("10 N / mm", "no spaces"),
        ("5 N/m", "rename the parameter"),
        ("h h", "not expected"),
        ("h +", "not expected"),
        ("(h", "closing parenthesis"),
        ("h)", "not expected"),
        ("", "not expected"),
        ("   ", "not expected"),
        ("h / 0", "divisor other than 0"),
        ("h / (t - 6 mm)", "divisor other than 0"),
        ("sqrt(t - h)", "positive"),
        ("sqrt(h)", "It is a length"),
        ("sqrt(h, t)", "one value"),
        ("min(h, 3)", "Give both a unit"),
        ("sqrt", "function"),
        ("1e400 mm", "finite"),
        ("1e200 mm * 1e200", "too large"),
        ("(1e300 * m)^4", "too large"),
        ("nan", "not declared"),
        ("inf mm", "not declared"),
        ("__import__('os')", "Remove the character"),
        ("h.real", "Remove the character"),
        ("0x10 mm", "no known unit"),
        ("\u0661 mm", "Remove the character"),  # an Arabic digit one is no digit here
        ("25 degC", "25 K"),
        ("(" * 100 + "h" + ")" * 100, "nested parentheses"),
        ("(" * 10_000, "at most 300 characters"),
    ],
)
def test_a_slip_is_refused_with_its_repair(text: str, word: str) -> None:
    start = time.perf_counter()
    with pytest.raises(ExpressionError) as caught:
        evaluate_as(text, KINDS["length"], SCOPE)
    assert word in str(caught.value)
    assert time.perf_counter() - start < 2.0  # nothing that a person can write takes long


def test_a_long_sum_does_not_nest() -> None:
    assert evaluate("+".join(["1"] * 150), {}).value == 150.0
