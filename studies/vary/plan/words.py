"""The plan as it is written: one model for the TOML file and for Python.

The model checks structure only (words, types); whatever needs the part, or a second field, is checked in
`studies.vary.plan.read`.
"""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import Field, Strict

from geometry.spec.model import LimitsSpec
from geometry.spec.words.fields import OfKind, Real, Size, Text, Words

Whole = Annotated[int, Strict()]
Value = Real | Text
Method = Literal["grid", "one at a time", "latin hypercube", "sobol", "as made"]
Distribution = Literal["uniform", "normal", "triangular"]


class VariedSpec(Words):
    """What one dimension, load or support may be: listed values, a range, or sizes of a stock list."""

    path: Text | None = Field(
        None, description="where it stands in the part, when the name is one of your own: members.arm.section.flange"
    )
    values: Annotated[list[Any], Field(min_length=1)] | None = Field(None, description="the values, listed")
    low: Value | None = Field(None, alias="from", description="least value of a range or of a stock list")
    high: Value | None = Field(None, alias="to", description="greatest value")
    steps: Annotated[Whole, OfKind("number", least=1.0, most=100000.0)] | None = Field(
        None, description="how many equal steps from the least to the greatest; there is one value more"
    )
    step: Value | None = Field(None, description="size of a step, instead of steps")
    stock: Text | None = Field(None, description="a stock list: its sizes from the least to the greatest")


class SamplingSpec(Words):
    """Which points of the ranges become variants."""

    method: Method = Field(
        "grid",
        description="grid: every combination; one at a time: each value by itself, the others as in the part; "
        "latin hypercube, sobol: spread evenly over the ranges; as made: within the tolerances",
    )
    points: Annotated[Whole, OfKind("number", least=1.0)] | None = Field(
        None, description="how many, for latin hypercube, sobol and as made (sobol: best a power of two)"
    )
    seed: Annotated[Whole, OfKind("number", least=0.0)] = Field(1, description="the same seed gives the same points")


class ShopSpec(Words):
    """What the shop can make; a variant that breaks a rule is left out, with the reason."""

    least_wall: Size | None = Field(None, description="least thickness of any wall, also of what cuts leave")
    tool_radius: Size | None = Field(None, description="least radius of inner corners that are milled")
    edge_distance: Annotated[Value, OfKind("number", above=0.0)] | None = Field(
        None, description="from the middle of a hole to an edge or an end, in diameters of the hole"
    )


class ToleranceSpec(Words):
    """How far a dimension may be off as made."""

    minus: Text | None = Field(None, description="how much smaller it may be; 0 when left out")
    plus: Text | None = Field(None, description="how much larger it may be; 0 when left out")
    distribution: Distribution = Field(
        "uniform",
        description="between the two, for `as made`: uniform; normal (three standard deviations to either side, cut "
        "off there); triangular (peak at the dimension as drawn)",
    )


class AimSpec(Words):
    """What the best variant has least or most of; one of the two."""

    least: Text | None = Field(None, description="a kept figure, or arithmetic: 2.1 * mass / (1 kg) + bore / (1 m)")
    most: Text | None = Field(None, description="the same, where more is better")


class RunsSpec(Words):
    """Variants of which the whole run folder is kept: tables, fields, pictures."""

    best: Annotated[Whole, OfKind("number", least=0.0)] = Field(3, description="how many of the best by the aim")
    worst: Annotated[Whole, OfKind("number", least=0.0)] = Field(
        1, description="how many of those that miss a limit by most, or have least left"
    )
    suspicious: Annotated[Whole, OfKind("number", least=0.0)] = Field(5, description="how many suspicious ones at most")
    every: Annotated[Whole, OfKind("number", least=0.0)] = Field(0, description="every n-th variant; 0: none")


class KeepSpec(Words):
    """What is kept of each variant."""

    figures: list[Text] = Field(
        default_factory=list, description="figures beside those always kept, such as displacement_z@arm.end"
    )
    runs: RunsSpec = Field(default_factory=RunsSpec, description="whole run folders")


class RunSpec(Words):
    """Bounds of one variant."""

    seconds: Annotated[Value, OfKind("time", above=0.0)] = Field("300 s", description="time that a variant may take")
    memory: Annotated[Whole, OfKind("number", least=256.0)] = Field(2048, description="MiB that a worker may take")
    safer_mesh: Annotated[bool, Strict()] = Field(
        True, description="a variant that fails by itself is tried once more on a safer mesh"
    )


class PlanSpec(Words):
    """The plan of one study."""

    title: Text = Field("", description="what the study is called; the part's title when left out")
    part: Text | dict[str, Any] = Field(description="file of the part, beside the plan; or its tables")
    base: dict[str, Any] = Field(
        default_factory=dict, description="name or path = value: where the plan departs from the part in all variants"
    )
    vary: dict[str, list[Any] | VariedSpec] = Field(
        default_factory=dict, description="a parameter by its name, or any field of the part by its path in quotes"
    )
    sampling: SamplingSpec = Field(default_factory=SamplingSpec, description="which points are taken")
    stock: dict[str, Annotated[list[Text], Field(min_length=1)]] = Field(
        default_factory=dict, description="stock lists of your own: name = [sizes]"
    )
    constraints: dict[str, Text] = Field(
        default_factory=dict, description='name = comparison: "tip_depth <= root_depth - 10 mm"'
    )
    shop: ShopSpec = Field(default_factory=ShopSpec, description="what the shop can make")
    tolerances: dict[str, Text | ToleranceSpec] = Field(
        default_factory=dict, description="a parameter or path, and how far it may be off: to either side, or a table"
    )
    limits: LimitsSpec = Field(
        default_factory=LimitsSpec, description="as in a part: added to its limits, or in place of those of the name"
    )
    aim: AimSpec | None = Field(None, description="what the best variant is; the least mass when left out")
    keep: KeepSpec = Field(default_factory=KeepSpec, description="what is kept")
    run: RunSpec = Field(default_factory=RunSpec, description="bounds of one variant")
