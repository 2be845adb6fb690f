"""Envelopes of a travelling load along the member: greatest and least of each figure over the positions."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np

from studies.check.studied import Peak, TravelEnvelope, TravelSummary
from studies.report import frame
from studies.report.diagrams import NOTE, PANELS, STRESSES, finish
from studies.report.raster import Floats

SHADE = "#e3e3e3"
"""Between the beam's greatest and least."""
LITTLE = 1e-2
"""Share of the largest of its kind below which a figure gets no diagram."""


def envelope_diagrams(path: Path, title: str, member: str, travel: TravelSummary, rows: Sequence[TravelEnvelope]
                      ) -> None:
    """Small diagrams of section forces, displacements and stresses; the beam as lines, the solid as markers."""
    ours = [row for row in rows if row.key.case == travel.case and row.key.place.startswith(f"{member}@")]
    kinds = [(quantity, component, f"{text} ({unit})", factor) for quantity, component, text, factor, unit in PANELS]
    kinds += [("nominal_stress", component, f"stress at {side} (MPa)", 1.0) for component, side in STRESSES]
    scales = {q: max((_size(row) for row in ours if row.key.quantity == q), default=0.0) for q, *_ in kinds}
    drawn = [kind for kind in kinds if _largest(ours, kind[0], kind[1]) > LITTLE * scales[kind[0]]]
    count = -(-(len(drawn) + 1) // 3)
    with frame.page(13, 2.7 * count + 1.4) as figure:
        panels = figure.subplots(count, 3, sharex=True, squeeze=False)
        for axes, (quantity, component, text, factor) in zip(panels.flat, drawn, strict=False):
            _panel(axes, [r for r in ours if (r.key.quantity, r.key.component) == (quantity, component)], factor)
            finish(axes, text, _largest(ours, quantity, component), factor, scales[quantity])
        for axes in panels.flat[len(drawn):]:
            axes.set_axis_off()
        for k, axes in enumerate(panels.flat[:len(drawn)]):
            if k + 3 >= len(drawn):
                axes.xaxis.set_tick_params(labelbottom=True)
                axes.set_xlabel("distance from the start of the member (mm)")
        _key(panels.flat[len(drawn)])
        first, last = travel.positions[0], travel.positions[-1]
        figure.suptitle(f"{title}, case {travel.case}: greatest and least over {len(travel.positions)} positions of "
                        f"{travel.load}, first axle at {first:.6g} to {last:.6g} mm", fontsize=13)
        figure.supxlabel(NOTE, fontsize=9.5, color=frame.NEUTRAL)
        frame.save(figure, path)


def _size(row: TravelEnvelope) -> float:
    return max(abs(p.value) for p in (row.solid_greatest, row.solid_least, row.beam_greatest, row.beam_least) if p)


def _largest(rows: Sequence[TravelEnvelope], quantity: str, component: str) -> float:
    return max((_size(r) for r in rows if (r.key.quantity, r.key.component) == (quantity, component)), default=0.0)


def curve(rows: Sequence[TravelEnvelope], name: str) -> tuple[Floats, Floats]:
    """Station (mm) and value of one extreme (``solid_greatest`` ...) of each row that has it, along the member."""
    found: list[tuple[float, Peak]] = [(float(row.key.place.partition("@")[2]), peak) for row in rows
                                       if (peak := getattr(row, name)) is not None]
    found.sort(key=lambda item: item[0])
    return np.array([x for x, _ in found]), np.array([peak.value for _, peak in found])


def _panel(axes: Any, rows: Sequence[TravelEnvelope], factor: float) -> None:
    (x, high), (_, low) = curve(rows, "beam_greatest"), curve(rows, "beam_least")
    if len(high) == len(low):
        axes.fill_between(x, factor * low, factor * high, color=SHADE, lw=0, zorder=1)
    for name, marker in (("greatest", "^"), ("least", "v")):
        xb, vb = curve(rows, f"beam_{name}")
        xs, vs = curve(rows, f"solid_{name}")
        axes.plot(xb, factor * vb, color=frame.BEAM, lw=1.4)
        axes.plot(xs, factor * vs, ls="none", marker=marker, ms=5, mfc="none", mec=frame.SOLID, mew=1.4)


def _key(axes: Any) -> None:
    axes.fill_between([], [], color=SHADE, label="range of the beam model")
    axes.plot([], [], color=frame.BEAM, lw=1.4, label="beam model, greatest and least")
    for marker, word in (("^", "greatest"), ("v", "least")):
        axes.plot([], [], ls="none", marker=marker, ms=6, mfc="none", mec=frame.SOLID, mew=1.4,
                  label=f"solid model, {word}")
    axes.legend(loc="center", frameon=False, fontsize=12)
