"""What is written to VTU is read back whole, with its curved elements in VTK's order."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from geometry.problem import MeshError
from mesher import NamedMesh, read_vtu, write_vtu
from mesher.numbering import TET_EDGES


def test_round_trip_keeps_everything(tmp_path: Path, rod_mesh: NamedMesh) -> None:
    path = tmp_path / "rod.vtu"
    displacement, quality = rod_mesh.nodes.T * 1e-3, rod_mesh.quality
    write_vtu(path, rod_mesh, {"displacement": displacement}, {"quality": quality})
    back = read_vtu(path)
    assert [block.type for block in back.cells] == ["tetra10"]
    assert np.array_equal(back.points, rod_mesh.nodes.T)
    assert np.array_equal(back.cells[0].data, rod_mesh.tets.T)
    assert np.array_equal(back.point_data["displacement"], displacement)
    assert np.array_equal(back.cell_data["quality"][0], quality)


def test_another_reader_reads_the_same(tmp_path: Path, rod_mesh: NamedMesh) -> None:
    """VTK's own reader; a name with signs that XML reserves; a field of six components, and one of an odd length."""
    xml = pytest.importorskip("vtkmodules.vtkIOXML")
    support = pytest.importorskip("vtkmodules.util.numpy_support")
    path = tmp_path / "rod.vtu"
    rng = np.random.default_rng(1)
    count = rod_mesh.nodes.shape[1]
    fields = {'a < b & "c" stress': rng.random((count, 6)), "plain": rng.random(count)}
    write_vtu(path, rod_mesh, fields)
    reader = xml.vtkXMLUnstructuredGridReader()
    reader.SetFileName(str(path))
    reader.Update()
    grid = reader.GetOutput()
    assert (grid.GetNumberOfPoints(), grid.GetNumberOfCells()) == (rod_mesh.nodes.shape[1], rod_mesh.tets.shape[1])
    assert np.array_equal(support.vtk_to_numpy(grid.GetPoints().GetData()), rod_mesh.nodes.T)
    assert grid.GetCellType(0) == 24
    last = grid.GetCell(rod_mesh.tets.shape[1] - 1)
    assert [last.GetPointId(i) for i in range(10)] == rod_mesh.tets[:, -1].tolist()
    for name, values in fields.items():
        assert np.array_equal(support.vtk_to_numpy(grid.GetPointData().GetArray(name)), values)


def test_the_edges_are_in_vtks_order() -> None:
    vtk = pytest.importorskip("vtkmodules.vtkCommonDataModel")
    cell = vtk.vtkQuadraticTetra()
    for i in range(10):
        cell.GetPointIds().SetId(i, i)
    for number, (a, b) in enumerate(TET_EDGES):
        ids = cell.GetEdge(number).GetPointIds()
        assert {ids.GetId(0), ids.GetId(1)} == {a, b}
        assert ids.GetId(2) == 4 + number


def test_data_of_the_wrong_length_is_refused(tmp_path: Path, rod_mesh: NamedMesh) -> None:
    with pytest.raises(MeshError, match=r"'u': shape \(3,\); one row for each of the \d+ nodes"):
        write_vtu(tmp_path / "x.vtu", rod_mesh, {"u": np.zeros(3)})
    with pytest.raises(MeshError, match="cannot be written"):
        write_vtu(tmp_path / "missing" / "x.vtu", rod_mesh)


@pytest.mark.parametrize("content", ["", "no xml", "<VTKFile type='UnstructuredGrid'><UnstructuredGrid/></VTKFile>"])
def test_a_corrupt_file_raises_and_does_not_end_the_program(tmp_path: Path, content: str) -> None:
    path = tmp_path / "corrupt.vtu"
    path.write_text(content)
    with pytest.raises(MeshError, match="cannot be read"):
        read_vtu(path)
    with pytest.raises(MeshError, match="cannot be read"):
        read_vtu(tmp_path / "missing.vtu")
