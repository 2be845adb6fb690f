"""The resolved spec: numbers instead of text, in N, mm, MPa, tonne, s and K.

A `Part` says what was *declared*, and nothing that has to be worked out: no outline, no interpolated
dimension, no area, no load resultant. The solid model and the beam model each work those out alone.

Axes. Global axes are right-handed. A member has its own: x from `Member.start` to `Member.end`, z is
the direction of the section's depth (towards `Member.up`), y = z cross x. A section is drawn in (y, z)
with y to the right and z up, as seen looking against x (from the far end back to the start).
Angles are in radian. A positive rotation or moment turns by the right-hand rule about its axis (only
`Cut.turned` has a rule of its own).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

from geometry.outline import Outline

Vector = tuple[float, float, float]

Shape = Literal["rectangle", "round", "tube", "box", "I", "channel", "angle", "tee", "outline"]
"""Dimensions of each shape (all in mm; those with a default may be left out in the spec):

rectangle  depth, width, corner_radius = 0
round      diameter
tube       diameter (outside), wall
box        depth, width (outside), wall, corner_radius = 0 (outside), inner_radius = corner_radius - wall or 0
I          depth, width (top), web, flange (top), root_radius = 0, bottom_width = width, bottom_flange = flange
channel    depth, width, web, flange, root_radius = 0        web on the left, flanges point to +y
angle      depth, width, thickness, root_radius = 0, toe_radius = 0   upright leg on the left, other leg at the bottom
tee        depth, width, web, flange, root_radius = 0        flange on top

Each is drawn about its own origin: z = 0 at half the depth; y = 0 in the plane of symmetry, or at the
back of the web (channel) or of the upright leg (angle). An `outline` keeps the origin of its points.
"""

Anchor = Literal["top", "centre", "bottom"]
"""What stays straight when the depth varies: the upper side, half the depth, or the lower side."""


@dataclass(frozen=True, slots=True)
class Section:
    """Section at the start of a member: its shape, dimensions (mm) and, for `outline`, its loops."""

    shape: Shape
    dims: Mapping[str, float] = field(default_factory=dict)
    outline: Outline | None = None


@dataclass(frozen=True, slots=True)
class Station:
    """Dimensions declared at a distance `at` (mm) from the start of the member.

    A dimension varies linearly from the last place that names it to the next place that names it
    (the section itself names all of them at 0) and stays constant after the last one. Stations stand in
    order. Two stations at exactly one place (equal `at`) are a step: the first one ends the stretch before,
    the second begins the next. A dimension that only the first names varies up to it and goes on from its
    value, without a jump; one that only the second names keeps its last value up to the step and jumps there.
    `shoulder_fillet` is the radius at such a step (0: sharp), kept on the second of the two.
    """

    at: float
    dims: Mapping[str, float]
    shoulder_fillet: float = 0.0


CutKind = Literal["hole", "slot", "opening", "notch"]
Through = Literal[
    "all", "web", "flanges", "top flange", "bottom flange", "left wall", "right wall", "top wall", "bottom wall",
    "upright leg", "bottom leg",
]


@dataclass(frozen=True, slots=True)
class Cut:
    """One cut, its axis across the member.

    Attributes
    ----------
    name
        Name of the region left on its inner faces, without the member: ``hole1``, ``pivot.2``.
    group
        Name shared by the cuts of one row or grid: ``pivot``.
    kind
        hole (round), slot (two half circles), opening (rectangular, corner radius), notch (from an
        edge inwards: a half-round-ended or square one, see `length`, `depth` and `corner_radius`). A
        notch passes the whole section.
    axis
        Direction in which the tool passes: member ``y`` or ``z``.
    through
        Which wall of the section it passes, its root fillets with it; ``all`` for the whole section. A cut
        through one wall lies beside the other walls: it touches none of them.
    at
        Distance of its middle from the member's start, mm.
    offset
        Coordinate of its middle across the member, from the member's line, mm (along z for axis y,
        along y for axis z). Not used by a notch.
    length, depth
        Size along the member and across it, mm. Hole: both the diameter. Slot: overall length along
        its own direction and its width. Notch: length along the member, depth from the edge inwards; on a
        taper it counts from where the edge is at the notch's middle (`at`; beyond a step there), and the
        notch's floor stays parallel to the member's line.
    corner_radius
        Radius of the inner corners of an opening or a notch. A notch whose radius is half its length
        ends in a half circle.
    turned
        Angle from the member's x to the long side of a slot or opening, rad: positive from x towards z for
        axis y (seen from the left, the far end goes up) and from x towards y for axis z. For axis y this is
        against the right-hand rule about member y.
    edge
        For a notch: the side it starts from, ``top``/``bottom`` (axis y) or ``left``/``right`` (axis z).
    """

    name: str
    group: str
    kind: CutKind
    axis: Literal["y", "z"]
    through: Through
    at: float
    offset: float
    length: float
    depth: float
    corner_radius: float = 0.0
    turned: float = 0.0
    edge: Literal["", "top", "bottom", "left", "right"] = ""


@dataclass(frozen=True, slots=True)
class EdgeRadius:
    """A radius on named edges.

    `edges`: ``top left``, ``top right``, ``bottom left``, ``bottom right`` (outer edges along the
    member: the outermost corner of the top or bottom side; a corner or toe radius there is replaced, and the
    radius lies in the plane of the section), ``start`` or ``end`` (rim of that end face), or the name of a
    cut or row (its two rims).
    """

    edges: str
    radius: float


@dataclass(frozen=True, slots=True)
class Patch:
    """A part of a face, between two stations (mm), over the full width of the face or part of it.

    `across` is the range of y (top, bottom) or z (left, right) in member axes from the line, mm.
    """

    name: str
    face: str
    start: float
    end: float
    across: tuple[float, float] | None = None


@dataclass(frozen=True, slots=True)
class Member:
    """A straight member.

    Attributes
    ----------
    start, end
        Ends of the declared line, global, mm.
    up
        Global direction towards which the section's depth points (made square to the line).
    roll
        Further turn about x, rad.
    line_at
        Point of the start section, drawn without `edge_radii` and cuts, that lies on the declared line:
        ``origin`` (see `Shape`),
        ``centroid``, ``top``, ``bottom``, ``left``, ``right`` (middle of that side of the bounding
        rectangle, in line with the section's origin), ``web`` (middle of the web's thickness, half the depth;
        I, channel and tee), or a corner of the bounding rectangle such as ``top left``.
    anchor
        What stays straight when the depth varies.
    """

    name: str
    start: Vector
    end: Vector
    up: Vector
    roll: float
    section: Section
    line_at: str = "centroid"
    anchor: Anchor = "centre"
    stations: tuple[Station, ...] = ()
    cuts: tuple[Cut, ...] = ()
    edge_radii: tuple[EdgeRadius, ...] = ()
    patches: tuple[Patch, ...] = ()


@dataclass(frozen=True, slots=True)
class Material:
    """E, yield and ultimate strength in MPa, density in t/mm^3, expansion in 1/K.

    `kind` says what the strength is: characteristic, minimum, typical or declared.
    """

    name: str
    E: float
    nu: float
    density: float
    expansion: float
    yield_strength: float | None
    ultimate: float | None
    kind: str
    source: str


Coupling = Literal["surface", "rigid", "average"]
"""How a region is held or loaded.

surface   point by point: every point is held alike; a force is an even traction.
rigid     the region moves as one rigid body; its six freedoms are held or loaded. A region that any support
          or load couples so is rigid in every case, whether the load acts in it or not.
average   the area-weighted mean displacement and rotation is held or loaded; the region may deform
          (a force-distributing coupling).
"""

Freedom = Literal["x", "y", "z", "rx", "ry", "rz", "normal"]


@dataclass(frozen=True, slots=True)
class Support:
    """Held freedoms of a region.

    `held` maps a freedom to its prescribed displacement (mm) or rotation (rad), mostly 0.
    ``normal`` (plane faces, `surface` only) is the direction of the outward normal; rotations are
    allowed for `rigid` and `average` only, about the region's area centroid. `axes`: which axes x, y, z
    mean. Prescribed values act in every case with factor 1.
    """

    name: str
    on: str
    held: Mapping[Freedom, float]
    coupling: Coupling = "surface"
    axes: Literal["global", "member"] = "global"


@dataclass(frozen=True, slots=True)
class RegionLoad:
    """Force (N) and moment (N mm) on a region, global components, moment about the region's centroid.

    `surface`: the force is an even traction and the moment a traction linear over the region's area.
    """

    name: str
    on: str
    force: Vector = (0.0, 0.0, 0.0)
    moment: Vector = (0.0, 0.0, 0.0)
    coupling: Coupling = "surface"


@dataclass(frozen=True, slots=True)
class Pressure:
    """Pressure (MPa) on a region, positive when it pushes into the part."""

    name: str
    on: str
    value: float


@dataclass(frozen=True, slots=True)
class BearingLoad:
    """Force (N, global) of a pin in a hole: radial pressure, cosine over the half that is pushed.

    The force must be square to the hole's axis.
    """

    name: str
    on: str
    force: Vector


@dataclass(frozen=True, slots=True)
class LineLoad:
    """Force per length (N/mm, global) on one face of a member between two stations (mm).

    Varies linearly from `first` to `last`. In the solid it is a traction on that stretch of the face,
    even across its width; in the beam it acts at the middle of that width.
    """

    name: str
    on: str
    start: float
    end: float
    first: Vector
    last: Vector


@dataclass(frozen=True, slots=True)
class RemotePoint:
    """A point off the part, coupled to a region, with force, moment, mass (t) and inertia (t mm^2).

    `inertia` is about the point: xx, yy, zz, xy, yz, zx (global), the entries of the tensor
    int (r.r 1 - r r) dm, so that xy is - int x y dm. Under acceleration (and
    self-weight) the mass gives a force at the point.
    """

    name: str
    on: str
    point: Vector
    coupling: Literal["rigid", "average"]
    force: Vector = (0.0, 0.0, 0.0)
    moment: Vector = (0.0, 0.0, 0.0)
    mass: float = 0.0
    inertia: tuple[float, float, float, float, float, float] = (0.0,) * 6


@dataclass(frozen=True, slots=True)
class BodyLoad:
    """Acceleration *of the part's weight*: force per mass (mm/s^2, global) on everything that has mass.

    Self-weight is the body load ``self_weight`` with the gravity vector; a part that is accelerated
    by `a` carries the body load ``-a`` (the spec's `acceleration` is turned round when it is read).
    """

    name: str
    force_per_mass: Vector


@dataclass(frozen=True, slots=True)
class TemperatureLoad:
    """Uniform temperature change, K."""

    name: str
    change: float


@dataclass(frozen=True, slots=True)
class StripLoad:
    """One position of a load that travels along a face: a force (N, global) on each of some short strips of it.

    Attributes
    ----------
    name
        The travelling load's name and the position: ``trolley@350``.
    on
        The face travelled on, ``rail.top``.
    centres
        Middle of each strip (one an axle), distance from the member's start, mm, in rising order.
    length
        Length of each strip along the member, mm.
    force
        Of each strip: an even traction over the strip and across the face's whole width (what cuts leave of it). In
        the beam it acts at the middle of that width, spread evenly over the strip's length. A strip that passes an
        end of the part acts with its whole force on what is left of it.
    """

    name: str
    on: str
    centres: tuple[float, ...]
    length: float
    force: Vector


Load = RegionLoad | Pressure | BearingLoad | LineLoad | RemotePoint | BodyLoad | TemperatureLoad | StripLoad


@dataclass(frozen=True, slots=True)
class Travel:
    """Which position of a travelling load a case stands for: the declared `case`, the `load`, and where its first axle
    is (`position`, mm from the member's start)."""

    case: str
    load: str
    position: float


@dataclass(frozen=True, slots=True)
class Case:
    """Load case: factor of each load by name. Loads that are not named do not act.

    The mass of a remote point acts with the factors of the body loads. A case with a travelling load is resolved into
    one case a position, named ``crossing@350``; `travel` then says which position of what.
    """

    name: str
    factors: Mapping[str, float]
    travel: Travel | None = None


@dataclass(frozen=True, slots=True)
class Vibration:
    """Natural frequencies are wanted: the lowest `modes` of them (of a free part: not counting its rigid motions).

    `free`: without the supports. Supports hold with the value zero; remote masses with their inertia belong to the
    part; loads do not act.
    """

    modes: int = 6
    free: bool = False


@dataclass(frozen=True, slots=True)
class Buckling:
    """Linear buckling factors of one case: the `modes` of least size.

    The loads named in `fixed` keep their value, the others of the case grow together: (K + G_fixed + factor G_varying)
    phi = 0 with G the geometric stiffness of the linear stress. A negative factor: under the varying loads reversed.
    """

    case: str
    fixed: tuple[str, ...] = ()
    modes: int = 3


@dataclass(frozen=True, slots=True)
class Place:
    """A named station of the member where section means are reported."""

    name: str
    member: str
    at: float


@dataclass(frozen=True, slots=True)
class Limit:
    """Largest (or, for a factor, least) allowed value of one quantity.

    Attributes
    ----------
    quantity
        deflection (size of the section's mean displacement, mm), displacement (one component of it),
        rotation (rad, size or component), relative_displacement (between `at` and `relative_to`),
        stress (MPa, see `basis`), yield_factor, mass (t), reaction (N, size of the force at a support),
        frequency (Hz, least of the natural frequencies), buckling_factor (least positive one).
    at
        Place, region or support; empty: anywhere.
    component
        ``x``, ``y``, ``z`` (global) or empty for the size.
    basis
        Strength limits. ``nominal``: longitudinal stress of the net section by the beam formula. ``edge``:
        local stress of the solid wherever it converges, and at held edges, where it does not, the stress of
        the outer fibres extrapolated to the edge. ``local``: local stress only, so that a part whose highest
        stress is at a place with no converged value cannot pass.
    cases
        Cases it is judged in; empty: all.
    """

    name: str
    quantity: str
    value: float
    at: str = ""
    relative_to: str = ""
    component: str = ""
    basis: Literal["nominal", "edge", "local"] = "edge"
    cases: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Part:
    """The resolved spec of one part, with the text it came from.

    Regions are named ``member.region``: ``start``, ``end``; outer faces ``top``, ``bottom``, ``left``,
    ``right`` (straight sides on the bounding rectangle; ``left`` and ``right`` of an I: the tips of both its
    flanges, whichever is wider); ``surface`` (round, tube); ``bore`` (tube, box); ``web_left``, ``web_right``
    (I, tee, channel: the sides of the web); each cut and each group of cuts; each patch. A line load makes a
    region named ``member.load:NAME``. A face is what cuts leave of it, without corner, edge and root radii and
    without the wall of a step. The region of a cut is its inner faces through every wall that it passes.
    """

    title: str
    material: Material
    members: tuple[Member, ...]
    supports: tuple[Support, ...]
    loads: tuple[Load, ...]
    cases: tuple[Case, ...]
    limits: tuple[Limit, ...] = ()
    places: tuple[Place, ...] = ()
    vibration: Vibration | None = None
    buckling: tuple[Buckling, ...] = ()
    accuracy: float = 0.02
    parameters: Mapping[str, float] = field(default_factory=dict)
    source_text: str = ""
