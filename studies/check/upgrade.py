"""Result files of older layouts, as they would be written today."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from studies.check.result import FORMAT

Raw = dict[str, Any]


def _to_2(raw: Raw) -> Raw:
    """Runs before modes and travelling loads had neither; their solver was not told."""
    return {**raw, "modes": [], "travels": [], "envelopes": [], "solver": None}


STEPS: dict[int, Callable[[Raw], Raw]] = {1: _to_2}
"""What brings a file from its layout to the next one."""


def upgraded(raw: Raw) -> Raw:
    """The content of a file in the layout of `FORMAT`; that it has a known format has been seen before."""
    given, ours = (int(name.rpartition("/")[2]) for name in (raw["format"], FORMAT))
    for number in range(given, ours):
        raw = STEPS[number](raw)
    return {**raw, "format": FORMAT}
