"""The outer surface of a mesh, lit and drawn on a canvas."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from geometry.part import Part
from mesher.named_mesh import NamedMesh
from studies.report.raster import Camera, Canvas, Floats, Ints

QUARTERS = np.array([[0, 3, 5], [3, 1, 4], [5, 4, 2], [3, 4, 5]])
"""The four plane triangles of a 6-node triangle (corners 0 1 2, mid-edge nodes 3 = 01, 4 = 12, 5 = 02)."""

EDGES = np.array([[0, 3], [3, 1], [1, 4], [4, 2], [2, 5], [5, 0]])
"""Half edges of a 6-node triangle."""

LIGHT = np.array([-0.35, 0.55, -0.76])
"""Direction to the light in picture axes (right, up, away from the eye)."""

GREY = np.array([0.80, 0.81, 0.83])
INK = (0.10, 0.10, 0.12, 1.0)


@dataclass(frozen=True, slots=True)
class Surface:
    """Plane triangles of the boundary, four to each curved one.

    Attributes
    ----------
    triangles
        (t, 3) node indices, outward oriented.
    facet
        (t,) boundary facet that each came from.
    outline, lines
        (s, 2) half edges between two CAD faces, and (m, 2) half edges of all facets.
    face
        (t,) CAD face of each triangle.
    """

    triangles: Ints
    facet: Ints
    face: Ints
    outline: Ints
    lines: Ints

    @classmethod
    def of(cls, mesh: NamedMesh) -> Surface:
        """The boundary of `mesh`."""
        boundary, face = mesh.boundary, mesh.face_index
        count = boundary.shape[1]
        triangles = boundary[QUARTERS].transpose(2, 0, 1).reshape(-1, 3)
        facet = np.repeat(np.arange(count), 4)
        halves = np.sort(boundary[EDGES].transpose(2, 0, 1).reshape(-1, 2), axis=1)
        lines, inverse = np.unique(halves, axis=0, return_inverse=True)
        of_half = np.repeat(face, len(EDGES))
        low, high = np.full(len(lines), np.iinfo(np.int64).max), np.full(len(lines), -1)
        np.minimum.at(low, inverse.ravel(), of_half)
        np.maximum.at(high, inverse.ravel(), of_half)
        return cls(triangles, facet, face[facet], lines[low != high], lines)

    def normals(self, nodes: Floats) -> Floats:
        """(t, 3, 3) unit normals at the corners, smooth within a CAD face; `nodes` is (n, 3)."""
        a, b, c = (nodes[self.triangles[:, k]] for k in range(3))
        flat = np.cross(b - a, c - a)
        key = (self.triangles * (int(self.face.max()) + 1) + self.face[:, None]).ravel()
        _, inverse = np.unique(key, return_inverse=True)
        total = np.zeros((int(inverse.max()) + 1, 3))
        np.add.at(total, inverse.ravel(), np.repeat(flat, 3, axis=0))
        total /= np.maximum(np.linalg.norm(total, axis=1, keepdims=True), 1e-30)
        return total[inverse.ravel()].reshape(-1, 3, 3)


def facets_in(mesh: NamedMesh, region: str) -> NDArray[np.bool_]:
    """(b,) which boundary facets belong to `region`."""
    if region not in mesh.facets:
        return np.zeros(mesh.boundary.shape[1], dtype=bool)
    stride = mesh.nodes.shape[1] + 1
    ours, theirs = np.sort(mesh.boundary[:3], axis=0), np.sort(mesh.facets[region][:3], axis=0)

    def key(corners: Ints) -> Ints:
        return (corners[0] * stride + corners[1]) * stride + corners[2]

    return np.isin(key(ours), key(theirs))


def view_of(part: Part, below: bool = False) -> Camera:
    """A camera that shows the first member from left to right, from above in front (or below, from behind)."""
    member = part.members[0]
    along = np.subtract(member.end, member.start)
    along = along / np.linalg.norm(along)
    up = np.array([0.0, 0.0, 1.0])
    if abs(along @ up) > 0.9:
        eye = np.array([0.75, 0.9, -0.35]) if below else np.array([0.6, -1.0, 0.4])
        return Camera.towards(eye, up)
    aside = np.cross(up, along)
    aside /= np.linalg.norm(aside)
    flat = np.cross(aside, up)
    eye = 0.38 * flat - 1.0 * aside + 0.5 * up
    if below:
        eye = -0.38 * flat + 1.0 * aside - 0.5 * up
    return Camera.towards(eye, up)


def draw(mesh: NamedMesh, surface: Surface, nodes: Floats, camera: Camera, canvas: Canvas,
         colours: Floats | None = None, by_facet: Floats | None = None) -> None:
    """Draw the lit surface.

    Parameters
    ----------
    nodes
        (n, 3) places of the nodes (deflected or not), mm.
    colours
        (n, 3) RGB of each node, interpolated; or None.
    by_facet
        (b, 3) RGB of each boundary facet; or None. Without both, plain grey.
    """
    flat = camera.project(nodes)
    normals = surface.normals(nodes) @ camera.axes.T
    lit = np.clip(normals @ (LIGHT / np.linalg.norm(LIGHT)), -1.0, 1.0)
    shade = 0.62 + 0.38 * np.clip(0.5 + 0.62 * lit, 0.0, 1.0)
    if colours is not None:
        corner = colours[surface.triangles]
        shade = 0.5 + 0.5 * shade  # keep the hue readable against the colour bar
    elif by_facet is not None:
        corner = np.repeat(by_facet[surface.facet][:, None, :], 3, axis=1)
    else:
        corner = np.broadcast_to(GREY, (*surface.triangles.shape, 3))
    facing = normals[:, :, 2].mean(axis=1) < 0.15  # leave out what looks away
    corners = flat[surface.triangles]
    image = canvas.draw_triangles(corners[facing], (corner * shade[:, :, None])[facing])
    drawn = ~np.isnan(image[:, :, 0])
    canvas.colour[drawn, :3] = np.clip(image[drawn], 0.0, 1.0)
    canvas.colour[drawn, 3] = 1.0


def draw_edges(edges: Ints, nodes: Floats, camera: Camera, canvas: Canvas,
               colour: tuple[float, float, float, float] = INK, thick: int = 1, hidden: bool = False) -> None:
    """Draw node pairs `edges` (s, 2); behind the surface too when `hidden`."""
    flat = camera.project(nodes)
    bias = np.inf if hidden else 2.5 * canvas.pixel
    canvas.draw_segments(flat[edges], colour, bias, thick)
