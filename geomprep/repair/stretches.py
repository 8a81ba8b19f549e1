"""Where one run lies along others: its distance sample by sample, and the stretches that are copies."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.spatial import KDTree

from geomprep.model import BoolArray, FloatArray, IntArray

__all__ = ["Beside", "Forest", "Limits", "Samples", "Stretch", "copied_stretches"]

_COS_APART = np.cos(np.radians(30.0))
_WINDOW = 1.0
"""Radii on both sides over which the distance to another run is averaged."""
_WEAK = 3.0
"""A stretch goes on while single samples stay within this many limits."""
_OF_LENGTH = 0.4
"""Largest distance of a copy in parts of its length."""
_CLOSE_PART = 0.4
"""Part of a stretch that must be close on average; lines that only cross stay below one third."""
_GAP, _INSIDE = 6.0, 0.75
"""Longest way between two stretches, and how far it may stray, in radii, to be a copy too."""
_PARTED = 0.9
"""Distance in radii up to which parting runs are taken to part at a steady angle."""


@dataclass(frozen=True, eq=False)
class Samples:
    """A run sampled at its points and, between them, a quarter of a radius apart.

    Attributes
    ----------
    edge : (k,) int array
    part : (k,) float array
        Fraction of that edge; the last sample is the end of the last edge.
    point, tangent : (k, 3) float array
        The tangent is the direction of the chord over one radius to both sides.
    radius : (k,) float array
    along : (k,) float array
        Distance along the run in local radii.
    """

    edge: IntArray
    part: FloatArray
    point: FloatArray
    tangent: FloatArray
    radius: FloatArray
    along: FloatArray

    def __getitem__(self, rows: slice) -> Samples:
        """Some of the samples."""
        return Samples(
            self.edge[rows], self.part[rows], self.point[rows], self.tangent[rows], self.radius[rows], self.along[rows]
        )


@dataclass(frozen=True, eq=False)
class Beside:
    """For each sample of a run the nearest place on the others.

    Attributes
    ----------
    edge : (k,) int array
    part : (k,) float array
    place : (k, 3) float array
    distance : (k,) float array
        In parts of the smaller radius of the two.
    cosine : (k,) float array
        Between the two tangents, without sign.
    ratio : (k,) float array
        Larger radius over smaller.
    """

    edge: IntArray
    part: FloatArray
    place: FloatArray
    distance: FloatArray
    cosine: FloatArray
    ratio: FloatArray


class Forest:
    """Nearest-neighbour search in a set of samples that grows.

    Trees of doubling size: each row is rebuilt into a larger tree a few times only.
    """

    def __init__(self) -> None:
        self._trees: list[tuple[IntArray, KDTree]] = []

    def __len__(self) -> int:
        return sum(len(rows) for rows, _ in self._trees)

    def add(self, rows: IntArray, points: FloatArray) -> None:
        """Add rows; `points` holds the places of all rows."""
        while self._trees and len(self._trees[-1][0]) <= len(rows):
            rows = np.concatenate((self._trees.pop()[0], rows))
        if len(rows):
            self._trees.append((rows, KDTree(points[rows])))

    def nearest(self, places: FloatArray, count: int, within: float) -> IntArray:
        """Rows of the nearest samples not farther than a distance, (q, c); −1 where there are fewer."""
        found = []
        apart = []
        for rows, tree in self._trees:
            distance, index = tree.query(places, k=count, distance_upper_bound=within)
            index = index.reshape(len(places), count)
            found.append(np.append(rows, -1)[np.minimum(index, len(rows))])
            apart.append(distance.reshape(len(places), count))
        if not found:
            return np.full((len(places), 1), -1, np.int64)
        order = np.argsort(np.concatenate(apart, axis=1), axis=1)[:, :count]
        nearest: IntArray = np.take_along_axis(np.concatenate(found, axis=1), order, axis=1)
        return nearest


@dataclass(frozen=True)
class Limits:
    """When a stretch counts as a copy.

    Attributes
    ----------
    apart : float
        Root mean square distance of two copies, in radii.
    overlap : float
        Shortest stretch in radii, unless it holds an open end or the whole run.
    radius_ratio : float
        Largest ratio of the two radii.
    """

    apart: float
    overlap: float
    radius_ratio: float


@dataclass(frozen=True)
class Stretch:
    """Samples ``first`` to ``last`` of a run that are a copy.

    Attributes
    ----------
    first, last : int
        At the places where the run parts from the others, or its ends.
    mean_distance, largest_distance : float
        Root mean square and maximum, in radii.
    """

    first: int
    last: int
    mean_distance: float
    largest_distance: float


def copied_stretches(run: Samples, beside: Beside, limits: Limits, open_ends: tuple[bool, bool]) -> list[Stretch]:
    """Find the stretches of a run that are copies of what it lies beside.

    A stretch is a series of samples of which each is within three limits and whose
    distance, averaged over one radius to both sides, is within the limit in the middle.

    Parameters
    ----------
    run : Samples
    beside : Beside
    limits : Limits
    open_ends : tuple of bool
        Whether the run begins and ends at an open end.
    """
    capped = np.minimum(beside.distance, 3.0)
    close = (_windowed(capped, run.along) <= limits.apart) & (beside.ratio <= limits.radius_ratio)
    weak = beside.distance <= _WEAK * limits.apart
    found = []
    for first, last in _series(weak):
        inner = first + np.flatnonzero(close[first : last + 1])
        if len(inner) and _is_copy(run, beside, limits, (first, last, inner), open_ends):
            start = _parting(run.along, capped, int(inner[0]), first, -1, open_ends[0])
            end = _parting(run.along, capped, int(inner[-1]), last, 1, open_ends[1])
            found.append((start, end))
    return [_measured(beside, *rows) for rows in _bridged(found, run.along, capped)]


def _bridged(stretches: list[tuple[int, int]], along: FloatArray, distance: FloatArray) -> list[tuple[int, int]]:
    """Join stretches where the line stays well inside the other vessel between them."""
    joined: list[tuple[int, int]] = []
    for first, last in stretches:
        before = joined[-1] if joined else None
        if before and along[first] - along[before[1]] <= _GAP and distance[before[1] : first].max() <= _INSIDE:
            joined[-1] = (before[0], last)
        else:
            joined.append((first, last))
    return joined


def _measured(beside: Beside, first: int, last: int) -> Stretch:
    """A stretch with its distances."""
    distance = beside.distance[first : last + 1]
    return Stretch(first, last, float(np.sqrt(np.mean(distance**2))), float(distance.max()))


def _windowed(distance: FloatArray, along: FloatArray) -> FloatArray:
    """Root mean square distance over a window around each sample."""
    square = distance * distance
    total = np.concatenate(([0.0], np.cumsum(0.5 * (square[1:] + square[:-1]) * np.diff(along))))
    low = np.maximum(along - _WINDOW, along[0])
    high = np.minimum(along + _WINDOW, along[-1])
    mean = (np.interp(high, along, total) - np.interp(low, along, total)) / (high - low)
    root: FloatArray = np.sqrt(np.maximum(mean, 0.0))
    return root


def _series(inside: BoolArray) -> list[tuple[int, int]]:
    """First and last row of each series of true rows."""
    change = np.flatnonzero(np.diff(np.concatenate(([False], inside, [False])).astype(np.int8)))
    return [(int(first), int(end) - 1) for first, end in zip(change[0::2], change[1::2], strict=True)]


def _is_copy(
    run: Samples, beside: Beside, limits: Limits, where: tuple[int, int, IntArray], open_ends: tuple[bool, bool]
) -> bool:
    """Whether a series is long, close and parallel enough."""
    first, last, inner = where
    length = run.along[last] - run.along[first]
    at_start, at_end = first == 0, last == len(run.along) - 1
    exempt = (at_start and at_end) or (at_start and open_ends[0]) or (at_end and open_ends[1])
    if length <= 0 or (length < limits.overlap and not exempt):
        return False
    if beside.distance[first : last + 1].max() > _OF_LENGTH * length:
        return False  # a short piece between two places on other lines, which nothing runs along
    if run.along[inner[-1]] - run.along[inner[0]] < _CLOSE_PART * length:
        return False
    # the places beside a copy move along with it; those beside a stub at the end of a vessel do not
    ways = [np.linalg.norm(np.diff(line[first : last + 1], axis=0), axis=1).sum() for line in (run.point, beside.place)]
    return bool(ways[1] >= 0.5 * ways[0] and np.mean(beside.cosine[inner]) >= _COS_APART)


def _parting(along: FloatArray, distance: FloatArray, close: int, weak: int, side: int, open_end: bool) -> int:
    """Sample at which a run parts from the others, between its last close and its last weak sample.

    The distance grows steadily behind the place where two vessels part; the place
    is found by following that growth back to zero.
    """
    end = len(along) - 1 if side > 0 else 0
    if weak == end or (open_end and abs(along[end] - along[weak]) <= 1.0):
        return end  # what is left is shorter than a radius, inside the other vessel
    far = weak + side
    further = far
    while further != end and distance[further] < _PARTED and abs(along[further] - along[far]) < 2.0:
        further += side
    growth = (distance[further] - distance[far]) / max(abs(along[further] - along[far]), 1e-12)
    if further == far or growth < 0.1:
        return close
    parted = along[far] - side * distance[far] / growth
    low, high = min(close, weak), max(close, weak)
    return low + int(np.argmin(np.abs(along[low : high + 1] - parted)))
