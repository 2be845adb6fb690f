"""``haunch lightest``."""

from __future__ import annotations

import argparse
import math
import os
import shlex
import sys
from pathlib import Path

from geometry.budget import available_threads
from studies.cli.arguments import Commands, command, whole

EPILOG = """\
exit status
  0    a variant was found that meets every limit, and its whole run confirmed it
  1    none was found, or it was not confirmed, or neighbours of it are left to be solved (--budget)
  2    the plan or the command line is wrong; every mistake is listed
  3    the search had to stop (the disk is full ...); what was solved is in the record
  130  stopped by Ctrl-C, SIGTERM or SIGHUP; what was solved is in the record
  The same command goes on where it stopped, after 3 and 130, a crash or a loss of power.

how it searches
  Of a range with steps the steps are taken, of one without any value. The first variants are spread evenly. Then a
  surrogate (Gaussian process) of each limit's figure, with its own error, tells where a better variant that meets
  every limit is most to be expected; it is solved, and the surrogates learn from it. A variant that fails, is
  suspicious, or leaves a limit not established does not count as meeting the limits. The search ends when nothing is
  expected to gain 0.1 %, and no neighbour of the best is better. It finds the best variant or one near it; that there
  is none better anywhere is not shown.

the record
  The search is a study of its own, TITLE: lightest. `haunch report` reads it. With --share it can be the record of
  `haunch vary`, whose finished variants are then not solved again."""


def register(commands: Commands[argparse.ArgumentParser]) -> None:
    """Add the command."""
    lightest = command(commands, "lightest", "search a plan for the best variant that meets every limit, with far "
                       "fewer solves than a grid", _lightest)
    lightest.epilog = EPILOG
    lightest.add_argument("plan", metavar="PLAN.toml", help="what may be chosen, the limits, and the aim")
    lightest.add_argument("--record", metavar="FILE", help="file to write or to go on with; PLAN.lightest.study in the "
                                                           "current folder if left out")
    lightest.add_argument("--budget", metavar="N", type=whole(2, 10**5), default=60,
                          help="variants that may be solved, those in the record included (%(default)s)")
    lightest.add_argument("--seed", metavar="N", type=whole(0, 2**31 - 1), default=1,
                          help="of what is left to chance; the same seed gives the same search (%(default)s)")
    lightest.add_argument("--together", metavar="N", type=whole(1, 1024), default=2,
                          help="variants chosen at a time; more use more workers, and a few more solves (%(default)s)")
    lightest.add_argument("--workers", metavar="N", type=whole(1, 1024), default=0,
                          help=f"variants solved at a time, one core each (one for each core that this process may "
                               f"use: {available_threads()}); the result does not depend on it")
    lightest.add_argument("--memory", metavar="MiB", type=whole(256, 10**8),
                          help="memory that one variant may take, in place of the plan's")
    lightest.add_argument("--share", action="store_true",
                          help="the record may hold other studies; variants that they have finished are used again")
    lightest.add_argument("--quiet", action="store_true", help="print nothing but the result")
    lightest.add_argument("--log", metavar="FILE", help="add a line with the time to FILE for everything that happens")


def _lightest(options: argparse.Namespace) -> int:
    for name in ("OMP_NUM_THREADS", "MKL_NUM_THREADS", "OPENBLAS_NUM_THREADS", "NUMBA_NUM_THREADS"):
        os.environ[name] = "1"  # each worker has a core of its own
    from studies.lightest.search import Step
    from studies.lightest.study import lightest
    from studies.lightest.words import told
    from studies.vary.plan import read_plan
    from studies.vary.run import Happening, Progress, StudyStopped

    def hear(what: Happening | Progress) -> None:
        if isinstance(what, Happening) and what.kind in ("failed", "again", "note") and not options.quiet:
            print(what.text, flush=True)

    def step(what: Step) -> None:
        if not options.quiet:
            best = "none meets every limit yet" if what.best is None else f"best so far variant {what.best.number}"
            gain = f", {100 * what.gain:.2g} % expected to gain" if math.isfinite(what.gain) else ""
            print(f"{what.solved} solved ({what.doing}{gain}); {best}", flush=True)

    options.part = options.plan  # whose mistakes they are
    plan = read_plan(options.plan, allow_many=True)
    record = Path(options.record) if options.record else Path(f"{Path(options.plan).stem}.lightest.study")
    try:
        made = lightest(plan, record, budget=options.budget, seed=options.seed, together=options.together,
                        workers=options.workers, share=options.share, memory=options.memory, log=options.log,
                        listener=hear, tell=step)
    except StudyStopped as error:
        print(f"haunch: {error}:\n  {_same_command()}", file=sys.stderr)
        return 3
    if made.interrupted:
        print(f"haunch: stopped ({made.interrupted}): what was solved is in {record}; the same command goes on:\n  "
              f"{_same_command()}", file=sys.stderr)
        return 130
    for line in told(plan, made):
        print(line)
    print(f"The report: haunch report {record}")
    assert made.found is not None
    return 0 if made.best is not None and made.confirmed and not made.found.unchecked else 1


def _same_command() -> str:
    return shlex.join(["haunch", *sys.argv[1:]])
