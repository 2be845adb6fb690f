"""``haunch report``."""

from __future__ import annotations

import argparse
import contextlib
import os
import tempfile
from pathlib import Path

from geometry.problem import HaunchError
from studies.cli.arguments import Commands, command


def register(commands: Commands[argparse.ArgumentParser]) -> None:
    """Add the command."""
    report = command(commands, "report", "write what a study found as one HTML page, finished or not", _report)
    report.add_argument("record", metavar="RECORD", help="file that `haunch vary` wrote; it is only read")
    report.add_argument("--out", metavar="FILE.html", help="page to write; RECORD.html in the current folder if left "
                                                           "out. Open it in any browser: it needs no network")
    report.add_argument("--replace", action="store_true", help="overwrite FILE.html")
    report.add_argument("--study", metavar="TITLE", help="of several studies in the record the one with this title; "
                                                         "the last one if left out")


def _report(options: argparse.Namespace) -> int:
    from studies.record import Record
    from studies.report.study.gather import chosen_pictures, study_data
    from studies.report.study.page import study_page, top_of

    out = Path(options.out or f"{Path(options.record).stem}.html")
    if out.exists() and not options.replace:
        raise HaunchError(f"{out} exists already; choose another name, or give --replace")
    with Record.open(options.record, options.study) as record:
        data = study_data(record, out)
        path = record.path
    top = top_of(data)
    pictures = chosen_pictures(data, top.row.number, path) if top.row is not None else {}
    _write(out, study_page(data, pictures), options.replace)
    print(top.headline)
    for text in (*top.warnings, *top.reasons[:1]):
        print(text)
    print(f"The page is {out}: open it in a browser.")
    return 0


def _write(out: Path, text: str, replace: bool) -> None:
    """All of the page or nothing: it is written beside its place and moved there."""
    draft = ""
    try:
        handle, draft = tempfile.mkstemp(prefix=f".{out.name}.", dir=out.parent)
        with os.fdopen(handle, "w", encoding="utf-8", newline="\n") as file:
            file.write(text)
        os.chmod(draft, 0o666 & ~_mask())
        if replace:
            os.replace(draft, out)
        else:
            os.link(draft, out)  # fails when somebody else made it meanwhile
            os.unlink(draft)
    except FileExistsError:
        raise HaunchError(f"{out} exists already; choose another name, or give --replace") from None
    except OSError as error:
        raise HaunchError(f"cannot write {out}: {error.strerror}") from error
    finally:
        with contextlib.suppress(OSError):
            os.unlink(draft)


def _mask() -> int:
    mask = os.umask(0o077)
    os.umask(mask)
    return mask
