"""What runs in a Dask worker's process. Each function takes a text and gives a text (JSON).

A process has one `Host`, from the first study that it is accepted for until its end; the host's templates end with it,
however it ends. The functions are called by driver processes (`studies.vary.cluster.backend`): `report`, `beat` and
`stop` beside the tasks, `evaluate` as a task, in one of the worker's threads.
"""

from __future__ import annotations

import atexit
import json
import os
import socket
import threading
import time
import uuid
from contextlib import suppress

from studies.vary.cluster.answers import TOPIC, read_group, write_end
from studies.vary.work import Ended, Host

LEASE = 60.0
"""Seconds without a word from a driver after which its work is ended: it was killed, or its machine is off."""

PROCESS = uuid.uuid4().hex
"""Name of this process. An order is for one process: where Dask gives it to another one, it is refused."""

_lock = threading.Lock()
_host: Host | None = None
_heard: dict[str, float] = {}  # driver -> when it was last heard of
_stopped: set[str] = set()
_begun: set[str] = set()  # groups; none is begun twice, whatever Dask repeats


def report(text: str) -> str:
    """What this process is; and its host is started where its versions are those of the driver (`text`)."""
    asked = json.loads(text)
    mine = versions()
    told = {"process": PROCESS, "machine": socket.gethostname(), "versions": mine, "fault": ""}
    if asked["versions"] == mine:
        _heard[asked["driver"]] = time.monotonic()
        try:
            _the_host(asked["threads"])
        except Exception as error:  # noqa: BLE001 - told in words; an exception would cross as a pickle
            told["fault"] = str(error)
    return json.dumps(told)


def versions() -> dict[str, str]:
    """Versions that the keys of variants depend on, and that of Haunch itself."""
    from importlib.metadata import PackageNotFoundError, version

    from studies.check.run import versions as found
    from studies.vary.plan.key import MATTER

    try:
        haunch = version("haunch")
    except PackageNotFoundError:
        haunch = "not installed"
    return {"haunch": haunch, **{name: found()[name] for name in MATTER}}


def _the_host(threads: int) -> Host:
    """The host of this process, with one job for each of the worker's threads."""
    global _host
    with _lock:
        if _host is None:
            for name in ("OMP_NUM_THREADS", "MKL_NUM_THREADS", "OPENBLAS_NUM_THREADS", "NUMBA_NUM_THREADS"):
                os.environ[name] = "1"  # as on one machine: each job has a core of its own
            host = Host(threads)
            host.__enter__()
            atexit.register(host.close)
            _host = host
        return _host


def beat(driver: str) -> str:
    """A driver is there still. Gives the name of this process."""
    _heard[driver] = time.monotonic()
    return PROCESS


def stop(driver: str) -> str:
    """A driver wants nothing more: all that it has here is ended."""
    _stopped.add(driver)
    return PROCESS


def evaluate(text: str) -> str:
    """Evaluate a group of orders. Each end is told at once as an event of `TOPIC`, and all of them in the answer."""
    from distributed import get_worker

    try:
        worker = get_worker()
        asked, orders = read_group(text)
        driver, group = asked["driver"], asked["group"]
        if asked["process"] != PROCESS:
            return json.dumps({"refused": "the worker's process has ended"})
        with _lock:
            if group in _begun:
                return json.dumps({"refused": "the worker was given it twice"})
            _begun.add(group)
        _heard[driver] = time.monotonic()

        def cancelled() -> bool:
            return (driver in _stopped or time.monotonic() - _heard[driver] > LEASE
                    or worker.status.name in ("closing", "closed", "failed"))

        ends = []
        for place, end in enumerate(_the_host(int(asked["threads"])).evaluate_group(orders, cancelled)):
            ends.append(write_end(end))
            if not (isinstance(end, Ended) and cancelled()):
                with suppress(Exception):  # the scheduler is gone; who asked will hear of it
                    worker.log_event(TOPIC, json.dumps({"group": group, "place": place, **ends[-1]}))
        return json.dumps({"ends": ends})
    except Exception as error:  # noqa: BLE001 - told in words; an exception would cross as a pickle
        return json.dumps({"fault": f"{type(error).__name__}: {error}"})
