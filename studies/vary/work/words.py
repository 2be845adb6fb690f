"""Why a variant is suspicious, in sentences that can be counted."""

from __future__ import annotations

from studies.check.result import CheckResult, Pair

MOST = 40
"""Sentences kept of one variant."""


def suspicions(result: CheckResult) -> tuple[str, ...]:
    """One sentence for each suspicious pair, envelope and failed check: what and where first, then after a colon the
    values."""
    pairs = [p for p in result.pairs if p.judgement == "suspicious"]
    found = [f"check {c.name}: {c.value:.4g}, allowed {c.allowed:.4g}" for c in result.checks if not c.ok]
    found += [f"{_what(p)}: solid {_shown(p.solid)}, beam {_shown(p.beam)} {p.unit}" for p in sorted(pairs, key=_share)]
    left = len(found) - MOST
    return (*found[:MOST], *((f"and {left} more: not listed",) if left > 0 else ()))


def _share(pair: Pair) -> float:
    """Least for what differs most beside the largest of its kind."""
    return -abs(pair.difference or 0.0) / pair.scale if pair.scale else 0.0


def _what(pair: Pair) -> str:
    key = pair.key
    words = f"{key.quantity.replace('_', ' ')} {key.component}".strip()
    where = f" at {key.place}" if key.place else ""
    return f"{words}{where}" + (f" in case {key.case}" if key.case else "")


def _shown(value: float | None) -> str:
    return "none" if value is None else f"{value:.4g}"
