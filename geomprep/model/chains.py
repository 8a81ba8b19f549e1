"""Cut a point graph into chains of edges between its junctions and ends.

The one place that walks a graph: joining, repair and segments share it. No compiler and
no Python loop over points: edges that follow one another in the input are first taken
together as runs, so that poly-lines cost only their ends. Every run has two directed halves,
each half points to its successor through a point of degree 2, and pointer doubling finds the
end of every chain in log2(runs of the longest chain) rounds.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from geomprep.model.arrays import BoolArray, IntArray

__all__ = ["Chains", "chains", "degrees"]


@dataclass(frozen=True, eq=False)
class Chains:
    """Ordered runs of points between points whose degree is not 2.

    Attributes
    ----------
    point : (k,) int array
        Points along all chains; chain i is ``point[offsets[i]:offsets[i + 1]]`` and both
        its ends are included. A closed chain repeats its first point at its end.
    offsets : (c + 1,) int array
    edge : (k - c,) int array
        Edge between consecutive points; chain i uses
        ``edge[offsets[i] - i:offsets[i + 1] - i - 1]``.
    ring : (c,) bool array
        True for closed rings without any junction or open end.
    """

    point: IntArray
    offsets: IntArray
    edge: IntArray
    ring: BoolArray

    @property
    def n_chains(self) -> int:
        """Number of chains."""
        return len(self.offsets) - 1

    @property
    def edge_offsets(self) -> IntArray:
        """(c + 1,) offsets into `edge`."""
        return self.offsets - np.arange(len(self.offsets))


def degrees(n_points: int, edges: IntArray) -> IntArray:
    """Return the number of edge ends at each point; a self-loop counts twice.

    Examples
    --------
    >>> degrees(3, np.array([[0, 1], [1, 1]]))
    array([1, 3, 0])
    """
    return np.bincount(edges.ravel(), minlength=n_points).astype(np.int64, copy=False)


def chains(n_points: int, edges: IntArray, stop: BoolArray | None = None) -> Chains:
    """Cut a graph into chains at every point whose degree is not 2.

    Parameters
    ----------
    n_points : int
        Number of points.
    edges : (e, 2) int array
        Ends of each edge; parallel edges and self-loops are allowed.
    stop : (n_points,) bool array, optional
        Further points at which to cut, such as those where a model border lies.

    Returns
    -------
    Chains
        Sorted by the smaller edge number at their ends; a ring starts at its
        smallest point number.

    Examples
    --------
    >>> found = chains(4, np.array([[0, 1], [2, 1], [1, 3]]))
    >>> found.n_chains, found.point.tolist()
    (3, [0, 1, 2, 1, 1, 3])
    >>> chains(0, np.empty((0, 2), dtype=np.int64)).n_chains
    0
    """
    edges = np.ascontiguousarray(edges, dtype=np.int64).reshape(-1, 2)
    if len(edges) == 0:
        return Chains(_none(), np.zeros(1, np.int64), _none(), np.zeros(0, np.bool_))
    through = degrees(n_points, edges) == 2
    through[edges[edges[:, 0] == edges[:, 1], 0]] = False
    if stop is not None:
        through &= ~stop
    inner = through
    runs = _Runs.of(edges, inner)
    last, rank, ended = _doubled(_successors(runs.ends, inner))
    if not ended.all():  # a ring leads nowhere
        inner = through.copy()
        inner[_smallest_on_rings(edges, runs, ~ended[: len(runs.ends)])] = False
        runs = _Runs.of(edges, inner)
        last, rank, _ = _doubled(_successors(runs.ends, inner))
    offsets, half = _ordered(last, rank)
    return _laid_out(edges, runs, (offsets, half), through)


def _none() -> IntArray:
    """An empty int array."""
    return np.empty(0, np.int64)


@dataclass(frozen=True, eq=False)
class _Runs:
    """Edges that follow one another in the input, head to tail through points of degree 2."""

    first: IntArray
    count: IntArray
    ends: IntArray

    @classmethod
    def of(cls, edges: IntArray, through: BoolArray) -> _Runs:
        """Find the runs of the edges as they come."""
        new = np.ones(len(edges), np.bool_)
        new[1:] = (edges[:-1, 1] != edges[1:, 0]) | ~through[edges[1:, 0]]
        first = np.flatnonzero(new)
        count = np.diff(first, append=len(edges))
        return cls(first, count, np.stack((edges[first, 0], edges[first + count - 1, 1]), axis=1))

    def edges_of(self, half: IntArray) -> tuple[IntArray, IntArray]:
        """Edges of halves one after the other, in their direction; where each half begins is given, too."""
        run = np.where(half < len(self.first), half, half - len(self.first))
        count = self.count[run]
        starts = np.cumsum(count) - count
        backward = half >= len(self.first)
        step = np.where(backward, -1, 1)
        edge = self.first[run] + np.where(backward, count - 1, 0) - step * starts
        edge, step = np.repeat(edge, count), np.repeat(step, count)
        return edge + step * np.arange(len(edge)), starts


def _successors(runs: IntArray, through: BoolArray) -> IntArray:
    """For each half (h < m forwards, h ≥ m backwards) the half that leaves its head, or −1."""
    n_runs = len(runs)
    tail = runs.T.ravel()
    half = np.flatnonzero(through[tail])
    # two halves leave every point of degree 2: their sum less one of them is the other
    total = np.bincount(tail[half], half, minlength=len(through)).astype(np.int64)
    successor = np.full(2 * n_runs, -1, np.int64)
    # the half that arrives where one leaves is the reverse of it
    successor[_reverse(half, n_runs)] = total[tail[half]] - half
    return successor


def _reverse(half: IntArray, n_runs: int) -> IntArray:
    """The same runs the other way."""
    return np.where(half < n_runs, half + n_runs, half - n_runs)


def _doubled(successor: IntArray) -> tuple[IntArray, IntArray, BoolArray]:
    """Last half reached from each half, the number of steps to it, and whether there is a last one.

    Halves that have arrived take no further part.
    """
    goes_on = successor >= 0
    active = np.flatnonzero(goes_on)
    jump = np.where(goes_on, successor, np.arange(len(successor)))
    weight = goes_on.astype(np.int64)
    for _ in range(len(successor).bit_length() + 1):
        active = active[goes_on[jump[active]]]
        if len(active) == 0:
            break
        onward = jump[active]
        more, further = weight[onward], jump[onward]
        weight[active] += more
        jump[active] = further
    return jump, weight, ~goes_on[jump]


def _smallest_on_rings(edges: IntArray, runs: _Runs, on_ring: BoolArray) -> IntArray:
    """Smallest point of each closed ring, at which it is cut so that every chain has an end."""
    which = np.flatnonzero(on_ring)
    place, row = np.unique(runs.ends[which], return_inverse=True)
    row = row.reshape(-1, 2)
    matrix = coo_array((np.ones(len(row), np.int8), (row[:, 0], row[:, 1])), shape=(len(place), len(place)))
    count, label = connected_components(matrix, directed=False)
    edge, starts = runs.edges_of(which)
    smallest = np.full(count, np.iinfo(np.int64).max)
    np.minimum.at(smallest, label[row[:, 0]], np.minimum.reduceat(edges[edge].min(axis=1), starts))
    return smallest


def _ordered(last: IntArray, rank: IntArray) -> tuple[IntArray, IntArray]:
    """Lay the halves of each chain in order, of the two directions one: offsets of the chains, and the halves."""
    n_runs = len(last) // 2
    reverse = _reverse(np.arange(2 * n_runs), n_runs)
    first = reverse[last[reverse]]  # the half that starts the chain of each half
    start_run = np.where(first < n_runs, first, first - n_runs)
    end_run = np.where(last < n_runs, last, last - n_runs)
    # of each chain and its reverse the one whose first run has the smaller number
    kept = np.flatnonzero((start_run < end_run) | ((start_run == end_run) & (first < n_runs)))
    first = first[kept]
    start = kept[first == kept]
    start = start[np.argsort(start_run[start])]
    offsets = np.concatenate(([0], np.cumsum(rank[start] + 1)))
    before = np.empty(2 * n_runs, np.int64)
    before[start] = offsets[:-1] + rank[start]
    order = np.empty(n_runs, np.int64)
    order[before[first] - rank[kept]] = kept
    return offsets, order


def _laid_out(edges: IntArray, runs: _Runs, ordered: tuple[IntArray, IntArray], through: BoolArray) -> Chains:
    """Points and edges of chains of halves."""
    run_offsets, half = ordered
    edge, starts = runs.edges_of(half)
    edge_offsets = np.append(starts, len(edge))[run_offsets]
    offsets = edge_offsets + np.arange(len(edge_offsets))
    backward = half >= len(runs.first)
    turned = np.repeat(backward, np.diff(starts, append=len(edge)))
    first = half[run_offsets[:-1]]
    point = np.empty(len(edge) + len(first), np.int64)
    point[offsets[:-1]] = runs.ends.T.ravel()[first]
    inner = np.ones(len(point), np.bool_)
    inner[offsets[:-1]] = False
    point[inner] = edges.ravel()[2 * edge + ~turned]
    ring = (point[offsets[:-1]] == point[offsets[1:] - 1]) & through[point[offsets[:-1]]]
    return Chains(point, offsets, edge, ring)
