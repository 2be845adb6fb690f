"""Finding the solid builder's faces again in the mesh kernel, by what they are and not by their order."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

_AREA = 1e-5
_PLACE = 1e-5
"""Relative to the area, and to the solid's extent."""

_BOX_RATIO = 10.0
"""Kernels pad the boxes of curved faces differently, so boxes only decide between faces of equal area and
centroid, and only when the best one fits this many times better than the next."""


class FaceMismatch(ValueError):
    """The kernel's faces are not those that the solid builder named."""


def match_faces(wanted: Sequence[Mapping[str, Any]], found: Sequence[Mapping[str, Any]], extent: float) -> list[int]:
    """Tag of the kernel's face for each wanted mark.

    Parameters
    ----------
    wanted
        Marks with ``area`` (mm^2), ``centroid`` (3 mm) and ``box`` (6 mm).
    found
        The kernel's faces: the same, with ``tag``.
    extent
        Size of the solid, mm; distances are judged against it.

    Raises
    ------
    FaceMismatch
        A face without a partner, or with two that cannot be told apart.
    """
    if len(wanted) != len(found):
        raise FaceMismatch(f"the solid has {len(wanted)} faces, the mesh kernel read {len(found)}")
    area = np.array([f["area"] for f in found])
    centroid = np.array([f["centroid"] for f in found])
    box = np.array([f["box"] for f in found])
    chosen: list[int] = []
    for number, mark in enumerate(wanted):
        fits = np.abs(area - mark["area"]) <= _AREA * mark["area"]
        fits &= np.abs(centroid - mark["centroid"]).max(axis=1) <= _PLACE * extent
        partners = np.flatnonzero(fits)
        if len(partners) > 1:
            partners = _by_box(partners, np.abs(box[partners] - mark["box"]).max(axis=1), extent)
        if len(partners) != 1:
            what = "no partner" if len(partners) == 0 else f"{len(partners)} partners that cannot be told apart"
            raise FaceMismatch(
                f"face {number} (area {mark['area']:.6g} mm^2, centroid {np.round(mark['centroid'], 4).tolist()})"
                f" has {what} among the mesh kernel's faces"
            )
        chosen.append(int(partners[0]))
    if len(set(chosen)) != len(chosen):
        raise FaceMismatch("two faces of the solid have the same partner among the mesh kernel's faces")
    return [int(found[i]["tag"]) for i in chosen]


def _by_box(partners: NDArray[np.int64], off: NDArray[np.float64], extent: float) -> NDArray[np.int64]:
    """The partner whose box fits by far the best, or all of them."""
    order = np.argsort(off)
    if off[order[0]] + 1e-6 * extent <= off[order[1]] / _BOX_RATIO:
        return partners[order[:1]]
    return partners
