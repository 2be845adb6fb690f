"""What the modes of a part give reason to say."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from fem.mode import Mode
from fem.solid import SolidResult
from geometry.part import Buckling, Part
from studies.judge.modes import WALLS

GROWING = 3.0
"""Buckling factor below which what a linear solution leaves out is worth a warning: 1 / (1 - 1 / 3) = 1.5 times."""


def mode_cautions(part: Part, solid: SolidResult) -> Iterator[str]:
    """Sentences about vibration, then about each buckling study."""
    if part.vibration is not None:
        yield from _vibration(part, solid.vibration)
    for study in part.buckling:
        yield from _buckling(study, [mode for mode in solid.buckling if mode.case == study.case])


def _local(mode: Mode) -> bool:
    return mode.kind == "local" or mode.section_share < WALLS


def _vibration(part: Part, modes: Sequence[Mode]) -> Iterator[str]:
    if not modes:
        yield "Natural frequencies were asked for, and the solid model gave none."
        return
    lowest = min(modes, key=lambda mode: mode.value)
    if _local(lowest):
        yield (f"The lowest natural frequency, {lowest.value:.4g} Hz, is that of a wall that moves by itself: the beam "
               "model knows no such shape, so that one model alone speaks for it.")
    if part.vibration is not None and part.vibration.free and part.supports:
        yield "The natural frequencies are those of the free part, without its supports."
    yield ("A frequency says nothing of how far the part swings: keep it away from what excites the part, and look at "
           "fatigue where it cannot be kept away. Damping, and the give of what the supports stand on, are not in it.")


def _buckling(study: Buckling, modes: Sequence[Mode]) -> Iterator[str]:
    case = f"case {study.case}"
    if not modes:
        yield f"Buckling, {case}: the solid model found no factor; its loads press on nothing that could give way."
        return
    grows = f" ({', '.join(study.fixed)} kept as it is)" if study.fixed else ""
    positive = [mode for mode in modes if mode.value > 0.0]
    negative = [mode for mode in modes if mode.value < 0.0]
    if positive:
        lowest = min(positive, key=lambda mode: mode.value)
        factor = lowest.value
        if factor <= 1.0:
            yield (f"The part buckles under {case}{grows}: factor {factor:.3g}, {lowest.kind}. The linear figures of "
                   "this case mean nothing.")
        elif factor < GROWING:
            yield (f"Buckling factor {factor:.3g} under {case}{grows}: deflections and stresses grow beyond the linear "
                   f"ones by about 1 / (1 - 1 / {factor:.3g}) = {1.0 / (1.0 - 1.0 / factor):.2g} times.")
        if _local(lowest):
            yield (f"The lowest buckling factor of {case}, {factor:.3g}, is that of a wall that buckles by itself: the "
                   "beam model knows no such shape, so that one model alone speaks for it.")
    if negative:
        least = max(negative, key=lambda mode: mode.value)
        yield (f"Buckling, {case}: the factor {least.value:.3g} is negative: the part would buckle under the varying "
               f"loads reversed, {abs(least.value):.3g} times as large.")
    yield (f"The buckling factors of {case} are those of the perfect, elastic part. Crookedness, residual stress and "
           "yielding bring a real part down earlier, a short or thin-walled one much earlier: the column and plate "
           "curves of a code of practice, and whoever is licensed to apply them, decide.")
