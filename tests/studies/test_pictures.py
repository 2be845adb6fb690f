"""The renderer and the tables: what is in front is seen, what a table shows is what the result holds."""

from __future__ import annotations

import dataclasses
from pathlib import Path
from types import ModuleType

import numpy as np
import pytest

from studies.report.diagrams import stations_of
from studies.report.frame import round_number
from studies.report.pictures import file_ending
from studies.report.raster import Camera, Canvas
from studies.report.scene import Surface, facets_in, view_of
from studies.report.tables import headlines, readable, suspicious, tallies, verdict


def canvas_over(width: float, height: float, pixels: int) -> Canvas:
    return Canvas.around(np.array([[0.0, 0.0], [width, height]]), pixels, margin=0.0)


def test_a_triangle_covers_its_area_and_interpolates_linearly() -> None:
    """Covered pixels against the exact area; a linear field must come out linear at every pixel."""
    canvas = canvas_over(100.0, 50.0, 1000)
    corners = np.array([[[10.0, 5.0, 0.0], [90.0, 10.0, 0.0], [40.0, 45.0, 0.0]]])
    image = canvas.draw_triangles(corners, corners[:, :, :2])
    seen = ~np.isnan(image[:, :, 0])
    exact = 0.5 * abs(80 * 40 - 30 * 5)
    assert seen.sum() * canvas.pixel**2 == pytest.approx(exact, rel=2e-3)
    rows, columns = np.nonzero(seen)
    assert np.abs(image[rows, columns, 0] - (columns + 0.5) * canvas.pixel).max() < 1e-3
    assert np.abs(image[rows, columns, 1] - (rows + 0.5) * canvas.pixel).max() < 1e-3


@pytest.mark.parametrize("order", [(0, 1), (1, 0)])
def test_the_nearer_triangle_hides_the_farther_whatever_the_order(order: tuple[int, int]) -> None:
    canvas = canvas_over(10.0, 10.0, 100)
    base = np.array([[1.0, 1.0, 0.0], [9.0, 1.0, 0.0], [5.0, 9.0, 0.0]])
    stack = np.array([base, base + [0.0, 0.0, 2.0]])[list(order)]
    tone = np.array([[[1.0]] * 3, [[2.0]] * 3])[list(order)]
    image = canvas.draw_triangles(stack, tone)
    assert np.unique(image[~np.isnan(image)]) == pytest.approx(1.0)


def test_crossing_triangles_are_split_where_they_cross() -> None:
    canvas = canvas_over(10.0, 10.0, 200)
    flat = np.array([[0.0, 0.0, 5.0], [10.0, 0.0, 5.0], [10.0, 10.0, 5.0]])
    tilted = np.array([[0.0, 0.0, 0.0], [10.0, 0.0, 10.0], [10.0, 10.0, 10.0]])
    image = canvas.draw_triangles(np.array([flat, tilted]), np.array([[[1.0]] * 3, [[2.0]] * 3]))[:, :, 0]
    columns = (np.arange(image.shape[1]) + 0.5) * canvas.pixel
    row = image[4]
    assert set(row[(columns < 4.9) & ~np.isnan(row)]) == {2.0} and set(row[columns > 5.1]) == {1.0}


def test_a_line_behind_the_surface_is_not_drawn() -> None:
    canvas = canvas_over(10.0, 10.0, 100)
    canvas.draw_triangles(np.array([[[0.0, 0.0, 0.0], [10.0, 0.0, 0.0], [10.0, 10.0, 0.0]]]), np.ones((1, 3, 1)))
    ends = np.array([[[0.0, 2.0, 1.0], [10.0, 2.0, 1.0]]])
    canvas.draw_segments(ends, (1.0, 0.0, 0.0, 1.0), bias=0.1)
    drawn = np.flatnonzero(canvas.colour[:, :, 3].any(axis=0)) * canvas.pixel
    assert drawn.min() < 0.2 and drawn.max() == pytest.approx(2.0, abs=0.25)  # only where no surface is in front


def test_the_camera_is_right_handed_and_shows_up_as_up() -> None:
    camera = Camera.towards(np.array([0.4, -1.0, 0.5]), np.array([0.0, 0.0, 1.0]))
    right, up, away = camera.axes
    assert np.cross(right, up) == pytest.approx(-away) and camera.axes @ camera.axes.T == pytest.approx(np.eye(3))
    assert right[2] == pytest.approx(0.0) and up[2] > 0 and right[0] > 0


@pytest.mark.parametrize("end", [(200.0, 0.0, 0.0), (-200.0, 0.0, 0.0), (0.0, 150.0, 30.0), (0.0, 0.0, 200.0)])
def test_every_view_shows_start_left_of_end_or_below_it(helpers: ModuleType, end: tuple[float, float, float]) -> None:
    part = helpers.make_part()
    member = dataclasses.replace(part.members[0], end=end)
    flat = view_of(dataclasses.replace(part, members=(member,))).project(np.array([member.start, member.end]))
    upright = end[:2] == (0.0, 0.0)
    assert flat[1, 1] > flat[0, 1] if upright else flat[1, 0] > flat[0, 0]


def test_the_surface_is_the_boundary(helpers: ModuleType) -> None:
    """Area and outward normals of the plane triangles against the block; the outline is its twelve edges."""
    mesh = helpers.make_mesh()
    surface, nodes = Surface.of(mesh), mesh.nodes.T
    a, b, c = (nodes[surface.triangles[:, k]] for k in range(3))
    normal = np.cross(b - a, c - a) / 2
    assert np.linalg.norm(normal, axis=1).sum() == pytest.approx(sum(mesh.region_area.values()))
    assert np.einsum("tk,tk->", a, normal) / 3 == pytest.approx(mesh.volume)
    edges = np.linalg.norm(np.diff(nodes[surface.outline], axis=1), axis=-1).sum()
    assert edges == pytest.approx(4 * (helpers.L + helpers.WIDTH + helpers.DEPTH))
    assert surface.normals(nodes).reshape(-1, 3)[:, 0].max() == pytest.approx(1.0)
    top = facets_in(mesh, "arm.top")
    assert top.sum() == mesh.facets["arm.top"].shape[1] and set(mesh.face_index[top]) == {5}
    assert not facets_in(mesh, "arm.nothing").any()


def test_stations_come_in_order(helpers: ModuleType) -> None:
    figures = helpers.fabricated_figures(helpers.make_part())
    x, value = stations_of(figures[::-1], "carrying", "arm", "displacement", "z")
    assert x == pytest.approx(np.linspace(0, helpers.L, 21)) and value[-1] == pytest.approx(-0.2)


def test_numbers_are_written_with_their_units() -> None:
    assert readable(12345.0, "N mm") == "12.35 N m" and readable(5e-3, "t") == "5 kg" and readable(1.5, "1") == "1.5"
    assert readable(2e-3, "rad") == "2 mrad" and readable(None, "mm") == "-"
    assert readable(-0.12345, "mm") == "-0.1235 mm"
    assert [round_number(v) for v in (1.0, 1.9, 2.0, 49.0, 0.7)] == [1.0, 1.0, 2.0, 20.0, 0.5]


def test_file_names_of_cases_are_plain_and_told_apart() -> None:
    assert file_ending(0, "carrying") == "carrying" and file_ending(1, "a/b") == "a_b-2" != file_ending(2, "a b")


def test_tables_pick_the_largest_and_the_worst(helpers: ModuleType, tmp_path: Path) -> None:
    import studies.check.run as run
    from studies.check.stages import Clock

    models = helpers.make_models()
    result = run.make_result(models, helpers.make_judgement(models), "arm.toml", "t", Clock())
    shown = {(pair.key.quantity, pair.key.component): pair.key.place for pair in headlines(result, "carrying")}
    assert shown[("section_moment", "My")] == "arm@0" and ("section_force", "N") not in shown
    assert shown[("displacement", "z")] == "arm.end" and shown[("nominal_stress", "xx@top")] == "arm@0"
    rows = {row.quantity: row for row in tallies(result, "carrying")}
    assert rows["section_moment"].count == 63 and rows["section_moment"].word == "agrees"
    worse = [dataclasses.replace(pair, judgement="suspicious", difference=pair.band * (2 + i), look_at="x")
             for i, pair in enumerate(result.pairs[:3])]
    bad = dataclasses.replace(result, pairs=(*worse, *result.pairs[3:]))
    assert suspicious(bad) == worse[::-1] and "3 are suspicious" in verdict(bad)
    assert next(row for row in tallies(bad, "carrying") if row.quantity == "displacement").worst == worse[-1]


def test_the_summary_tells_signed_causes_from_allowances(helpers: ModuleType) -> None:
    import studies.check.run as run
    from studies.check.result import Cause, Reason
    from studies.check.stages import Clock
    from studies.report.summary import summary

    models = helpers.make_models()
    result = run.make_result(models, helpers.make_judgement(models), "arm.toml", "t", Clock())
    at = next(i for i, pair in enumerate(result.pairs) if pair.key.place == "arm.end")
    given = result.pairs[at]
    pair = dataclasses.replace(given, causes=(Cause("the hole", 0.0125),), judgement="explained",
                               reasons=(Reason("mesh", 0.01 * given.scale),))
    text = summary(dataclasses.replace(result, pairs=(*result.pairs[:at], pair, *result.pairs[at + 1:])))
    row = next(line for line in text.splitlines() if line.startswith("| displacement z at arm.end"))
    assert "the hole (0.0125 mm)" in row and "~ explained" in row and "mesh" not in row
    assert "- displacement: mesh 1 %" in text.splitlines()


def test_close_peak_places_share_a_label_and_hidden_ones_have_none(helpers: ModuleType) -> None:
    from studies.report.fields import _labels
    from studies.report.scene import draw

    mesh, camera = helpers.make_mesh(), view_of(helpers.make_part())
    flat = camera.project(mesh.nodes.T)
    canvas = Canvas.around(flat, 400)
    draw(mesh, Surface.of(mesh), mesh.nodes.T, camera, canvas)
    front, beside, far, behind = [100.0, -10.0, 0.0], [103.0, -10.0, 1.0], [20.0, -10.0, 0.0], [100.0, 10.0, 0.0]
    assert [text for _, text in _labels(canvas, camera.project(np.array([front, behind, beside, far])))] == ["1 3", "4"]
