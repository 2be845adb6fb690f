"""How far a study is, in numbers and in words; the log file."""

from __future__ import annotations

import time
from collections import Counter, deque
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from datetime import datetime
from pathlib import Path
from types import TracebackType
from typing import Literal

from studies.report.tables import MARKS, digits

FAILED = "failed"
SHOWN = {word: MARKS.get(word, "x")
         for word in ("agrees", "explained", "load check", "no beam value", "suspicious", FAILED)}
"""Judgements from the best to the worst, then ``failed``, each with its mark."""

LOG_SECONDS = 60.0
"""Between two lines of counts in the log file."""

WINDOW = 50
"""The rate is that of the last so many variants: it follows when variants become dearer."""


Kind = Literal["start", "finished", "failed", "again", "note", "stop", "end"]


@dataclass(frozen=True, slots=True)
class Happening:
    """Something that a listener may show: in words, one line."""

    kind: Kind
    text: str
    number: int = 0
    """Of the variant; 0 where it is about none."""


@dataclass(frozen=True, slots=True)
class Progress:
    """How far a study is. All counts are of points of the plan; two points may be the same variant.

    Attributes
    ----------
    points
        Points to be evaluated, as far as is known; ``exact`` once the plan was read to its end.
    words
        Judgement, or ``failed`` -> number of points.
    reused
        Of the points that are done those whose outcome was there before this call, or was another point's.
    rate
        Variants a minute, from what this call has evaluated; None before there is any.
    left
        Seconds to the end at that rate.
    """

    points: int
    exact: bool
    done: int
    words: Mapping[str, int]
    left_out: int
    reused: int
    under_way: int
    seconds: float
    rate: float | None
    left: float | None


Listener = Callable[["Happening | Progress"], None]


def duration(seconds: float) -> str:
    """``2 h 05 min``, ``3 min 20 s``, ``12 s``."""
    whole = round(seconds)
    if whole >= 3600:
        return f"{whole // 3600} h {whole % 3600 // 60:02d} min"
    return f"{whole // 60} min {whole % 60:02d} s" if whole >= 60 else f"{whole} s"


def several(count: int, what: str) -> str:
    """``1 variant``, ``3 variants``."""
    return f"{count} {what}{'' if count == 1 else 's'}"


def in_words(progress: Progress) -> str:
    """Counts, rate and time left in one line, each judgement with its mark."""
    total = f"{progress.points}" if progress.exact else f"about {progress.points}"
    parts = [f"{progress.done} of {total} done"]
    parts += [f"{mark} {count} {word}" for word, mark in SHOWN.items() if (count := progress.words.get(word, 0))]
    parts += [f"{progress.left_out} left out"] if progress.left_out else []
    parts += [f"{progress.reused} reused"] if progress.reused else []
    parts += [f"{digits(progress.rate)} a minute"] if progress.rate is not None else []
    if progress.left is not None and progress.done < progress.points:
        parts.append(f"{duration(progress.left)} left")
    return ", ".join(parts)


@dataclass
class Tally:
    """Counts while a study runs."""

    expected: int
    exact: bool = False
    left_out: int = 0
    evaluated: int = 0
    """Variants that this call has evaluated."""
    reused: int = 0
    words: Counter[str] = field(default_factory=Counter)
    started: float = field(default_factory=time.monotonic)
    _word_of: dict[str, str] = field(default_factory=dict)
    _points_of: Counter[str] = field(default_factory=Counter)
    _times: deque[float] = field(default_factory=lambda: deque(maxlen=WINDOW + 1))

    def known(self, words: Mapping[str, str]) -> None:
        """Outcomes that were there before: key -> judgement, or ``failed``."""
        self._word_of.update(words)

    def point(self, key: str) -> None:
        """A point of the plan was read."""
        self._points_of[key] += 1
        if word := self._word_of.get(key):
            self.words[word] += 1
            self.reused += 1

    def forget(self, key: str) -> bool:
        """An outcome is to be replaced by a new one; False when there is none yet."""
        if key not in self._word_of:
            return False
        self.words[self._word_of.pop(key)] -= self._points_of[key]
        self.reused -= self._points_of[key]
        return True

    def whole_plan(self, points: int, left_out: int) -> None:
        """The plan was read to its end."""
        self.expected, self.left_out, self.exact = points, left_out, True

    def outcome(self, key: str, word: str) -> None:
        """A variant was evaluated and its outcome is on disk."""
        if not self._times:
            self._times.append(self.started)
        self._times.append(time.monotonic())
        self._word_of[key] = word
        self.evaluated += 1
        self.words[word] += self._points_of[key]
        self.reused += self._points_of[key] - 1

    @property
    def done(self) -> int:
        return sum(self.words.values())

    def _left_out_so_far(self) -> int:
        return 0 if self.exact else self.left_out

    def progress(self, under_way: int) -> Progress:
        """The counts as they are now."""
        rate = left = None
        if len(self._times) > 1 and self._times[-1] > self._times[0]:
            now = self._times[-1] if self.exact and self.done >= self.expected else time.monotonic()
            rate = 60.0 * (len(self._times) - 1) / (now - self._times[0])
            left = 60.0 * max(self.expected - self._left_out_so_far() - self.done, 0) / rate
        words = {word: count for word, count in self.words.items() if count}
        return Progress(self.expected - self._left_out_so_far(), self.exact, self.done, words, self.left_out,
                        self.reused, under_way, time.monotonic() - self.started, rate, left)


class Log:
    """The log file: a line for everything that happens, with the time before it, and the counts now and then.

    It passes on what it hears to the listener. A log that cannot be written stops no study: that is told once, and
    lines are written again as soon as it works.
    """

    def __init__(self, path: Path | None, listener: Listener | None) -> None:
        self._path, self._listener = path, listener
        self._told = False
        self._last = time.monotonic()

    def __enter__(self) -> Log:
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, _: TracebackType | None) -> None:
        if error is not None:
            self._write(f"stopped: {error}".replace("\n", " | "))

    def __call__(self, what: Happening | Progress) -> None:
        """Hear it, write it, pass it on."""
        if isinstance(what, Happening):
            self._write(what.text)
        elif time.monotonic() - self._last > LOG_SECONDS:
            self._last = time.monotonic()
            self._write(in_words(what))
        self._pass_on(what)

    def _pass_on(self, what: Happening | Progress) -> None:
        if self._listener is not None:
            self._listener(what)

    def _write(self, text: str) -> None:
        if self._path is None:
            return
        try:
            with self._path.open("a", encoding="utf-8") as file:
                file.write(f"{datetime.now().astimezone().isoformat(timespec='seconds')}  {text}\n")
            self._told = False
        except OSError as error:
            if not self._told:
                self._told = True
                self._pass_on(Happening("note", f"the log {self._path} cannot be written ({error.strerror}); the study "
                                                "goes on without"))
