"""The table of materials.

Values of the standards depend on the thickness; the row for the thickest plate of the section is used.
Where the exact row matters, a spec declares its own values. Strengths are *characteristic* (nominal
values of a design standard), *minimum* (of a product standard) or *typical* (handbook averages, not for
acceptance). ``checked`` tells rows held against a text of the source from those quoted from memory.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from geometry.part import Material

PER_CUBIC_MM = 1e12  # (kg/m^3) per (t/mm^3)


@dataclass(frozen=True, slots=True)
class Grade:
    """One grade: E (MPa), nu, density (kg/m^3), expansion (1/K), strengths by thickness.

    `strengths` holds rows (largest thickness in mm, yield, ultimate), thinnest first. `note` names the
    product form that the rows hold for.
    """

    name: str
    E: float
    nu: float
    density: float
    expansion: float
    strengths: tuple[tuple[float, float, float], ...]
    kind: str
    source: str
    note: str = ""
    checked: bool = True

    @property
    def thickest(self) -> float:
        """Largest thickness with a value, mm."""
        return self.strengths[-1][0]

    def at(self, thickness: float) -> Material:
        """The material for a thickness (mm); `ValueError` when the table has no value for it."""
        for most, proof, ultimate in self.strengths:
            if thickness <= most * (1.0 + 1e-9):
                reach = f", t <= {most:g} mm" if math.isfinite(most) else ""
                source = self.source + reach + (f" ({self.note})" if self.note else "")
                return Material(
                    self.name, self.E, self.nu, self.density / PER_CUBIC_MM, self.expansion, proof, ultimate,
                    self.kind, source if self.checked else source + "; from memory",
                )  # fmt: skip
        raise ValueError(f"{self.name} has no strength for a thickness of {thickness:g} mm")


_EC3 = "EN 1993-1-1:2005 table 3.1 and 3.2.6, EN 1991-1-1 table A.4"
_EC9 = "EN 1999-1-1:2007 table 3.2b"
_STAINLESS = "EN 10088-1 annex, EN 10088-2, EN 1993-1-4 table 2.1"
_ANY = math.inf


def _steel(name: str, *rows: tuple[float, float, float]) -> Grade:
    return Grade(name, 210000.0, 0.3, 7850.0, 12e-6, rows, "characteristic", _EC3)


def _aluminium(name: str, *rows: tuple[float, float, float], note: str = "profile", checked: bool = True) -> Grade:
    # The expansion of aluminium (23e-6, EN 1999-1-1 3.2.5) is from memory in every row.
    source = _EC9 + "; expansion EN 1999-1-1 3.2.5 from memory"
    return Grade(name, 70000.0, 0.3, 2700.0, 23e-6, rows, "characteristic", source, note, checked)


def _stainless(name: str, density: float, proof: float, ultimate: float, form: str) -> Grade:
    return Grade(
        f"{name} {form}", 200000.0, 0.3, density, 16e-6, ((_ANY, proof, ultimate),), "minimum", _STAINLESS, form, False
    )


GRADES: dict[str, Grade] = {
    grade.name: grade
    for grade in (
        _steel("S235", (40.0, 235.0, 360.0), (80.0, 215.0, 360.0)),
        _steel("S275", (40.0, 275.0, 430.0), (80.0, 255.0, 410.0)),
        _steel("S355", (40.0, 355.0, 490.0), (80.0, 335.0, 470.0)),
        _aluminium("EN AW-6082 T6", (5.0, 250.0, 290.0), (15.0, 260.0, 310.0), note="profile, bar", checked=False),
        _aluminium("EN AW-6061 T6", (20.0, 240.0, 260.0)),
        _aluminium("EN AW-6005A T6", (5.0, 225.0, 270.0), (10.0, 215.0, 260.0), (25.0, 200.0, 250.0), note="open"),
        _aluminium("EN AW-6060 T6", (15.0, 140.0, 170.0)),
        _aluminium("EN AW-6063 T6", (25.0, 160.0, 195.0)),
        _aluminium("EN AW-5083 H111", (200.0, 110.0, 270.0), note="extruded"),
        Grade("EN AW-5083 H111 sheet", 70000.0, 0.3, 2700.0, 23e-6, ((50.0, 125.0, 275.0),), "characteristic",
              "EN 1999-1-1:2007 table 3.2a", "sheet", False),
        Grade("EN AW-7075 T6", 71700.0, 0.33, 2810.0, 23e-6, ((_ANY, 503.0, 572.0),), "typical",
              "ASM Metals Handbook; not in EN 1999-1-1", "", False),
        _stainless("1.4301", 7900.0, 230.0, 540.0, "cold strip"),
        _stainless("1.4301", 7900.0, 210.0, 520.0, "hot strip"),
        _stainless("1.4301", 7900.0, 210.0, 520.0, "plate"),
        _stainless("1.4404", 8000.0, 240.0, 530.0, "cold strip"),
        _stainless("1.4404", 8000.0, 220.0, 530.0, "hot strip"),
        _stainless("1.4404", 8000.0, 220.0, 520.0, "plate"),
        Grade("Ti-6Al-4V", 114000.0, 0.32, 4430.0, 8.6e-6, ((_ANY, 828.0, 895.0),), "minimum",
              "ASTM B348 / B265 grade 5, annealed; nu 0.31 to 0.34, density 4420 to 4430 kg/m^3 in the sources"),
    )
}  # fmt: skip
"""Every grade by name."""


def find(name: str) -> Grade | None:
    """The grade called `name`; case, spaces and hyphens do not matter."""
    wanted = _plain(name)
    return next((grade for known, grade in GRADES.items() if _plain(known) == wanted), None)


def _plain(name: str) -> str:
    return "".join(name.split()).replace("-", "").replace("_", "").lower()
