"""Areas along centrelines from a mask: the volume of the voxels nearest to each station, per length.

A voxel counts whole or not at all, so that areas have no bias from the outline; a distance from the
axis to the nearest outside voxel, taken as radius, would lose half a voxel.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from geomprep.curves import arc_length
from geomprep.errors import InputError
from geomprep.model import BoolArray, FloatArray, IntArray

__all__ = ["MaskAreas", "VoxelGrid", "mask_areas"]

_VOXELS_AT_ONCE = 1 << 20


@dataclass(frozen=True, eq=False)
class VoxelGrid:
    """Where the voxels of an array lie.

    Attributes
    ----------
    origin : (3,) float array
        Centre of voxel 0, 0, 0, m.
    spacing : (3,) float array
        From centre to centre along each axis of the array, m.
    directions : (3, 3) float array
        Column k is the unit vector along axis k of the array; the columns are square to one another.
    """

    origin: FloatArray
    spacing: FloatArray
    directions: FloatArray

    def __post_init__(self) -> None:
        """Refuse what is no grid."""
        put = object.__setattr__
        for name, shape in (("origin", (3,)), ("spacing", (3,)), ("directions", (3, 3))):
            array = np.asarray(getattr(self, name), dtype=np.float64)
            if array.shape != shape or not np.isfinite(array).all():
                raise InputError(f"{name} of the voxels {array.tolist()}: finite numbers of shape {shape} are needed")
            put(self, name, array)
        if not (self.spacing > 0).all():
            raise InputError(f"spacing of the voxels {self.spacing.tolist()}: it must be above zero")
        if not np.allclose(self.directions.T @ self.directions, np.eye(3), atol=1e-4):
            raise InputError("directions of the voxels are no unit vectors square to one another: resample the mask")

    def centres(self, index: IntArray) -> FloatArray:
        """Places (n, 3) of voxels (n, 3)."""
        return np.asarray(self.origin + (index * self.spacing) @ self.directions.T)


@dataclass(frozen=True, eq=False)
class MaskAreas:
    """Areas per station.

    Attributes
    ----------
    area : (n,) float array
        m²; not a number where no voxel is nearest.
    volume : (n,) float array
        Of the voxels nearest to the station, m³.
    length : (n,) float array
        Of the line that belongs to the station: halfway to its neighbours, m.
    empty : (n,) bool array
        Stations without voxels.
    unassigned_volume : float
        Voxels beyond the ends of lines, or farther away than allowed, m³.
    """

    area: FloatArray
    volume: FloatArray
    length: FloatArray
    empty: BoolArray
    unassigned_volume: float


@dataclass(frozen=True, eq=False)
class _Lines:
    """Stations laid out along one common axis, line after line, with gaps between."""

    stations: FloatArray
    along: FloatArray
    first: IntArray
    last: IntArray
    borders: FloatArray
    line: IntArray


def _shrunk(radius: FloatArray) -> FloatArray:
    """Height at which a station stands so that squared distances are less its squared radius, but for a constant."""
    # the same radius may square differently alone and in an array, in the last digit
    height: FloatArray = np.sqrt(np.maximum(np.max(radius) ** 2 - radius**2, 0.0))
    return height


def mask_areas(
    mask: BoolArray,
    grid: VoxelGrid,
    stations: FloatArray,
    offsets: IntArray,
    radius: FloatArray | None = None,
    farthest: float = math.inf,
) -> MaskAreas:
    """Return the area at each station: volume of the mask's voxels nearest to it, over its length.

    Every voxel belongs to the piece of line next to the station it is nearest to, at its foot on that
    piece. There it is spread over its own width, so that layers of voxels do not beat with the stations.

    Parameters
    ----------
    mask : (a, b, c) bool array
        True inside the lumen.
    grid : VoxelGrid
    stations : (n, 3) float array
        m.
    offsets : (m + 1,) int array
        Line i owns stations ``offsets[i]:offsets[i + 1]``, two or more, none repeated.
    radius : (n,) float array, optional
        Given, distances are taken as d² − r²: where vessels of unlike size meet, voxels go to the tube that
        holds them and not to the nearer axis.
    farthest : float
        Voxels farther from their line are left out, m.

    Returns
    -------
    MaskAreas

    Raises
    ------
    InputError
        Arrays of other shapes, lines of one station or with repeated ones.

    Notes
    -----
    In a bend the volume between two planes across the axis is still area times length of the axis while
    the axis runs through the centres of area (Pappus). End stations take the mean over half a step, first order in
    a taper. A mask that ends inside the length of a station gives it too small an area: look at the
    neighbours of empty stations.

    Examples
    --------
    A square duct of 4 by 4 voxels of 1 mm:

    >>> grid = VoxelGrid(np.zeros(3), np.full(3, 1e-3), np.eye(3))
    >>> line = np.array([[1.5, 1.5, 2.0], [1.5, 1.5, 4.5], [1.5, 1.5, 7.0]]) * 1e-3
    >>> found = mask_areas(np.ones((4, 4, 10), bool), grid, line, np.array([0, 3]))
    >>> (found.area * 1e6).round(9), found.empty.any()
    (array([16., 16., 16.]), np.False_)
    >>> round(found.unassigned_volume * 1e9, 9)
    80.0
    """
    from scipy.spatial import cKDTree

    mask, lines = np.asarray(mask), _laid_out(np.asarray(stations, np.float64), np.asarray(offsets, np.int64))
    if mask.ndim != 3 or mask.dtype != np.bool_:
        raise InputError(f"mask: shape {mask.shape} of {mask.dtype}; three axes of true and false are needed")
    if radius is not None and (np.shape(radius) != (len(lines.stations),) or not np.isfinite(radius).all()):
        raise InputError(
            f"radius: shape {np.shape(radius)} for {len(lines.stations)} stations; finite, one per station"
        )
    voxels = np.argwhere(mask)
    volume, voxel = np.zeros(len(lines.stations)), float(np.prod(grid.spacing))
    if len(voxels) and len(lines.stations):
        shrunk = np.zeros(len(lines.stations)) if radius is None else _shrunk(radius)
        tree = cKDTree(np.column_stack((lines.stations, shrunk)))
        for start in range(0, len(voxels), _VOXELS_AT_ONCE):
            place = grid.centres(voxels[start : start + _VOXELS_AT_ONCE])
            nearest = tree.query(np.column_stack((place, np.zeros(len(place)))))[1]
            volume += _spread(lines, grid, place, nearest, farthest)
    length = np.diff(lines.borders)[np.arange(len(volume)) + lines.line]
    empty = volume <= 0
    area = np.where(empty, np.nan, volume * voxel / length)
    return MaskAreas(area, volume * voxel, length, empty, float((len(voxels) - volume.sum()) * voxel))


def _laid_out(stations: FloatArray, offsets: IntArray) -> _Lines:
    """Lines one after the other on a common axis, checked."""
    if stations.ndim != 2 or stations.shape[1] != 3 or not np.isfinite(stations).all():
        raise InputError(f"stations: shape {stations.shape}; rows of three finite numbers are needed")
    if len(offsets) == 0 or offsets[0] != 0 or offsets[-1] != len(stations) or np.any(np.diff(offsets) < 2):
        raise InputError(f"offsets must rise from 0 to {len(stations)} by two or more: a line has two stations or more")
    counts = np.diff(offsets)
    line = np.repeat(np.arange(len(counts)), counts)
    first, last = np.repeat(offsets[:-1], counts), np.repeat(offsets[1:] - 1, counts)
    along = arc_length(stations, offsets)
    repeated = np.flatnonzero((np.diff(along) <= 0) & (line[1:] == line[:-1]))
    if len(repeated):
        raise InputError(f"stations {repeated[0]} and {repeated[0] + 1} lie at one place: drop one of them")
    length = along[offsets[1:] - 1]
    room = 2 * length + 1.0
    along = along + np.repeat(np.cumsum(room) - room, counts)
    border = np.empty(len(along) + len(counts))
    row = np.arange(len(along)) + line
    border[row] = np.where(np.arange(len(along)) == first, along, 0.5 * (along + np.roll(along, 1)))
    border[offsets[1:] + np.arange(len(counts))] = along[offsets[1:] - 1]
    return _Lines(stations, along, first, last, border, line)


def _spread(lines: _Lines, grid: VoxelGrid, place: FloatArray, nearest: IntArray, farthest: float) -> FloatArray:
    """Voxels per station, in parts of voxels."""
    before = np.maximum(nearest - 1, lines.first[nearest])
    after = np.minimum(nearest, lines.last[nearest] - 1)
    foot, away, tangent = _foot(lines, place, before)
    other = _foot(lines, place, after)
    nearer = other[1] < away
    foot, away = np.where(nearer, other[0], foot), np.where(nearer, other[1], away)
    tangent = np.where(nearer[:, None], other[2], tangent)
    inside = away <= farthest
    foot, nearest = foot[inside], nearest[inside]
    # a box as wide as the voxel is deep along the line, in the mean square
    width = np.linalg.norm((tangent[inside] @ grid.directions) * grid.spacing, axis=1)
    return _shares(lines, foot - width / 2, foot + width / 2, lines.line[nearest])


def _foot(lines: _Lines, place: FloatArray, piece: IntArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Foot of places on pieces, on the common axis, distance to the piece, its direction.

    Feet may lie beyond the ends of a line, not beyond the other ends of pieces.
    """
    start, step = lines.stations[piece], lines.stations[piece + 1] - lines.stations[piece]
    length = lines.along[piece + 1] - lines.along[piece]
    tangent = step / length[:, None]
    along = np.einsum("ij,ij->i", place - start, tangent)
    low = np.where(piece == lines.first[piece], -np.inf, 0.0)
    high = np.where(piece + 1 == lines.last[piece], np.inf, length)
    foot = np.clip(along, low, high)
    away = np.linalg.norm(place - start - np.clip(along, 0.0, length)[:, None] * tangent, axis=1)
    return lines.along[piece] + foot, away, tangent


def _shares(lines: _Lines, low: FloatArray, high: FloatArray, line: IntArray) -> FloatArray:
    """How much of every box from low to high falls to each station of its line."""
    n = len(lines.stations)
    first = np.flatnonzero(lines.first == np.arange(n))[line]
    last = lines.last[first]
    row = np.clip(np.searchsorted(lines.borders, low, side="right") - 1 - line, first, last)
    stop = np.clip(np.searchsorted(lines.borders, high, side="left") - 1 - line, first, last)
    total = np.zeros(n)
    for step in range(int((stop - row).max(initial=-1)) + 1):
        at = row + step
        here = at <= stop
        edge = at[here] + line[here]
        part = np.minimum(high[here], lines.borders[edge + 1]) - np.maximum(low[here], lines.borders[edge])
        total += np.bincount(at[here], np.maximum(part, 0) / (high - low)[here], minlength=n)
    return total
