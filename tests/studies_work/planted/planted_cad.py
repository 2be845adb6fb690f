"""The real CAD template; a part's title plants a fault."""

import os
import signal
import time

from studies.check import solid_child
from studies.check.solid_child import serve

__all__ = ["prepare", "serve"]


def prepare() -> None:
    solid_child.prepare()
    import geometry.solid

    real = geometry.solid.build_solid

    def build(part, *args):
        if part.title == "crash in solid":
            os.kill(os.getpid(), signal.SIGABRT)
        if part.title == "wait in solid":
            time.sleep(600)
        return real(part, *args)

    geometry.solid.build_solid = build
