"""Studies made from a formula: an I-arm whose deflection, stress and mass are known without any model."""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable, Mapping, Sequence
from typing import Any

import numpy as np
from scipy.stats import qmc

from studies.report.study.data import Axis, LeftOut, Row, StudyData
from studies.vary.outcome import Held, Kept, Outcome

AXES = (Axis("root_depth", "mm"), Axis("tip_depth", "mm"), Axis("web", "mm"))
REACH, FORCE, E, DENSITY = 360.0, 180.0, 70000.0, 2.7e-9


def arm(root: float, tip: float, web: float, width: float = 30.0, flange: float = 5.0) -> dict[str, float]:
    """Mass (t), tip deflection (mm) and root stress (MPa) of a tapered I-arm by integration along it."""
    x = (np.arange(200) + 0.5) / 200 * REACH
    depth = root + (tip - root) * x / REACH
    inner = depth - 2 * flange
    inertia = (width * depth**3 - (width - web) * inner**3) / 12
    area = 2 * width * flange + web * inner
    moment = FORCE * (REACH - x)
    return {"mass": DENSITY * float(area.sum()) * REACH / 200,
            "deflection": float((moment * (REACH - x) / (E * inertia)).sum()) * REACH / 200,
            "stress": float((moment * depth / 2 / inertia).max())}


def outcome(key: str, found: Mapping[str, float], limits: Mapping[str, float] | None = None, **more: Any) -> Outcome:
    """A finished variant with these figures; a limit of `limits` is held against the figure of its name."""
    units = {"mass": "t", "deflection": "mm", "stress": "MPa", "frequency": "Hz", "cost": "1"}
    figures = {name: Kept(value, 0.98 * value, units.get(name, "1"), "explained") for name, value in found.items()}
    held = []
    for name, given in (limits or {}).items():
        value = found[name]
        margin = value / given - 1 if name == "frequency" else 1 - value / given
        held.append(Held(name, name if name != "stress" else "stress (established basis)", given, value,
                         units.get(name, "1"), "met" if margin >= 0 else "missed", margin))
    settings: dict[str, Any] = {"judgement": "explained", "figures": figures, "limits": tuple(held),
                                "unknowns": 61234, "seconds": {"solve": 1.2, "wall": 2.1}, **more}
    settings.setdefault("fine", settings["judgement"] != "suspicious" and all(h.verdict == "met" for h in held))
    return Outcome(key, "finished", **settings)


def row(number: int, point: Mapping[str, float], result: Outcome | None, aim: str = "mass", **more: Any) -> Row:
    """A row whose values are lengths."""
    value = result.figures[aim].solid if result is not None and aim in result.figures else None
    return Row(number, {name: f"{x:.6g} mm" for name, x in point.items()}, dict(point), result, value, **more)


LIMITS = {"deflection": 0.21, "stress": 7.6}


def grid(limits: Mapping[str, float] | None = None, steps: Sequence[Sequence[float]] = (
        (48.0, 54.0, 60.0, 66.0, 72.0), (26.0, 32.0, 38.0), (4.0, 5.0, 6.0, 8.0)), spoil: bool = True) -> StudyData:
    """Sixty variants, two of which failed and three of which are suspicious."""
    limits = LIMITS if limits is None else limits
    rows = []
    for number, values in enumerate(itertools.product(*steps), start=1):
        point = dict(zip(("root_depth", "tip_depth", "web"), values, strict=True))
        found = arm(*values)
        more: dict[str, Any] = {}
        if spoil and number in (7, 21, 40):
            more = {"judgement": "suspicious", "suspicions": (
                f"displacement z at arm.end: remainder {0.01 * number:.3g} mm, allowed 0.004 mm",)}
        result = outcome(f"{number:064d}", found, limits, **more)
        if spoil and number in (12, 33):
            result = Outcome(f"{number:064d}", "failed", stage="mesh",
                             reason=f"meshing took longer than {300 + number} s and was ended")
        rows.append(row(number, point, result))
    return StudyData("Camera arm: which depth and web", "camera_arm_plan.toml", "camera_arm_plan.study", "grid", AXES,
                     tuple(rows), started="2026-12-01 22:04", written="2026-12-02 07:31", seconds=27000.0,
                     left_out=(LeftOut("constraint slope: tip_depth <= root_depth - 10 mm does not hold", 4, (61, 62)),)
                     if spoil else (), versions={"haunch": "0.1.0"})


def sampled(number: int, function: Callable[..., Mapping[str, float]] = arm, limits: Mapping[str, float] | None = None,
            seed: int = 1) -> StudyData:
    """A Latin hypercube of `number` points."""
    low, high = np.array([48.0, 26.0, 4.0]), np.array([72.0, 38.0, 8.0])
    points = low + (high - low) * qmc.LatinHypercube(3, rng=seed).random(number)
    rows = []
    for i, values in enumerate(points.tolist(), start=1):
        point = dict(zip(("root_depth", "tip_depth", "web"), values, strict=True))
        rows.append(row(i, point, outcome(f"{i:064d}", function(*values), LIMITS if limits is None else limits)))
    return StudyData("A sample", "sample.toml", "sample.study", "latin hypercube", AXES, tuple(rows))


def additive(a: float, b: float, c: float) -> dict[str, float]:
    """mass = 3 a' + 2 b' + c' with a', b', c' from 0 to 1: its variance shares are 9/14, 4/14, 1/14."""
    return {"mass": 10 + 3 * (a - 48) / 24 + 2 * (b - 26) / 12 + (c - 4) / 4, "deflection": 1.0}


def ishigami(a: float, b: float, c: float) -> dict[str, float]:
    """T. Ishigami, T. Homma (1990) with 7 and 0.1: first-order indices 0.3139, 0.4424, 0."""
    x, y, z = (math.pi * (2 * t - 1) for t in ((a - 48) / 24, (b - 26) / 12, (c - 4) / 4))
    return {"mass": math.sin(x) + 7 * math.sin(y) ** 2 + 0.1 * z**4 * math.sin(x), "deflection": 1.0}


def hostile() -> StudyData:
    """Names, values and reasons that would do harm if a page took them for its own; an aim that is a formula."""
    evil = "<script>document.body.dataset.harmed='yes'</script>"
    axes = (Axis("web"), Axis(f"hold {evil}", numeric=False), Axis("a \"b' & `${1}` {{ 7 * 7 }}", "mm"))
    words = ["all", ["x", "y"], f"{evil}", "</script><img src=x onerror=document.body.dataset.harmed=1>"]
    rows = []
    for number in range(1, 17):
        values = {"web": number % 4 + 1.0, axes[2].name: float(number)}
        found = {"mass": 1e-3 * number, "deflection": 1.0 / number, f"displacement_z@{evil}": -0.1 * number}
        more: dict[str, Any] = {} if number % 5 else {"judgement": "suspicious",
                                                      "suspicions": (f"{evil}: solid 1, beam 2",)}
        result = outcome(str(number), found, {"deflection": 0.4}, cautions=(f"mind {evil}",), **more)
        if number == 11:
            result = Outcome("11", "failed", stage=evil, reason=f"{evil} \u2028 </script> ]]> -->")
        rows.append(Row(number, {**values, axes[1].name: words[number % 4]}, values, result,
                        result.figures["mass"].solid and 2.5 * number if result.figures else None,
                        run="javascript:document.body.dataset.harmed=1//" if number == 3 else ""))
    return StudyData(f"{evil} & co", f"{evil}.toml", "it's \"here\".study", "grid", axes, tuple(rows),
                     aim=f"2.5 * mass / (1 kg) + {evil}", aim_unit="1", left_out=(LeftOut(evil, 2, (17,)),),
                     tolerances={evil: evil}, notes=(evil,))
