"""Write ``golden.json``: figures of both models of the test bar, under the current version of the numbers.

Run it by hand after bumping ``studies.check.version.RESULTS``: ``python tests/judge/write_golden.py``.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path

HERE = Path(__file__).parent
sys.path[:0] = [str(HERE), str(HERE.parent / "solid_model"), str(HERE.parent.parent)]


def golden() -> dict[str, object]:
    """Version, and the figures of each model at the tip, the middle, the wall and two stations."""
    from bar import sound

    from studies.check.version import RESULTS

    _, _, _, solid, beam = sound()
    kept: dict[str, dict[str, float]] = {}
    for name, figures in (("solid", solid.figures), ("beam", beam.figures)):
        wanted = ("", "arm.end", "middle", "wall", "arm@100", "arm@200")
        kept[name] = {" | ".join(f.key): f.value for f in figures if f.key.place in wanted}
    return {"results": RESULTS, **kept}


if __name__ == "__main__":
    (HERE / "golden.json").write_text(json.dumps(golden(), indent=1, sort_keys=True) + "\n", encoding="utf-8")
