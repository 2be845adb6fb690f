"""Local deformation of loaded faces: displacement relative to the member's sections."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from fem.solid.cut import Cut
from fem.solid.frame import member_frame
from fem.solid.model import SolidModel
from fem.solid.result import Denting
from fem.solid.sections import Motions
from fem.solid.shape import Array
from geometry.part import StripLoad


def denting(
    model: SolidModel, u: Array, sections: dict[str, dict[float, Cut]], motions: Motions
) -> Iterator[Denting]:
    """Largest displacement of each loaded region relative to the rigid motion of the section at each point's station.

    The sections' mean displacement and rotation are splined over the stations. Regions on no member are left out. Of a
    travelling load only the facets that its strips touch count.
    """
    mesh = model.mesh
    motion = {}
    for member in model.part.members:
        frame = member_frame(member)
        cuts = [cut for cut in sections[member.name].values() if cut.weights.size]
        rows = [np.concatenate(motions[member.name][cut.at], axis=1) for cut in cuts]
        at = np.array([cut.at for cut in cuts])
        centres = np.array([cut.centroid for cut in cuts])
        motion[member.name] = (frame, CubicSpline(at, np.array(rows)), CubicSpline(at, centres))
    known: dict[str, tuple[NDArray[np.int64], Array, Array]] = {}  # of each face: nodes, (k, c, 6), (k, 3)
    for load in model.part.loads:
        on = getattr(load, "on", "")
        name = on.partition(".")[0]
        if name not in motion or on not in mesh.facets:
            continue
        if on not in known:
            frame, spline, centre = motion[name]
            nodes = np.unique(mesh.facets[on])
            local = frame.local(mesh.nodes[:, nodes])
            at = np.clip(local[0], spline.x[0], spline.x[-1])
            known[on] = nodes, spline(at), (local.T - centre(at)) @ frame.axes
        nodes, values, arms = known[on]
        mine: slice | NDArray[np.intp] = slice(None)
        if isinstance(load, StripLoad):
            pressed = np.unique(np.concatenate([piece.facets for piece in model.loads[load.name].pieces], axis=1))
            mine = np.searchsorted(nodes, pressed)
        for k, case in enumerate(model.part.cases):
            if case.factors.get(load.name, 0.0):
                rigid = values[mine, k, :3] + np.cross(values[mine, k, 3:], arms[mine])
                off = np.linalg.norm(u[k][:, nodes[mine]].T - rigid, axis=1)
                yield Denting(case.name, on, float(off.max()))
