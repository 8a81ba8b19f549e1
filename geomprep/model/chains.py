"""Cut a point graph into chains of edges between its junctions and ends.

The one place that walks a graph: joining, repair and segments share it. No compiler and
no Python loop over points: every edge has two directed halves, each half points to its
successor through a point of degree 2, and pointer doubling finds the end of every chain in
log2(longest run) rounds. Edges that follow one another in the input are contracted
into runs first, so that poly-lines cost only their ends.
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
    return np.bincount(edges.ravel(), minlength=n_points).astype(np.int64)


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
    successor = _successors(edges, through)
    last, rank, ended = _doubled(successor, len(edges))
    if not ended.all():  # a ring leads nowhere
        _open_rings(edges, successor, ~ended[: len(edges)])
        last, rank, _ = _doubled(successor, len(edges))
    return _ordered(edges, last, rank, through)


def _none() -> IntArray:
    """An empty int array."""
    return np.empty(0, np.int64)


def _successors(edges: IntArray, through: BoolArray) -> IntArray:
    """For each half (h < e forwards, h ≥ e backwards) the half that leaves its head, or −1."""
    n_edges = len(edges)
    tail = np.concatenate((edges[:, 0], edges[:, 1]))
    half = np.flatnonzero(through[tail])
    # two halves leave every point of degree 2: their sum less one of them is the other
    total = np.bincount(tail[half], half, minlength=len(through)).astype(np.int64)
    successor = np.full(2 * n_edges, -1, np.int64)
    # the half that arrives where one leaves is the reverse of it
    successor[half + np.where(half < n_edges, n_edges, -n_edges)] = total[tail[half]] - half
    return successor


def _open_rings(edges: IntArray, successor: IntArray, on_ring: BoolArray) -> None:
    """Cut closed rings at their smallest point so that every chain has an end (in place)."""
    n_edges = len(edges)
    half = np.flatnonzero(np.concatenate((on_ring, on_ring)))
    matrix = coo_array(
        (np.ones(len(half), np.int8), (half % n_edges, successor[half] % n_edges)), shape=(n_edges, n_edges)
    )
    count, label = connected_components(matrix, directed=False)
    closed = np.zeros(count, np.bool_)
    closed[label[on_ring]] = True
    _cut_at_smallest(edges, successor, label, closed)


def _cut_at_smallest(edges: IntArray, successor: IntArray, label: IntArray, closed: BoolArray) -> None:
    """Remove the two links through the smallest point of each closed component (in place)."""
    n_edges = len(edges)
    on_ring = np.flatnonzero(closed[label])
    smallest = np.full(len(closed), np.iinfo(np.int64).max)
    np.minimum.at(smallest, label[on_ring], edges[on_ring].min(axis=1))
    both_halves = np.concatenate((on_ring, on_ring + n_edges))
    head = np.concatenate((edges[on_ring, 1], edges[on_ring, 0]))
    successor[both_halves[head == smallest[label[both_halves % n_edges]]]] = -1


def _doubled(successor: IntArray, n_edges: int) -> tuple[IntArray, IntArray, BoolArray]:
    """Last half reached from each half, the number of steps to it, and whether there is a last one.

    Halves whose successor is the next number (or the previous, backwards) are first taken
    together as runs, so that the doubling works on run ends only; those that have
    arrived take no further part.
    """
    n_half = 2 * n_edges
    index = np.arange(n_half, dtype=np.int64)
    in_run = successor == np.where(index < n_edges, index + 1, index - 1)
    in_run[[n_edges - 1, n_edges]] = False  # a run stays among forward or among backward halves
    run_end, distance = _run_ends(in_run, n_edges)
    heads = np.flatnonzero(~in_run)  # halves that end a run
    position = np.full(n_half, -1, np.int64)
    position[heads] = np.arange(len(heads))
    target = successor[heads]
    goes_on = target >= 0
    active = np.flatnonzero(goes_on)
    jump = np.arange(len(heads), dtype=np.int64)
    weight = np.zeros(len(heads), np.int64)
    jump[active] = position[run_end[target[active]]]
    weight[active] = 1 + distance[target[active]]
    for _ in range(int(n_half).bit_length() + 1):
        active = active[goes_on[jump[active]]]
        if len(active) == 0:
            break
        onward = jump[active]
        more, further = weight[onward], jump[onward]
        weight[active] += more
        jump[active] = further
    reached = position[run_end]
    return heads[jump[reached]], distance + weight[reached], ~goes_on[jump[reached]]


def _run_ends(in_run: BoolArray, n_edges: int) -> tuple[IntArray, IntArray]:
    """End of the run of consecutive numbers each half is in, and the steps to that end."""
    index = np.arange(2 * n_edges, dtype=np.int64)
    far = np.where(in_run, np.iinfo(np.int64).max, index)
    forward = np.minimum.accumulate(far[:n_edges][::-1])[::-1]
    back = np.where(in_run, np.iinfo(np.int64).min, index)[n_edges:]
    end = np.concatenate((forward, np.maximum.accumulate(back)))
    return end, np.abs(end - index)


def _ordered(edges: IntArray, last: IntArray, rank: IntArray, through: BoolArray) -> Chains:
    """Lay the halves of each chain in order; of the two directions keep one."""
    n_edges = len(edges)
    half = np.arange(2 * n_edges)
    reverse = np.where(half < n_edges, half + n_edges, half - n_edges)
    first = reverse[last[reverse]]  # the half that starts the chain of each half
    forward = np.flatnonzero(_keep_direction(first, last, n_edges))
    start = forward[first[forward] == forward]
    start = start[np.lexsort((start, np.minimum(start % n_edges, last[start] % n_edges)))]
    chain = np.empty(2 * n_edges, np.int64)
    chain[start] = np.arange(len(start))
    lengths = rank[start] + 1
    edge_offsets = np.concatenate(([0], np.cumsum(lengths)))
    order = np.empty(n_edges, np.int64)
    order[edge_offsets[chain[first[forward]]] + rank[first[forward]] - rank[forward]] = forward
    edge = np.where(order < n_edges, order, order - n_edges)
    flat = np.concatenate((edges[:, 0], edges[:, 1]))
    offsets = edge_offsets + np.arange(len(start) + 1)
    point = np.empty(offsets[-1], np.int64)
    point[offsets[:-1]] = flat[start]
    inner = np.ones(len(point), np.bool_)
    inner[offsets[:-1]] = False
    point[inner] = flat[reverse[order]]
    ring = (point[offsets[:-1]] == point[offsets[1:] - 1]) & through[point[offsets[:-1]]]
    return Chains(point, offsets.astype(np.int64), edge.astype(np.int64), ring)


def _keep_direction(first: IntArray, last: IntArray, n_edges: int) -> BoolArray:
    """Of each chain and its reverse, keep the one whose starting edge has the smaller number."""
    start, end = first % n_edges, last % n_edges
    kept: BoolArray = (start < end) | ((start == end) & (first < n_edges))
    return kept
