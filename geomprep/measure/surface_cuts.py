"""A lumen surface made ready for cutting, and VTK's cuts through it by many planes."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from geomprep.errors import InputError
from geomprep.model import BoolArray, FloatArray, IntArray

__all__ = ["Cuts", "Surface", "cut", "finite_rows", "nearby", "plane_axes", "runs_of", "welded_surface"]

_STATIONS_AT_ONCE = 32
_REACH = 4.0  # half-size of the part that is cut first, in distances from stations to the surface


@dataclass(frozen=True, eq=False)
class Surface:
    """Welded triangles and their unit normals."""

    points: FloatArray
    triangles: IntArray
    normals: FloatArray

    def part(self, keep: BoolArray) -> Surface:
        """Only some of the triangles."""
        return Surface(self.points, self.triangles[keep], self.normals[keep])


@dataclass(frozen=True, eq=False)
class Cuts:
    """Pieces of the surface in several planes.

    Attributes
    ----------
    points : (k, 3) float array
    edges : (e, 2) int array
        Rows of `points`; both of one plane.
    triangle : (e,) int array
        Triangle that each edge runs through.
    plane : (k,) int array
    """

    points: FloatArray
    edges: IntArray
    triangle: IntArray
    plane: IntArray


def finite_rows(name: str, values: npt.ArrayLike) -> FloatArray:
    """Return values as finite rows of three numbers.

    Raises
    ------
    InputError
        Another shape, or a number that is not finite.

    Examples
    --------
    >>> finite_rows("points", [[0, 1, 2]])
    array([[0., 1., 2.]])
    """
    array = np.asarray(values, dtype=np.float64)
    if array.ndim != 2 or array.shape[1] != 3:
        raise InputError(f"{name}: shape {array.shape}; rows of three numbers are needed")
    finite = np.isfinite(array).all(axis=1)
    if not finite.all():
        first = int(np.argmin(finite))
        raise InputError(f"{name}: row {first} is {array[first].tolist()}; every number must be finite")
    return array


def welded_surface(points: npt.ArrayLike, triangles: IntArray) -> Surface:
    """Return triangles with equal corners made one point; those of fewer than three places are left out.

    Parameters
    ----------
    points : (p, 3) array_like
    triangles : (t, 3) int array

    Raises
    ------
    InputError
        Other shapes, numbers that are not finite, a point number out of range.

    Examples
    --------
    >>> corners = [[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 0]]
    >>> welded_surface(corners, np.array([[0, 1, 2], [3, 1, 2], [0, 3, 1]])).triangles
    array([[0, 1, 2],
           [0, 1, 2]])
    """
    corners = finite_rows("points", points)
    triangles = np.asarray(triangles)
    if triangles.ndim != 2 or triangles.shape[1] != 3 or triangles.dtype.kind not in "iu":
        raise InputError(f"triangles: shape {triangles.shape} of {triangles.dtype}; rows of three point numbers")
    if triangles.size and not (triangles.min() >= 0 and triangles.max() < len(corners)):
        raise InputError(
            f"triangles name points {triangles.min()} to {triangles.max()}, but there are {len(corners)} from 0"
        )
    order = np.lexsort((corners + 0.0).T)  # −0 and 0 are one place
    new = np.ones(len(corners), np.bool_)
    new[1:] = (corners[order[1:]] != corners[order[:-1]]).any(axis=1)
    number = np.empty(len(corners), np.int64)
    number[order] = np.cumsum(new) - 1
    corners, welded = corners[order[new]], number[triangles]
    normal = np.cross(corners[welded[:, 1]] - corners[welded[:, 0]], corners[welded[:, 2]] - corners[welded[:, 0]])
    whole = (welded != np.roll(welded, 1, axis=1)).all(axis=1)
    size = np.linalg.norm(normal[whole], axis=1, keepdims=True)
    return Surface(corners, welded[whole], normal[whole] / np.where(size > 0, size, 1.0))


def runs_of(rows: IntArray) -> list[IntArray]:
    """Return rows in runs of a size that keeps the arrays small.

    Examples
    --------
    >>> [len(run) for run in runs_of(np.arange(100))]
    [32, 32, 32, 4]
    """
    return [rows[i : i + _STATIONS_AT_ONCE] for i in range(0, len(rows), _STATIONS_AT_ONCE)]


def nearby(surface: Surface, stations: FloatArray) -> list[tuple[IntArray, Surface]]:
    """Return runs of stations, each with the triangles round it, so that a plane need not look at all.

    Parameters
    ----------
    surface : Surface
    stations : (n, 3) float array

    Returns
    -------
    list of (rows, Surface)
        The part reaches four times as far as the surface is from each station; what goes on beyond it is cut open.

    Examples
    --------
    >>> nearby(welded_surface(np.empty((0, 3)), np.empty((0, 3), np.int64)), np.empty((0, 3)))
    []
    """
    from scipy.spatial import cKDTree

    chunks = runs_of(np.arange(len(stations)))
    if len(surface.triangles) == 0:
        return [(rows, surface) for rows in chunks]
    reach = _REACH * cKDTree(surface.points).query(stations)[0]
    corners = surface.points[surface.triangles]
    low, high = corners.min(axis=1), corners.max(axis=1)
    found = []
    for rows in chunks:
        wide = reach[rows, None]
        first, last = (stations[rows] - wide).min(axis=0), (stations[rows] + wide).max(axis=0)
        found.append((rows, surface.part(((high >= first) & (low <= last)).all(axis=1))))
    return found


def cut(surface: Surface, stations: FloatArray, normals: FloatArray) -> Cuts:
    """Cut a surface by planes, given by a place and a unit normal each.

    Every corner lies on one side of a plane only (on it counts as above), and every cut mesh edge gives one
    point: a closed surface gives closed curves, wherever the plane meets its corners.

    Parameters
    ----------
    surface : Surface
    stations, normals : (n, 3) float array

    Examples
    --------
    >>> corners = [[1.0, 0, 0], [0, 1, 0], [0, 0, 1], [0, 0, 0]]
    >>> tetrahedron = welded_surface(corners, np.array([[0, 1, 2], [0, 1, 3], [0, 2, 3], [1, 2, 3]]))
    >>> found = cut(tetrahedron, np.array([[0, 0, 0.5]]), np.array([[0, 0, 1.0]]))
    >>> np.bincount(found.edges.ravel()), found.points.sum(axis=0)
    (array([2, 2, 2]), array([0.5, 0.5, 1.5]))
    """
    from vtkmodules.util import numpy_support
    from vtkmodules.vtkCommonDataModel import vtkPlane
    from vtkmodules.vtkFiltersCore import vtkPolyDataPlaneCutter

    convert: Any = numpy_support  # it carries no types
    plane, cutter = vtkPlane(), vtkPolyDataPlaneCutter()
    cutter.SetInputData(_vtk_surface(surface))
    cutter.SetPlane(plane)
    cutter.ComputeNormalsOff()
    places, edges, triangle, counts = [np.empty((0, 3))], [np.empty((0, 2), np.int64)], [np.empty(0, np.int64)], []
    total = 0
    for station, normal in zip(stations.tolist(), normals.tolist(), strict=True):
        plane.SetOrigin(station)
        plane.SetNormal(normal)
        cutter.Update()
        output: Any = cutter.GetOutput()
        n = output.GetNumberOfPoints()
        counts.append(n)
        if n:
            places.append(np.array(convert.vtk_to_numpy(output.GetPoints().GetData()), np.float64))
            ends = convert.vtk_to_numpy(output.GetLines().GetConnectivityArray()).reshape(-1, 2)
            edges.append(ends.astype(np.int64) + total)
            triangle.append(np.array(convert.vtk_to_numpy(output.GetCellData().GetArray("triangle")), np.int64))
        total += n
    owner = np.repeat(np.arange(len(stations)), counts)
    return Cuts(np.concatenate(places), np.concatenate(edges), np.concatenate(triangle), owner)


def plane_axes(normals: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return two unit vectors in each plane, square to one another.

    Parameters
    ----------
    normals : (n, 3) float array
        Unit vectors.

    Examples
    --------
    >>> across, up = plane_axes(np.array([[0.0, 0, 1]]))
    >>> bool(across[0] @ up[0] == 0), np.abs(np.cross(across, up))
    (True, array([[0., 0., 1.]]))
    """
    least = np.eye(3)[np.abs(normals).argmin(axis=1)]
    across = np.cross(normals, least)
    across /= np.linalg.norm(across, axis=1, keepdims=True)
    return across, np.cross(normals, across)


def _vtk_surface(surface: Surface) -> Any:
    """The triangles as VTK holds them, each with its number."""
    from vtkmodules.util import numpy_support
    from vtkmodules.vtkCommonCore import vtkPoints
    from vtkmodules.vtkCommonDataModel import vtkCellArray, vtkPolyData

    convert: Any = numpy_support  # it carries no types
    places, cells, data = vtkPoints(), vtkCellArray(), vtkPolyData()
    number = np.arange(len(surface.triangles) + 1, dtype=np.int64)
    places.SetData(convert.numpy_to_vtk(np.ascontiguousarray(surface.points), deep=True))
    connectivity = np.ascontiguousarray(surface.triangles, np.int64).reshape(-1)
    cells.SetData(*(convert.numpy_to_vtkIdTypeArray(each, deep=True) for each in (3 * number, connectivity)))
    numbered = convert.numpy_to_vtk(number[:-1], deep=True)
    numbered.SetName("triangle")
    data.SetPoints(places)
    data.SetPolys(cells)
    data.GetCellData().AddArray(numbered)
    return data
