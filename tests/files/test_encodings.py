"""The same lines in every encoding that VTK writes, and in some that only other producers write, to the last bit."""

import struct
from pathlib import Path

import numpy as np
import pytest
from vtkmodules.util.numpy_support import numpy_to_vtk
from vtkmodules.vtkCommonCore import vtkPoints
from vtkmodules.vtkCommonDataModel import VTK_LINE, VTK_POLY_LINE, vtkCellArray, vtkPolyData, vtkUnstructuredGrid
from vtkmodules.vtkIOLegacy import vtkPolyDataWriter, vtkUnstructuredGridWriter
from vtkmodules.vtkIOXML import vtkXMLPolyDataWriter, vtkXMLUnstructuredGridWriter

from geomprep.errors import FileError
from geomprep.files import FileContents, read_file

RANDOM = np.random.default_rng(11)
POINTS = {
    "float32": (RANDOM.normal(size=(40, 3)) * 30).astype(np.float32),
    "float64": RANDOM.normal(size=(40, 3)) * 30,
}
RADIUS = RANDOM.uniform(0.5, 3.0, 40)
LINES = [list(range(15)), [14, 15], list(range(15, 30)), [29, 30, 31, 32], list(range(32, 40))]
FLOW = np.arange(5, dtype=np.float64) * 1.5


def filled(grid: vtkPolyData | vtkUnstructuredGrid, points: np.ndarray) -> None:
    """Points and arrays."""
    place = vtkPoints()
    place.SetData(numpy_to_vtk(points, deep=True))
    grid.SetPoints(place)
    for data, name, values in ((grid.GetPointData(), "radius", RADIUS), (grid.GetCellData(), "flow", FLOW)):
        array = numpy_to_vtk(values, deep=True)
        array.SetName(name)
        data.AddArray(array)


def polydata(points: np.ndarray) -> vtkPolyData:
    grid, cells = vtkPolyData(), vtkCellArray()
    for line in LINES:
        cells.InsertNextCell(len(line), line)
    grid.SetLines(cells)
    filled(grid, points)
    return grid


def unstructured(points: np.ndarray) -> vtkUnstructuredGrid:
    grid = vtkUnstructuredGrid()
    for line in LINES:
        grid.InsertNextCell(VTK_LINE if len(line) == 2 else VTK_POLY_LINE, len(line), line)
    filled(grid, points)
    return grid


def same(found: FileContents, points: np.ndarray) -> None:
    """Everything that was written comes back, bit by bit."""
    assert found.points.dtype == points.dtype
    assert found.points.tobytes() == points.tobytes()
    assert found.connectivity.tolist() == [point for line in LINES for point in line]
    assert found.offsets.tolist() == np.cumsum([0] + [len(line) for line in LINES]).tolist()
    assert found.point_arrays["radius"].tobytes() == RADIUS.tobytes()
    assert found.cell_arrays["flow"].tobytes() == FLOW.tobytes()


XML = [
    (mode, compressor, header, order)
    for mode in ("ascii", "binary", "raw", "base64")
    for compressor in ("none", "zlib", "lz4", "lzma")
    for header in (32, 64)
    for order in ("little", "big")
    if not (mode == "ascii" and (compressor != "none" or header == 64 or order == "big"))
]


@pytest.mark.parametrize(("mode", "compressor", "header", "order"), XML)
def test_vtp(tmp_path: Path, mode: str, compressor: str, header: int, order: str) -> None:
    precision = "float32" if (header == 32) == (order == "little") else "float64"
    file = written(
        vtkXMLPolyDataWriter(), polydata(POINTS[precision]), tmp_path / "lines.vtp", mode, compressor, header, order
    )
    same(read_file(file), POINTS[precision])


@pytest.mark.parametrize("mode", ["ascii", "binary", "raw", "base64"])
def test_vtu(tmp_path: Path, mode: str) -> None:
    writer = vtkXMLUnstructuredGridWriter()
    file = written(writer, unstructured(POINTS["float64"]), tmp_path / "lines.vtu", mode, "zlib", 32, "little")
    same(read_file(file), POINTS["float64"])


def written(writer, grid, file: Path, mode: str, compressor: str, header: int, order: str) -> Path:
    """Write with VTK's own XML writer."""
    writer.SetInputData(grid)
    writer.SetFileName(str(file))
    if mode == "ascii":
        writer.SetDataModeToAscii()
    elif mode == "binary":
        writer.SetDataModeToBinary()
    else:
        writer.SetDataModeToAppended()
        writer.SetEncodeAppendedData(mode == "base64")
    getattr(writer, {"none": "SetCompressorTypeToNone", "zlib": "SetCompressorTypeToZLib",
                     "lz4": "SetCompressorTypeToLZ4", "lzma": "SetCompressorTypeToLZMA"}[compressor])()  # fmt: skip
    getattr(writer, f"SetHeaderTypeToUInt{header}")()
    getattr(writer, "SetByteOrderToLittleEndian" if order == "little" else "SetByteOrderToBigEndian")()
    assert writer.Write() == 1
    return file


@pytest.mark.parametrize("grid", ["polydata", "unstructured"])
@pytest.mark.parametrize("binary", [True, False])
@pytest.mark.parametrize("version", [42, 51])
def test_legacy(tmp_path: Path, grid: str, binary: bool, version: int) -> None:
    points = POINTS["float64" if binary else "float32"]
    writer = vtkPolyDataWriter() if grid == "polydata" else vtkUnstructuredGridWriter()
    writer.SetInputData(polydata(points) if grid == "polydata" else unstructured(points))
    writer.SetFileName(str(tmp_path / "lines.vtk"))
    writer.SetFileTypeToBinary() if binary else writer.SetFileTypeToASCII()
    writer.SetFileVersion(version)
    assert writer.Write() == 1
    found = read_file(tmp_path / "lines.vtk")
    if binary:
        same(found, points)
    else:  # the writer prints fewer digits than a double has
        np.testing.assert_allclose(found.points, points, rtol=1e-5)
        assert found.connectivity.tolist() == [point for line in LINES for point in line]


def test_legacy_version_3_by_hand(tmp_path: Path) -> None:
    text = (
        "# vtk DataFile Version 3.0\nby hand\nASCII\nDATASET POLYDATA\nPOINTS 4 float\n0 0 0 1 0 0 2 0 0 2 1 0.5\n"
        "LINES 2 7\n3 0 1 2\n2 2 3\nPOINT_DATA 4\nSCALARS radius double 1\nLOOKUP_TABLE default\n0.5 0.25 0.125 0.1\n"
    )
    (tmp_path / "hand.vtk").write_text(text)
    found = read_file(tmp_path / "hand.vtk")
    assert found.connectivity.tolist() == [0, 1, 2, 2, 3]
    assert found.offsets.tolist() == [0, 3, 5]
    assert found.point_arrays["radius"].tolist() == [0.5, 0.25, 0.125, 0.1]


def appended(order: str, header: str, with_header_type: bool = True) -> bytes:
    """A `.vtp` with raw appended data written byte by byte, without VTK."""
    sign, unsigned = ("<", ">")[order == "BigEndian"], {"UInt32": "I", "UInt64": "Q"}[header]
    blocks = [
        np.array([[0, 0, 0], [1, 0, 0], [2, 0, 0]], sign + "f4").tobytes(),
        np.array([0.5, 0.25, 0.125], sign + "f8").tobytes(),
        np.array([0, 1, 2], sign + "i8").tobytes(),
        np.array([3], sign + "i8").tobytes(),
    ]
    starts, data = [], b""
    for block in blocks:
        starts.append(len(data))
        data += struct.pack(sign + unsigned, len(block)) + block
    stated = f' header_type="{header}"' if with_header_type else ""
    version = "1.0" if with_header_type else "0.1"
    head = (
        f'<?xml version="1.0"?>\n<VTKFile type="PolyData" version="{version}" byte_order="{order}"{stated}>\n<PolyData>\n'
        '<Piece NumberOfPoints="3" NumberOfVerts="0" NumberOfLines="1" NumberOfStrips="0" NumberOfPolys="0">\n'
        f'<PointData>\n<DataArray type="Float64" Name="radius" format="appended" offset="{starts[1]}"/>\n</PointData>\n'
        f'<Points>\n<DataArray type="Float32" NumberOfComponents="3" format="appended" offset="{starts[0]}"/>\n</Points>\n'
        f'<Lines>\n<DataArray type="Int64" Name="connectivity" format="appended" offset="{starts[2]}"/>\n'
        f'<DataArray type="Int64" Name="offsets" format="appended" offset="{starts[3]}"/>\n</Lines>\n</Piece>\n'
        '</PolyData>\n<AppendedData encoding="raw">\n_'
    )
    return head.encode() + data + b"\n</AppendedData>\n</VTKFile>\n"


@pytest.mark.parametrize(
    "data",
    [
        appended("LittleEndian", "UInt32"),
        appended("BigEndian", "UInt32"),
        appended("LittleEndian", "UInt64"),
        appended("BigEndian", "UInt64"),
        appended("LittleEndian", "UInt32", with_header_type=False),
        appended("BigEndian", "UInt32", with_header_type=False),
    ],
    ids=["little 32", "big 32", "little 64", "big 64", "version 0.1", "version 0.1 big"],
)
def test_raw_appended_written_without_vtk(tmp_path: Path, data: bytes) -> None:
    (tmp_path / "hand.vtp").write_bytes(data)
    found = read_file(tmp_path / "hand.vtp")
    assert found.points.tolist() == [[0, 0, 0], [1, 0, 0], [2, 0, 0]]
    assert found.point_arrays["radius"].tolist() == [0.5, 0.25, 0.125]
    assert found.connectivity.tolist() == [0, 1, 2]


def test_vertices_polygons_and_lines_share_the_cell_arrays_rightly(tmp_path: Path) -> None:
    """Cell arrays of poly data hold vertices first, then lines, then polygons: only the rows of lines are kept."""
    grid = polydata(POINTS["float64"])
    vertices, polygons = vtkCellArray(), vtkCellArray()
    for point in (0, 39):
        vertices.InsertNextCell(1, [point])
    polygons.InsertNextCell(3, [0, 1, 2])
    grid.SetVerts(vertices)
    grid.SetPolys(polygons)
    values = numpy_to_vtk(np.concatenate(([-1.0, -2.0], FLOW, [-3.0])), deep=True)
    values.SetName("flow")
    grid.GetCellData().AddArray(values)
    file = written(vtkXMLPolyDataWriter(), grid, tmp_path / "mixed.vtp", "raw", "none", 32, "little")
    found = read_file(file)
    assert found.cell_arrays["flow"].tolist() == FLOW.tolist()
    assert (found.n_vertices_ignored, found.n_other_cells_ignored) == (2, 1)
    assert found.findings


def test_other_mesh_formats_come_through_meshio(tmp_path: Path) -> None:
    import meshio

    pairs = np.array([[0, 1], [1, 2], [2, 3]])
    mesh = meshio.Mesh(POINTS["float64"][:4], [("line", pairs)], point_data={"radius": RADIUS[:4]})
    for name, kind in (("lines.xdmf", "xdmf"), ("lines.msh", "gmsh"), ("old.msh", "gmsh22")):
        meshio.write(tmp_path / name, mesh, file_format=kind)
        found = read_file(tmp_path / name)
        assert found.connectivity.reshape(-1, 2).tolist() == pairs.tolist(), name
        np.testing.assert_array_equal(found.points, POINTS["float64"][:4])
        assert found.point_arrays["radius"].tobytes() == RADIUS[:4].tobytes()


@pytest.mark.parametrize("part", [0.3, 0.7, 0.95])
def test_a_cut_mesh_file_is_refused(tmp_path: Path, part: float) -> None:
    import meshio

    mesh = meshio.Mesh(POINTS["float64"][:4], [("line", np.array([[0, 1], [1, 2]]))], point_data={"radius": RADIUS[:4]})
    for name, kind in (("cut.msh", "gmsh"), ("old.msh", "gmsh22"), ("cut.xdmf", "xdmf"), ("cut.mesh", "medit")):
        if kind == "medit":
            mesh = meshio.Mesh(mesh.points, mesh.cells)
        meshio.write(tmp_path / name, mesh, file_format=kind)
        data = (tmp_path / name).read_bytes()
        (tmp_path / name).write_bytes(data[: int(part * len(data))])
        with pytest.raises(FileError):
            read_file(tmp_path / name)
