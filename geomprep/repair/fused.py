"""The state while copies are fused, and the graph that comes out of it."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
from scipy.spatial import KDTree

from geomprep.model import FloatArray, IntArray
from geomprep.repair.draft import Draft, degree, merged, with_edge_rows
from geomprep.repair.insert import with_new_points, with_split_edges
from geomprep.repair.runs import between, foot
from geomprep.repair.stretches import Beside, Samples, Stretch

__all__ = ["Absorbed", "Fusing", "fused_draft", "line_anchors", "move_to_mean"]

_SAME_JUNCTION = 1.0
"""Radii within which two places where copies part are one junction."""
_KEPT_STEP = 0.25
"""Shortest first step, in radii, of what is left of a run."""


@dataclass(frozen=True, eq=False)
class Absorbed:
    """A stretch of a run that was absorbed, and where it lay beside the kept ones.

    Attributes
    ----------
    stretch : Stretch
    samples : Samples
        Of the stretch.
    edge : (k,) int array
        Kept edge beside each sample.
    part : (k,) float array
    nodes : (a,) int array
        Points of the run that were absorbed.
    line : (4,) int array
        Points at the start, halfway (twice) and the end of the whole run.
    """

    stretch: Stretch
    samples: Samples
    edge: IntArray
    part: FloatArray
    nodes: IntArray
    line: IntArray


class Fusing:
    """Edges, ends and new points while runs are absorbed one by one.

    Attributes
    ----------
    draft : Draft
        As it was.
    edges, end_radius : arrays
        As they are now: what is left of an absorbed run begins at a new point.
    points : (n + c, 3) float array
        Room for new points behind the old ones.
    gone : (e,) bool array
        Absorbed edges.
    kept : (e,) bool array
        Edges of the kept network.
    on_kept : (n,) bool array
        Points that kept edges use.
    absorbed : list of Absorbed
    """

    def __init__(self, draft: Draft, room: int) -> None:
        self.draft = draft
        self.edges = draft.edges.copy()
        self.end_radius = draft.end_radius.copy()
        self.points = np.concatenate((draft.points, np.empty((room, 3))))
        self.gone = np.zeros(len(draft.edges), np.bool_)
        self.kept = np.zeros(len(draft.edges), np.bool_)
        self.on_kept = np.zeros(len(draft.points), np.bool_)
        self.degree = degree(draft)
        self.left_alone: list[int] = []  # points of doubled veins
        self.absorbed: list[Absorbed] = []
        self.new_edge: list[int] = []  # edge and fraction at which each new point lies
        self.new_part: list[float] = []
        self.goes_to: dict[int, int] = {}  # absorbed points that became one with a certain point
        self.goes_on: list[tuple[IntArray, IntArray, FloatArray]] = []  # those that go to the nearest one on an edge
        self._hubs: list[int] = []

    def keep(self, edges: IntArray) -> None:
        """Take edges into the kept network."""
        self.kept[edges] = True
        nodes = self.edges[edges].ravel()
        nodes = nodes[nodes < len(self.on_kept)]
        self.on_kept[nodes] = True
        self._hubs += np.unique(nodes[self.degree[nodes] != 2]).tolist()

    def node_at(self, edge: int, part: float, radius: float) -> int:
        """Point at a place on a kept edge: a junction within a radius of it, or a new point."""
        first, last = self.edges[edge]
        place = self.points[first] + part * (self.points[last] - self.points[first])
        if self._hubs:
            apart = np.linalg.norm(self.points[self._hubs] - place, axis=1)
            if apart.min() <= _SAME_JUNCTION * radius:
                return self._hubs[int(np.argmin(apart))]
        node = int(first) if part <= 0.0 else int(last) if part >= 1.0 else self._new(edge, part, place)
        self._hubs.append(node)
        return node

    def _new(self, edge: int, part: float, place: FloatArray) -> int:
        """Append a point on a kept edge."""
        node = len(self.on_kept) + len(self.new_edge)
        if node == len(self.points):
            self.points = np.concatenate((self.points, np.empty_like(self.points)))
        self.points[node] = place
        self.new_edge.append(edge)
        self.new_part.append(part)
        return node

    def absorb(self, run: Samples, beside: Beside, stretch: Stretch, after: int) -> tuple[int, int] | None:
        """Take a stretch of a run out; return the first and last edge that are gone.

        None where the stretch lies within one edge or begins on an edge before `after`:
        it cannot be taken apart there.
        """
        low, high = int(run.edge[0]), int(run.edge[-1])
        left, right = _last_kept(run, stretch.first), _first_kept(run, stretch.last)
        first = low if left is None else int(run.edge[left]) + 1
        last = high if right is None else _edge_before(run, right) - 1
        if left is not None and (first - 1 < after or (right is not None and first > last + 1)):
            return None
        tails = np.arange(max(first, low + 1), min(last + 1, high) + 1)
        inner = self.draft.edges[tails, 0]
        rows = np.clip(np.searchsorted(run.edge, tails), stretch.first, stretch.last)
        self.goes_on.append((inner, beside.edge[rows], beside.part[rows]))
        start = self._end_point(run, beside, 0, stretch.first) if left is None else inner[:0]
        end = self._end_point(run, beside, 1, stretch.last) if right is None else inner[:0]
        nodes = np.concatenate((start, inner, end))
        if left is not None:
            self._tie(run, beside, stretch.first, (first - 1, 1), nodes[:1])
        if right is not None:
            self._tie(run, beside, stretch.last, (last + 1, 0), nodes[-1:])
        self.gone[first : last + 1] = True
        taken = slice(stretch.first, stretch.last + 1)
        line = line_anchors(self.draft, run)
        self.absorbed.append(Absorbed(stretch, run[taken], beside.edge[taken], beside.part[taken], nodes, line))
        return first, last

    def _tie(self, run: Samples, beside: Beside, row: int, boundary: tuple[int, int], last: IntArray) -> None:
        """Let what is left of a run begin on the kept network; the absorbed point next to it goes there too."""
        node = self.node_at(int(beside.edge[row]), float(beside.part[row]), float(run.radius[row]))
        self.edges[boundary] = node
        # what lies between the other vessel's last sample and the first of its own is no taper
        edge, end = boundary
        self.end_radius[boundary] = self.end_radius[edge, 1 - end]
        for point in last.tolist():
            self.goes_to[point] = node

    def _end_point(self, run: Samples, beside: Beside, side: int, row: int) -> IntArray:
        """The end of a run that is absorbed up to there; empty where kept edges use it."""
        end = int(self.draft.edges[run.edge[-side], side])
        if self.on_kept[end]:
            return np.empty(0, np.int64)
        if self.degree[end] > 1:
            self.goes_to[end] = self.node_at(int(beside.edge[row]), float(beside.part[row]), float(run.radius[row]))
        else:
            self.goes_on.append((np.array([end]), beside.edge[row : row + 1], beside.part[row : row + 1]))
        return np.array([end])


def line_anchors(draft: Draft, run: Samples) -> IntArray:
    """Ends and middle points of the whole line of a run: what its id hangs on, (4,)."""
    low, high = int(run.edge[0]), int(run.edge[-1])
    whole = np.append(draft.edges[low : high + 1, 0], draft.edges[high, 1])
    return whole[[0, (len(whole) - 1) // 2, len(whole) // 2, -1]]


def _last_kept(run: Samples, row: int) -> int | None:
    """Row of the last point that stays before a stretch, None where the stretch begins the run."""
    if row == 0:
        return None
    before = np.flatnonzero((run.part[:row] == 0.0) & (run.along[:row] <= run.along[row] - _KEPT_STEP))
    return int(before[-1]) if len(before) else 0


def _first_kept(run: Samples, row: int) -> int | None:
    """Row of the first point that stays after a stretch, None where the stretch ends the run."""
    end = len(run.edge) - 1
    if row == end:
        return None
    after = np.flatnonzero((run.part[row:] == 0.0) & (run.along[row:] >= run.along[row] + _KEPT_STEP))
    return row + int(after[0]) if len(after) else end


def _edge_before(run: Samples, row: int) -> int:
    """Edge that leads to the point at a row."""
    return int(run.edge[row]) - (1 if run.part[row] == 0.0 else 0)


def fused_draft(state: Fusing) -> Draft:
    """Make the draft that is left once all runs are absorbed; the state is spent then."""
    draft, n = state.draft, len(state.draft.points)
    new_edge = np.array(state.new_edge, np.int64)
    new_point = n + np.arange(len(new_edge))
    label = _targets(state, n + len(new_edge))
    kept = np.flatnonzero(~state.gone)
    points = state.points[: n + len(new_edge)]
    whole = with_new_points(replace(draft, points=points[:n]), points[n:], new_edge)
    whole = replace(whole, edges=state.edges, end_radius=state.end_radius, edge_class=draft.edge_class)
    whole = with_edge_rows(whole, kept)
    del draft, points
    # of a million points these are large: what was drawn goes before the copies below are made
    state.draft, state.points, state.edges, state.end_radius = whole, whole.points, whole.edges, whole.end_radius
    number = np.searchsorted(kept, new_edge, side="right") - 1
    whole = with_split_edges(whole, number, np.array(state.new_part), new_point)
    stays = label == np.arange(len(label))
    return merged(whole, (np.cumsum(stays) - 1)[label], stays)


def _targets(state: Fusing, count: int) -> IntArray:
    """Point that each point becomes one with; itself where it stays."""
    label = np.arange(count)
    if state.goes_on:
        node, edge, part = (np.concatenate(column) for column in zip(*state.goes_on, strict=True))
        touched = np.unique(edge)
        split_edge, split_part = np.array(state.new_edge, np.int64), np.array(state.new_part)
        key = np.concatenate((2.0 * touched, 2.0 * split_edge + split_part, 2.0 * touched + 1.0))
        value = np.concatenate(
            (state.edges[touched, 0], count - len(split_edge) + np.arange(len(split_edge)), state.edges[touched, 1])
        )
        order = np.argsort(key, kind="stable")
        key, value = key[order], value[order]
        wanted = 2.0 * edge + part
        right = np.clip(np.searchsorted(key, wanted), 1, len(key) - 1)
        nearer = right - (wanted - key[right - 1] < key[right] - wanted)
        label[node] = value[nearer]
    for point, target in state.goes_to.items():
        label[point] = target
    while not np.array_equal(label[label], label):
        label = label[label]
    return label


def move_to_mean(state: Fusing, reach: float) -> None:
    """Move kept points to the mean of themselves and the copies absorbed beside them (in place).

    Radii at the ends of kept edges become the geometric mean; new points move with the edge they lie on.

    Parameters
    ----------
    state : Fusing
    reach : float
        Copies further from a kept point than this, in radii, do not move it.
    """
    n, count = len(state.draft.points), len(state.new_edge)
    moved, shift, log_radius, copies = _copies_beside(state, reach)
    ends = state.edges[np.array(state.new_edge, np.int64)]
    part = np.array(state.new_part)[:, None]
    first, last = (np.where(known[:, None], shift[row], 0.0) for row, known in (_row(moved, end) for end in ends.T))
    state.points[: n + count] += 0.0  # no negative zeros
    state.points[moved] += shift[:-1]
    state.points[n : n + count] += (1.0 - part) * first + part * last
    touched = np.zeros(len(state.points), np.bool_)
    touched[moved] = True
    place = np.flatnonzero(touched[state.edges])
    row, _ = _row(moved, state.edges.ravel()[place])
    radius = state.end_radius.ravel()
    radius[place] = np.exp((np.log(radius[place]) + log_radius[row]) / (1.0 + copies[row]))


def _row(moved: IntArray, point: IntArray) -> tuple[IntArray, npt.NDArray[np.bool_]]:
    """Row of points among those moved, and whether they are there; the row behind the last where all are smaller."""
    row = np.searchsorted(moved, point)
    return row, np.append(moved, -1)[row] == point


def _copies_beside(state: Fusing, reach: float) -> tuple[IntArray, FloatArray, FloatArray, FloatArray]:
    """Kept points with copies beside them: shift to the mean (and a row of zeros), sum of ln r and number of copies."""
    draft, n = state.draft, len(state.draft.points)
    found = []
    for taken in state.absorbed:
        nodes = np.unique(state.edges[taken.edge])
        nodes = nodes[nodes < n]
        nodes = nodes[state.on_kept[nodes]]
        nodes, place, radius = _beside_points(draft, taken.samples, nodes, reach)
        found.append((nodes, place - draft.points[nodes], np.log(radius)))
    node, away, log_radius = (np.concatenate(column) for column in zip(*found, strict=True))
    moved, row = np.unique(node, return_inverse=True)
    total = np.zeros((len(moved) + 1, 3))
    np.add.at(total, row, away)
    copies = np.bincount(row, minlength=len(moved) + 1).astype(np.float64)
    sums: FloatArray = np.bincount(row, log_radius, len(moved) + 1).astype(np.float64)
    return moved, total / (1.0 + copies)[:, None], sums, copies


def _beside_points(
    draft: Draft, samples: Samples, nodes: IntArray, reach: float
) -> tuple[IntArray, FloatArray, FloatArray]:
    """Of the given points those beside a stretch, with the nearest place on it and its radius there."""
    if len(nodes) == 0:
        return nodes, np.empty((0, 3)), np.empty(0)
    places = draft.points[nodes]
    row = KDTree(samples.point).query(places, k=min(2, len(samples.edge)))[1].reshape(len(nodes), -1)
    edge = np.concatenate((samples.edge[row], np.maximum(samples.edge[row] - 1, samples.edge[0])), axis=1)
    part, distance = foot(draft, np.repeat(places, edge.shape[1], axis=0), edge.ravel())
    part, distance = part.reshape(edge.shape), distance.reshape(edge.shape)
    best = np.argmin(distance, axis=1)[:, None]
    edge, part = np.take_along_axis(edge, best, 1)[:, 0], np.take_along_axis(part, best, 1)[:, 0]
    distance = np.take_along_axis(distance, best, 1)[:, 0]
    radius = between(draft.end_radius, edge, part)
    start, end = draft.points[draft.edges[edge, 0]], draft.points[draft.edges[edge, 1]]
    within = distance <= reach * radius
    # at the ends of a stretch the nearest place is no longer beside the point
    within &= (edge + part > samples.edge[0] + samples.part[0]) & (edge + part < samples.edge[-1] + samples.part[-1])
    return nodes[within], (start + part[:, None] * (end - start))[within], radius[within]
