"""Random kills of jobs and templates: every variant comes to its end, with the numbers of an undisturbed run."""

from __future__ import annotations

import os
import random
import signal
import sys
import threading
import time
from concurrent.futures import ThreadPoolExecutor
from contextlib import suppress
from typing import Any

import pytest
from work_helpers import bar, children, jobs, order_of, toy, until

from studies.vary.outcome import Outcome
from studies.vary.work import Ended, Host, Order

pytestmark = pytest.mark.skipif(sys.platform != "linux", reason="looks into /proc")


class Killer(threading.Thread):
    """Kills a random job, now and then a template, until told to stop."""

    def __init__(self, host: Host, seed: int, every: float, templates: float) -> None:
        super().__init__(daemon=True)
        self._host, self._random, self._every, self._templates = host, random.Random(seed), every, templates
        self.over, self.kills = threading.Event(), 0

    def run(self) -> None:
        while not self.over.wait(self._random.expovariate(1.0 / self._every)):
            templates = [t.pid for t in self._host.templates if t.pid and children(t.pid)]
            among = templates if self._random.random() < self._templates else jobs(self._host)
            if among:
                with suppress(ProcessLookupError):
                    os.kill(self._random.choice(among), self._random.choice([signal.SIGKILL, signal.SIGTERM]))
                    self.kills += 1


def _until_all_have(host: Host, orders: list[Order], tries: dict[str, int]) -> dict[str, Outcome]:
    def one(order: Order) -> Outcome:
        for _ in range(200):
            tries[order.variant.key] = tries.get(order.variant.key, 0) + 1
            end = host.evaluate(order)
            if isinstance(end, Outcome):
                return end
            assert isinstance(end, Ended) and end.key == order.variant.key and end.signal in ("SIGKILL", "SIGTERM"), end
        raise AssertionError("killed 200 times")

    with ThreadPoolExecutor(host.workers) as pool:
        return {outcome.key: outcome for outcome in pool.map(one, orders)}


def test_toys_under_fire(toys: Host) -> None:
    killer, tries = Killer(toys, 1, 0.3, 0.1), dict[str, int]()
    killer.start()
    ends = _until_all_have(toys, [toy(k, "wait") for k in range(12)], tries)
    killer.over.set()
    killer.join()
    assert len(ends) == 12 and all(end.status == "finished" for end in ends.values())
    assert killer.kills >= 5 and sum(tries.values()) > 12
    assert until(lambda: not jobs(toys))


def _numbers(outcome: Outcome) -> dict[str, Any]:
    plain = outcome.to_json()
    return {name: value for name, value in plain.items() if name not in ("seconds", "peak_memory", "worker")}


@pytest.mark.heavy
def test_a_hundred_kills_change_no_number(host: Host) -> None:
    orders = [order_of(k, bar(length=70 + k)) for k in range(20)]
    undisturbed = {key: _numbers(end) for key, end in _until_all_have(host, orders, {}).items()}
    killer, tries = Killer(host, 2, 0.2, 0.03), dict[str, int]()
    killer.start()
    rounds, began = 0, time.monotonic()
    while (killer.kills < 100 or not rounds) and time.monotonic() - began < 400.0:
        ends = _until_all_have(host, orders, tries)
        assert {key: _numbers(end) for key, end in ends.items()} == undisturbed
        rounds += 1
    killer.over.set()
    killer.join()
    assert killer.kills >= 100 and sum(tries.values()) > rounds * len(orders)
    assert until(lambda: not jobs(host)) and host.folder is not None
    assert [p.name for p in host.folder.iterdir()] == ["in-use"]
