"""The models' template without models: the real job and its talk with the host, and a variant whose value ``do`` says
what befalls it."""

import os
import signal
import tempfile
import time

from studies.vary.outcome import Outcome
from studies.vary.work import variant_job


def prepare() -> None:
    """Nothing to load."""


def serve(order, data) -> int:
    variant_job._evaluate = _evaluate
    return variant_job.serve(order, data)


def _evaluate(orders, cad, mesh, tell) -> None:
    for order in orders:
        variant = order["variant"]
        tell({"stage": variant["values"].get("stage", "solve")})
        _befall(variant["values"]["do"], mesh)
        tell({"outcome": Outcome(variant["key"], "finished", seconds={"solve": 0.0}).to_json()})


def _befall(what: str, mesh) -> None:
    hoard = []
    if what == "crash":
        os.kill(os.getpid(), signal.SIGSEGV)
    elif what == "leave":
        os._exit(3)
    elif what == "hang":
        with tempfile.NamedTemporaryFile(prefix="models-"):
            with mesh.submit({"folder": tempfile.tempdir}):
                time.sleep(600)
    elif what == "hog":
        while True:
            hoard.append(bytearray(b"x") * (4 * 2**20))
            time.sleep(0.005)
    elif what == "hog in the mesher":
        with mesh.submit({"folder": tempfile.tempdir, "hog": True}):
            time.sleep(600)
    elif what == "wait":
        time.sleep(0.3)
