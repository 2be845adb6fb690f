"""Stock lists: the sizes that can be bought."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Stock:
    """Sizes as written, and where they come from."""

    sizes: tuple[str, ...]
    source: str


def _mm(text: str) -> tuple[str, ...]:
    return tuple(f"{size} mm" for size in text.split())


_PRACTICE = "common practice, no source: look at what your supplier keeps"

BUILT_IN: dict[str, Stock] = {
    "plate": Stock(_mm("1 1.5 2 2.5 3 4 5 6 8 10 12 15 20 25 30 35 40 50"), f"plate thicknesses, {_PRACTICE}"),
    "bar": Stock(_mm("6 8 10 12 14 15 16 18 20 22 25 28 30 32 35 40 45 50 55 60 65 70 80 90 100"),
                 f"diameters and sides of bars, {_PRACTICE}"),
    "drill": Stock(_mm("1 1.5 2 2.5 3 3.3 3.5 4 4.2 4.5 5 5.5 6 6.5 6.6 7 7.5 8 8.5 9 9.5 10 10.2 10.5 11 11.5 12 12.5 "
                       "13 13.5 14 14.5 15 15.5 16 16.5 17 17.5 18 18.5 19 19.5 20 21 22 23 24 25 26 27 28 29 30"),
                   f"twist drills, with clearance and tapping sizes, {_PRACTICE}"),
}  # fmt: skip
"""Stock lists that every plan may name; one of the plan's own of the same name comes first."""
