"""All pictures of a run."""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path

from fem.beam.result import BeamResult
from fem.solid.result import SolidResult
from geometry.part import Part
from mesher.named_mesh import NamedMesh
from studies.check.result import CheckResult
from studies.report.diagrams import diagrams
from studies.report.fields import deflected_picture, mesh_picture, stress_picture
from studies.report.part_picture import part_picture


def draw_pictures(folder: Path, part: Part, mesh: NamedMesh, solid: SolidResult, beam: BeamResult,
                  result: CheckResult, progress: Callable[[str], None]) -> None:
    """Draw part, mesh, and for each case deflected shape, stress and diagrams, as PNG files in `folder`."""
    progress("drawing the part")
    part_picture(folder / "part.png", part, mesh)
    mesh_picture(folder / "mesh.png", part, mesh)
    for i, case in enumerate(solid.cases):
        progress(f"drawing case {case}")
        ending = file_ending(i, case)
        peaks = [peak for peak in result.peaks if peak.case == case]
        deflected_picture(folder / f"deflected-{ending}.png", part, mesh, case, solid.u[i])
        stress_picture(folder / f"stress-{ending}.png", part, mesh, case, solid.von_mises[i], peaks)
        for member in part.members:
            extra = f"-{_plain(member.name)}" if len(part.members) > 1 else ""
            diagrams(folder / f"diagrams-{ending}{extra}.png", part.title, case, member.name, result.solid_figures,
                     result.beam_figures, beam.diagrams.get(case))


def file_ending(number: int, case: str) -> str:
    """A file name's ending for a case: its name when that is plain, else its number too."""
    plain = _plain(case)
    return plain if plain == case else f"{plain}-{number + 1}"


def _plain(text: str) -> str:
    return re.sub(r"[^A-Za-z0-9_]+", "_", text)[:60]
