"""Surfaces of every format come back as they were written; damaged ones give one line."""

import struct
from pathlib import Path

import numpy as np
import pytest
from phantoms.skins import ellipse, straight
from vtkmodules.util.numpy_support import numpy_to_vtk, numpy_to_vtkIdTypeArray
from vtkmodules.vtkCommonCore import vtkPoints
from vtkmodules.vtkCommonDataModel import vtkCellArray, vtkPolyData, vtkUnstructuredGrid
from vtkmodules.vtkIOGeometry import vtkSTLWriter
from vtkmodules.vtkIOXML import vtkXMLPolyDataWriter, vtkXMLUnstructuredGridWriter

from geomprep.errors import FileError
from geomprep.files import read_surface
from geomprep.measure import cross_sections

POINTS, TRIANGLES = straight(ellipse(12, 2, 1), 5)
CORNERS = np.array([[0.0, 0, 0], [1, 0, 0], [1, 1, 0], [0.5, 1.5, 0], [0, 1, 0]])


def cells_of(cells: list[list[int]]) -> vtkCellArray:
    array = vtkCellArray()
    offsets = np.cumsum([0, *map(len, cells)])
    numbers = np.concatenate([np.asarray(cell, np.int64) for cell in cells])
    array.SetData(*(numpy_to_vtkIdTypeArray(each.astype(np.int64), deep=True) for each in (offsets, numbers)))
    return array


def places(points: np.ndarray) -> vtkPoints:
    held = vtkPoints()
    held.SetData(numpy_to_vtk(np.ascontiguousarray(points), deep=True))
    return held


def polydata(points: np.ndarray, **sections: list[list[int]]) -> vtkPolyData:
    data = vtkPolyData()
    data.SetPoints(places(points))
    for section, cells in sections.items():
        getattr(data, f"Set{section}")(cells_of(cells))
    return data


def grid(points: np.ndarray, types: list[int], cells: list[list[int]]) -> vtkUnstructuredGrid:
    data = vtkUnstructuredGrid()
    data.SetPoints(places(points))
    data.SetCells(numpy_to_vtk(np.array(types, np.uint8), deep=True), cells_of(cells))
    return data


def written(path: Path, data: object, text: bool = False) -> Path:
    kinds = {".vtp": vtkXMLPolyDataWriter, ".vtu": vtkXMLUnstructuredGridWriter, ".stl": vtkSTLWriter}
    writer = kinds[path.suffix]()
    if path.suffix == ".stl":
        writer.SetFileTypeToASCII() if text else writer.SetFileTypeToBinary()
    else:
        writer.SetDataModeToAscii() if text else writer.EncodeAppendedDataOff()
    writer.SetFileName(str(path))
    writer.SetInputData(data)
    writer.Write()
    return path


@pytest.fixture(scope="module")
def tube(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    folder = tmp_path_factory.mktemp("tube")
    data = polydata(POINTS, Polys=TRIANGLES.tolist())
    return {
        "vtp": written(folder / "raw.vtp", data),
        "vtp text": written(folder / "text.vtp", data, text=True),
        "vtu": written(folder / "grid.vtu", grid(POINTS, [5] * len(TRIANGLES), TRIANGLES.tolist())),
        "stl": written(folder / "binary.stl", data),
        "stl text": written(folder / "TEXT.STL".lower(), data, text=True),
    }


@pytest.mark.parametrize("kind", ["vtp", "vtp text", "vtu", "stl", "stl text"])
def test_triangles_come_back(tube: dict[str, Path], kind: str) -> None:
    found = read_surface(tube[kind])
    assert len(found.triangles) == len(TRIANGLES)
    digits = 1e-6 if "stl" in kind else 0 if kind != "vtp text" else 1e-9
    np.testing.assert_allclose(found.points[found.triangles], POINTS[TRIANGLES], atol=20 * digits)
    assert not found.findings
    assert len(found.sha256) == 64
    assert not found.points.flags.writeable


def test_sections_of_a_surface_that_was_read(tube: dict[str, Path]) -> None:
    """Twelve corners of an ellipse 2 by 1: area 12/2·sin(30°)·2 = 6."""
    found = read_surface(tube["stl"])
    stations = np.array([[0, 0, 4.0], [0, 0, 8], [0, 0, 12]])
    sections = cross_sections(found.points, found.triangles, stations, np.array([0, 3]))
    np.testing.assert_allclose(sections.area, 6, rtol=1e-6)
    assert not sections.marks.any()


def test_polygons_and_strips_become_triangles(tmp_path: Path) -> None:
    data = polydata(
        CORNERS, Verts=[[0]], Lines=[[0, 1, 2]], Polys=[[0, 1, 2, 3, 4], [0, 1, 2, 4]], Strips=[[0, 1, 4, 2]]
    )
    found = read_surface(written(tmp_path / "mixed.vtp", data))
    assert found.triangles.tolist() == [[0, 1, 2], [0, 2, 3], [0, 3, 4], [0, 1, 2], [0, 2, 4], [0, 1, 4], [1, 2, 4]]
    assert found.n_other_cells_ignored == 2
    assert [finding.kind for finding in found.findings] == ["ignored cells", "polygons cut"]


def test_all_triangles_of_a_strip_face_one_way(tmp_path: Path) -> None:
    zigzag = np.array([[i // 2, i % 2, 0.0] for i in range(7)])
    found = read_surface(written(tmp_path / "strip.vtp", polydata(zigzag, Strips=[list(range(7))])))
    edges = np.diff(zigzag[found.triangles], axis=1)
    assert len(set(np.sign(np.cross(edges[:, 0], edges[:, 1])[:, 2]))) == 1


def test_grids_give_their_flat_cells(tmp_path: Path) -> None:
    data = grid(CORNERS, [5, 9, 10, 6], [[0, 1, 2], [0, 1, 2, 4], [0, 1, 2, 3], [0, 1, 4, 2]])
    found = read_surface(written(tmp_path / "grid.vtu", data))
    assert found.triangles.tolist() == [[0, 1, 2], [0, 1, 2], [0, 2, 4], [0, 1, 4], [1, 2, 4]]
    assert found.n_other_cells_ignored == 1


def refused(path: Path, match: str) -> None:
    with pytest.raises(FileError, match=match) as caught:
        read_surface(path)
    assert "\n" not in str(caught.value)
    assert str(caught.value).startswith(str(path))


def test_what_is_no_surface_is_refused(tmp_path: Path) -> None:
    refused(written(tmp_path / "line.vtp", polydata(CORNERS, Lines=[[0, 1, 2]])), "holds 1 cells but no triangles")
    refused(
        written(tmp_path / "solid.vtu", grid(CORNERS, [10], [[0, 1, 2, 3]])), "surface of the lumen, not its volume"
    )
    refused(tmp_path / "surface.obj", "suffix '.obj' is not read here; one of .vtp, .vtu, .stl is needed")
    refused(tmp_path / "missing.stl", "there is no such file")
    (tmp_path / "empty.stl").touch()
    refused(tmp_path / "empty.stl", "is empty")


def test_damaged_surfaces_are_refused(tmp_path: Path) -> None:
    bad = np.where(np.arange(5)[:, None] == 3, np.nan, CORNERS)
    refused(written(tmp_path / "nan.vtp", polydata(bad, Polys=[[0, 1, 2]])), "not finite, the first is point 3")
    refused(written(tmp_path / "far.vtp", polydata(CORNERS, Polys=[[0, 1, 7]])), "names point 7, but there are 5")
    refused(written(tmp_path / "far.vtu", grid(CORNERS, [5], [[0, 1, 7]])), "names point 7, but there are 5")


@pytest.mark.parametrize("kind", ["vtp", "vtp text", "vtu", "stl", "stl text"])
@pytest.mark.parametrize("part", [0.02, 0.5, 0.97])
def test_files_cut_short_are_refused(tube: dict[str, Path], tmp_path: Path, kind: str, part: float) -> None:
    data = tube[kind].read_bytes()
    short = tmp_path / f"short{tube[kind].suffix}"
    short.write_bytes(data[: int(part * len(data))])
    refused(short, "damaged|anew")


def test_stl_faults(tube: dict[str, Path], tmp_path: Path) -> None:
    binary, text = tube["stl"].read_bytes(), tube["stl text"].read_bytes()
    cases = {
        "count": (binary[:80] + struct.pack("<I", 10**9) + binary[84:], "declares 1000000000 triangles"),
        "none": (binary[:80] + struct.pack("<I", 0), "holds no triangles"),
        "nan": (binary[:96] + struct.pack("<f", np.nan) + binary[100:], "finite"),
        "word": (text.replace(b"vertex ", b"vertex x", 1), "corners, .* of them with three numbers"),
        "lost": (text.replace(b"endloop", b"", 1), "closed triangles"),
        "junk": (bytes(range(256)) * 4, "declares"),
    }
    for name, (data, match) in cases.items():
        path = tmp_path / f"{name}.stl"
        path.write_bytes(data)
        refused(path, match)
