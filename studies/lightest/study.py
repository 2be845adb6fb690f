"""The search on a plan: every solve through the driver, into a record."""

from __future__ import annotations

import dataclasses
import threading
import time
from collections import Counter
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any, cast

from geometry.problem import HaunchError, Problem, SpecError
from studies.lightest.evaluator import Solved
from studies.lightest.mass import MassBefore
from studies.lightest.search import TOGETHER, Found, Step, search
from studies.lightest.slopes import Slope, slopes
from studies.lightest.space import Dimension, Point, Space
from studies.record import Record, RecordError, Writer
from studies.vary.outcome import Held, Outcome
from studies.vary.plan.key import digest
from studies.vary.run.attempts import Ticket
from studies.vary.run.backend import Backend, BackendLost
from studies.vary.run.driver import Driver
from studies.vary.run.keeping import kept_run, new_run
from studies.vary.run.progress import Happening, Listener, Log
from studies.vary.run.signals import heard
from studies.vary.run.study import StudyStopped
from studies.vary.variant import Variant
from studies.vary.work.limits import AT_LEAST

if TYPE_CHECKING:
    from studies.vary.plan import Plan

TINY = 1e-12
"""Least share of a limit: what was found may be zero."""


class _Stopped(Exception):
    """Stopped by a signal or the caller; everything solved is in the record."""


@dataclass(frozen=True)
class Lightest:
    """What became of a search on a plan.

    Attributes
    ----------
    found
        The search; None when it was stopped before its end.
    best
        The winner as a variant; None without one.
    outcome
        Of the winner.
    run_folder
        The winner's whole run.
    confirmed
        Its whole run gave the figures of the record again, and met every limit.
    evaluated
        Variants that this call evaluated; the others were in the record.
    nearest
        Without a winner: the solved variant that misses its limits by least.
    interrupted
        Signal or reason that stopped it; empty when it came to its end.
    """

    record: Path
    title: str
    found: Found | None
    space: Space
    best: Variant | None = None
    outcome: Outcome | None = None
    run_folder: Path | None = None
    confirmed: bool = False
    slopes: tuple[Slope, ...] = ()
    evaluated: int = 0
    left_out: Mapping[str, int] = dataclasses.field(default_factory=dict)
    nearest: tuple[Variant, Solved] | None = None
    unsound: Mapping[str, int] = dataclasses.field(default_factory=dict)
    seconds: float = 0.0
    interrupted: str = ""


def space_of(plan: Plan) -> Space:
    """The values that a plan varies. A range with steps is a list; one without may take any value."""
    made = []
    for name, one in plan.varied.items():
        if not one.numeric:
            made.append(Dimension(name, words=len(one.values)))
        elif one.values:
            made.append(Dimension(name, tuple(sorted(one.numbers))))
        else:
            assert one.low is not None and one.high is not None
            made.append(Dimension(name, low=one.low, high=one.high))
    return Space(tuple(made))


def lightest(plan: Plan, record: str | Path, *, budget: int = 60, seed: int = 1, together: int = TOGETHER,
             workers: int = 0, share: bool = False, memory: int | None = None, log: str | Path | None = None,
             listener: Listener | None = None, tell: Callable[[Step], None] = lambda step: None,
             stop: threading.Event | None = None, backend: Callable[[], Backend] | None = None) -> Lightest:
    """Search a plan for the variant with the best aim that meets every limit.

    The same call goes on where it stopped: what the record holds is not solved again.

    Parameters
    ----------
    plan
        What may be chosen, the limits and the aim. Its sampling does not matter.
    record
        File of the record; made when it is not there. The search is a study of its own in it.
    budget, seed, together, tell
        See `search`.
    workers, share, memory, log, listener, stop, backend
        As for `vary`.

    Raises
    ------
    SpecError
        The plan has nothing to choose from, or no limit.
    RecordError
        The record cannot be used.
    StudyStopped
        The record could not be written any more, or what evaluates was lost.
    """
    _refuse(plan)
    if memory is not None:
        plan = dataclasses.replace(plan, run=dataclasses.replace(plan.run, memory=memory))
    plan = dataclasses.replace(plan, title=f"{plan.title}: lightest", key=digest(plan.key, "lightest"),
                               keep=dataclasses.replace(plan.keep, every=0))
    path = Path(record)
    with Log(Path(log) if log else None, listener) as hear:
        with Record.resume(path, plan, share) if path.exists() else Record.create(path, plan) as writer:
            work = _Work(plan, writer, hear, stop or threading.Event(), backend or _backend(plan, workers, hear))
            hear(Happening("start", f"{plan.title}: at most {budget} solves, seed {seed}"))
            try:
                with heard(work.ask_to_stop):
                    return work.run(budget, seed, together, tell)
            except (RecordError, BackendLost) as error:
                raise StudyStopped(f"{str(error).rstrip('.')}. What was solved is in {path}; the same command goes on "
                                   "where this one stopped") from error
            finally:
                work.close()


def _refuse(plan: Plan) -> None:
    problems = []
    if plan.sampling.method == "as made":
        problems.append(Problem("sampling.method", "as made", "any other: there is nothing to choose in parts as made"))
    if not plan.part_data.get("limits"):
        problems.append(Problem("limits", "nothing", "at least one limit, in the part or the plan",
                                'Without one the least of everything is best: deflection = "0.5 mm"'))
    if problems:
        raise SpecError(problems)


def _backend(plan: Plan, workers: int, hear: Listener) -> Callable[[], Backend]:
    def make() -> Backend:
        from geometry.budget import available_threads
        from studies.vary.run.local import LocalBackend, compile_kernels

        compile_kernels(lambda text: hear(Happening("note", text)))
        return LocalBackend(workers or available_threads(), plan.run.memory)

    return make


class _Round:
    """What the driver reads of a plan: a few variants, and all else as the plan has it."""

    def __init__(self, plan: Plan, variants: Sequence[Variant]) -> None:
        self._plan, self._variants = plan, variants

    def __getattr__(self, name: str) -> Any:
        return getattr(self._plan, name)

    def count(self) -> int:
        return len(self._variants)

    def points(self) -> Iterator[Variant]:
        return iter(self._variants)


class _Work:
    """An `Evaluator` over the driver, and what follows the search."""

    def __init__(self, plan: Plan, writer: Writer, hear: Listener, stop: threading.Event,
                 make_backend: Callable[[], Backend]) -> None:
        self.plan, self.writer, self.hear, self._stop = plan, writer, hear, stop
        self.space = space_of(plan)
        self._make, self._backend = make_backend, cast("Backend | None", None)
        self._driver: Driver | None = None
        self._stopped_by = ""
        self._variants: dict[Point, Variant | None] = {}
        self._numbers = {point.key: point.number for point in writer.points()}
        self._left_out: Counter[str] = Counter()
        self._values = {name: dict(zip(one.numbers, one.values, strict=True)) if one.numeric and one.values else {}
                        for name, one in plan.varied.items()}
        self._mass = MassBefore.of(plan)
        self.evaluated = 0
        self._started = time.monotonic()

    # What a search asks

    def values(self, point: Point) -> dict[str, Any]:
        """As a plan's variant takes them."""
        made: dict[str, Any] = {}
        for one, coordinate in zip(self.space.dimensions, point, strict=True):
            varied = self.plan.varied[one.name]
            if one.words:
                made[one.name] = varied.values[int(coordinate)]
            else:
                number = one.number(coordinate)
                made[one.name] = self._values[one.name].get(number) if one.numbers else varied.written(number)
        return made

    def variant(self, point: Point) -> Variant | None:
        """The variant there; None where the plan leaves it out."""
        if point not in self._variants:
            try:
                self._variants[point] = self.plan.variant(self.values(point))
            except SpecError as error:
                self._variants[point] = None
                self._left_out[error.problems[0].path] += 1
        return self._variants[point]

    def allowed(self, point: Point) -> bool:
        """See `Evaluator`."""
        return self.variant(point) is not None

    def aim_before(self, point: Point) -> float | None:
        """See `Evaluator`."""
        if self._mass is None:
            return None
        fullest = None
        if self.plan.tolerances:
            variant = self.variant(point)
            fullest = variant.fullest if variant is not None else None
        return self._mass.aim(self.values(point), self.space.numbers(point), fullest)

    def solve(self, points: Sequence[Point]) -> list[Solved]:
        """See `Evaluator`."""
        variants = []
        for point in points:
            variant = self.variant(point)
            assert variant is not None
            number = self._numbers.setdefault(variant.key, max(self._numbers.values(), default=0) + 1)
            variants.append(dataclasses.replace(variant, number=number))
            self._variants[point] = variants[-1]
        self._evaluate(variants)
        return [self._solved(point, variant) for point, variant in zip(points, variants, strict=True)]

    def _evaluate(self, variants: Sequence[Variant]) -> None:
        new = list({variant.key: variant for variant in variants}.values())
        self._driver = driver = self._new_driver(new)
        if not self._stop.is_set():
            driver.run()
        self.evaluated += driver.tally.evaluated
        self._check_stop(driver)

    def _new_driver(self, variants: Sequence[Variant]) -> Driver:
        return Driver(cast("Plan", _Round(self.plan, variants)), self.writer, self._same_backend, self.hear, self._stop)

    def _same_backend(self) -> Backend:
        if self._backend is None:
            self._backend = self._make()
        return self._backend

    def _check_stop(self, driver: Driver) -> None:
        if self._stop.is_set():
            self._stopped_by = self._stopped_by or driver.stopped_by or "the caller"
            raise _Stopped

    def _solved(self, point: Point, variant: Variant) -> Solved:
        outcome = self.writer.outcome(variant.key)
        assert outcome is not None
        return solved_of(point, variant, outcome, self.plan)

    def ask_to_stop(self, why: str) -> None:
        """Called by signals."""
        self._stopped_by = self._stopped_by or why
        self._stop.set()
        if self._driver is not None:
            self._driver.ask_to_stop(why)

    def close(self) -> None:
        """End what is under way."""
        if self._backend is not None:
            self._backend.close()

    # The search and what follows it

    def run(self, budget: int, seed: int, together: int, tell: Callable[[Step], None]) -> Lightest:
        """Search, confirm the winner by its whole run, and see what each dimension does there."""
        made = Lightest(self.writer.path, self.plan.title, None, self.space)

        def heard_step(step: Step) -> None:
            tell(step)
            if self._stop.is_set():
                raise _Stopped

        try:
            found = search(self.space, self, budget, seed, together, heard_step)
            made = dataclasses.replace(made, found=found)
            if found.best is not None:
                made = self._confirm(made, found.best)
            else:
                made = dataclasses.replace(made, nearest=self._nearest(found))
            self.writer.note(_told(made))
            self.hear(Happening("end", _told(made)))
        except _Stopped:
            made = dataclasses.replace(made, interrupted=self._stopped_by or "the caller")
            self.hear(Happening("stop", f"stopped ({made.interrupted})"))
        why = Counter(one.why for one in (made.found.solved if made.found else ()) if not one.sound)
        return dataclasses.replace(made, evaluated=self.evaluated, left_out=dict(self._left_out), unsound=dict(why),
                                   seconds=time.monotonic() - self._started)

    def _confirm(self, made: Lightest, best: Solved) -> Lightest:
        """Check the winner once more, with its whole run folder, and compare it with the record."""
        variant = self.variant(best.point)
        assert variant is not None and made.found is not None
        outcome = self.writer.outcome(variant.key)
        assert outcome is not None
        folder = kept_run(self.writer.path, variant.key)
        if folder is None:
            self._driver = driver = self._new_driver([])
            driver._reading = False
            first = outcome if outcome.safer_mesh else None
            driver.keep([Ticket(variant, str(new_run(self.writer.path, variant)), recorded=True, first=first)],
                        self._same_backend)
            self._check_stop(driver)
            folder = kept_run(self.writer.path, variant.key)
        return dataclasses.replace(made, best=variant, outcome=outcome, run_folder=folder,
                                   confirmed=folder is not None and _same(folder, outcome),
                                   slopes=tuple(slopes(self.space, made.found, self.plan.varied)))

    def _nearest(self, found: Found) -> tuple[Variant, Solved] | None:
        usable = [one for one in found.solved if one.used]
        if not usable:
            return None
        one = min(usable, key=lambda one: (not one.sound, max(one.used.values())))
        variant = self.variant(one.point)
        return None if variant is None else (variant, one)


def solved_of(point: Point, variant: Variant, outcome: Outcome, plan: Plan) -> Solved:
    """An outcome as the search takes it."""
    if outcome.status == "failed":
        return Solved(point, float("nan"), {}, False, f"failed: {outcome.stage}: {outcome.reason}", variant.number)
    figures = {name: kept.beam if kept.solid is None else kept.solid for name, kept in outcome.figures.items()}
    used = {held.name: share for held in outcome.limits if (share := share_used(held)) is not None}
    why = ""
    if outcome.judgement == "suspicious":
        why = "suspicious" + (f": {outcome.suspicions[0].partition(': ')[0]}" if outcome.suspicions else "")
    elif unknown := [held for held in outcome.limits if held.verdict not in ("met", "missed") or
                     (held.verdict == "missed" and used.get(held.name, 1.0) <= 1.0)]:
        why = f"{unknown[0].name} {unknown[0].verdict}"
    elif not outcome.fine and all(share <= 1.0 for share in used.values()):
        why = "not every limit is met"
    return Solved(point, plan.aim.cost(figures, variant.numbers), used, not why, why, variant.number)


def share_used(held: Held) -> float | None:
    """Share of a limit that is used, up to 1 where it is met; None where nothing was found."""
    if held.found is None or held.given == 0.0:
        return None
    found, given = abs(held.found), abs(held.given)
    share = given / max(found, TINY * given) if held.quantity.partition(" ")[0] in AT_LEAST else found / given
    return min(share, 1.0) if held.verdict == "met" else max(share, TINY)


def _same(folder: Path, outcome: Outcome) -> bool:
    """Whether a run folder holds the limits of the outcome, all met."""
    from studies.check.result import CheckResult

    try:
        result = CheckResult.from_json((folder / "result.json").read_text(encoding="utf-8"))
    except (OSError, ValueError, HaunchError):
        return False
    of = {limit.name: limit.found for limit in result.limits}
    near = [held.found is not None and of.get(held.name) is not None
            and abs(cast(float, of[held.name]) - held.found) <= 1e-9 * abs(held.found)
            for held in outcome.limits if held.quantity != "mass"]
    return result.fine and all(near)


def _told(made: Lightest) -> str:
    found = made.found
    assert found is not None
    if made.best is None:
        return f"no variant meets every limit among {len(found.solved)} solved; {found.why}"
    values = ", ".join(f"{name} = {value}" for name, value in made.best.values.items())
    return f"lightest: variant {made.best.number} ({values}) after {len(found.solved)} solves; {found.why}"
