"""Find runs that may be copies of one another, without looking closely at the rest."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from scipy.spatial import KDTree

from geomprep.model import BoolArray, FloatArray, IntArray
from geomprep.repair.classes import may_join
from geomprep.repair.draft import Draft, degree
from geomprep.repair.runs import Marks, Runs, marked, nearest_on, places_on, runs

__all__ = ["Held", "Layout", "overlapping_runs"]

_COS_APART = np.cos(np.radians(30.0))
_PROBES, _CROWD, _NEAREST = 500, 30.0, 12
"""Where a sample of marks has more neighbours than that, as with fifty copies, only the nearest are paired."""
_REACH = 1.25
"""Marks of two overlapping runs lie within this many sizes of one another."""


@dataclass(frozen=True, eq=False)
class Layout:
    """Marks of a draft in trees of similar size, for searches with a local radius.

    Attributes
    ----------
    runs : Runs
    marks : Marks
    levels : list of (marks, tree, largest size)
        By octaves of size, from small to large; an octave may be empty.
    """

    runs: Runs
    marks: Marks
    levels: list[tuple[IntArray, KDTree | None, float]]

    @classmethod
    def of(cls, draft: Draft) -> Layout:
        """Mark the runs of a draft and build the trees."""
        laid = runs(draft)
        marks = marked(draft, laid)
        octave = np.floor(np.log2(marks.size / marks.size.min())).astype(np.int64)
        levels: list[tuple[IntArray, KDTree | None, float]] = []
        for number in range(int(octave.max()) + 1):
            which = np.flatnonzero(octave == number)
            if len(which) == 0:
                levels.append((which, None, 0.0))
                continue
            tree = KDTree(marks.point[which], balanced_tree=False, compact_nodes=False)
            levels.append((which, tree, float(marks.size[which].max())))
        return cls(laid, marks, levels)

    def near(self, places: FloatArray, reach: float) -> Iterator[tuple[IntArray, IntArray]]:
        """For each octave the numbers of places and of marks within `reach` sizes of one another."""
        if len(places) == 0:
            return
        wanted = KDTree(places, balanced_tree=False, compact_nodes=False)
        for which, tree, size in self.levels:
            if tree is not None:
                found = wanted.sparse_distance_matrix(tree, reach * size, output_type="ndarray")
                close = found["v"] <= reach * self.marks.size[which[found["j"]]]
                yield found["i"][close].astype(np.int64), which[found["j"][close]]


class Held:
    """A draft between two steps of joining, with its layout where that is known.

    A step takes the draft out and puts back the same or the next one: what it no longer needs can go
    while it still works, so that of a million points no more than two drafts are held.
    """

    def __init__(self, draft: Draft) -> None:
        self._held: list[tuple[Draft, Layout | None]] = [(draft, None)]

    @property
    def laid(self) -> bool:
        """Whether the layout is known: no step has changed the draft since."""
        return self._held[0][1] is not None

    def take(self) -> Draft:
        """Hand over the draft."""
        return self._held.pop()[0]

    def take_laid(self) -> tuple[Draft, Layout]:
        """Hand over the draft and its layout."""
        draft, layout = self._held.pop()
        return draft, layout or Layout.of(draft)

    def put(self, draft: Draft, layout: Layout | None = None) -> None:
        """Put back a draft, with its layout where it is the one that was taken."""
        self._held.append((draft, layout))


def _pairs(layout: Layout) -> IntArray:
    """Pairs of marks of different runs within reach of one another, (p, 2)."""
    marks, found = layout.marks, []
    before: tuple[IntArray, KDTree | None] = (np.empty(0, np.int64), None)
    for which, tree, size in layout.levels:
        if tree is not None:
            pairs = _within(tree, tree, _REACH * size)
            found.append(which[pairs])
            if before[1] is not None:
                cross = _within(before[1], tree, _REACH * size)
                found.append(np.stack((before[0][cross[:, 0]], which[cross[:, 1]]), axis=1))
        before = (which, tree)
    pairs = np.concatenate(found)
    pairs = pairs[marks.run[pairs[:, 0]] != marks.run[pairs[:, 1]]]
    apart = np.linalg.norm(marks.point[pairs[:, 0]] - marks.point[pairs[:, 1]], axis=1)
    close: IntArray = pairs[apart <= _REACH * marks.size[pairs].max(axis=1)]
    return close


def _within(one: KDTree, other: KDTree, reach: float) -> IntArray:
    """Pairs of points of two trees within reach; where they crowd, each with its nearest few only."""
    some = one.data[:: max(1, len(one.data) // _PROBES)]
    crowd = float(other.query_ball_point(some, reach, return_length=True).mean())
    if crowd > _CROWD:
        distance, index = other.query(one.data, k=_NEAREST, distance_upper_bound=reach)
        row, column = np.nonzero(np.isfinite(distance))
        return np.stack((row, index[row, column]), axis=1)
    if one is other:
        return np.asarray(one.query_pairs(reach, output_type="ndarray"), np.int64)
    found = one.sparse_distance_matrix(other, reach, output_type="ndarray")
    return np.stack((found["i"], found["j"]), axis=1).astype(np.int64)


def overlapping_runs(draft: Draft, layout: Layout, within: float, radius_ratio: float) -> IntArray:
    """Runs that lie along another one for two radii somewhere.

    Parameters
    ----------
    draft : Draft
    layout : Layout
    within : float
        Distance that counts as near, in parts of the smaller radius.
    radius_ratio : float
        Largest ratio of the two radii.

    Notes
    -----
    An overlap of two radii holds at least one mark, and on at least one side of it the
    whole half of its piece. Runs that part at a junction overlap only if both halves do.
    """
    marks = layout.marks
    pairs = _pairs(layout)
    pairs = pairs[may_join(draft.edge_class[marks.edge[pairs[:, 0]]], draft.edge_class[marks.edge[pairs[:, 1]]])]
    ratio = marks.radius[pairs[:, 0]] / marks.radius[pairs[:, 1]]
    pairs = pairs[np.maximum(ratio, 1.0 / ratio) <= radius_ratio]
    pairs = pairs[_along(draft, layout, pairs)]
    if len(pairs) == 0:
        return pairs[:, 0]
    both_ways = np.concatenate((pairs, pairs[:, ::-1]))
    near = _near_three(draft, layout, both_ways, within)
    kept = both_ways[near]
    return np.unique(marks.run[kept])


def _along(draft: Draft, layout: Layout, pairs: IntArray) -> BoolArray:
    """Whether two pieces run the same or the opposite way."""
    marks, laid = layout.marks, layout.runs
    which, row = np.unique(pairs, return_inverse=True)
    run, middle, half = marks.run[which], marks.along[which], marks.half[which]
    chord = _place(draft, laid, run, middle + half) - _place(draft, laid, run, middle - half)
    chord /= np.maximum(np.linalg.norm(chord, axis=1), np.finfo(float).tiny)[:, None]
    row = row.reshape(pairs.shape)
    cosine = np.abs(np.einsum("ij,ij->i", chord[row[:, 0]], chord[row[:, 1]]))
    along: BoolArray = cosine >= _COS_APART
    return along


def _place(draft: Draft, laid: Runs, run: IntArray, along: FloatArray) -> FloatArray:
    """Positions at distances along runs."""
    return places_on(draft, *laid.places(run, along))


def _near_three(draft: Draft, layout: Layout, pairs: IntArray, within: float) -> BoolArray:
    """Whether the first mark of each pair, and its piece's ends as far as needed, lie near the other runs."""
    marks, laid = layout.marks, layout.runs
    one, other = pairs[:, 0], pairs[:, 1]
    run = marks.run[other]
    first, _ = laid.places(run, marks.along[other] - 3.0 * marks.half[other])
    last, _ = laid.places(run, marks.along[other] + 3.0 * marks.half[other])
    limit = within * np.minimum(marks.radius[one], marks.radius[other])
    near = []
    for side in (0.0, -1.0, 1.0):
        place = _place(draft, laid, marks.run[one], marks.along[one] + side * marks.half[one])
        near.append(nearest_on(draft, place, first, last)[2] <= limit)
    middle, behind, ahead = near
    # an end of a piece may be near another of the runs than its middle
    some = np.zeros((2, len(marks.run)), np.bool_)
    some[0, one[behind]] = True
    some[1, one[ahead]] = True
    at_junction = _touches_junction(draft, layout)[one]
    enough = np.where(at_junction, some[0, one] & some[1, one], some[0, one] | some[1, one])
    found: BoolArray = middle & enough
    return found


def _touches_junction(draft: Draft, layout: Layout) -> BoolArray:
    """Marks whose piece begins or ends at a junction."""
    marks, laid = layout.marks, layout.runs
    junction = degree(draft) > 2
    first, last = laid.offsets[marks.run], laid.offsets[marks.run + 1] - 1
    at_start = junction[draft.edges[first, 0]] & (marks.along - 1.5 * marks.half <= laid.along[first])
    at_end = junction[draft.edges[last, 1]] & (marks.along + 1.5 * marks.half >= laid.along[last + 1])
    touches: BoolArray = at_start | at_end
    return touches
