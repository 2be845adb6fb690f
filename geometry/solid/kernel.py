"""Small wrappers about the CAD kernel: what a face measures, what a solid must be, bytes in and out."""

from __future__ import annotations

import io
import re
from typing import Any

import numpy as np
from numpy.typing import NDArray
from OCP.Bnd import Bnd_Box
from OCP.BRep import BRep_Builder
from OCP.BRepBndLib import BRepBndLib
from OCP.BRepBuilderAPI import BRepBuilderAPI_Transform
from OCP.BRepCheck import BRepCheck_Analyzer
from OCP.BRepGProp import BRepGProp
from OCP.BRepTools import BRepTools
from OCP.gp import gp_Trsf
from OCP.GProp import GProp_GProps
from OCP.IFSelect import IFSelect_RetDone
from OCP.Interface import Interface_Static
from OCP.Message import Message
from OCP.STEPControl import STEPControl_AsIs, STEPControl_Writer
from OCP.TopAbs import TopAbs_EDGE, TopAbs_FACE, TopAbs_SOLID
from OCP.TopExp import TopExp
from OCP.TopoDS import TopoDS, TopoDS_Shape
from OCP.TopTools import TopTools_IndexedMapOfShape

from geometry.named_solid import FaceMark
from geometry.problem import SolidError
from geometry.solid.frame import Frame

Array = NDArray[np.float64]


def _listed(shape: TopoDS_Shape, kind: Any) -> list[Any]:
    found = TopTools_IndexedMapOfShape()
    TopExp.MapShapes_s(shape, kind, found)
    return [found.FindKey(i) for i in range(1, found.Extent() + 1)]


def faces_of(shape: TopoDS_Shape) -> list[Any]:
    """Faces of `shape`, each once, in the kernel's order."""
    return [TopoDS.Face_s(face) for face in _listed(shape, TopAbs_FACE)]


def edges_of(shape: TopoDS_Shape) -> list[Any]:
    """Edges of `shape`, each once, in the kernel's order."""
    return [TopoDS.Edge_s(edge) for edge in _listed(shape, TopAbs_EDGE)]


def solids_of(shape: TopoDS_Shape) -> list[Any]:
    """Solids in `shape`, each once."""
    return [TopoDS.Solid_s(solid) for solid in _listed(shape, TopAbs_SOLID)]


def volume_of(shape: TopoDS_Shape) -> tuple[float, Array]:
    """Volume (mm^3, signed) and centroid (3,) of a solid."""
    props = GProp_GProps()
    BRepGProp.VolumeProperties_s(shape, props)
    c = props.CentreOfMass()
    return props.Mass(), np.array([c.X(), c.Y(), c.Z()])


def area_of(shape: TopoDS_Shape) -> tuple[float, Array]:
    """Area (mm^2) and centroid (3,) of a face or of the surface of a solid."""
    props = GProp_GProps()
    BRepGProp.SurfaceProperties_s(shape, props)
    c = props.CentreOfMass()
    return props.Mass(), np.array([c.X(), c.Y(), c.Z()])


def length_of(edge: TopoDS_Shape) -> float:
    """Length of an edge, mm."""
    props = GProp_GProps()
    BRepGProp.LinearProperties_s(edge, props)
    return props.Mass()


def one_solid(shape: TopoDS_Shape, what: str, severed: str = "") -> Any:
    """The one valid solid with positive volume in `shape`.

    Raises
    ------
    SolidError
        `shape` is invalid, holds no solid or several (`severed` then says why), or its volume is not positive.
    """
    if shape is None or shape.IsNull():
        raise SolidError(f"{what}: the geometry kernel returned nothing.")
    solids = solids_of(shape)
    if len(solids) != 1:
        volumes = ", ".join(f"{volume_of(solid)[0]:.6g}" for solid in solids) or "none"
        reason = severed if severed and len(solids) > 1 else "one solid is needed"
        raise SolidError(f"{what}: {reason} ({len(solids)} solids, volumes mm^3: {volumes}).")
    solid = solids[0]
    if not BRepCheck_Analyzer(solid).IsValid():
        raise SolidError(f"{what}: the geometry kernel made an invalid solid.")
    volume, _ = volume_of(solid)
    if not volume > 0.0:
        raise SolidError(f"{what}: the solid is inside out (volume {volume:.6g} mm^3).")
    return solid


def placed(solid: Any, frame: Frame) -> Any:
    """`solid`, drawn in member axes, at its global place (geometry rewritten, order of faces kept)."""
    m, o = frame.axes.T, frame.origin
    trsf = gp_Trsf()
    trsf.SetValues(*(float(v) for row in np.column_stack([m, o]) for v in row))
    return TopoDS.Solid_s(BRepBuilderAPI_Transform(solid, trsf, True).Shape())


def face_mark(face: Any) -> FaceMark:
    """Fingerprint of a face."""
    area, c = area_of(face)
    box = Bnd_Box()
    BRepBndLib.AddOptimal_s(face, box, False, False)
    return FaceMark(area, (float(c[0]), float(c[1]), float(c[2])), box.Get())


def brep_bytes(shape: TopoDS_Shape) -> bytes:
    """`shape` as BREP text."""
    stream = io.BytesIO()
    BRepTools.Write_s(shape, stream)
    return stream.getvalue()


def from_brep(data: bytes) -> TopoDS_Shape:
    """The shape in BREP text."""
    shape = TopoDS_Shape()
    BRepTools.Read_s(shape, io.BytesIO(data), BRep_Builder())
    return shape


def step_bytes(shape: TopoDS_Shape, title: str) -> bytes:
    """`shape` as STEP text (mm) with time, author and running numbers taken out of its header.

    Raises
    ------
    SolidError
        The kernel could not write it.
    """
    printers = Message.DefaultMessenger_s().ChangePrinters()
    kept = list(printers)
    printers.Clear()  # the writer would talk to standard output
    try:
        return _step_text(shape, title)
    finally:
        for printer in kept:
            printers.Append(printer)


def _step_text(shape: TopoDS_Shape, title: str) -> bytes:
    writer = STEPControl_Writer()
    Interface_Static.SetCVal_s("write.step.unit", "MM")
    Interface_Static.SetCVal_s("write.step.product.name", "part")
    if writer.Transfer(shape, STEPControl_AsIs) != IFSelect_RetDone:
        raise SolidError("the geometry kernel could not turn the solid into STEP.")
    stream = io.BytesIO()
    if writer.WriteStream(stream) != IFSelect_RetDone:
        raise SolidError("the geometry kernel could not write STEP.")
    text = stream.getvalue().decode("latin-1")
    name = re.sub(r"[^ -~]", "?", title).replace("'", "''").replace("\\", "/") or "part"
    header = f"FILE_NAME('{name}','1970-01-01T00:00:00',(''),(''),'','','');"
    text = re.sub(r"PRODUCT\('part \d+','part \d+'", "PRODUCT('part','part'", text, count=1)
    text = re.sub(r"FILE_NAME\(.*?\);", lambda _: header, text, count=1, flags=re.S)
    return text.encode("latin-1")
