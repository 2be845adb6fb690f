"""Numbers that move without a bump of the results' version are found here."""

from __future__ import annotations

import json
from pathlib import Path

from write_golden import golden

STORED = json.loads((Path(__file__).parent / "golden.json").read_text(encoding="utf-8"))
HELP = "if the change is meant: bump studies.check.version.RESULTS, say so in CHANGELOG.md, run write_golden.py"


def test_figures_have_not_moved() -> None:
    now = golden()
    assert now["results"] == STORED["results"], HELP
    for model in ("solid", "beam"):
        stored, found = STORED[model], now[model]
        assert isinstance(found, dict)
        assert found.keys() == stored.keys(), HELP
        largest: dict[str, float] = {}
        for name, value in stored.items():
            quantity = name.split(" | ")[2]
            largest[quantity] = max(largest.get(quantity, 0.0), abs(value))
        moved = [name for name, value in stored.items()
                 if abs(found[name] - value) > 1e-7 * largest[name.split(" | ")[2]]]
        assert not moved, f"{model}: {moved[:5]}; {HELP}"
