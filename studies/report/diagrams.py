"""Diagrams along the member: solid model as markers, beam model as a line, on one axis."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np

from fem.beam.result import Diagram
from fem.figure import Figure, Quantity
from studies.report import frame

PANELS: tuple[tuple[Quantity, str, str, float, str], ...] = (
    ("section_force", "N", "axial force N", 1.0, "N"),
    ("section_force", "Vy", "shear force Vy", 1.0, "N"),
    ("section_force", "Vz", "shear force Vz", 1.0, "N"),
    ("section_moment", "T", "torque T", 1e-3, "N m"),
    ("section_moment", "My", "bending moment My", 1e-3, "N m"),
    ("section_moment", "Mz", "bending moment Mz", 1e-3, "N m"),
    ("displacement", "x", "displacement x", 1.0, "mm"),
    ("displacement", "y", "displacement y", 1.0, "mm"),
    ("displacement", "z", "displacement z", 1.0, "mm"),
)
"""Quantity, component, title, factor from the internal unit, unit drawn."""

STRESSES = (("xx@top", "top"), ("xx@bottom", "bottom"), ("xx@left", "left"), ("xx@right", "right"))

NOTE = ("Section forces: what the far part exerts on the near part, about the declared member line, member axes; "
        "moments right-handed\n(My positive: tension at +z; Mz positive: tension at -y). "
        "Displacements: section means, global axes. Stress: along the member, tension positive.")


def stations_of(figures: Sequence[Figure], case: str, member: str, quantity: Quantity,
                component: str) -> tuple[np.ndarray, np.ndarray]:
    """Station (mm) and value of every figure of that kind, in order along the member."""
    found = sorted((float(f.key.place.partition("@")[2]), f.value) for f in figures
                   if f.key.case == case and f.key.quantity == quantity and f.key.component == component
                   and f.key.place.startswith(f"{member}@"))
    return np.array([x for x, _ in found]), np.array([v for _, v in found])


def diagrams(path: Path, title: str, case: str, member: str, solid: Sequence[Figure], beam: Sequence[Figure],
             line: Diagram | None = None) -> None:
    """Eleven small diagrams for one case of one member.

    `line` is the beam's own curve of section forces, whose jumps stand upright; without it the beam's values
    at the stations are joined.
    """
    with frame.page(13, 11.5) as figure:
        panels = figure.subplots(4, 3, sharex=True)
        kinds = {("section_force", "N"), ("section_moment", "N m"), ("displacement", "mm")}
        scales = {kind[0]: _scale([solid, beam], case, kind[0]) for kind in kinds}
        for axes, (quantity, component, text, factor, unit) in zip(panels.flat, PANELS, strict=False):
            curves = [stations_of(figures, case, member, quantity, component) for figures in (solid, beam)]
            if line is not None and quantity in ("section_force", "section_moment"):
                curves[1] = (line.x, getattr(line, component))
            _panel(axes, curves, f"{text} ({unit})", factor, scales[quantity])
        scale = _scale([solid, beam], case, "nominal_stress")
        for axes, pair in zip(panels[3, :2], (STRESSES[:2], STRESSES[2:]), strict=True):
            _stress_panel(axes, pair, case, member, solid, beam, scale)
        for axes in panels[3]:
            axes.set_xlabel("distance from the start of the member (mm)")
        panels[2, 2].xaxis.set_tick_params(labelbottom=True)
        panels[2, 2].set_xlabel("distance from the start of the member (mm)")
        _key(panels[3, 2])
        figure.suptitle(f"{title}, case {case}: {member} as solid and as beam", fontsize=13)
        figure.supxlabel(NOTE, fontsize=9.5, color=frame.NEUTRAL)
        frame.save(figure, path)


def _scale(models: Sequence[Sequence[Figure]], case: str, quantity: str) -> float:
    return max((abs(f.value) for figures in models for f in figures
                if f.key.case == case and f.key.quantity == quantity and "@" in f.key.place), default=0.0)


def _panel(axes: Any, curves: Sequence[tuple[np.ndarray, np.ndarray]], text: str, factor: float,
           scale: float) -> None:
    (xs, vs), (xb, vb) = curves
    axes.plot(xb, factor * vb, color=frame.BEAM, lw=1.4)
    axes.plot(xs, factor * vs, ls="none", marker="o", ms=5, mfc="none", mec=frame.SOLID, mew=1.4)
    finish(axes, text, max((float(np.abs(v).max()) for v in (vs, vb) if v.size), default=0.0), factor, scale)


def finish(axes: Any, text: str, largest: float, factor: float, scale: float) -> None:
    """Title and zero line; a diagram that is nothing beside its kind is drawn flat, not blown up to noise."""
    axes.axhline(0.0, color="#888888", lw=0.8, zorder=1)
    axes.set_title(text, loc="left", fontsize=11)
    axes.margins(x=0.02, y=0.12)
    if scale > 0 and largest < 3e-3 * scale:
        axes.set_ylim(-0.02 * factor * scale, 0.02 * factor * scale)
        axes.text(0.5, 0.8, "next to nothing", transform=axes.transAxes, ha="center", color=frame.NEUTRAL, fontsize=10)


def _stress_panel(axes: Any, sides: Sequence[tuple[str, str]], case: str, member: str, solid: Sequence[Figure],
                  beam: Sequence[Figure], scale: float) -> None:
    largest = 0.0
    for (component, side), dash, marker in zip(sides, ("-", "--"), ("o", "s"), strict=True):
        xs, vs = stations_of(solid, case, member, "nominal_stress", component)
        xb, vb = stations_of(beam, case, member, "nominal_stress", component)
        axes.plot(xb, vb, color=frame.BEAM, lw=1.4, ls=dash, label=f"{side}, beam")
        axes.plot(xs, vs, ls="none", marker=marker, ms=5, mfc="none", mec=frame.SOLID, mew=1.4, label=f"{side}, solid")
        largest = max([largest, *(float(np.abs(v).max()) for v in (vs, vb) if v.size)])
    finish(axes, f"stress at {sides[0][1]} and {sides[1][1]} (MPa)", largest, 1.0, scale)
    axes.legend(frameon=False, fontsize=8.5, ncols=2)


def _key(axes: Any) -> None:
    axes.set_axis_off()
    axes.plot([], [], color=frame.BEAM, lw=1.4, label="beam model")
    axes.plot([], [], ls="none", marker="o", ms=6, mfc="none", mec=frame.SOLID, mew=1.4, label="solid model")
    axes.legend(loc="center", frameon=False, fontsize=12)
