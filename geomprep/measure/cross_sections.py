"""Cross-sections of a lumen surface, perpendicular to its centreline.

Every station's plane is cut by VTK; of the curves in it, the closed one round the station is the lumen.
What may be wrong with a section is marked on it, so that no doubtful area passes for a measured one.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import IntFlag

import numpy as np

from geomprep.curves import arc_length
from geomprep.errors import InputError
from geomprep.measure.outlines import Outlines, crosses_itself, dents, holds, outlines
from geomprep.measure.surface_cuts import Surface, cut, finite_rows, nearby, plane_axes, runs_of, welded_surface
from geomprep.model import BoolArray, FloatArray, IntArray, Uint8Array

__all__ = ["CrossSections", "CutMark", "CutSettings", "cross_sections", "smoothed_tangents"]

_LEAST_TURN = 0.5 * math.pi  # part of a turn by which an open curve goes round a station it belongs to
_ABRUPT = 0.01  # part of the radius that may be wider still
_TURNED_BACK = 0.05  # rad by which an outline may run back, seen from the station


class CutMark(IntFlag):
    """What is doubtful about a section; several may hold at once.

    ``OUTSIDE`` no closed curve goes round the station. ``OPEN`` the curve round it has ends: the plane
    meets an opening or a hole. ``TOUCHING`` the lumen meets, crosses or holds another surface, or itself.
    ``INDENTED`` the outline is not convex enough: a branch or a neighbour may be part of it, or the
    lumen is bean-shaped. ``OBLIQUE`` the plane is not perpendicular to the wall. ``OFF_CENTRE`` the
    station lies far from the centre of area. ``ABRUPT`` the section is wider than its neighbours along the line
    allow, as where a branch still runs inside its parent. Without a closed curve there are no measures.
    """

    NONE = 0
    OUTSIDE = 1
    OPEN = 2
    TOUCHING = 4
    INDENTED = 8
    OBLIQUE = 16
    OFF_CENTRE = 32
    ABRUPT = 64


@dataclass(frozen=True)
class CutSettings:
    """When a section is marked.

    Attributes
    ----------
    tangent_reach : int
        Stations on either side through which the tangent is smoothed.
    largest_obliqueness : float
        rad, from the tangent to the axis that the wall shows; 10° make an area 1.5 % too large.
    largest_dent : float
        Depth of a dent in the outline, in radii of the circle of equal area. Where two round lumens are
        fused, neither axis inside the other lumen, 0.08 leaves no area more than 1 % too large.
    largest_offset : float
        From the station to the centre of area, in the same radii.
    steepest : float
        Slope by which the radius of equal area may widen along a line. What is wider than the narrowest
        sections before and behind allow is not the same lumen: inside a parent, say.
    """

    tangent_reach: int = 2
    largest_obliqueness: float = math.radians(10.0)
    largest_dent: float = 0.08
    largest_offset: float = 0.2
    steepest: float = 1.0

    def __post_init__(self) -> None:
        """Refuse limits that mark all or nothing."""
        if self.tangent_reach < 1:
            raise InputError(f"tangent_reach = {self.tangent_reach}: one station on either side is the least")
        for name in ("largest_obliqueness", "largest_dent", "largest_offset", "steepest"):
            if not 0 < getattr(self, name) < math.inf:
                raise InputError(f"{name} = {getattr(self, name):g}: it must be finite and above zero")


@dataclass(frozen=True, eq=False)
class CrossSections:
    """One section per station; not a number where there is none.

    Attributes
    ----------
    area, perimeter : (n,) float array
        m², m.
    polar_moment : (n,) float array
        ∫(x² + y²) dA about the centre of area, m⁴.
    centre : (n, 3) float array
        Centre of area, m.
    offset : (n,) float array
        From the station to it, m.
    dent : (n,) float array
        How far the outline dips below its convex hull at most, m.
    obliqueness : (n,) float array
        Angle from the tangent to the axis that the wall shows, rad.
    tangent : (n, 3) float array
        Unit normal of each plane.
    marks : (n,) uint8 array
        Sum of :class:`CutMark` values; 0 where nothing is doubtful.
    """

    area: FloatArray
    perimeter: FloatArray
    polar_moment: FloatArray
    centre: FloatArray
    offset: FloatArray
    dent: FloatArray
    obliqueness: FloatArray
    tangent: FloatArray
    marks: Uint8Array

    @property
    def hydraulic_diameter(self) -> FloatArray:
        """(n,) 4 · area over perimeter, m."""
        return np.asarray(4 * self.area / self.perimeter)

    @property
    def circularity(self) -> FloatArray:
        """(n,) 4π · area over perimeter²; 1 for a circle, below 1 for all else."""
        return np.asarray(4 * np.pi * self.area / self.perimeter**2)

    def marked(self, mark: CutMark) -> BoolArray:
        """(n,) whether any of these marks is set."""
        return np.asarray(self.marks & mark.value > 0)


def cross_sections(
    points: FloatArray,
    triangles: IntArray,
    stations: FloatArray,
    offsets: IntArray,
    tangents: FloatArray | None = None,
    settings: CutSettings | None = None,
) -> CrossSections:
    """Cut a lumen surface perpendicular to its centreline at every station.

    Triangles may be turned either way and need not share points: equal coordinates are one point.

    Parameters
    ----------
    points : (p, 3) float array
        Corners, m.
    triangles : (t, 3) int array
        Rows of `points`; the surface may be open or closed.
    stations : (n, 3) float array
        Places on centrelines, m.
    offsets : (m + 1,) int array
        Line i owns stations ``offsets[i]:offsets[i + 1]``.
    tangents : (n, 3) float array, optional
        Directions of any length; default :func:`smoothed_tangents` of the stations.
    settings : CutSettings, optional

    Returns
    -------
    CrossSections

    Raises
    ------
    InputError
        Arrays of other shapes, a point number out of range, values that are not finite, a tangent of no length.

    Notes
    -----
    VTK's ``vtkPolyDataPlaneCutter`` makes the pieces of the cut; measures are those of the polygon they
    form, so their error falls with the square of the triangles' size. The wall's axis is the direction in
    which the unit normals along the outline vary least, which is the axis of any cylinder or cone.

    What the marks cannot see: the mouth of a small branch whose axis still lies inside the lumen, up to
    a tenth of the area; the junction zone is where to look for it. What they see too often: the stairs of
    a surface that was not smoothed, below about 12 voxels per diameter; take the areas of the mask there.

    Examples
    --------
    A square tube of side 2, open at both ends:

    >>> corner = np.array([[1.0, 1, 0], [-1, 1, 0], [-1, -1, 0], [1, -1, 0]])
    >>> points = np.concatenate((corner, corner + [0, 0, 5]))
    >>> wall = [[i, (i + 1) % 4, 4 + i] for i in range(4)] + [[4 + i, (i + 1) % 4, 4 + (i + 1) % 4] for i in range(4)]
    >>> line = np.array([[0, 0, 1.0], [0, 0, 2], [0, 0, 3], [0, 0, 8]])
    >>> cut = cross_sections(points, np.array(wall), line, np.array([0, 4]))
    >>> cut.area
    array([ 4.,  4.,  4., nan])
    >>> cut.circularity.round(4), cut.marks
    (array([0.7854, 0.7854, 0.7854,    nan]), array([0, 0, 0, 1], dtype=uint8))
    """
    settings = settings or CutSettings()
    surface = welded_surface(points, triangles)
    stations = finite_rows("stations", stations)
    if len(offsets) == 0 or offsets[0] != 0 or offsets[-1] != len(stations) or np.any(np.diff(offsets) < 0):
        raise InputError(f"offsets of the lines must rise from 0 to {len(stations)}, the number of stations")
    directions = smoothed_tangents(stations, offsets, settings.tangent_reach) if tangents is None else tangents
    directions = _unit(finite_rows("tangents", directions), len(stations))
    columns = _Columns.empty(len(stations))
    for rows, part in nearby(surface, stations):
        columns.put(rows, _measured(part, stations[rows], directions[rows], settings))
    missing = np.flatnonzero(columns.marks & (CutMark.OUTSIDE | CutMark.OPEN | CutMark.TOUCHING).value)
    for rows in runs_of(missing):  # the near part may have cut the outline off
        columns.put(rows, _measured(surface, stations[rows], directions[rows], settings))
    columns.marks[_abrupt(columns.values[:, 0], stations, offsets, settings.steepest)] |= CutMark.ABRUPT.value
    return columns.sections(stations, directions)


def smoothed_tangents(stations: FloatArray, offsets: IntArray, reach: int = 2) -> FloatArray:
    """Return the unit tangent of the parabola fitted through each station and its neighbours.

    Neighbours are weighted 1 − (k/(reach + 1))², k stations away; ends are fitted from one side. The
    tangent is exact on straight lines and of second order in the spacing on curves.

    Parameters
    ----------
    stations : (n, 3) float array
        m.
    offsets : (m + 1,) int array
        Lines; a line of a single station gets the direction 0, 0, 0.
    reach : int
        Stations on either side.

    Returns
    -------
    (n, 3) float array

    Examples
    --------
    >>> smoothed_tangents(np.array([[0.0, 0, 0], [0, 0, 3]]), np.array([0, 2]))
    array([[0., 0., 1.],
           [0., 0., 1.]])
    """
    if len(stations) == 0:
        return np.zeros((0, 3))
    along = arc_length(stations, offsets)
    counts = np.diff(offsets)
    first, last = np.repeat(offsets[:-1], counts), np.repeat(offsets[1:] - 1, counts)
    shift = np.arange(-reach, reach + 1)
    wanted = np.arange(len(stations))[:, None] + shift
    near = np.clip(wanted, first[:, None], last[:, None])
    weight = np.where(near == wanted, 1 - (shift / (reach + 1)) ** 2, 0.0)
    step = along[near] - along[:, None]
    scale = np.abs(step).max(axis=1, keepdims=True)
    step = step / np.where(scale > 0, scale, 1.0)
    powers = weight[..., None] * np.stack((np.ones_like(step), step, step**2), axis=-1)
    moved = weight[..., None] * (stations[near] - stations[:, None])
    slope = np.einsum("nk,nkc->nc", np.linalg.pinv(powers, rcond=1e-9)[:, 1], moved)
    size = np.linalg.norm(slope, axis=1, keepdims=True)
    return np.asarray(slope / np.where(size > 0, size, 1.0))


def _unit(directions: FloatArray, n_stations: int) -> FloatArray:
    """Directions of length 1, one per station."""
    if len(directions) != n_stations:
        raise InputError(f"tangents: {len(directions)} rows for {n_stations} stations; give one per station")
    size = np.linalg.norm(directions, axis=1, keepdims=True)
    if not (size > 0).all():
        first = int(np.argmin(size))
        raise InputError(f"tangent of station {first} has no length: drop repeated stations or give tangents")
    return np.asarray(directions / size)


@dataclass(frozen=True, eq=False)
class _Columns:
    """Measures of all stations while they are filled in."""

    values: FloatArray
    centre: FloatArray
    marks: Uint8Array

    @classmethod
    def empty(cls, n: int) -> _Columns:
        """Nothing measured, everything outside."""
        return cls(np.full((n, 5), np.nan), np.full((n, 3), np.nan), np.full(n, CutMark.OUTSIDE.value, np.uint8))

    def put(self, rows: IntArray, measured: _Columns) -> None:
        """Take the measures of some stations in."""
        self.values[rows], self.centre[rows], self.marks[rows] = measured.values, measured.centre, measured.marks

    def sections(self, stations: FloatArray, tangent: FloatArray) -> CrossSections:
        """The same as a result."""
        area, perimeter, moment, dent, obliqueness = self.values.T
        offset = np.linalg.norm(self.centre - stations, axis=1)
        return CrossSections(
            area, perimeter, moment, self.centre, offset, dent, obliqueness, tangent, self.marks
        )  # fmt: skip


def _measured(surface: Surface, stations: FloatArray, normals: FloatArray, settings: CutSettings) -> _Columns:
    """Sections of a few stations."""
    cuts = cut(surface, stations, normals)
    across, up = plane_axes(normals)
    away = cuts.points - stations[cuts.plane]
    flat = [np.einsum("ij,ij->i", away, axis[cuts.plane]) for axis in (across, up)]
    found = outlines(np.stack(flat, axis=1), cuts.edges, cuts.plane)
    columns = _Columns.empty(len(stations))
    chosen, nested = _round_station(found, len(stations))
    rows = np.flatnonzero(chosen >= 0)
    ring = chosen[rows]
    centre = found.centre[ring]
    values = np.stack((found.area, found.perimeter, found.polar_moment), axis=1)[ring]
    dent = dents(found, ring)
    oblique = _obliqueness(found, ring, surface.normals[cuts.triangle], normals[rows])
    columns.values[rows] = np.concatenate((values, dent[:, None], oblique[:, None]), axis=1)
    columns.centre[rows] = stations[rows] + centre[:, :1] * across[rows] + centre[:, 1:] * up[rows]
    columns.marks[:] = _missing(found, len(stations))
    columns.marks[rows] = _doubts(found, ring, columns.values[rows], settings)
    columns.marks[nested] |= CutMark.TOUCHING.value
    return columns


def _round_station(found: Outlines, n_stations: int) -> tuple[IntArray, IntArray]:
    """The smallest closed curve round each station, or −1; stations with several round them."""
    round_it = np.flatnonzero(found.closed & (found.winding > math.pi))
    order = round_it[np.lexsort((found.area[round_it], found.plane[round_it]))]
    plane, first, count = np.unique(found.plane[order], return_index=True, return_counts=True)
    chosen = np.full(n_stations, -1, np.int64)
    chosen[plane] = order[first]
    return chosen, plane[count > 1]


def _obliqueness(found: Outlines, ring: IntArray, wall: FloatArray, normals: FloatArray) -> FloatArray:
    """Angle between the plane's normal and the direction in which the wall's normals vary least."""
    if len(ring) == 0:
        return np.zeros(0)
    counts = found.offsets[ring + 1] - found.offsets[ring] - 1
    starts = np.cumsum(counts) - counts
    row = np.arange(counts.sum()) + np.repeat(found.offsets[ring] - starts, counts)
    length = np.linalg.norm(found.points[row + 1] - found.points[row], axis=1)
    unit = wall[found.edge[row - np.repeat(ring, counts)]]
    total = np.add.reduceat(length, starts)
    mean = np.add.reduceat(length[:, None] * unit, starts) / total[:, None]
    apart = unit - np.repeat(mean, counts, axis=0)
    spread = np.add.reduceat(length[:, None, None] * apart[:, :, None] * apart[:, None, :], starts)
    axis = np.linalg.eigh(spread)[1][:, :, 0]
    return np.asarray(np.arccos(np.clip(np.abs(np.einsum("ij,ij->i", axis, normals)), 0.0, 1.0)))


def _doubts(found: Outlines, ring: IntArray, values: FloatArray, settings: CutSettings) -> Uint8Array:
    """Marks of the sections that there are."""
    area, _, _, dent, obliqueness = values.T
    radius = np.sqrt(area / np.pi)
    away = np.linalg.norm(found.centre[ring], axis=1)
    indented = (dent > settings.largest_dent * radius) | (found.turned_back[ring] > _TURNED_BACK)
    twice = found.winding[ring] > 3 * math.pi
    marks = CutMark.INDENTED.value * indented
    marks += CutMark.OBLIQUE.value * (obliqueness > settings.largest_obliqueness)
    marks += CutMark.OFF_CENTRE.value * (away > settings.largest_offset * radius)
    marks += CutMark.TOUCHING.value * (twice | _meets(found, ring))
    return np.asarray(marks, np.uint8)


def _meets(found: Outlines, ring: IntArray) -> BoolArray:
    """Whether a lumen holds part of another curve of its plane, or crosses itself."""
    reach = _reach(found, ring)
    owner = np.repeat(np.arange(len(found.plane)), np.diff(found.offsets))
    of_plane = np.full(int(found.plane.max(initial=-1)) + 1, -1, np.int64)
    of_plane[found.plane[ring]] = np.arange(len(ring))
    row = of_plane[found.plane[owner]]
    other = (row >= 0) & (ring[row] != owner) if len(ring) else np.zeros(len(owner), np.bool_)
    other[other] = np.linalg.norm(found.points[other], axis=1) < reach[row[other]]
    meets = np.zeros(len(ring), np.bool_)
    for i in np.unique(row[other]).tolist():
        meets[i] = holds(found.curve(ring[i]), found.points[other & (row == i)]).any()
    for i in np.flatnonzero((found.turned_back[ring] > _TURNED_BACK) & ~meets).tolist():
        meets[i] = crosses_itself(found.curve(ring[i]))
    return meets


def _reach(found: Outlines, ring: IntArray) -> FloatArray:
    """Distance from each station to the farthest point of its lumen."""
    if len(ring) == 0:
        return np.zeros(0)
    return np.maximum.reduceat(np.linalg.norm(found.points, axis=1), found.offsets[:-1])[ring]


def _missing(found: Outlines, n_stations: int) -> Uint8Array:
    """Why a station has no closed curve round it."""
    marks = np.full(n_stations, CutMark.OUTSIDE.value, np.uint8)
    marks[found.plane[~found.closed & (found.winding > _LEAST_TURN)]] = CutMark.OPEN.value
    marks[found.pinched] = CutMark.TOUCHING.value
    return marks


def _abrupt(area: FloatArray, stations: FloatArray, offsets: IntArray, steepest: float) -> BoolArray:
    """Sections wider than the cone that opens from any other section of their line."""
    if len(area) == 0:
        return np.zeros(0, np.bool_)
    radius = np.sqrt(np.where(np.isnan(area), np.inf, area) / np.pi)
    rise = steepest * arc_length(stations, offsets)
    finite = np.isfinite(radius)
    apart = 2 * (rise.max() + radius[finite].max(initial=0.0))  # lines laid below one another do not meet
    line = np.repeat(np.arange(len(offsets) - 1), np.diff(offsets)) * apart
    before = np.minimum.accumulate(radius - rise - line) + rise + line
    after = np.minimum.accumulate((radius + rise + line)[::-1])[::-1] - rise - line
    return np.asarray(finite & (radius > (1 + _ABRUPT) * np.minimum(before, after)))
