"""How much each varied value moves each kept figure.

Three measures, by how the points were laid out:

- ``grid``: shares of the variance from the additive model with one constant a level (main effects of the analysis of
  variance). In a full grid these are the first-order Sobol indices of the levels tried. Where points are missing, a
  share is what the sum of squares grows by when the levels are added last (type II), so that no value is credited
  with what it only shares with another; the rest is told as such.
- ``one at a time``: the swing about the base. There is no variance to share out: the values never vary together.
- sampled plans: where the additive model with a cubic curve for each value leaves less than `ADDITIVE` of the variance
  unexplained (adjusted for its number of constants), the variance of each curve over the sum of all and what is left:
  the first-order Sobol indices of independent values, free of the chance by which a sample's values go together (the
  way of polynomial chaos: B. Sudret, Reliability Engineering and System Safety 93 (2008) 964-979). Otherwise
  first-order Sobol indices without any model, by the random balance design (RBD-FAST), which needs no sample of its own
  design: S. Tarantola, D. Gatelli, T. Mara, Reliability Engineering and System Safety 91 (2006) 717-727; bias removed
  after J.-Y. Tissot, C. Prieur, same journal 107 (2012) 205-213; SALib's code. There a value with few levels, or
  without an order, has its correlation ratio with the bias removed (T. L. Kelley's epsilon squared).

Sobol's own estimator needs Saltelli's sample and is not used.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Literal, NamedTuple

import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]
Kind = Literal["variance", "swing", "curves", "sampled", "correlation", "none"]

LEAST_SAMPLED = 32
"""Points below which a sampled plan gets rank correlations only: the indices scatter by more than 0.15 (set by trial
on three functions with known indices)."""
ADDITIVE = 0.1
"""Share of the variance that the additive curves may leave over."""
ROWS_A_CONSTANT = 3
"""Points that the additive curves need for each of their constants (common practice, no source)."""
RESAMPLES = 60
FEW = 9
"""Values with fewer levels than this are taken by level."""
MOST_ANALYSED = 4000
"""Points that the sampled measure takes; more would not change a percent (its own scatter at 1000 is under 0.02)."""
SHADES = 1e-9
"""A spread below this share of the figure is rounding."""


@dataclass(frozen=True, slots=True)
class Effect:
    """Effect of one varied value on one figure.

    Attributes
    ----------
    share
        Of the variance, or for ``swing`` of the base value: largest less least of the figure; None: not known.
    give
        Half width of the 95 % interval of `share`; nought for grids, which have no scatter.
    centres, means, lows, highs
        Levels (or middles of classes of a sampled value), mean (of the fitted curve where there is one), least and
        largest figure there. A value without an
        order has its levels counted from nought.
    rank
        Spearman's rank correlation; None for a value without an order.
    """

    share: float | None
    give: float
    centres: tuple[float, ...]
    means: tuple[float, ...]
    lows: tuple[float, ...]
    highs: tuple[float, ...]
    rank: float | None = None


@dataclass(frozen=True, slots=True)
class Effects:
    """Effects of all varied values on one figure.

    Attributes
    ----------
    together
        Share of the variance that no value has by itself: it comes from values together.
    shared
        Share that cannot be told apart because the points are not laid out evenly.
    base
        Value of the figure at the base of a ``one at a time`` plan.
    """

    kind: Kind
    count: int
    each: tuple[Effect, ...]
    together: float | None = None
    shared: float | None = None
    base: float | None = None


def effects(columns: Sequence[Floats], ordered: Sequence[bool], figure: Floats, sampling: str) -> Effects:
    """Effects on one figure.

    Parameters
    ----------
    columns
        For each varied value its numbers (n,), or the number of the level of one without an order.
    ordered
        Whether each has an order.
    figure
        (n,) values; NaN where a variant has none: such rows are left out, and `count` says how many are left.
    sampling
        How the points were laid out: see `StudyData`.
    """
    there = np.isfinite(figure)
    y = figure[there]
    xs = [column[there] for column in columns]
    if y.size < 2 or np.ptp(y) <= SHADES * np.abs(y).max():
        return Effects("none", int(y.size), tuple(_along(x, y, None, 0.0, o) for x, o in zip(xs, ordered, strict=True)))
    if sampling == "grid":
        return _grid(xs, ordered, y)
    if sampling == "one at a time":
        return _one_at_a_time(xs, ordered, y)
    return _sampled(xs, ordered, y)


def _grid(xs: Sequence[Floats], ordered: Sequence[bool], y: Floats) -> Effects:
    *shares, together = _additive([_indicators(x) for x in xs], y)
    shared = 1.0 - together - sum(shares)
    each = tuple(_along(x, y, _clean(s), 0.0, o) for x, s, o in zip(xs, shares, ordered, strict=True))
    return Effects("variance", int(y.size), each, _clean(together), shared if abs(shared) > 1e-9 else 0.0)


def _additive(blocks: Sequence[Floats], y: Floats) -> list[float]:
    """Share of the sum of squares that each block adds when it comes last, then what all leave over."""
    total = float(((y - y.mean()) ** 2).sum())
    if total == 0:
        return [0.0] * (len(blocks) + 1)
    left = _residual(blocks, y)
    return [*((_residual([*blocks[:i], *blocks[i + 1:]], y) - left) / total for i in range(len(blocks))), left / total]


def _curve(x: Floats, ordered: bool) -> Floats:
    """(n, 3 or fewer) columns of a cubic without its constant; of a value without an order its levels."""
    levels = np.unique(x).size
    if not ordered:
        return _indicators(x)
    scaled = 2.0 * (x - x.min()) / (np.ptp(x) or 1.0) - 1.0
    return np.polynomial.legendre.legvander(scaled, min(3, levels - 1))[:, 1:]


def _indicators(x: Floats) -> Floats:
    """(n, levels - 1) columns that are one at a level."""
    _, places = np.unique(x, return_inverse=True)
    return np.eye(places.max() + 1)[places][:, 1:]


def _residual(blocks: Sequence[Floats], y: Floats) -> float:
    """Sum of squares that a constant and the levels leave over."""
    matrix = np.column_stack([np.ones(y.size), *blocks])
    solution = np.linalg.lstsq(matrix, y - y.mean(), rcond=None)[0]
    return float(((y - y.mean() - matrix @ solution) ** 2).sum())


def _one_at_a_time(xs: Sequence[Floats], ordered: Sequence[bool], y: Floats) -> Effects:
    """The base is what all values agree on with most of the others."""
    common = [_commonest(x) for x in xs]
    off = [x != c for x, c in zip(xs, common, strict=True)]
    away = np.sum(off, axis=0)
    at_base = np.flatnonzero(away == 0)
    base = float(y[at_base[0]]) if at_base.size else None
    each = []
    for x, apart, o in zip(xs, off, ordered, strict=True):
        ours = (away == 0) | ((away == 1) & apart)
        swing = None
        if ours.any() and base:
            swing = float(np.ptp(y[ours])) / abs(base)
        each.append(_along(x[ours], y[ours], swing, 0.0, o))
    return Effects("swing", int(y.size), tuple(each), base=base)


def _commonest(x: Floats) -> float:
    values, counts = np.unique(x, return_counts=True)
    return float(values[counts.argmax()])


def _sampled(xs: Sequence[Floats], ordered: Sequence[bool], y: Floats) -> Effects:
    some = np.linspace(0, y.size - 1, min(y.size, MOST_ANALYSED)).round().astype(np.int64)
    curves = _curves([x[some] for x in xs], ordered, y[some])
    if curves is not None:
        fitted = _fitted(xs, ordered, curves.constants, float(y.mean()))
        each = [_along(x, y, _clean(s), g, o, shown) for x, s, g, o, shown
                in zip(xs, curves.shares, curves.give, ordered, fitted, strict=True)]
        return Effects("curves", int(y.size), tuple(each), _clean(curves.left))
    if y.size < LEAST_SAMPLED:
        return Effects("correlation", int(y.size),
                       tuple(_along(x, y, None, 0.0, o) for x, o in zip(xs, ordered, strict=True)))
    each = []
    for x, o in zip(xs, ordered, strict=True):
        few = np.unique(x).size < FEW
        share, give = _by_level(x[some], y[some]) if few or not o else _random_balance(x[some], y[some])
        each.append(_along(x, y, _clean(share), give, o))
    total = sum(effect.share or 0.0 for effect in each)
    return Effects("sampled", int(y.size), tuple(each), together=max(0.0, 1.0 - total))


class Curves(NamedTuple):
    """Shares from additive curves, half widths of their 95 % intervals, the share left over, and the constants of the
    curves (the first one stands alone)."""

    shares: list[float]
    give: list[float]
    left: float
    constants: Floats


def _curves(xs: Sequence[Floats], ordered: Sequence[bool], y: Floats) -> Curves | None:
    """None where the curves do not explain enough, or there are too few points."""
    blocks = [_curve(x, o) for x, o in zip(xs, ordered, strict=True)]
    constants = 1 + sum(block.shape[1] for block in blocks)
    if y.size < ROWS_A_CONSTANT * constants:
        return None
    (*shares, left), solution = _curve_shares(blocks, y)
    if left > ADDITIVE:
        return None
    rng = np.random.default_rng(1)
    again = [rng.integers(y.size, size=y.size) for _ in range(RESAMPLES)]
    spread = np.std([_curve_shares([block[i] for block in blocks], y[i])[0][:-1] for i in again], axis=0)
    return Curves(shares, [1.96 * float(s) for s in spread], left, solution)


def _fitted(xs: Sequence[Floats], ordered: Sequence[bool], solution: Floats, mean: float) -> list[Floats]:
    """Each curve at its points (n,), about the mean of the figure: what one value does while the others are even."""
    found, at = [], 1
    for x, o in zip(xs, ordered, strict=True):
        block = _curve(x, o)
        curve = block @ solution[at:at + block.shape[1]]
        found.append(mean + curve - curve.mean())
        at += block.shape[1]
    return found


def _curve_shares(blocks: Sequence[Floats], y: Floats) -> tuple[list[float], Floats]:
    """Variance of each curve, then of what all leave over, as shares of their sum; and the constants."""
    matrix = np.column_stack([np.ones(y.size), *blocks])
    solution: Floats = np.linalg.lstsq(matrix, y, rcond=None)[0].astype(np.float64)
    left = float(((y - matrix @ solution) ** 2).sum()) / (y.size - matrix.shape[1])
    ends = np.cumsum([1, *(block.shape[1] for block in blocks)])
    found = [float(np.var(block @ solution[a:b])) for block, a, b in zip(blocks, ends, ends[1:], strict=False)]
    total = sum(found) + left
    shares = [*(one / total for one in found), left / total] if total > 0 else [0.0] * (len(found) + 1)
    return shares, solution


def _random_balance(x: Floats, y: Floats) -> tuple[float, float]:
    """First-order index and the half width of its 95 % interval."""
    from SALib.analyze import rbd_fast

    if np.ptp(x) == 0:
        return 0.0, 0.0
    problem: dict[str, Any] = {"num_vars": 1, "names": ["x"], "bounds": [[float(x.min()), float(x.max())]]}
    found = rbd_fast.analyze(problem, x[:, None], y, M=4 if y.size < 200 else 6, num_resamples=RESAMPLES, seed=1)
    # SALib draws half as many points each time: its interval is wider by the root of two.
    return float(found["S1"][0]), float(found["S1_conf"][0]) / 2**0.5


def _by_level(x: Floats, y: Floats) -> tuple[float, float]:
    """Epsilon squared of the levels, and the half width of its 95 % interval by resampling."""
    _, places = np.unique(x, return_inverse=True)
    rng = np.random.default_rng(1)
    again = [rng.integers(y.size, size=y.size) for _ in range(RESAMPLES)]
    spread = float(np.std([_epsilon(places[i], y[i]) for i in again]))
    return _epsilon(places, y), 1.96 * spread


def _epsilon(places: Ints, y: Floats) -> float:
    counts = np.bincount(places)
    sums = np.bincount(places, y)
    there = counts > 0
    total = float(((y - y.mean()) ** 2).sum())
    between = float((sums[there] ** 2 / counts[there]).sum() - y.size * y.mean() ** 2)
    free = y.size - int(there.sum())
    if free <= 0 or total <= 0:
        return 0.0
    return (between - (int(there.sum()) - 1) * (total - between) / free) / total


def _along(x: Floats, y: Floats, share: float | None, give: float, ordered: bool, shown: Floats | None = None
           ) -> Effect:
    """Means along one value: at each level, or in classes of equal count when there are many levels. They are of
    `shown` where that is given, a fitted curve."""
    if x.size == 0:
        return Effect(share, give, (), (), (), ())
    values, places = np.unique(x, return_inverse=True)
    if ordered and values.size > 2 * FEW:
        classes = int(np.clip(x.size // 8, 3, 10))
        places = (np.argsort(np.argsort(x, kind="stable"), kind="stable") * classes) // x.size
        values = np.array([x[places == k].mean() for k in range(classes)])
    groups = [y[places == k] for k in range(values.size)]
    means = groups if shown is None else [shown[places == k] for k in range(values.size)]
    return Effect(share, give, tuple(map(float, values)), tuple(float(g.mean()) for g in means),
                  tuple(float(g.min()) for g in groups), tuple(float(g.max()) for g in groups),
                  _spearman(x, y) if ordered else None)


def _spearman(x: Floats, y: Floats) -> float | None:
    from scipy.stats import rankdata

    if x.size < 3 or np.ptp(x) == 0 or np.ptp(y) == 0:
        return None
    return float(np.corrcoef(rankdata(x), rankdata(y))[0, 1])


def _clean(share: float) -> float:
    """Between nought and one: an estimate may stray a little outside."""
    return min(1.0, max(0.0, share if share > 1e-12 else 0.0))
