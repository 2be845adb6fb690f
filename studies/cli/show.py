"""``haunch show``."""

from __future__ import annotations

from pathlib import Path

from geometry.problem import HaunchError
from studies.check.folder import RESULT
from studies.check.result import CheckResult
from studies.cli.screen import make_console, print_result


def run_show(folder: str) -> int:
    """Print the tables of the run in `folder`; 0 when it is fine, else 1."""
    file = Path(folder) / RESULT
    try:
        text = file.read_text(encoding="utf-8")
    except (OSError, UnicodeDecodeError) as error:
        reason = error.strerror if isinstance(error, OSError) else "not UTF-8 text"
        raise HaunchError(f"{folder} is not a run folder: {RESULT} cannot be read ({reason})") from None
    result = CheckResult.from_json(text)
    print_result(make_console(), result)
    return 0 if result.fine else 1
