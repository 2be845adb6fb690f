"""What is wrong with an input, in a form that a person can act on."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Problem:
    """One mistake.

    Attributes
    ----------
    path
        Where it is, in the words of the spec: ``members.arm.section.web``.
    given
        What was found there, as text (empty where nothing was given).
    allowed
        What may stand there: a range, a list of names, a form.
    fix
        The likeliest repair, as one sentence.
    """

    path: str
    given: str
    allowed: str
    fix: str = ""

    def __str__(self) -> str:
        text = f"{self.path}: given {self.given}; allowed: {self.allowed}"
        return f"{text}. {self.fix}" if self.fix else text


class HaunchError(Exception):
    """Base of every error that Haunch raises on purpose."""


class SpecError(HaunchError):
    """The spec is wrong. Holds every mistake found, not only the first."""

    def __init__(self, problems: Iterable[Problem]) -> None:
        self.problems = tuple(problems)
        super().__init__("\n".join(map(str, self.problems)))


class RunError(HaunchError):
    """The spec is right, but a stage of the run failed.

    ``stage`` is one of ``solid``, ``mesh``, ``solve``, ``beam``, ``compare``, ``write``.
    """

    def __init__(self, stage: str, message: str) -> None:
        self.stage = stage
        super().__init__(message)


class SolidError(RunError):
    """The solid could not be built, or was built wrongly."""

    def __init__(self, message: str) -> None:
        super().__init__("solid", message)


class MeshError(RunError):
    """No meshing attempt gave a mesh that may be used."""

    def __init__(self, message: str) -> None:
        super().__init__("mesh", message)


class SolveError(RunError):
    """The equations were not solved to the accuracy that a result needs."""

    def __init__(self, message: str) -> None:
        super().__init__("solve", message)
