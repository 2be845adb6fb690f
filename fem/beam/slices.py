"""The beam model's sections where the CAD solid was cut: both sides of the slice check are made apart."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from numpy.typing import NDArray

from fem.beam.outlines import net_section
from fem.beam.section import outline_integrals
from geometry.part import Member


def sections_at(member: Member, stations: Iterable[float]) -> NDArray[np.float64]:
    """Net sections at stations (mm from the member's start).

    Returns
    -------
    (n, 7) x, A, yc, zc, Iyy, Izz, Iyz in mm: (y, z) in member axes from the declared line; second moments
    about the section's own centroid, ``Iyy`` = int z^2, ``Izz`` = int y^2, ``Iyz`` = int y z. Exact for the
    beam's own outlines (`outline_integrals`).
    """
    rows = []
    for x in stations:
        s = outline_integrals(net_section(member, float(x)))
        rows.append((float(x), s.area, s.yc, s.zc, s.Iyy, s.Izz, s.Iyz))
    return np.array(rows).reshape(-1, 7)
