"""``haunch materials``."""

from __future__ import annotations

import math

from rich.table import Table

from geometry.spec.materials import GRADES
from studies.cli.screen import make_console


def run_materials() -> int:
    """Print every grade, one line for each range of thickness."""
    console = make_console()
    table = Table("name", "up to (mm)", "E (MPa)", "nu", "density (kg/m^3)", "expansion (1/K)", "yield (MPa)",
                  "ultimate (MPa)", "kind", box=None, pad_edge=False, header_style="bold")
    sources: dict[str, None] = {}
    for grade in GRADES.values():
        for thickness, proof, ultimate in grade.strengths:
            table.add_row(grade.name, f"{thickness:g}" if math.isfinite(thickness) else "any", f"{grade.E:g}",
                          f"{grade.nu:g}", f"{grade.density:g}", f"{grade.expansion:g}", f"{proof:g}",
                          f"{ultimate:g}", grade.kind)
        memory = "" if grade.checked else "; from memory"
        sources[f"{grade.name}: {grade.source}{f' ({grade.note})' if grade.note else ''}{memory}"] = None
    console.print(table)
    console.print()
    for source in sources:
        console.print(source, soft_wrap=True)
    return 0
