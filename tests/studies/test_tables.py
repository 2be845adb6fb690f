"""Numbers as a person reads them."""

from __future__ import annotations

import pytest

from studies.report.tables import digits, readable


@pytest.mark.parametrize(("value", "shown"), [
    (0.0, "0"), (9999.6, "10000"), (-15000.0, "-15000"), (123456.0, "123500"), (9_999_600.0, "10000000"),
    (1.2e8, "1.2e+08"), (1.234567e-7, "1.235e-07"),
])
def test_four_figures_without_a_power_of_ten_where_that_is_short(value: float, shown: str) -> None:
    assert digits(value) == shown


def test_a_unit_is_converted_before_the_figures_are_counted() -> None:
    assert readable(1.5e7, "N mm") == "15000 N m"
