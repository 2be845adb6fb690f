"""Which variants go together, and in which order."""

from __future__ import annotations

import time

from studies.vary.run.attempts import Ticket
from studies.vary.run.progress import Tally, duration, in_words
from studies.vary.run.schedule import MOST_TOGETHER, Pool
from studies.vary.variant import Variant


def ticket(number: int, shape: str) -> Ticket:
    return Ticket(Variant(number, {}, {}, {}, f"key {number}", shape))


def taken(pool: Pool, slots: int = 2, reading: bool = False) -> list[int]:
    return [ticket.variant.number for ticket in pool.take(slots, reading)]


def test_one_shape_goes_together_in_the_order_of_its_first():
    pool = Pool()
    for number, shape in enumerate("abcabcabc", 1):
        pool.put(ticket(number, shape))
    groups = [taken(pool, reading=True) for _ in range(4)]
    assert groups == [[1, 4, 7], [2, 5, 8], [3, 6, 9], []] and len(pool) == 0


def test_groups_are_bounded_and_grow_smaller_so_that_all_have_work():
    pool = Pool()
    for number in range(40):
        pool.put(ticket(number, "a"))
    sizes = []
    while group := pool.take(2, False):
        sizes.append(len(group))
    assert sum(sizes) == 40 and sizes[0] == MOST_TOGETHER == 8
    assert sizes == sorted(sizes, reverse=True) and sizes[-2:] == [1, 1]


def test_safer_first_new_then_ended_last():
    pool = Pool()
    ended, lonely, safer = ticket(1, "a"), ticket(2, "a"), ticket(3, "b")
    ended.endings, lonely.endings, safer.first = 1, 2, object()
    for each in (ended, lonely, ticket(4, "a"), ticket(5, "a"), safer):
        pool.put(each)
    assert [taken(pool, reading=True) for _ in range(4)] == [[3], [4, 5], [1], [2]]


def test_one_that_has_to_wait_waits_and_keeps_its_place():
    pool = Pool()
    early = ticket(1, "a")
    early.endings, early.not_before = 1, time.monotonic() + 0.05
    pool.put(early)
    assert taken(pool) == [] and pool.next_time() == early.not_before and len(pool) == 1
    time.sleep(0.06)
    assert taken(pool) == [1] and pool.next_time() is None


def test_counts_are_of_points_and_rate_of_what_was_evaluated(monkeypatch):
    now = [0.0]
    monkeypatch.setattr(time, "monotonic", lambda: now[0])
    tally = Tally(11, started=0.0)
    tally.known({"old": "agrees", "bad": "failed"})
    for key in ("old", "a", "a", "bad", "b", "c"):
        tally.point(key)
    for second, key in ((30.0, "a"), (60.0, "b")):
        now[0] = second
        tally.outcome(key, "suspicious")
    tally.whole_plan(6, 5)
    progress = tally.progress(1)
    assert progress.words == {"agrees": 1, "failed": 1, "suspicious": 3} and progress.reused == 3
    assert progress.rate == 2.0 and progress.left == 30.0  # two in 60 s, one point is left
    assert in_words(progress) == ("5 of 6 done, = 1 agrees, ! 3 suspicious, x 1 failed, 5 left out, 3 reused, "
                                  "2 a minute, 30 s left")
    assert tally.forget("bad") and not tally.forget("c") and tally.progress(0).done == 4
    assert tally.progress(0).reused == 2


def test_durations_in_words():
    assert [duration(s) for s in (0.4, 59.6, 200, 7500)] == ["0 s", "1 min 00 s", "3 min 20 s", "2 h 05 min"]
