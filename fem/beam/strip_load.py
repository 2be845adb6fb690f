"""A load that travels along a face, at one position: forces on short strips of the face (`StripLoad`)."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.beam.faces import FACES
from fem.beam.mesh import BeamMesh
from fem.beam.regions import linear_load
from geometry.part import StripLoad
from geometry.problem import RunError

Array = NDArray[np.float64]


def strip_forces(mesh: BeamMesh, load: StripLoad) -> tuple[NDArray[np.int64], Array]:
    """Loaded lengths (k,) and the load on them (k, 12), member axes, see `linear_load`.

    The force of each strip is even over the strip's length (over what the ends of the part leave of it; where cuts
    take the face's whole width, over the rest) and acts at the middle of the face's width at each station.

    Raises
    ------
    RunError
        Stage ``beam``: no such face, or nothing of it is left under a strip.
    """
    member, _, face = load.on.partition(".")
    if member != mesh.member.name or face not in FACES:
        raise RunError("beam", f"load {load.name}: {load.on} is no face of member {mesh.member.name} that a load can "
                       f"travel on ({', '.join(FACES)})")
    h = np.diff(mesh.x)
    middle = 0.5 * (mesh.x[:-1] + mesh.x[1:])
    gauss = mesh.gauss.reshape(-1, 2)
    force = mesh.axes @ load.force
    c = np.zeros((len(h), 2, 6))
    for centre in load.centres:
        under = np.flatnonzero(np.abs(middle - centre) < 0.5 * load.length)
        arms = np.array([mesh.face_middle(face, float(x), int(e)) for e in under for x in gauss[e]]).reshape(-1, 2, 3)
        there = np.isfinite(arms).all(axis=(1, 2))
        under, arms = under[there], arms[there]
        left = float(h[under].sum())
        if left <= 0.0:
            raise RunError("beam", f"load {load.name}: nothing of {load.on} is left under the strip at "
                           f"x = {centre:.6g} mm; move it")
        q = force / left
        c[under] += np.concatenate([np.broadcast_to(q, arms.shape), np.cross(arms, q)], axis=2)
    loaded = np.flatnonzero(np.abs(c).any(axis=(1, 2)))
    return loaded, linear_load(c[loaded], h[loaded])
