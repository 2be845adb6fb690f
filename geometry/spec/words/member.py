"""Tables that describe a member: its sections, stations, cuts, edges and patches."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import BaseModel, ConfigDict, Discriminator, Field, Tag

from geometry.spec.words.fields import Angle, Count, DirectionVector, Length, OfKind, Point, Radius, Size, Text, Words


class RectangleSection(Words):
    """Solid rectangle."""

    shape: Literal["rectangle"] = Field(description="the shape")
    depth: Size = Field(description="along z")
    width: Size = Field(description="along y")
    corner_radius: Radius = Field("0 mm", description="radius of its four corners")


class RoundSection(Words):
    """Solid round bar."""

    shape: Literal["round"] = Field(description="the shape")
    diameter: Size = Field(description="diameter")


class TubeSection(Words):
    """Round tube."""

    shape: Literal["tube"] = Field(description="the shape")
    diameter: Size = Field(description="outside diameter")
    wall: Size = Field(description="wall thickness")


class BoxSection(Words):
    """Rectangular tube."""

    shape: Literal["box"] = Field(description="the shape")
    depth: Size = Field(description="outside, along z")
    width: Size = Field(description="outside, along y")
    wall: Size = Field(description="wall thickness")
    corner_radius: Radius = Field("0 mm", description="outside radius of its corners")
    inner_radius: Radius | None = Field(None, description="inside radius of its corners; corner_radius - wall or 0")


class ISection(Words):
    """I section, with equal or unequal flanges."""

    shape: Literal["I"] = Field(description="the shape")
    depth: Size = Field(description="overall, along z")
    width: Size = Field(description="of the top flange, along y")
    web: Size = Field(description="web thickness")
    flange: Size = Field(description="thickness of the top flange")
    root_radius: Radius = Field("0 mm", description="radius between web and flanges")
    bottom_width: Size | None = Field(None, description="of the bottom flange; as width when left out")
    bottom_flange: Size | None = Field(None, description="thickness of the bottom flange; as flange when left out")


class ChannelSection(Words):
    """Channel: web on the left, flanges towards +y."""

    shape: Literal["channel"] = Field(description="the shape")
    depth: Size = Field(description="overall, along z")
    width: Size = Field(description="of the flanges, along y, from the back of the web")
    web: Size = Field(description="web thickness")
    flange: Size = Field(description="flange thickness")
    root_radius: Radius = Field("0 mm", description="radius between web and flanges")


class AngleSection(Words):
    """Angle: upright leg on the left, the other leg at the bottom."""

    shape: Literal["angle"] = Field(description="the shape")
    depth: Size = Field(description="of the upright leg, along z")
    width: Size = Field(description="of the bottom leg, along y")
    thickness: Size = Field(description="of both legs")
    root_radius: Radius = Field("0 mm", description="radius between the legs")
    toe_radius: Radius = Field("0 mm", description="radius at the inner edge of each toe")


class TeeSection(Words):
    """Tee: flange on top."""

    shape: Literal["tee"] = Field(description="the shape")
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

    shape: Literal["outline"] = Field(description="the shape")
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
    turned: Angle = Field("0 deg", description="from the member's x towards z (along y) or y (along z)")


class OpeningSpec(AcrossSpec):
    """A rectangular opening."""

    length: Size = Field(description="along the member")
    height: Size = Field(description="across it")
    corner_radius: Radius = Field("0 mm", description="of its corners")
    turned: Angle = Field("0 deg", description="from the member's x towards z (along y) or y (along z)")


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
