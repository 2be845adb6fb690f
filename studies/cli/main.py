"""Entry point: parse, run one command, turn every failure into a sentence and an exit status."""

from __future__ import annotations

import contextlib
import os
import signal
import sys
import tempfile
import threading
import time
import traceback
from collections.abc import Sequence
from pathlib import Path

from geometry.problem import HaunchError, RunError, SpecError
from studies.cli.parser import make_parser

FINE, NOT_FINE, SPEC_WRONG, RUN_FAILED, STOPPED = 0, 1, 2, 3, 130


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command; returns its exit status (see ``haunch --help``). Never shows a traceback."""
    _never_fail_to_print()
    parser = make_parser()
    try:
        options = parser.parse_args(arguments)
    except SystemExit as end:  # --help, --version, or a mistake that argparse has explained
        return end.code if isinstance(end.code, int) else SPEC_WRONG
    try:
        with _terminated_is_interrupted():
            status: int = options.run(options)
            sys.stdout.flush()
            return status
    except SpecError as error:
        return _tell_spec_error(error, getattr(options, "part", ""))
    except BrokenPipeError:  # the reader, such as `head`, has enough
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return FINE
    except OSError as error:  # the commands tell their own; what is left is printing, to a full disk for one
        with contextlib.suppress(OSError):
            os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        print(f"haunch: cannot print the result: {error.strerror or error}", file=sys.stderr)
        return RUN_FAILED
    except KeyboardInterrupt:
        print("haunch: stopped; nothing was written", file=sys.stderr)
        return STOPPED
    except RunError as error:
        print(f"haunch: {_stage_words(error.stage)}: {error}", file=sys.stderr)
        if error.__cause__ is not None and not isinstance(error.__cause__, HaunchError | OSError | MemoryError):
            print(f"haunch: details are in {_write_log(error)}", file=sys.stderr)
        return RUN_FAILED
    except HaunchError as error:
        print(f"haunch: {error}", file=sys.stderr)
        return RUN_FAILED
    except Exception as error:  # noqa: BLE001 - the last resort; the log has everything
        print(f"haunch: an unforeseen fault ({type(error).__name__}) stopped the command; details are in "
              f"{_write_log(error)}", file=sys.stderr)
        return RUN_FAILED


def _never_fail_to_print() -> None:
    """A closed stream is none to fail on, and characters that the terminal's encoding lacks (LANG=C) become question
    marks, not a fault after the work."""
    for name in ("stdout", "stderr"):
        stream = getattr(sys, name)
        if stream is None:  # closed by the shell: >&-
            setattr(sys, name, open(os.devnull, "w", encoding="utf-8"))  # noqa: SIM115 - until the end
        elif hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="replace")


def _stage_words(stage: str) -> str:
    return {"write": "the run folder was not written", "compare": "the comparison failed",
            "solve": "the solid model was not solved", "beam": "the beam model failed",
            "mesh": "meshing failed", "solid": "the solid was not built"}.get(stage, f"stage {stage} failed")


def _tell_spec_error(error: SpecError, part: str) -> int:
    count = len(error.problems)
    print(f"haunch: {count} mistake{'s' if count != 1 else ''} in {part or 'the spec'}", file=sys.stderr)
    for problem in error.problems:
        print(f"\n  {problem.path}", file=sys.stderr)
        for word, text in (("given", problem.given), ("allowed", problem.allowed), ("fix", problem.fix)):
            if text:
                print(f"    {word:8s} {text}", file=sys.stderr)
    return SPEC_WRONG


def _write_log(error: BaseException) -> str:
    """Put the traceback into a file of its own; returns its path, or why there is none."""
    stamp = time.strftime("%Y%m%d-%H%M%S")
    try:
        handle, name = tempfile.mkstemp(prefix=f"haunch-{stamp}-", suffix=".log")
        with os.fdopen(handle, "w", encoding="utf-8") as log:
            log.write(f"{' '.join(map(str, sys.argv[1:]))}\n\n{''.join(traceback.format_exception(error))}")
        return str(Path(name))
    except OSError as problem:
        return f"no file ({problem.strerror})"


@contextlib.contextmanager
def _terminated_is_interrupted():  # type: ignore[no-untyped-def]
    """Let SIGTERM unwind like Ctrl-C, so that no half-written folder and no child process stays behind.

    Compiled code that calls Python back (the compiler of kernels does, after each long step) cannot be unwound: the
    interruption is lost there, and Python shows a traceback. It comes once more instead, a moment later.
    """

    def interrupt(*_: object) -> None:
        raise KeyboardInterrupt

    try:
        before = signal.signal(signal.SIGTERM, interrupt)
    except ValueError:  # not in the main thread
        yield
        return
    lost = sys.unraisablehook

    def again(what: sys.UnraisableHookArgs) -> None:
        if what.exc_type is not KeyboardInterrupt:
            lost(what)
            return
        reminder = threading.Timer(0.05, remind)
        reminder.daemon = True
        reminder.start()

    def remind() -> None:
        if sys.unraisablehook is again:
            os.kill(os.getpid(), signal.SIGTERM)

    sys.unraisablehook = again
    try:
        yield
    finally:
        sys.unraisablehook = lost
        signal.signal(signal.SIGTERM, before)
