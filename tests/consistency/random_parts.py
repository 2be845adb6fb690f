"""Random specs as text, from a seed: every shape, way of varying, cut and orientation that the spec knows.

The text is made in two passes: the member without cuts is read first, so that cuts can be aimed at their walls.
Nothing here is checked twice: a spec that the reader refuses is simply a refused spec.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from geometry.part import Cut, Member, Part
from geometry.spec import part_from_text
from geometry.spec.checks.cuts import walls_of
from geometry.spec.checks.profile import dims_at, profile_of
from geometry.spec.resolve.member import AXIS_OF_WALL, WALLS

SHAPES = ("rectangle", "round", "tube", "box", "I", "channel", "angle", "tee", "outline")
LINES = ("origin", "centroid", "top", "bottom", "left", "right", "web", "top left", "top right", "bottom left",
         "bottom right")  # fmt: skip
FACES = {
    "rectangle": ("top", "bottom", "left", "right"),
    "round": ("surface",),
    "tube": ("surface", "bore"),
    "box": ("top", "bottom", "left", "right", "bore"),
    "I": ("top", "bottom", "left", "right", "web_left", "web_right"),
    "channel": ("top", "bottom", "left", "right", "web_left", "web_right"),
    "angle": ("top", "bottom", "left", "right"),
    "tee": ("top", "bottom", "left", "right", "web_left", "web_right"),
    "outline": ("bottom",),
}
"""Faces that each shape has."""


def toml(value: Any) -> str:
    """A value as TOML: numbers bare, texts quoted, lists and inline tables."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int | float):
        return repr(value)
    if isinstance(value, str):
        return f'"{value}"'
    if isinstance(value, dict):
        return "{ " + ", ".join(f"{k} = {toml(v)}" for k, v in value.items()) + " }"
    return "[" + ", ".join(map(toml, value)) + "]"


def document(spec: dict[str, Any]) -> str:
    """A whole spec as TOML, one inline table a key."""
    lines = []
    for key, value in spec.items():
        if isinstance(value, dict) and key in ("members", "supports", "loads", "cases", "places"):
            lines += [f"[{key}]", *(f"{name} = {toml(v)}" for name, v in value.items()), ""]
        else:
            lines.insert(0, f"{key} = {toml(value)}")
    return "\n".join(lines) + "\n"


def mm(value: float) -> str:
    """A length as the spec writes it, to a hundredth."""
    return f"{round(float(value), 2):g} mm"


class Maker:
    """Draws one spec after another from its generator."""

    def __init__(self, seed: int) -> None:
        self.rng = np.random.default_rng(seed)

    def pick(self, options: Any) -> Any:
        return options[int(self.rng.integers(len(options)))]

    def between(self, low: float, high: float) -> float:
        return float(self.rng.uniform(low, high))

    def chance(self, p: float) -> bool:
        return bool(self.rng.random() < p)

    def section(self, shape: str) -> dict[str, Any]:
        """Dimensions in mm of one section."""
        d, w = self.between(24, 60), self.between(24, 60)
        t = self.between(0.09, 0.16) * min(d, w)
        r = self.between(0.3, 1.2) * t
        match shape:
            case "rectangle":
                return {"depth": d, "width": w} | ({"corner_radius": 0.1 * min(d, w)} if self.chance(0.3) else {})
            case "round":
                return {"diameter": d}
            case "tube":
                return {"diameter": d, "wall": self.between(0.1, 0.2) * d}
            case "box":
                corner = {"corner_radius": self.between(0.5, 2.0) * t} if self.chance(0.5) else {}
                inner = {"inner_radius": 0.6 * t} if self.chance(0.3) else {}
                return {"depth": d, "width": w, "wall": t} | corner | inner
            case "I":
                unequal = {"bottom_width": self.between(0.6, 1.3) * w, "bottom_flange": 1.3 * t}
                other = unequal if self.chance(0.4) else {}
                root = {"root_radius": r} if self.chance(0.7) else {}
                return {"depth": d, "width": w, "web": t, "flange": self.between(1, 1.5) * t} | other | root
            case "channel" | "tee":
                root = {"root_radius": r} if self.chance(0.7) else {}
                return {"depth": d, "width": w, "web": t, "flange": self.between(1, 1.5) * t} | root
            case "angle":
                toe = {"toe_radius": 0.4 * t} if self.chance(0.4) else {}
                root = {"root_radius": r} if self.chance(0.7) else {}
                return {"depth": d, "width": w, "thickness": 1.2 * t} | root | toe
        raise ValueError(shape)

    def outline(self) -> dict[str, Any]:
        """A lopsided polygon with a rounded corner, sometimes with a round void."""
        d, w = self.between(24, 50), self.between(24, 50)
        corners = [[0, 0], [w, 0], [w, 0.5 * d, 3.0], [0.7 * w, d], [0.1 * w, 0.9 * d, 4.0]]
        shape: dict[str, Any] = {"shape": "outline", "outer": [[mm(v) for v in c] for c in corners]}
        if self.chance(0.5):
            shape["circles"] = [{"y": mm(0.45 * w), "z": mm(0.4 * d), "diameter": mm(0.3 * d)}]
        return shape

    def member(self, shape: str) -> tuple[dict[str, Any], float]:
        """A member without cuts, and its length in mm."""
        dims = {} if shape == "outline" else {k: round(v, 2) for k, v in self.section(shape).items()}
        size = max((dims.get(k, 0.0) for k in ("depth", "width", "diameter")), default=0.0) or 45.0
        length = round(self.between(5, 9) * size, 1)
        start = np.round(self.rng.uniform(-50, 50, 3), 1) if self.chance(0.7) else np.zeros(3)
        ways = ([1, 0, 0], [0, 1, 0], [0, 0, 1], [-1, 0, 0], [0, 0, -1], [2, -1, 2], [2, 3, 6])
        way = np.array(self.pick(ways), float)
        end = start + length * way / np.linalg.norm(way)
        member: dict[str, Any] = {
            "from": [f"{v:.10g} mm" for v in start],
            "to": [f"{v:.10g} mm" for v in end],
            "section": self.outline() if shape == "outline" else {"shape": shape} | {k: mm(v) for k, v in dims.items()},
            "line_at": self.pick([w for w in LINES if w != "web" or shape in ("I", "channel", "tee")]),
        }
        if self.chance(0.3):
            member["up"] = [round(float(v), 2) for v in self.rng.uniform(-1, 1, 3)]
        if self.chance(0.4):
            member["roll"] = f"{round(self.between(-180, 180), 1)} deg"
        if self.chance(0.4):
            member["anchor"] = self.pick(("top", "centre", "bottom"))
        if dims:
            self._vary(member, dims, length)
        outer = [e for e in ("top left", "top right", "bottom left", "bottom right") if self.chance(0.2)]
        walls = [dims[k] for k in ("web", "wall", "flange", "bottom_flange", "thickness") if k in dims]
        if outer and "corner_radius" not in dims and shape not in ("round", "tube", "outline"):
            radius = 0.3 * min(walls or [dims["depth"]])
            member["edge_radii"] = [{"edges": e, "radius": mm(radius)} for e in outer]
        return member, length

    def _vary(self, member: dict[str, Any], dims: dict[str, float], length: float) -> None:
        names = list(dims)

        def some(factor: float, least: int = 1) -> dict[str, str]:
            count = int(self.rng.integers(least, len(names) + 1))
            chosen = self.rng.choice(names, size=min(count, 3), replace=False)
            return {str(n): mm(dims[str(n)] * factor * self.between(0.93, 1.07)) for n in chosen}

        how = self.pick(("none", "none", "taper", "stations", "step", "step", "both"))
        stations: list[dict[str, Any]] = []
        if how in ("stations", "both"):
            at = np.sort(self.rng.uniform(0.15, 0.5, int(self.rng.integers(1, 3)))) * length
            stations += [{"at": mm(x)} | some(self.between(0.85, 1.15)) for x in at]
        if how in ("step", "both"):
            at = mm(self.between(0.55, 0.65) * length)
            first = some(1.0) if self.chance(0.6) else {}
            outer = [n for n in names if n in ("depth", "width", "diameter")]
            if self.chance(0.4):  # only outer sizes step: a fillet where walls step as well is another matter
                second = {n: mm(dims[n] * self.between(0.6, 0.75)) for n in outer[: int(self.rng.integers(1, 3))]}
                stations += [{"at": at}, {"at": at} | second | {"shoulder_fillet": "1 mm"}]
            else:
                stations += [{"at": at} | first, {"at": at} | some(self.between(0.75, 0.9))]
        if stations:
            member["stations"] = stations
        if how == "taper" or (how == "stations" and self.chance(0.5)):
            member["taper"] = some(self.between(0.65, 0.95))

    def cuts(self, member: dict[str, Any], part: Part, length: float) -> None:
        """Add up to three cuts, aimed at their walls, and up to two patches."""
        m = part.members[0]
        shape = m.section.shape
        places = np.linspace(0.2, 0.85, 4) * length
        for x in places[self.rng.permutation(4)[: int(self.rng.integers(0, 4))]]:
            kind = self.pick(("holes", "slots", "openings", "notches"))
            spec = self._notch(m, x) if kind == "notches" else self._cut(m, x, kind)
            if spec and not (kind == "notches" and shape in ("round", "tube", "outline")):
                member.setdefault(kind, []).append(spec)
        for k in range(int(self.rng.integers(0, 3))):
            a, b = np.sort(self.rng.uniform(0.05, 0.95, 2)) * length
            if b - a > 0.05 * length and shape != "outline":
                patch = {"face": self.pick(FACES[shape]), "from": mm(a), "to": mm(b)}
                member.setdefault("patches", {})[f"patch{k}"] = patch

    def _cut(self, m: Member, x: float, kind: str) -> dict[str, Any]:
        through = self.pick(WALLS[m.section.shape])
        axis = AXIS_OF_WALL.get(through) or self.pick(("y", "z"))
        if through == "all" and m.section.shape in ("I", "channel", "angle", "tee"):
            return {}
        cut = Cut("c", "c", "hole", axis, through, x, 0.0, 1.0, 1.0)
        try:
            rooms = [r for _, stretches in walls_of(profile_of(m), cut, dims_at(m, x)) for r in stretches[:1]]
        except KeyError:
            return {}
        low, high = max(r[0] for r in rooms), min(r[1] for r in rooms)
        room = high - low
        if room < 6.0:
            return {}
        size = self.between(0.25, 0.5) * room
        at = low + self.between(0.6, 1.4) * 0.5 * room if size < 0.4 * room else 0.5 * (low + high)
        spec: dict[str, Any] = {"through": through, "along": axis, "at": mm(x), "offset": mm(at)}
        if kind == "holes":
            row = {"count": 2, "pitch": mm(1.6 * size)} if self.chance(0.3) else {}
            return spec | {"diameter": mm(size)} | row
        turned = {"turned": f"{round(self.between(-60, 60), 1)} deg"} if self.chance(0.6) else {}
        if kind == "slots":
            return spec | {"length": mm(0.9 * size), "width": mm(0.5 * size)} | turned
        return spec | {"length": mm(0.9 * size), "height": mm(0.6 * size), "corner_radius": mm(0.12 * size)} | turned

    def _notch(self, m: Member, x: float) -> dict[str, Any]:
        edge = self.pick(("top", "bottom", "left", "right"))
        low_y, high_y, low_z, high_z = profile_of(m).box(dims_at(m, x))
        deep = self.between(0.08, 0.2) * (high_z - low_z if edge in ("top", "bottom") else high_y - low_y)
        long = 2.0 * deep if self.chance(0.4) else self.between(1.5, 3.0) * deep
        radius = 0.5 * long if long <= 2.0 * deep and self.chance(0.7) else self.between(0.1, 0.9) * min(long / 2, deep)
        radius = min(radius, deep)
        return {"edge": edge, "at": mm(x), "length": mm(2 * round(long / 2, 2)), "depth": mm(deep + 0.01),
                "corner_radius": mm(math.floor(radius * 100) / 100)}  # fmt: skip

    def geometry(self, shape: str | None = None) -> str:
        """A spec with a member, held at its start, pushed at its end."""
        return document(self.plain(shape))

    def plain(self, shape: str | None = None) -> dict[str, Any]:
        """The spec as a table: see `geometry`."""
        shape = shape or self.pick(SHAPES)
        member, length = self.member(shape)
        spec: dict[str, Any] = {
            "material": "S235",
            "members": {"m": member},
            "supports": {"s": {"on": "m.start", "hold": "all"}},
            "loads": {"f": {"on": "m.end", "force": ["10 N", "20 N", "-30 N"]}},
        }
        part = part_from_text(document(spec))
        self.cuts(member, part, length)
        return spec

    def whole(self, shape: str | None = None) -> dict[str, Any]:
        """A spec with supports and loads of every kind."""
        spec = self.plain(shape)
        member = spec["members"]["m"]
        m = part_from_text(document(spec)).members[0]
        shape, length = m.section.shape, math.dist(m.start, m.end)
        spec["accuracy"] = "7 %"
        spec["supports"] = self._supports(m)
        spec["loads"] = {}
        for k in range(int(self.rng.integers(2, 5))):
            self._load(spec, f"f{k}", m, member, length)
        names = list(spec["loads"])
        spec["cases"] = {"one": dict.fromkeys(names, 1.0), "weight": {"self_weight": 1.0}}
        if len(names) > 1:
            spec["cases"]["two"] = {n: round(self.between(-2, 2), 2) for n in names}
        spec["places"] = {"here": {"at": mm(0.37 * length)}}
        return spec

    def _supports(self, m: Member) -> dict[str, Any]:
        coupling = self.pick(("surface", "surface", "rigid", "average"))
        first: dict[str, Any] = {"on": "m.start", "hold": "all", "coupling": coupling}
        how = self.pick(("cantilever", "cantilever", "propped", "simple", "moved"))
        if how == "simple":
            held = ["x", "y", "z", "rx"]
            return {"a": {"on": "m.start", "hold": held, "coupling": "average", "axes": "member"},
                    "b": {"on": "m.end", "hold": ["y", "z"], "coupling": "average", "axes": "member"}}  # fmt: skip
        supports = {"a": first}
        if how == "propped":
            coupling = self.pick(("average", "rigid"))
            supports["b"] = {"on": "m.end", "hold": ["z"], "coupling": coupling, "axes": "member"}
        if how == "moved":
            supports["b"] = {"on": "m.end", "hold": {"y": "0.05 mm", "z": "-0.1 mm"}, "coupling": "average",
                             "axes": "member"}  # fmt: skip
        patches = [p for p in m.patches if p.face in ("top", "bottom", "left", "right")]
        if how == "cantilever" and patches and self.chance(0.3) and not m.stations:
            supports["b"] = {"on": f"m.{patches[0].name}", "hold": ["normal"]}
        return supports

    def _vector(self, size: float, unit: str) -> list[str]:
        return [f"{round(float(v), 1)} {unit}" for v in self.rng.normal(0, size, 3)]

    def _load(self, spec: dict[str, Any], name: str, m: Member, member: dict[str, Any], length: float) -> None:
        loads, shape = spec["loads"], m.section.shape
        regions = ["m.end", "m.end", *(f"m.{p.name}" for p in m.patches), *(f"m.{c.group}" for c in m.cuts)]
        kind = self.pick(("force", "moment", "torque", "pressure", "bearing", "line", "line", "remote", "mass",
                          "acceleration", "temperature"))  # fmt: skip
        on = self.pick(regions)
        coupling = self.pick(("surface", "rigid", "average"))
        if kind == "force":
            loads[name] = {"on": on, "force": self._vector(100, "N"), "coupling": coupling}
        elif kind == "moment":
            loads[name] = {"on": "m.end", "moment": self._vector(4, "N m"), "coupling": coupling}
        elif kind == "torque":
            loads[name] = {"on": "m.end", "torque": "5 N m", "coupling": coupling}
        elif kind == "pressure":
            face = self.pick(FACES[shape])
            loads[name] = {"on": self.pick([f"m.{face}", *(f"m.{p.name}" for p in m.patches)]), "pressure": "0.03 MPa"}
        elif kind == "bearing":
            holes = [c for c in m.cuts if c.kind == "hole"]
            if holes:
                from fem.beam.axes import member_axes  # global components of a force square to the hole

                axes = member_axes(m)[0]
                force = 80.0 * axes[0] + 60.0 * axes[2 if holes[0].axis == "y" else 1]
                loads[name] = {"on": f"m.{holes[0].name}", "bearing": [f"{v:.12g} N" for v in force]}
        elif kind == "line":
            a, b = np.sort(self.rng.uniform(0.05, 0.95, 2)) * length
            load = {"on": f"m.{self.pick(FACES[shape])}", "force_per_length": self._vector(0.3, "N/mm")}
            more = {"force_per_length_end": self._vector(0.3, "N/mm")} if self.chance(0.5) else {}
            loads[name] = load | more | {"from": mm(a), "to": mm(b)}
        elif kind in ("remote", "mass"):
            end = np.array(m.end) + self.rng.uniform(-40, 40, 3)
            load = {"on": "m.end", "point": [mm(v) for v in end], "coupling": self.pick(("rigid", "average"))}
            own: dict[str, Any] = {"mass": "3 kg"}
            if kind == "remote":
                own = {"force": self._vector(60, "N"), "moment": self._vector(2, "N m")}
            loads[name] = load | own
        elif kind == "acceleration":
            loads[name] = {"acceleration": self._vector(20, "m/s^2")}
        elif kind == "temperature":
            loads[name] = {"temperature_change": "40 K"}
        if not loads:
            loads[name] = {"on": "m.end", "force": self._vector(100, "N")}
