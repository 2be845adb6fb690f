"""All pictures of a run."""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path

from fem.beam.result import BeamResult
from fem.solid.result import SolidResult
from geometry.part import Part
from mesher.named_mesh import NamedMesh
from studies.check.record import kept_cases
from studies.check.result import CheckResult
from studies.report.diagrams import diagrams
from studies.report.envelope_diagrams import envelope_diagrams
from studies.report.fields import deflected_picture, mesh_picture, stress_picture
from studies.report.mode_pictures import mode_picture
from studies.report.part_picture import part_picture


def draw_pictures(folder: Path, part: Part, mesh: NamedMesh, solid: SolidResult, beam: BeamResult,
                  result: CheckResult, progress: Callable[[str], None]) -> None:
    """Draw part, mesh, for each case (of a travelling load: for the position that governs) deflected shape, stress and
    diagrams, the envelopes of travelling loads and the shapes of the modes, as PNG files in `folder`."""
    progress("drawing the part")
    part_picture(folder / "part.png", part, mesh)
    mesh_picture(folder / "mesh.png", part, mesh)
    drawn = kept_cases(part, result.travels)
    for i, case in enumerate(solid.cases):
        if case not in drawn:
            continue
        progress(f"drawing case {case}")
        ending = file_ending(i, case)
        peaks = [peak for peak in result.peaks if peak.case == case]
        deflected_picture(folder / f"deflected-{ending}.png", part, mesh, case, solid.u[i])
        stress_picture(folder / f"stress-{ending}.png", part, mesh, case, solid.von_mises[i], peaks)
        for member in part.members:
            extra = f"-{_plain(member.name)}" if len(part.members) > 1 else ""
            diagrams(folder / f"diagrams-{ending}{extra}.png", part.title, case, member.name, solid.figures,
                     beam.figures, beam.diagrams.get(case))
    for travel in result.travels:
        progress(f"drawing the envelopes of case {travel.case}")
        envelope_diagrams(folder / f"envelopes-{_plain(travel.case)}.png", part.title, part.members[0].name, travel,
                          result.envelopes)
    _draw_modes(folder, part, mesh, solid, result, progress)


def _draw_modes(folder: Path, part: Part, mesh: NamedMesh, solid: SolidResult, result: CheckResult,
                progress: Callable[[str], None]) -> None:
    """Natural vibrations, and the buckling shapes of each case."""
    modes = [mode for mode in result.modes if mode.solid is not None]
    free = " of the free part" if part.vibration is not None and part.vibration.free else ""
    if len(solid.vibration):
        progress("drawing the natural vibrations")
        ours = [mode for mode in modes if mode.key.quantity == "natural_frequency"]
        mode_picture(folder / "vibration.png", part, mesh, f"natural vibrations{free}", ours, solid.vibration_shapes)
    for case in dict.fromkeys(mode.case for mode in solid.buckling):
        progress(f"drawing the buckling of case {case}")
        ours = [mode for mode in modes if mode.key.quantity == "buckling_factor" and mode.key.case == case]
        shapes = solid.buckling_shapes[[mode.case == case for mode in solid.buckling]]
        mode_picture(folder / f"buckling-{_plain(case)}.png", part, mesh, f"buckling of case {case}", ours, shapes)


def file_ending(number: int, case: str) -> str:
    """A file name's ending for a case: its name when that is plain, else its number too; ``crossing-at-350`` (mm)."""
    declared, at, position = case.partition("@")
    if at and _plain(declared) == declared:
        return f"{declared}-at-{position}"
    plain = _plain(case)
    return plain if plain == case else f"{plain}-{number + 1}"


def _plain(text: str) -> str:
    return re.sub(r"[^A-Za-z0-9_]+", "_", text)[:60]
