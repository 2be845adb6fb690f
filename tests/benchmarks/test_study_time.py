"""The benchmark of a study runs, and its table says what was measured. No test looks at a time."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

HERE = Path(__file__).resolve().parent
sys.path.insert(0, str(HERE))

import study_time  # noqa: E402


def study(workers: int, rate: float, cpu: float) -> dict[str, object]:
    """Two variants of 1.5 processor seconds each."""
    stages = {name: [0.25, 0.25] for name in study_time.STAGES}
    return {"workers": workers, "variants": 2, "failed": 0, "seconds": 2.0 / rate, "rate": rate, "cpu": cpu,
            "stages": stages, "walls": [1.5, 1.5], "unknowns": [40000, 50000], "memory": [300.0, 310.0],
            "solvers": ["multigrid"]}


FOUND = {"references": [[0.3, 0.05, 0.1], [0.25, 0.06, 0.4]], "studies": [study(1, 0.5, 3.2), study(2, 0.95, 3.1)],
         "shared": [{"what": "loads vary", **study(1, 1.0, 3.0)}], "same": True}


def test_the_table_says_rates_ratio_and_overhead() -> None:
    text = study_time.report(FOUND)
    assert "| variants an hour | 1800 | 3420 | | |" in text
    assert "| in a night of eight hours | 14400 | 27360 | | |" in text
    assert "2 workers do 1.90 times the variants of one" in text
    assert "| runner's share of the processor time | 6.2 % | 3.2 % | | |" in text
    assert "| solid | 0.250 | 0.250 | 1.00 | 5.0 |" in text
    assert "Where only loads vary: 1.50 processor seconds a variant (multigrid)." in text


def test_numbers_that_differ_are_told() -> None:
    assert "THEIR NUMBERS DIFFER" in study_time.report({**FOUND, "same": False})


def test_the_readme_needs_its_marks(tmp_path: Path) -> None:
    readme = tmp_path / "README.md"
    readme.write_text(f"before\n{study_time.BEGIN}\nold\n{study_time.END}\nafter\n", encoding="utf-8")
    study_time.write_between_marks(readme, "new")
    assert readme.read_text(encoding="utf-8") == (
        f"before\n{study_time.BEGIN}\n\nnew\n\n{study_time.END}\nafter\n")
    readme.write_text("nothing", encoding="utf-8")
    with pytest.raises(ValueError, match="once each"):
        study_time.write_between_marks(readme, "new")


@pytest.mark.heavy
def test_a_short_run() -> None:
    run = subprocess.run([sys.executable, str(HERE / "study_time.py"), "--quick"], capture_output=True, text=True,
                         timeout=300, check=False)
    assert run.returncode == 0, run.stderr
    assert "0 variants failed; numbers the same" in run.stdout
