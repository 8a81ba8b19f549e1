"""What differs between two networks: vessels new, gone, longer, shorter, wider, narrower, split, joined."""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import IntEnum

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components
from scipy.special import ndtr, ndtri

from geomprep.measure.alongside import Cells, Nearest, Reach, cells, nearest, nearest_of_pairs, shared_pairs
from geomprep.measure.comparison_settings import ComparisonSettings
from geomprep.model import BoolArray, FloatArray, IntArray, Stations, TextArray, Uint8Array

__all__ = ["Change", "Comparison", "ComparisonSettings", "Vessels", "compare_vessels", "local_changes", "shared_length"]

_AROUND = 2
"""Cells on both sides over which a local change of radius is averaged."""


class Change(IntEnum):
    """How a vessel of the second network differs from that of the first; a vessel may differ in several ways."""

    NEW = 0
    GONE = 1
    LONGER = 2
    SHORTER = 3
    WIDER = 4
    NARROWER = 5
    SPLIT = 6
    JOINED = 7
    REROUTED = 8
    RENAMED = 9


@dataclass(frozen=True, eq=False)
class Vessels:
    """What is compared of a network of s segments.

    Attributes
    ----------
    stations : Stations
    from_node, to_node : (s,) int array
    name : (s,) str array
        Empty where none is known.
    vessel_class : (s,) uint8 array
        0 unknown, 1 artery, 2 vein.
    """

    stations: Stations
    from_node: IntArray
    to_node: IntArray
    name: TextArray
    vessel_class: Uint8Array


@dataclass(frozen=True, eq=False)
class Comparison:
    """Two networks, vessel by vessel; g groups of segments that answer to one another.

    Columns 0 and 1 belong to the first and the second network.

    Attributes
    ----------
    group : tuple of two (s,) int arrays
        Group of each segment of both networks; a segment that answers to none is a group of its own.
    changes : (g, 10) bool array
        Which of :class:`Change` hold.
    length, shared : (g, 2) float array
        Length, and how much of it runs along the other network, m.
    radius : (g, 2) float array
        Radius of equal resistance over the shared length, m; of a vessel that is new or gone over all of it in the one
        network, NaN in the other.
    inverse_fourth_power : (g, 2) float array
        ∫ds/r⁴ from end to end, 1/m³; NaN for segments that form no single line (then no one number says it), and where
        there are none.
    local : (g, 2) float array
        Least and largest ln(second radius/first radius) along the shared length; NaN where nothing is shared.
    place : (g, 3) float array
        Where the radius differs most; the middle of the vessel where nothing is shared, m.
    """

    group: tuple[IntArray, IntArray]
    changes: BoolArray
    length: FloatArray
    shared: FloatArray
    radius: FloatArray
    inverse_fourth_power: FloatArray
    local: FloatArray
    place: FloatArray

    def __len__(self) -> int:
        """Return the number of groups."""
        return len(self.changes)


@dataclass(frozen=True, eq=False)
class _Side:
    """One network while it is compared."""

    vessels: Vessels
    cells: Cells
    along: Nearest
    group: IntArray  # of each segment
    sign: float  # turns ln(other radius/own radius) into ln(second/first)


def compare_vessels(first: Vessels, second: Vessels, settings: ComparisonSettings | None = None) -> Comparison:
    """Compare two networks by their geometry.

    Cells of either network are laid on the nearest axis of the other that is near enough and runs the same way.
    Segments that share half of the shorter one, seen from both sides, answer to one another; connected
    sets of them are compared as one vessel, so that a segment cut in two is told from a change.

    Parameters
    ----------
    first, second : Vessels
        In one frame.
    settings : ComparisonSettings, optional

    Returns
    -------
    Comparison
        Swapping the networks swaps new and gone, longer and shorter, and so on, with equal numbers.

    Examples
    --------
    A vessel of 2 mm against the same at 1.5 mm:

    >>> def tube(radius):
    ...     line = Stations([0, 2], [0.0, 0.03], [[0.0, 0, 0], [0.03, 0, 0]], [radius, radius], [0, 0])
    ...     return Vessels(line, np.array([0]), np.array([1]), np.array([""], object), np.array([1], np.uint8))
    >>> found = compare_vessels(tube(2e-3), tube(1.5e-3))
    >>> [Change(kind).name for kind in np.flatnonzero(found.changes[0])], found.radius.round(6).tolist()
    (['NARROWER'], [[0.002, 0.0015]])
    """
    settings = settings or ComparisonSettings()
    sides, groups = _laid_together(first, second, settings)
    length, shared, whole = (
        np.column_stack([function(side, groups) for side in sides]) for function in (_length, _shared, _line_integral)
    )
    radius = np.column_stack([_shared_radius(side, groups) for side in sides])
    seen = _seen(sides)
    found = Comparison(
        group=(sides[0].group, sides[1].group),
        changes=np.zeros((groups, len(Change)), np.bool_),
        length=length,
        shared=shared,
        radius=radius,
        inverse_fourth_power=whole,
        local=_extremes(seen, groups),
        place=seen.middle[_most_or_middle(np.abs(np.nan_to_num(seen.change)), seen.group, groups)],
    )
    _mark(found, sides, settings)
    found.changes[:, [Change.WIDER, Change.NARROWER]] |= _beyond(seen, groups, settings)
    return found


def _laid_together(first: Vessels, second: Vessels, settings: ComparisonSettings) -> tuple[tuple[_Side, _Side], int]:
    """Both networks with what each cell runs along and the group of each segment, and how many groups there are."""
    reach = Reach(settings.within, settings.named_within, settings.voxel or 0.0, math.cos(settings.angle))
    one, two = (cells(each.stations, settings.cell) for each in (first, second))
    kinds = (first.name, first.vessel_class), (second.name, second.vessel_class)
    back = kinds[1], kinds[0]
    met = (one, nearest(one, two, kinds, reach)), (two, nearest(two, one, back, reach))
    pairs = shared_pairs(*met, settings.share)
    size = len(first.name), len(second.name)
    matrix = coo_array((np.ones(len(pairs)), (pairs[:, 0], size[0] + pairs[:, 1])), shape=(sum(size), sum(size)))
    groups, label = connected_components(matrix, directed=False)
    label = label.astype(np.int64)
    return (
        _Side(first, one, nearest_of_pairs(one, two, kinds, reach, pairs, met[0][1]), label[: size[0]], 1.0),
        _Side(second, two, nearest_of_pairs(two, one, back, reach, pairs[:, ::-1], met[1][1]), label[size[0] :], -1.0),
    ), int(groups)


def _of_group(side: _Side, groups: int, values: FloatArray) -> FloatArray:
    """Values of cells summed over groups."""
    return np.bincount(side.group[side.cells.segment], values, groups).astype(np.float64)


def _length(side: _Side, groups: int) -> FloatArray:
    """Length of each group."""
    return _of_group(side, groups, side.cells.length)


def _shared(side: _Side, groups: int) -> FloatArray:
    """Length of each group that runs along the other network."""
    return _of_group(side, groups, np.where(side.along.segment >= 0, side.cells.length, 0.0))


def _shared_radius(side: _Side, groups: int) -> FloatArray:
    """Radius of equal resistance over the shared length, or over all of it where nothing is shared."""
    met = side.along.segment >= 0
    met |= (_shared(side, groups) == 0)[side.group[side.cells.segment]]
    length = _of_group(side, groups, np.where(met, side.cells.length, 0.0))
    whole = _of_group(side, groups, np.where(met, side.cells.inverse_fourth_power, 0.0))
    absent = whole == 0
    return np.where(absent, np.nan, (length / np.where(absent, 1.0, whole)) ** 0.25)


def _line_integral(side: _Side, groups: int) -> FloatArray:
    """∫ds/r⁴ of groups whose segments form a single line; NaN for others."""
    count = np.bincount(side.group, minlength=groups)
    ends = np.concatenate((side.vessels.from_node, side.vessels.to_node))
    columns = int(ends.max(initial=0)) + 1
    key, place, degree = np.unique(
        np.tile(side.group, 2) * columns + ends, return_inverse=True, return_counts=True
    )  # nodes, once in each group that touches them
    tail, head = place.reshape(2, -1)
    matrix = coo_array((np.ones(len(tail)), (tail, head)), shape=(len(key), len(key)))
    part = connected_components(matrix, directed=False)[1]
    nodes = np.bincount(key // columns, minlength=groups)
    parts = np.bincount(key[np.unique(part, return_index=True)[1]] // columns, minlength=groups)
    forked = np.bincount(key[degree > 2] // columns, minlength=groups) > 0
    line = (count > 0) & ~forked & (parts == 1) & (nodes == count + 1)
    return np.where(line, _of_group(side, groups, side.cells.inverse_fourth_power), np.nan)


def local_changes(cut: Cells, along: Nearest) -> FloatArray:
    """Return ln(other radius/own radius) of each cell, averaged over five cells of its segment that run along the other.

    Parameters
    ----------
    cut : Cells
    along : Nearest

    Returns
    -------
    (c,) float array
        NaN where fewer than three of the five do, or the cell itself does not.

    Examples
    --------
    >>> line = Stations([0, 2], [0.0, 0.01], [[0.0, 0, 0], [0.01, 0, 0]], [1e-3, 1e-3], [0, 0])
    >>> found = local_changes(cells(line, 0.5), Nearest(np.zeros(20, np.int64), np.full(20, 2e-3)))
    >>> np.exp(found[[0, 10]]).round(9).tolist()
    [2.0, 2.0]
    """
    met = along.segment >= 0
    value = np.where(met, np.log(np.where(met, along.radius, 1.0) / cut.radius), 0.0)
    total, number = (np.concatenate(([0.0], np.cumsum(column))) for column in (value, met.astype(np.float64)))
    row = np.arange(len(value))
    low = np.maximum(row - _AROUND, cut.first[cut.segment])
    high = np.minimum(row + _AROUND + 1, cut.first[cut.segment + 1])
    count = number[high] - number[low]
    return np.where(met & (count >= 3), (total[high] - total[low]) / np.maximum(count, 1.0), np.nan)


@dataclass(frozen=True, eq=False)
class _Seen:
    """Cells of both networks: group, ln(second radius/first), mean of both radii (NaN where not shared), middle."""

    group: IntArray
    change: FloatArray
    radius: FloatArray
    middle: FloatArray


def _seen(sides: tuple[_Side, _Side]) -> _Seen:
    """Local changes seen from both sides."""
    return _Seen(
        group=np.concatenate([side.group[side.cells.segment] for side in sides]),
        change=np.concatenate([side.sign * local_changes(side.cells, side.along) for side in sides]),
        radius=np.concatenate([0.5 * (side.cells.radius + side.along.radius) for side in sides]),
        middle=np.concatenate([side.cells.middle for side in sides]),
    )


def _extremes(seen: _Seen, groups: int) -> FloatArray:
    """Least and largest local change of each group; NaN where there is none."""
    known = np.flatnonzero(np.isfinite(seen.change))
    local = np.full((groups, 2), np.nan)
    if known.size:
        rows = known[np.lexsort((seen.change[known], seen.group[known]))]
        starts = np.flatnonzero(np.diff(seen.group[rows], prepend=-1))
        ends = np.append(starts[1:], len(rows)) - 1
        local[seen.group[rows[starts]]] = np.column_stack((seen.change[rows[starts]], seen.change[rows[ends]]))
    return local


def _beyond(seen: _Seen, groups: int, settings: ComparisonSettings) -> BoolArray:
    """Whether a group is somewhere wider, and somewhere narrower, than limit and noise, (g, 2).

    The longer a vessel, the more places have a chance to differ by noise: the factor of the noise
    rises so that the chance for the whole vessel stays that of a single place (Bonferroni's bound).
    """
    known = np.isfinite(seen.change)
    places = np.bincount(seen.group[known], minlength=groups) / (2 * (2 * _AROUND + 1))
    factor = -ndtri(ndtr(-settings.noise_factor) / np.maximum(places, 1.0))
    noise = factor[seen.group] * math.sqrt(2) * settings.radius_noise / seen.radius
    limit = np.maximum(math.log1p(settings.local_change), noise)
    beyond = [known & (sign * seen.change > limit) for sign in (1.0, -1.0)]
    return np.column_stack([np.bincount(seen.group[each], minlength=groups) > 0 for each in beyond])


def _most_or_middle(size: FloatArray, group: IntArray, groups: int) -> IntArray:
    """Row of the largest size of each group, or its middle row where there is none above rounding."""
    order = np.lexsort((np.arange(len(group)), group))
    starts = np.searchsorted(group[order], np.arange(groups))
    counts = np.bincount(group, minlength=groups)
    middle = order[starts + counts // 2]
    largest = np.maximum.reduceat(size[order], starts) if groups else np.zeros(0)
    by_size = np.lexsort((-size, group))[starts] if groups else np.zeros(0, np.int64)
    chosen: IntArray = np.where(largest > 1e-9, by_size, middle)
    return chosen


def _mark(found: Comparison, sides: tuple[_Side, _Side], settings: ComparisonSettings) -> None:
    """Set the changes of each group."""
    count = [np.bincount(side.group, minlength=len(found)) for side in sides]
    both = (count[0] > 0) & (count[1] > 0)
    mean_radius = np.mean([_mean_radius(side, len(found)) for side in sides], axis=0)
    put = found.changes
    put[:, Change.NEW], put[:, Change.GONE] = count[0] == 0, count[1] == 0
    put[:, Change.SPLIT], put[:, Change.JOINED] = both & (count[1] > 1), both & (count[0] > 1)
    limit = _length_limit(found, mean_radius, settings)
    grown = found.length[:, 1] - found.length[:, 0]
    put[:, Change.LONGER], put[:, Change.SHORTER] = both & (grown > limit), both & (grown < -limit)
    apart = (found.length - found.shared > limit[:, None]).all(axis=1)
    put[:, Change.REROUTED] = both & apart
    whole = np.log(found.radius[:, 1] / found.radius[:, 0])
    wide = _radius_limit(mean_radius, settings)
    put[:, Change.WIDER], put[:, Change.NARROWER] = both & (whole > wide), both & (whole < -wide)
    put[:, Change.RENAMED] = both & _other_names(sides, len(found))


def _mean_radius(side: _Side, groups: int) -> FloatArray:
    """Mean radius of each group by length; 0 where the network has none of it."""
    length = _length(side, groups)
    return _of_group(side, groups, side.cells.length * side.cells.radius) / np.where(length > 0, length, 1.0)


def _length_limit(found: Comparison, mean_radius: FloatArray, settings: ComparisonSettings) -> FloatArray:
    """Difference of length above which a vessel is longer or shorter, m."""
    noise = settings.noise_factor * math.sqrt(2) * settings.position_noise
    relative = settings.length_change * found.length.mean(axis=1)
    limit: FloatArray = np.maximum(np.maximum(relative, settings.end_shift * mean_radius), noise)
    return limit


def _radius_limit(mean_radius: FloatArray, settings: ComparisonSettings) -> FloatArray:
    """Logarithm of the ratio of radii above which a vessel has changed as a whole."""
    noise = settings.noise_factor * math.sqrt(2) * settings.radius_noise / mean_radius
    return np.maximum(math.log1p(settings.radius_change), noise)


def _other_names(sides: tuple[_Side, _Side], groups: int) -> BoolArray:
    """Whether both networks name a group, and share no name of it."""
    words = np.concatenate([side.vessels.name for side in sides]).astype(str)
    number = np.unique(words, return_inverse=True)[1]
    named = words != ""
    group = np.concatenate([side.group for side in sides])
    side = np.repeat([0, 1], [len(each.group) for each in sides])
    key = group * max(len(words), 1) + number
    mine, theirs = (np.unique(key[named & (side == one)]) for one in (0, 1))
    has, had, common = (
        np.bincount(keys // max(len(words), 1), minlength=groups) > 0
        for keys in (mine, theirs, np.intersect1d(mine, theirs))
    )
    other: BoolArray = has & had & ~common
    return other


def shared_length(found: Comparison) -> float:
    """Return the part of the length of both networks that runs along the other, 0 to 1.

    Parameters
    ----------
    found : Comparison

    Examples
    --------
    >>> line = Stations([0, 2], [0.0, 0.03], [[0.0, 0, 0], [0.03, 0, 0]], [1e-3, 1e-3], [0, 0])
    >>> tube = Vessels(line, np.array([0]), np.array([1]), np.array([""], object), np.array([1], np.uint8))
    >>> shared_length(compare_vessels(tube, tube))
    1.0
    """
    return float(found.shared.sum() / found.length.sum())
