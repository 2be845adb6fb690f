"""The spec as it is written: one model for the TOML file and for Python.

Quantities stay text here (``"reach / 2"``); `PartSpec.resolve` turns them into numbers. The model checks
structure only (words, types, counts). Whatever needs a value or a second field is checked in
`geometry.spec.resolve.part` and `geometry.spec.checks.part`, which also run when another part of the spec is wrong.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field, Strict

from geometry.spec.words.fields import (
    AccelerationVector,
    ForceVector,
    Length,
    LineForceVector,
    Moment,
    MomentVector,
    Number,
    OfKind,
    Point,
    Real,
    Size,
    Strength,
    Text,
    Words,
)
from geometry.spec.words.member import MemberSpec

if TYPE_CHECKING:
    from geometry.part import Part


class MaterialSpec(Words):
    """A material by its values, instead of a name from the table."""

    name: Text = Field("own material", description="what it is called in reports")
    E: Annotated[Text, OfKind("stress", above=0.0)] = Field(description="modulus of elasticity")
    nu: Annotated[Real | Text, OfKind("number", least=0.0, most=0.49)] = Field(description="Poisson's ratio")
    density: Annotated[Text, OfKind("density", above=0.0)] | None = Field(
        None, description="needed for self-weight, acceleration and mass"
    )
    expansion: Annotated[Text, OfKind("thermal expansion", least=0.0)] | None = Field(
        None, description="thermal expansion, needed for a temperature change"
    )
    yield_strength: Strength | None = Field(None, alias="yield", description="yield or proof strength")
    ultimate: Strength | None = Field(None, description="ultimate strength")
    kind: Literal["characteristic", "minimum", "typical", "declared"] = Field(
        "declared", description="what sort of value the strengths are"
    )
    source: Text = Field("declared in the spec", description="where the values come from")


FreedomWord = Literal["x", "y", "z", "rx", "ry", "rz", "normal"]


class SupportSpec(Words):
    """How a region is held."""

    on: Text = Field(description="the region: member.start, a hole, a patch ...")
    hold: (
        Literal["all", "pin", "symmetry"]
        | Annotated[list[FreedomWord], Field(min_length=1)]
        | Annotated[dict[FreedomWord, Real | Text], Field(min_length=1)]
    ) = Field(description="all, pin (x, y, z on average), symmetry (normal), freedoms, or freedom = value")
    coupling: Literal["surface", "rigid", "average"] | None = Field(
        None, description="surface (every point), rigid, or average; average for a pin, else surface"
    )
    axes: Literal["global", "member"] = Field("global", description="which axes x, y, z mean")


class TravelSpec(Words):
    """A load that travels along a face: its positions, each a case of its own (`crossing@350`)."""

    start: Length = Field(alias="from", description="first position of the first axle, from the member's start")
    end: Length = Field(alias="to", description="its last position")
    steps: Annotated[Annotated[int, Strict()] | Text, OfKind("number", least=1.0, most=200.0)] = Field(
        20, description="how many equal steps from the first to the last; there is one position more"
    )
    contact: Size = Field(description="length along the member over which the force of an axle is spread")
    axles: Annotated[list[Length], Field(min_length=1, max_length=20)] = Field(
        default_factory=lambda: ["0 mm"],
        description="distance of each axle from the first, itself with 0, towards the member's end",
    )


class LoadSpec(Words):
    """One load: its kind follows from the words used."""

    on: Text | None = Field(None, description="the region it acts on; none for acceleration and temperature_change")
    force: ForceVector | None = Field(None, description="force, global")
    moment: MomentVector | None = Field(None, description="moment about the region's centroid (or point), global")
    torque: Moment | None = Field(None, description="moment about the member's x")
    pressure: Annotated[Text, OfKind("stress")] | None = Field(None, description="positive: pushes into the part")
    travels: TravelSpec | None = Field(None, description="it travels along a face; force is that of each axle")
    bearing: ForceVector | None = Field(None, description="force of a pin in a hole, global, square to the hole")
    force_per_length: LineForceVector | None = Field(None, description="on a face, global")
    force_per_length_end: LineForceVector | None = Field(None, description="its value at the end of the stretch")
    start: Length | None = Field(None, alias="from", description="where the stretch starts; the member's start")
    end: Length | None = Field(None, alias="to", description="where the stretch ends; the member's end")
    point: Point | None = Field(None, description="a point off the part, coupled to the region, global")
    mass: Annotated[Text, OfKind("mass", least=0.0)] | None = Field(None, description="of what is carried at point")
    inertia: (
        Annotated[list[Annotated[Text, OfKind("mass moment of inertia")]], Field(min_length=3, max_length=6)] | None
    ) = Field(
        None, description="of that mass about point: xx, yy, zz and if needed xy, yz, zx (xy: minus the sum of x y m)"
    )
    coupling: Literal["surface", "rigid", "average"] | None = Field(
        None, description="surface (even traction) for force, moment, torque; average for a point"
    )
    acceleration: AccelerationVector | None = Field(None, description="of the whole part, global")
    temperature_change: Annotated[Text, OfKind("temperature change")] | None = Field(
        None, description="uniform, from the stress-free state"
    )


class LimitSpec(Words):
    """A limit with a name of its own."""

    quantity: Literal[
        "deflection",
        "displacement",
        "rotation",
        "relative_displacement",
        "stress",
        "yield_factor",
        "mass",
        "reaction",
        "frequency",
        "buckling_factor",
    ] = Field(description="what is limited")
    at: Text = Field("", description="place, region or support; anywhere when left out")
    relative_to: Text = Field("", description="second place of a relative_displacement")
    component: Literal["", "x", "y", "z"] = Field("", description="global; the size when left out")
    max: Real | Text | None = Field(None, description="largest value (everything that has no min)")
    min: Real | Text | None = Field(None, description="least value (yield_factor, frequency, buckling_factor)")
    basis: Literal["nominal", "edge", "local"] = Field(
        "edge",
        description="nominal: beam formula, net section; edge: local stress where it converges, outer fibres "
        "extrapolated to held edges; local: local stress only, which cannot pass at a held sharp edge",
    )
    cases: list[Text] = Field(
        default_factory=list,
        description="cases it is judged in (one with a travelling load: at every position); all when left out",
    )


class LimitsSpec(BaseModel):
    """Limits: simple ones by their quantity, any others as tables with names of their own."""

    model_config = ConfigDict(extra="allow", populate_by_name=True, hide_input_in_errors=True)
    __pydantic_extra__: dict[str, LimitSpec]

    deflection: Size | None = Field(None, description="largest size of the displacement, anywhere")
    rotation: Annotated[Text, OfKind("angle", above=0.0)] | None = Field(None, description="largest rotation")
    stress: Strength | None = Field(None, description="largest stress (edge basis)")
    yield_factor: Annotated[Real | Text, OfKind("number", above=0.0)] | None = Field(
        None, description="least factor against first yield (edge basis)"
    )
    mass: Annotated[Text, OfKind("mass", above=0.0)] | None = Field(None, description="largest mass of the part")
    frequency: Annotated[Text, OfKind("frequency", above=0.0)] | None = Field(
        None, description="least natural frequency; needs [vibration]"
    )
    buckling_factor: Annotated[Real | Text, OfKind("number", above=0.0)] | None = Field(
        None, description="least buckling factor over the cases of [buckling]"
    )


ModeCount = Annotated[Annotated[int, Strict()] | Text, OfKind("number", least=1.0, most=40.0)]


class VibrationSpec(Words):
    """Natural frequencies of the part with the masses it carries (`mass` of loads at a point); loads do not act."""

    modes: ModeCount = Field(6, description="how many, from the lowest; rigid motions of a free part do not count")
    supports: Literal["declared", "none"] = Field(
        "declared", description="declared: held as in [supports]; none: the free part, as if hung in soft slings"
    )


class BucklingSpec(Words):
    """Linear buckling of one case: by which factor its loads may grow until the perfect part has another shape."""

    fixed: list[Text] = Field(
        default_factory=list, description="loads of the case that keep their value; the others grow together"
    )
    modes: ModeCount = Field(3, description="how many factors, from the one of least size")


class PlaceSpec(Words):
    """A named station of a member."""

    member: Text | None = Field(None, description="may be left out when there is one member")
    at: Annotated[Text, OfKind("length", least=0.0)] = Field(description="distance from the member's start")


class PartSpec(Words):
    """The spec of one part."""

    title: Text = Field("", description="what the part is called in reports")
    material: MaterialSpec | Text = Field(description="a name from the table of materials, or a table of values")
    accuracy: Annotated[Real | Text, OfKind("number", least=0.001, most=0.2)] = Field(
        "2 %", description="wanted of displacement and stress; it steers the mesh"
    )
    gravity: AccelerationVector = Field(
        default_factory=lambda: ["0 m/s^2", "0 m/s^2", "-9.81 m/s^2"],
        description="used by the built-in load self_weight",
    )
    parameters: dict[str, Annotated[Real | Text, OfKind("quantity")]] = Field(
        default_factory=dict, description="dimensions that may be varied"
    )
    members: dict[str, MemberSpec] = Field(description="the members, by name; one for now")
    places: dict[str, PlaceSpec] = Field(default_factory=dict, description="stations to report at")
    supports: dict[str, SupportSpec] = Field(description="how the part is held")
    loads: dict[str, LoadSpec] = Field(default_factory=dict, description="loads by name")
    cases: dict[str, dict[str, Number]] = Field(
        default_factory=dict, description="load = factor; one case `all` with every load at 1 when left out"
    )
    vibration: VibrationSpec | None = Field(None, description="natural frequencies are wanted")
    buckling: dict[str, BucklingSpec] = Field(default_factory=dict, description="buckling factors wanted, by case")
    limits: LimitsSpec = Field(default_factory=LimitsSpec, description="what the part must meet")

    def resolve(self, source_text: str = "") -> Part:
        """The part in numbers; raise `SpecError` with every mistake found."""
        from geometry.spec.resolve.part import resolve

        return resolve(self, source_text)
