"""The real template of both models; a part's title plants a fault."""

import os
import signal
import time

from studies.vary.work import variant_job
from studies.vary.work.variant_job import serve

__all__ = ["prepare", "serve"]


def prepare() -> None:
    variant_job.prepare()
    from studies.vary.work import evaluate

    for stage, name in (("beam", "solve_beam"), ("solve", "solve_solid"), ("compare", "judge")):
        setattr(evaluate, name, _planted(getattr(evaluate, name), stage))


def _planted(real, stage):
    def work(part, *args, **kwargs):
        if part.title == f"crash in {stage}":
            os.kill(os.getpid(), signal.SIGSEGV)
        if part.title == f"wait in {stage}":
            time.sleep(600)
        if part.title == f"fault in {stage}":
            raise ZeroDivisionError("planted")
        if part.title == f"memory in {stage}":
            raise MemoryError
        return real(part, *args, **kwargs)

    return work
