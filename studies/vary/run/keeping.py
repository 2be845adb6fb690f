"""Where the whole run folders of chosen variants are."""

from __future__ import annotations

from pathlib import Path

from studies.vary.variant import Variant

DIGITS = 12
"""Of a key, in the name of a folder."""


def runs_folder(record: str | Path) -> Path:
    """Where the run folders of a record's variants are kept: ``arm.runs`` beside ``arm.study``."""
    return Path(record).with_suffix(".runs")


def kept_run(record: str | Path, key: str) -> Path | None:
    """The kept run folder of the variant with that key; None when none was kept."""
    return next(iter(sorted(runs_folder(record).glob(f"*-{key[:DIGITS]}"))), None)


def new_run(record: str | Path, variant: Variant) -> Path:
    """The run folder that is to be written for a variant: its number, then the beginning of its key, for several
    studies may share a record."""
    return runs_folder(record) / f"{variant.number:04d}-{variant.key[:DIGITS]}"


def at_once(number: int, every: int) -> bool:
    """Whether a variant is one of every n-th, counted from the first: its folder is written as it is evaluated."""
    return every > 0 and (number - 1) % every == 0
