"""The spec as it is written: one model for the TOML file and for Python.

Quantities stay text here (``"reach / 2"``); `PartSpec.resolve` turns them into numbers. The model checks
structure only (words, types, counts). Whatever needs a value or a second field is checked in
`geometry.spec.resolve` and `geometry.spec.checks`, which also run when another part of the spec is wrong.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Annotated, Any, Literal

from pydantic import BaseModel, ConfigDict, Discriminator, Field, Strict, Tag

from geometry.spec.quantity import KINDS, Kind

if TYPE_CHECKING:
    from geometry.part import Part


@dataclass(frozen=True, slots=True)
class OfKind:
    """Mark of a field that holds a quantity: its kind, and the range its value must lie in."""

    word: str
    above: float | None = None
    least: float | None = None
    most: float | None = None

    @property
    def kind(self) -> Kind:
        return KINDS[self.word]

    @property
    def range(self) -> str:
        """The range in words, empty when any value may stand."""
        unit = f" {self.kind.unit}" if self.kind.unit else ""
        words = []
        if self.above is not None:
            words.append(f"greater than {self.above:g}{unit if self.above else ''}")
        if self.least is not None:
            words.append(f"at least {self.least:g}{unit if self.least else ''}")
        if self.most is not None:
            words.append(f"at most {self.most:g}{unit}")
        return " and ".join(words)


Text = Annotated[str, Strict()]
Real = Annotated[float, Strict()]
Length = Annotated[Text, OfKind("length")]
Size = Annotated[Text, OfKind("length", above=0.0)]
Radius = Annotated[Text, OfKind("length", least=0.0)]
Angle = Annotated[Text, OfKind("angle")]
Force = Annotated[Text, OfKind("force")]
Moment = Annotated[Text, OfKind("moment")]
LineForce = Annotated[Text, OfKind("force per length")]
Acceleration = Annotated[Text, OfKind("acceleration")]
Direction = Annotated[Real | Text, OfKind("number")]
Number = Annotated[Real | Text, OfKind("number")]
Count = Annotated[Annotated[int, Strict()] | Text, OfKind("number", least=1.0, most=1000.0)]
Strength = Annotated[Text, OfKind("stress", above=0.0)]

Point = Annotated[list[Length], Field(min_length=3, max_length=3)]
ForceVector = Annotated[list[Force], Field(min_length=3, max_length=3)]
MomentVector = Annotated[list[Moment], Field(min_length=3, max_length=3)]
LineForceVector = Annotated[list[LineForce], Field(min_length=3, max_length=3)]
AccelerationVector = Annotated[list[Acceleration], Field(min_length=3, max_length=3)]
DirectionVector = Annotated[list[Direction], Field(min_length=3, max_length=3)]


class Words(BaseModel):
    """Base of every table: unknown words are mistakes, and Python may use the field names."""

    model_config = ConfigDict(extra="forbid", populate_by_name=True, hide_input_in_errors=True)


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


class RectangleSection(Words):
    """Solid rectangle."""

    shape: Literal["rectangle"]
    depth: Size = Field(description="along z")
    width: Size = Field(description="along y")
    corner_radius: Radius = Field("0 mm", description="radius of its four corners")


class RoundSection(Words):
    """Solid round bar."""

    shape: Literal["round"]
    diameter: Size = Field(description="diameter")


class TubeSection(Words):
    """Round tube."""

    shape: Literal["tube"]
    diameter: Size = Field(description="outside diameter")
    wall: Size = Field(description="wall thickness")


class BoxSection(Words):
    """Rectangular tube."""

    shape: Literal["box"]
    depth: Size = Field(description="outside, along z")
    width: Size = Field(description="outside, along y")
    wall: Size = Field(description="wall thickness")
    corner_radius: Radius = Field("0 mm", description="outside radius of its corners")
    inner_radius: Radius | None = Field(None, description="inside radius of its corners; corner_radius - wall or 0")


class ISection(Words):
    """I section, with equal or unequal flanges."""

    shape: Literal["I"]
    depth: Size = Field(description="overall, along z")
    width: Size = Field(description="of the top flange, along y")
    web: Size = Field(description="web thickness")
    flange: Size = Field(description="thickness of the top flange")
    root_radius: Radius = Field("0 mm", description="radius between web and flanges")
    bottom_width: Size | None = Field(None, description="of the bottom flange; as width when left out")
    bottom_flange: Size | None = Field(None, description="thickness of the bottom flange; as flange when left out")


class ChannelSection(Words):
    """Channel: web on the left, flanges towards +y."""

    shape: Literal["channel"]
    depth: Size = Field(description="overall, along z")
    width: Size = Field(description="of the flanges, along y, from the back of the web")
    web: Size = Field(description="web thickness")
    flange: Size = Field(description="flange thickness")
    root_radius: Radius = Field("0 mm", description="radius between web and flanges")


class AngleSection(Words):
    """Angle: upright leg on the left, the other leg at the bottom."""

    shape: Literal["angle"]
    depth: Size = Field(description="of the upright leg, along z")
    width: Size = Field(description="of the bottom leg, along y")
    thickness: Size = Field(description="of both legs")
    root_radius: Radius = Field("0 mm", description="radius between the legs")
    toe_radius: Radius = Field("0 mm", description="radius at the inner edge of each toe")


class TeeSection(Words):
    """Tee: flange on top."""

    shape: Literal["tee"]
    depth: Size = Field(description="overall, along z")
    width: Size = Field(description="of the flange, along y")
    web: Size = Field(description="web thickness")
    flange: Size = Field(description="flange thickness")
    root_radius: Radius = Field("0 mm", description="radius between web and flange")


Corner = Annotated[list[Length], Field(min_length=2, max_length=3)]


class Circle(Words):
    """A round void of an outline."""

    y: Length = Field(description="its centre")
    z: Length = Field(description="its centre")
    diameter: Size = Field(description="its diameter")


class OutlineSection(Words):
    """A section drawn by its corners: each ``[y, z]``, or ``[y, z, radius]`` for a rounded one."""

    shape: Literal["outline"]
    outer: Annotated[list[Corner], Field(min_length=3, max_length=500)] = Field(
        description="corners of the outer loop, in order, either way round"
    )
    inner: list[Annotated[list[Corner], Field(min_length=3, max_length=500)]] = Field(
        default_factory=list, description="loops of the voids"
    )
    circles: list[Circle] = Field(default_factory=list, description="round voids")


def _shape_of(value: Any) -> str | None:
    shape = value.get("shape") if isinstance(value, dict) else getattr(value, "shape", None)
    return shape if isinstance(shape, str) else None


SectionSpec = Annotated[
    Annotated[RectangleSection, Tag("rectangle")]
    | Annotated[RoundSection, Tag("round")]
    | Annotated[TubeSection, Tag("tube")]
    | Annotated[BoxSection, Tag("box")]
    | Annotated[ISection, Tag("I")]
    | Annotated[ChannelSection, Tag("channel")]
    | Annotated[AngleSection, Tag("angle")]
    | Annotated[TeeSection, Tag("tee")]
    | Annotated[OutlineSection, Tag("outline")],
    Discriminator(_shape_of),
]


class StationSpec(BaseModel):
    """Dimensions at a distance from the start: any dimension of the section, by its name."""

    model_config = ConfigDict(extra="allow", populate_by_name=True, hide_input_in_errors=True)
    __pydantic_extra__: dict[str, Length]

    at: Annotated[Text, OfKind("length", least=0.0)] = Field(description="distance from the member's start")
    shoulder_fillet: Radius = Field("0 mm", description="radius at a step (two stations at one place)")


ThroughWord = Literal[
    "all", "web", "flanges", "top flange", "bottom flange", "left wall", "right wall", "top wall", "bottom wall",
    "upright leg", "bottom leg",
]  # fmt: skip


class CutSpec(Words):
    """What holes, slots, openings and notches have in common."""

    name: Text | None = Field(None, description="name of its region; hole1, slot2 ... when left out")
    through: ThroughWord | None = Field(None, description="which wall it passes; all when the section is solid")
    along: Literal["y", "z"] | None = Field(None, description="direction of its axis; follows from through")
    at: Length = Field(description="distance of its middle from the member's start; of the first one of a row")
    count: Count = Field(1, description="how many along the member")
    pitch: Size | None = Field(None, description="distance between those")


class AcrossSpec(CutSpec):
    """A cut whose middle may stand off the member's line, and that may come in rows."""

    offset: Length = Field("0 mm", description="of its middle from the member's line, across the member")
    rows: Count = Field(1, description="how many rows, evenly to both sides of offset")
    row_pitch: Size | None = Field(None, description="distance between rows")


class HoleSpec(AcrossSpec):
    """A round hole."""

    diameter: Size = Field(description="its diameter")


class SlotSpec(AcrossSpec):
    """A slot with half-round ends."""

    length: Size = Field(description="overall")
    width: Size = Field(description="its width")
    turned: Angle = Field("0 deg", description="from the member's x to the slot's long side")


class OpeningSpec(AcrossSpec):
    """A rectangular opening."""

    length: Size = Field(description="along the member")
    height: Size = Field(description="across it")
    corner_radius: Radius = Field("0 mm", description="of its corners")
    turned: Angle = Field("0 deg", description="from the member's x to the opening's length")


class NotchSpec(CutSpec):
    """A notch from an edge inwards."""

    edge: Literal["top", "bottom", "left", "right"] = Field(description="the side it starts from")
    length: Size = Field(description="along the member")
    depth: Size = Field(description="from the edge inwards")
    corner_radius: Radius = Field("0 mm", description="of its inner corners; half the length: half-round")


class EdgeRadiusSpec(Words):
    """A radius on named edges."""

    edges: Text = Field(description="top left, top right, bottom left, bottom right, start, end, or a cut's name")
    radius: Size = Field(description="the radius")


class PatchSpec(Words):
    """A named part of a face."""

    face: Text = Field(description="the face it lies on: top, bottom, left, right ...")
    start: Length = Field(alias="from", description="where it starts, from the member's start")
    end: Length = Field(alias="to", description="where it ends")
    across: Annotated[list[Length], Field(min_length=2, max_length=2)] | None = Field(
        None, description="its range across the face, from the member's line; the full width when left out"
    )


LineAt = Literal[
    "origin", "centroid", "top", "bottom", "left", "right", "web", "top left", "top right", "bottom left",
    "bottom right",
]  # fmt: skip


class MemberSpec(Words):
    """A straight member."""

    start: Point = Field(alias="from", description="start of its line, global")
    end: Point = Field(alias="to", description="end of its line, global")
    up: DirectionVector | None = Field(
        None, description="direction of the section's depth; global z, or global x for an upright member"
    )
    roll: Angle = Field("0 deg", description="further turn about its own x")
    section: SectionSpec = Field(description="section at the start")
    line_at: LineAt = Field("centroid", description="point of the start section that lies on the line")
    anchor: Literal["top", "centre", "bottom"] | None = Field(
        None, description="what stays straight when the depth varies; follows line_at"
    )
    taper: dict[str, Length] | None = Field(None, description="values of dimensions at the far end")
    stations: list[StationSpec] = Field(default_factory=list, description="dimensions at stations between")
    holes: list[HoleSpec] = Field(default_factory=list, description="round holes")
    slots: list[SlotSpec] = Field(default_factory=list, description="slots")
    openings: list[OpeningSpec] = Field(default_factory=list, description="rectangular openings")
    notches: list[NotchSpec] = Field(default_factory=list, description="notches")
    edge_radii: list[EdgeRadiusSpec] = Field(default_factory=list, description="radii on edges")
    patches: dict[str, PatchSpec] = Field(default_factory=dict, description="named parts of faces")


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


class LoadSpec(Words):
    """One load: its kind follows from the words used."""

    on: Text | None = Field(None, description="the region it acts on; none for acceleration and temperature_change")
    force: ForceVector | None = Field(None, description="force, global")
    moment: MomentVector | None = Field(None, description="moment about the region's centroid (or point), global")
    torque: Moment | None = Field(None, description="moment about the member's x")
    pressure: Annotated[Text, OfKind("stress")] | None = Field(None, description="positive: pushes into the part")
    bearing: ForceVector | None = Field(None, description="force of a pin in a hole, global, square to the hole")
    force_per_length: LineForceVector | None = Field(None, description="on a face, global")
    force_per_length_end: LineForceVector | None = Field(None, description="its value at the end of the stretch")
    start: Length | None = Field(None, alias="from", description="where the stretch starts; the member's start")
    end: Length | None = Field(None, alias="to", description="where the stretch ends; the member's end")
    point: Point | None = Field(None, description="a point off the part, coupled to the region, global")
    mass: Annotated[Text, OfKind("mass", least=0.0)] | None = Field(None, description="of what is carried at point")
    inertia: (
        Annotated[list[Annotated[Text, OfKind("mass moment of inertia")]], Field(min_length=3, max_length=6)] | None
    ) = Field(None, description="of that mass about point: xx, yy, zz and if needed xy, yz, zx")
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
        "deflection", "displacement", "rotation", "relative_displacement", "stress", "yield_factor", "mass", "reaction"
    ] = Field(description="what is limited")
    at: Text = Field("", description="place, region or support; anywhere when left out")
    relative_to: Text = Field("", description="second place of a relative_displacement")
    component: Literal["", "x", "y", "z"] = Field("", description="global; the size when left out")
    max: Real | Text | None = Field(None, description="largest value (everything but yield_factor)")
    min: Real | Text | None = Field(None, description="least value (yield_factor)")
    basis: Literal["nominal", "edge", "local"] = Field("local", description="which stress is meant")
    cases: list[Text] = Field(default_factory=list, description="cases it is judged in; all when left out")


class LimitsSpec(BaseModel):
    """Limits: simple ones by their quantity, any others as tables with names of their own."""

    model_config = ConfigDict(extra="allow", populate_by_name=True, hide_input_in_errors=True)
    __pydantic_extra__: dict[str, LimitSpec]

    deflection: Size | None = Field(None, description="largest size of the displacement, anywhere")
    rotation: Annotated[Text, OfKind("angle", above=0.0)] | None = Field(None, description="largest rotation")
    stress: Strength | None = Field(None, description="largest local stress")
    yield_factor: Annotated[Real | Text, OfKind("number", above=0.0)] | None = Field(
        None, description="least factor against local first yield"
    )
    mass: Annotated[Text, OfKind("mass", above=0.0)] | None = Field(None, description="largest mass of the part")


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
    parameters: dict[str, Annotated[Real | Text, OfKind("quantity")]] = Field(default_factory=dict, description="dimensions that may be varied")
    members: dict[str, MemberSpec] = Field(description="the members, by name; one for now")
    places: dict[str, PlaceSpec] = Field(default_factory=dict, description="stations to report at")
    supports: dict[str, SupportSpec] = Field(description="how the part is held")
    loads: dict[str, LoadSpec] = Field(default_factory=dict, description="loads by name")
    cases: dict[str, dict[str, Number]] = Field(
        default_factory=dict, description="load = factor; one case `all` with every load at 1 when left out"
    )
    limits: LimitsSpec = Field(default_factory=LimitsSpec, description="what the part must meet")

    def resolve(self, source_text: str = "") -> Part:
        """The part in numbers; raise `SpecError` with every mistake found."""
        from geometry.spec.resolve import resolve

        return resolve(self, source_text)
