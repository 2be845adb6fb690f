"""``haunch vary``."""

from __future__ import annotations

import argparse
import os
import shlex
import sys
from pathlib import Path

from geometry.budget import available_threads
from geometry.problem import SpecError
from studies.cli.arguments import Commands, command, on_a_cluster, tls_of, whole

EPILOG = """\
exit status
  0    every variant is finished, and at least one of them has nothing suspicious and meets every limit
  1    every variant is done, but some failed, or none is such a one
  2    the plan or the command line is wrong; every mistake is listed
  3    the study had to stop (the disk is full, the scheduler is gone ...); what was finished is in the record
  130  stopped by Ctrl-C, SIGTERM or SIGHUP; what was finished is in the record
  The same command goes on where it stopped, after 3 and 130, a crash or a loss of power.

again
  A variant that was ended from outside is run again by itself, as it was. One that failed by a fault of its own is
  tried once more on a safer mesh, and then stands as failed. --again failed tries all of those once more; --again 17 23
  evaluates these, whatever the record has. `haunch again RECORD 17` checks one alone, with a whole run folder.

cron
  haunch vary PLAN.toml --quiet --log PLAN.log"""


def register(commands: Commands[argparse.ArgumentParser]) -> None:
    """Add the command."""
    vary = command(commands, "vary", "evaluate every variant of a plan, into a record; or go on with it", _vary)
    vary.epilog = EPILOG
    vary.add_argument("plan", metavar="PLAN.toml", help="what to vary and how")
    vary.add_argument("--record", metavar="FILE",
                      help="file to write or to go on with; PLAN.study in the current folder if left out")
    vary.add_argument("--workers", metavar="N", type=whole(1, 1024), default=0,
                      help=f"variants at a time, one core each (one for each core that this process may use: "
                           f"{available_threads()})")
    vary.add_argument("--memory", metavar="MiB", type=whole(256, 10**8),
                      help="memory that one variant may take, in place of the plan's")
    on_a_cluster(vary)
    vary.add_argument("--share", action="store_true",
                      help="the record may hold other studies; variants that they have finished are used again")
    vary.add_argument("--again", metavar="failed|NUMBER", nargs="+", type=_failed_or_number, default=[],
                      help="evaluate these once more: all that failed, or variants by their numbers")
    vary.add_argument("--quiet", action="store_true", help="print nothing but what stops the study")
    vary.add_argument("--log", metavar="FILE", help="add a line with the time to FILE for everything that happens")
    vary.add_argument("--yes", action="store_true", help="more than 100 000 points are meant")


def _failed_or_number(text: str) -> str | int:
    return "failed" if text == "failed" else whole(1, 10**9)(text)


def _vary(options: argparse.Namespace) -> int:
    for name in ("OMP_NUM_THREADS", "MKL_NUM_THREADS", "OPENBLAS_NUM_THREADS", "NUMBA_NUM_THREADS"):
        os.environ[name] = "1"  # each worker has a core of its own
    from studies.cli.vary_screen import StudyView, print_summary
    from studies.vary.plan import read_plan
    from studies.vary.run import StudyStopped, vary

    try:
        plan = read_plan(options.plan, allow_many=options.yes)
    except SpecError as error:
        options.part = options.plan  # whose mistakes they are
        raise error
    record = Path(options.record) if options.record else Path(f"{Path(options.plan).stem}.study")
    view = StudyView(options.quiet)
    try:
        with view:
            summary = vary(plan, record, workers=options.workers, on=options.on, tls=tls_of(options),
                           share=options.share, again=options.again, memory=options.memory, log=options.log,
                           listener=view)
    except SpecError as error:
        options.part = "the command line"
        raise error
    except StudyStopped as error:
        print(f"haunch: {error}:\n  {_same_command()}", file=sys.stderr)
        return 3
    if summary.interrupted:
        print(f"haunch: stopped ({summary.interrupted}): {summary.done} of {summary.points} points are done and in "
              f"{record}; the same command goes on:\n  {_same_command()}", file=sys.stderr)
        return 130
    if not options.quiet:
        print_summary(plan, summary, record, options.plan)
    return 0 if not summary.failed and summary.fine else 1


def _same_command() -> str:
    return shlex.join(["haunch", *sys.argv[1:]])
