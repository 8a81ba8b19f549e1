"""Where tubes that meet at a node leave one another, and the volume they have in common.

Tubes are centrelines with radii, sampled from a node outwards. A *path* is the axis of one tube, or
of two that continue one another through the node. All pairs of ends are worked on at once, in blocks.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from geomprep.curves import piece_integrals
from geomprep.model import BoolArray, FloatArray, IntArray, Stations

__all__ = ["Axes", "EndPairs", "Ends", "exit_distances", "overlap_volumes"]

_STEPS = 33  # places along a branch at which it is looked at
_SLICES = 29  # cross-sections along a branch, for volumes
_VERTICES = 41  # of a path
_BLOCK = 64  # ends taken at once: 64 · 2 · 29 · 16 · 41 numbers are 19 MB


@dataclass(frozen=True, eq=False)
class Ends:
    """Segment ends at junctions.

    Attributes
    ----------
    segment : (t,) int array
    end : (t,) int array
        0 where the segment starts here, 1 where it ends here.
    length : (t,) float array
        Length of the segment, m.
    widest : (t,) float array
        Largest radius at the junction, m.
    """

    segment: IntArray
    end: IntArray
    length: FloatArray
    widest: FloatArray

    def __len__(self) -> int:
        """Return the number of ends."""
        return len(self.segment)

    def rows(self, mask: BoolArray) -> Ends:
        """Return some of the ends."""
        return Ends(*(getattr(self, name)[mask] for name in self.__dataclass_fields__))


@dataclass(frozen=True, eq=False)
class EndPairs:
    """Ends beside the paths that they leave or touch, sorted by `owner`.

    Attributes
    ----------
    owner : (p,) int array
        The end that is looked at.
    first, second : (p,) int array
        Ends that make the path; `second` is −1 where the path stops at its node.
    is_parent : (p,) bool array
        The whole common volume belongs to the path; else it is shared alike.
    is_left : (p,) bool array
        The path counts where the owner starts.
    """

    owner: IntArray
    first: IntArray
    second: IntArray
    is_parent: BoolArray
    is_left: BoolArray

    def rows(self, mask: BoolArray) -> EndPairs:
        """Return some of the pairs."""
        return EndPairs(*(getattr(self, name)[mask] for name in self.__dataclass_fields__))


@dataclass(frozen=True, eq=False)
class Axes:
    """Stations laid out so that any place on any segment is found by one search.

    Attributes
    ----------
    along : (n,) float array
        Distance of every station with all segments in a row, a metre apart.
    start : (s,) float array
        Where each segment begins in that row.
    length : (s,) float array
    values : (n, 4) float array
        x, y, z, r in m.
    stations : Stations
    """

    along: FloatArray
    start: FloatArray
    length: FloatArray
    values: FloatArray
    stations: Stations

    @classmethod
    def of(cls, stations: Stations) -> Axes:
        """Lay the stations out."""
        length = stations.distance[stations.offsets[1:] - 1]
        start = np.cumsum(length + 1.0) - length - 1.0
        values = np.column_stack((stations.position, stations.radius))
        return cls(stations.distance + start[stations.segment], start, length, values, stations)

    def sampled(self, segment: IntArray, end: IntArray, at: FloatArray) -> FloatArray:
        """Return position and radius at distances from segment ends.

        Parameters
        ----------
        segment, end : (t, 1) or (t, k) int array
            Segment, and 0 to measure from its first station or 1 from its last.
        at : (t, k) float array
            Distance from that end, m; clipped to the segment.

        Returns
        -------
        (t, k, 4) float array
            x, y, z, r in m.

        Examples
        --------
        >>> axes = Axes.of(Stations([0, 2], [0.0, 2.0], [[0.0, 0, 0], [2, 0, 0]], [1.0, 3.0], [0, 0]))
        >>> axes.sampled(np.array([[0]]), np.array([[1]]), np.array([[0.5]]))
        array([[[1.5, 0. , 0. , 2.5]]])
        """
        offsets, distance = self.stations.offsets, self.stations.distance
        place = np.clip(np.where(end == 0, at, self.length[segment] - at), 0.0, self.length[segment])
        upper = np.searchsorted(self.along, place + self.start[segment])
        upper = np.clip(upper, offsets[segment] + 1, offsets[segment + 1] - 1)
        lower = upper - 1
        part = np.clip((place - distance[lower]) / (distance[upper] - distance[lower]), 0.0, 1.0)[..., None]
        return np.asarray(self.values[lower] * (1.0 - part) + self.values[upper] * part)


def exit_distances(axes: Axes, ends: Ends, pairs: EndPairs) -> FloatArray:
    """Return how far along each end its axis is the path's radius away from the path.

    Stretches twice as long are searched one after the other. The place is interpolated linearly
    between samples a thousandth of the stretch apart.

    Parameters
    ----------
    axes : Axes
    ends : Ends
    pairs : EndPairs
        Those with `is_left` count; where an end has several, the last to be left.

    Returns
    -------
    (t,) float array
        Distance from the node, m; 0 for ends that own no pair, the length for those that never leave.

    Examples
    --------
    Two tubes of radius 1 and 0.5 at a right angle:

    >>> x = [[0.0, 0, 0], [9, 0, 0], [0, 0, 0], [0, 9, 0]]
    >>> tubes = Stations([0, 2, 4], [0.0, 9, 0, 9], x, [1.0, 1, 0.5, 0.5], [0] * 4)
    >>> ends = Ends(np.array([0, 1]), np.array([0, 0]), np.array([9.0, 9]), np.array([1.0, 1]))
    >>> pair = EndPairs(*(np.array([value]) for value in (1, 0, -1, True, True)))
    >>> exit_distances(Axes.of(tubes), ends, pair).round(6)
    array([0., 1.])
    """
    pairs = pairs.rows(pairs.is_left)
    low, high = np.zeros((2, len(ends)))
    active = np.unique(pairs.owner)
    reach = np.minimum(3 * ends.widest, ends.length)
    while len(active):
        start, stop = high[active], reach[active]
        before, after, found = _first_outside(axes, ends, pairs, active, (start, stop))
        low[active], high[active] = np.where(found, before, stop), np.where(found, after, stop)
        active = active[~found & (stop < ends.length[active])]
        reach[active] = np.minimum(2 * reach[active], ends.length[active])
    bracket = np.flatnonzero(high > low)
    low[bracket], high[bracket], _ = _first_outside(
        axes, ends, pairs, bracket, (low[bracket], high[bracket]), exact=True
    )
    return high


def _first_outside(
    axes: Axes,
    ends: Ends,
    pairs: EndPairs,
    owners: IntArray,
    stretch: tuple[FloatArray, FloatArray],
    exact: bool = False,
) -> tuple[FloatArray, FloatArray, BoolArray]:
    """Last place inside and first outside (the crossing itself if exact), and whether there is one."""
    start, stop = stretch
    at = start[:, None] + (stop - start)[:, None] * np.linspace(0.0, 1.0, _STEPS)

    def depth(rows: IntArray, own: EndPairs, owner: IntArray) -> FloatArray:
        """Distance outside all paths, negative inside one."""
        axis = axes.sampled(ends.segment[owners[rows], None], ends.end[owners[rows], None], at[rows])
        outside = _outside(axis[owner, :, None, :3], *_paths(axes, ends, own, 2 * stop[rows][owner]), flat=False)
        first = np.flatnonzero(np.diff(owner, prepend=-1))
        return np.minimum.reduceat(outside[:, :, 0], first)

    gap = _in_blocks(depth, pairs, owners, np.zeros((len(owners), _STEPS)))
    found: BoolArray = np.any(gap >= 0, axis=1)
    k = np.argmax(gap >= 0, axis=1)
    row = np.arange(len(owners))
    before, after = np.maximum(k - 1, 0), k
    inside, outside = gap[row, before], gap[row, after]
    part = np.where(after > before, inside / np.where(inside < outside, inside - outside, 1.0), 0.0)
    crossing = at[row, before] + np.clip(part, 0.0, 1.0) * (at[row, after] - at[row, before])
    return at[row, before], crossing if exact else at[row, after], found


def _in_blocks(
    work: Callable[[IntArray, EndPairs, IntArray], FloatArray], pairs: EndPairs, owners: IntArray, out: FloatArray
) -> FloatArray:
    """Fill rows of `out`: blocks of owners with their pairs, and the number of each pair's owner in the block."""
    first = np.searchsorted(pairs.owner, owners)
    count = np.searchsorted(pairs.owner, owners, side="right") - first
    for begin in range(0, len(owners), _BLOCK):
        rows = np.arange(begin, min(begin + _BLOCK, len(owners)))
        owner = np.repeat(np.arange(len(rows)), count[rows])
        before = np.repeat(np.cumsum(count[rows]) - count[rows], count[rows])
        chosen = np.repeat(first[rows], count[rows]) + np.arange(len(owner)) - before
        out[rows] = work(rows, pairs.rows(chosen), owner)
    return out


def _paths(axes: Axes, ends: Ends, pairs: EndPairs, reach: FloatArray) -> tuple[FloatArray, BoolArray]:
    """Vertices (p, v, 4) of paths up to a reach, from far to the node and on, and whether they stop at the node."""
    half, number = _VERTICES // 2, np.arange(_VERTICES)
    single = pairs.second < 0
    other = np.where(single, pairs.first, pairs.second)
    side = np.where(number <= half, pairs.first[:, None], other[:, None])
    part = np.where(single[:, None], 1.0 - number / (_VERTICES - 1), np.abs(number - half) / half)
    at = part * np.minimum(reach[:, None], ends.length[side])
    path = axes.sampled(ends.segment[side], ends.end[side], at)
    # both sides count alike where their radii differ at the node, or their nodes within one junction
    node = axes.sampled(ends.segment[other, None], ends.end[other, None], at[:, half, None])[:, 0]
    path[:, half] = 0.5 * (path[:, half] + node)
    return path, single


def _outside(points: FloatArray, path: FloatArray, single: BoolArray, flat: bool) -> FloatArray:
    """Signed distance from the surface of each path of points (p, k, f, 3), positive outside.

    With `flat`, a path that stops at its node is cut off there; else it ends in a half sphere.
    """
    shape = points.shape[:3]
    origin = path[:, _VERTICES // 2, None, :3]  # products of coordinates far from 0 would lose digits
    vertex = np.concatenate((path[..., :3] - origin, path[..., 3:]), axis=2)
    x = points.reshape(len(path), -1, 3) - origin
    square = np.einsum("pvi,pvi->pv", vertex[..., :3], vertex[..., :3])[:, None, :]
    nearest = np.argmin(square - 2 * x @ np.swapaxes(vertex[..., :3], 1, 2), axis=2)
    row = np.arange(len(path))[:, None]
    after = np.minimum(nearest, _VERTICES - 2)
    ahead = np.einsum("pki,pki->pk", x - vertex[row, after, :3], (vertex[:, 1:] - vertex[:, :-1])[row, after, :3])
    j = np.where((nearest > 0) & (ahead < 0), after - 1, after)
    run, slope = (vertex[:, 1:] - vertex[:, :-1])[row, j, :3], (vertex[:, 1:] - vertex[:, :-1])[row, j, 3]
    away = x - vertex[row, j, :3]
    size = np.einsum("pki,pki->pk", run, run)
    t = np.einsum("pki,pki->pk", away, run) / np.where(size > 0, size, 1.0)
    clipped = np.clip(t, 0.0, 1.0)
    away -= clipped[..., None] * run
    result = np.sqrt(np.einsum("pki,pki->pk", away, away)) - vertex[row, j, 3] - clipped * slope
    if flat:
        cut = single[:, None] & (j == _VERTICES - 2)
        result = np.where(cut, np.maximum(result, (t - 1) * np.sqrt(size)), result)
    return np.asarray(result.reshape(shape))


def overlap_volumes(axes: Axes, ends: Ends, pairs: EndPairs, exits: FloatArray) -> FloatArray:
    """Return the volume at each end that other tubes hold, or its share of what they hold in common.

    Cross-sections of the tube are filled with fibres by a Gauss rule on the disc, and each fibre is
    followed from inside the other tubes to outside. Tubes end flat at their nodes. What lies in a parent
    is the parent's; what lies in n other tubes belongs to each of the n + 1 in equal parts.

    Parameters
    ----------
    axes : Axes
    ends : Ends
    pairs : EndPairs
    exits : (t,) float array
        From :func:`exit_distances`.

    Returns
    -------
    (t,) float array
        m³; 0 for ends that own no pair.

    Examples
    --------
    Two halves of one tube that run the same way: each holds half of the length that is searched.

    >>> x = [[0.0, 0, 0], [9, 0, 0], [0, 0, 0], [9, 0, 0]]
    >>> tubes = Stations([0, 2, 4], [0.0, 9, 0, 9], x, [1.0] * 4, [0] * 4)
    >>> ends = Ends(np.array([0, 1]), np.array([0, 0]), np.array([9.0, 9]), np.array([1.0, 1]))
    >>> both = [np.array([0, 1]), np.array([1, 0]), np.array([-1, -1]), np.zeros(2, bool), np.ones(2, bool)]
    >>> (overlap_volumes(Axes.of(tubes), ends, EndPairs(*both), np.array([9.0, 9])) / (9 * np.pi)).round(6)
    array([0.5, 0.5])
    """
    owners = np.unique(pairs.owner)
    own = axes.sampled(ends.segment[:, None], ends.end[:, None], ends.widest[:, None])[:, 0, 3]
    reach = np.minimum(2 * exits + 6 * np.maximum(own, 0.5 * ends.widest), ends.length)
    place, weight = _disc()

    def held(rows: IntArray, pair: EndPairs, owner: IntArray) -> FloatArray:
        """Volume of the tubes in a block that is not their own."""
        at = reach[owners[rows], None] * np.linspace(0.0, 1.0, _SLICES)
        tube = axes.sampled(ends.segment[owners[rows], None], ends.end[owners[rows], None], at)
        step = np.diff(at, axis=1)
        volume = piece_integrals(step.ravel(), tube[:, :-1, 3].ravel(), tube[:, 1:, 3].ravel())[:, 0]
        paths, single = _paths(axes, ends, pair, 2 * reach[owners[rows]][owner])
        head = np.flatnonzero(np.diff(owner, prepend=-1))
        fibres = _fibres(tube, paths[head], place)
        outside = _outside(fibres[owner], paths, single, flat=True)
        within = np.maximum(-outside, 0.0)
        size = np.abs(outside[:, :-1]) + np.abs(outside[:, 1:])
        part = (within[:, :-1] + within[:, 1:]) / np.where(size > 0, size, 1.0)
        of_parent = pair.is_parent[:, None, None]
        parent = np.add.reduceat(part * of_parent, head)
        shared = np.add.reduceat(part * ~of_parent, head)
        kept = (1.0 - parent) / (1.0 + shared)
        return np.asarray(np.sum(volume.reshape(step.shape) * (1.0 - kept @ weight), axis=1))

    total = np.zeros(len(ends))
    total[owners] = _in_blocks(held, pairs, owners, np.zeros(len(owners)))
    return total


def _disc() -> tuple[FloatArray, FloatArray]:
    """Places (f, 2) and weights of a rule on the unit disc: Gauss in the square of the radius, 8 directions."""
    node, weight = np.polynomial.legendre.leggauss(2)
    radius, turn = np.sqrt(0.5 + 0.5 * node), (np.arange(8) + 0.5) * np.pi / 4
    place = np.stack((np.outer(radius, np.cos(turn)), np.outer(radius, np.sin(turn))), axis=2)
    return place.reshape(-1, 2), np.repeat(weight / 16, 8)


def _fibres(tube: FloatArray, path: FloatArray, place: FloatArray) -> FloatArray:
    """Points (b, k, f, 3) over the cross-sections of tubes; their frame stands on the plane of tube and path."""
    axis = np.gradient(tube[..., :3], axis=1)
    axis /= np.maximum(np.linalg.norm(axis, axis=2, keepdims=True), np.finfo(float).tiny)
    across = np.cross(axis.mean(axis=1), path[:, 0, :3] - path[:, -1, :3])
    least = np.eye(3)[np.argmin(np.abs(axis.mean(axis=1)), axis=1)]  # for parallel tubes
    scale = np.linalg.norm(path[:, 0, :3] - path[:, -1, :3], axis=1, keepdims=True)
    across = np.where(np.linalg.norm(across, axis=1, keepdims=True) > 1e-6 * scale, across, least)[:, None, :]
    u = across - np.einsum("bki,bki->bk", across * np.ones_like(axis), axis)[..., None] * axis
    u /= np.maximum(np.linalg.norm(u, axis=2, keepdims=True), np.finfo(float).tiny)
    v = np.cross(axis, u)
    offset = place[:, 0, None] * u[:, :, None, :] + place[:, 1, None] * v[:, :, None, :]
    return np.asarray(tube[:, :, None, :3] + tube[:, :, None, 3:] * offset)
