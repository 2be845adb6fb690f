"""The models' template without models: a real job that says that it was started, takes its time, and gives figures of a
rectangular cantilever worked out by hand. ``ROOM`` and ``WAIT`` are told by the environment of the worker."""

import os
import time
from pathlib import Path

from studies.vary.outcome import Kept, Outcome
from studies.vary.work import variant_job


def prepare() -> None:
    """Nothing to load."""


def serve(order, data) -> int:
    variant_job._evaluate = _evaluate
    return variant_job.serve(order, data)


def _evaluate(orders, cad, mesh, tell) -> None:
    for order in orders:
        variant = order["variant"]
        with (Path(os.environ["ROOM"]) / "started").open("a") as started:
            started.write(f"{os.getpid()} {variant['number']}\n")
        time.sleep(float(os.environ["WAIT"]))
        depth, width = variant["numbers"]["depth"], variant["numbers"]["width"]
        mass, deflection = depth * width * 1e-6, 4e6 / (width * depth**3)
        figures = {"mass": Kept(mass, mass, "t", "agrees"),
                   "deflection": Kept(deflection, deflection, "mm", "agrees")}
        tell({"outcome": Outcome(variant["key"], "finished", judgement="agrees", fine=True, figures=figures).to_json()})
