"""The network drawn flat: inlets at the top, outlets at the bottom, as few crossings as a simple rule gives."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.model import FloatArray, IntArray, Network

__all__ = ["FlatMap", "flat_map"]

_SWEEPS = 12


@dataclass(frozen=True, eq=False)
class FlatMap:
    """Places of nodes on the flat map.

    Attributes
    ----------
    place : (n, 2) float array
        Across and down, 0 to 1.
    bulge : (s,) float array
        How far each segment bends aside, so that parallel segments lie apart.
    """

    place: FloatArray
    bulge: FloatArray


def flat_map(network: Network) -> FlatMap:
    """Lay a network out flat.

    A node's row is its longest way from the inlets along from → to; nodes of one row stand in the
    order of the mean place of their neighbours (barycentre rule, Sugiyama, Tagawa and Toda 1981,
    doi:10.1109/TSMC.1981.4308636), left and right as in the body at the start.

    Parameters
    ----------
    network : Network
        Oriented; loops of directed segments are cut by a limit on the rounds.

    Returns
    -------
    FlatMap
    """
    start, end = network.segments.from_node, network.segments.to_node
    level = _levels(len(network.nodes), start, end)
    outlets = np.array([outlet.node for outlet in network.outlets or ()], dtype=np.int64)
    level[outlets] = level.max(initial=0)
    across = _spread(level, network.nodes.position[:, 0])
    for _ in range(_SWEEPS):
        total = np.bincount(start, across[end], len(level)) + np.bincount(end, across[start], len(level))
        count = np.bincount(start, minlength=len(level)) + np.bincount(end, minlength=len(level))
        across = _spread(level, np.where(count > 0, total / np.maximum(count, 1), across))
    down = level / max(1, level.max(initial=0))
    return FlatMap(np.stack((across, down), axis=1), _bulges(start, end))


def _levels(n_nodes: int, start: IntArray, end: IntArray) -> IntArray:
    """Longest number of segments from a source to each node."""
    level = np.zeros(n_nodes, np.int64)
    moving = start != end
    for _ in range(min(n_nodes, 400)):
        new = level.copy()
        np.maximum.at(new, end[moving], level[start[moving]] + 1)
        if np.array_equal(new, level):
            break
        level = new
    return level


def _spread(level: IntArray, wish: FloatArray) -> FloatArray:
    """Place the nodes of each row at equal distances, in the order of their wishes."""
    order = np.lexsort((wish, level))
    sorted_level = level[order]
    first = np.searchsorted(sorted_level, sorted_level)
    count = np.bincount(level)[sorted_level]
    across = np.empty(len(level))
    across[order] = (np.arange(len(level)) - first + 0.5) / count
    return across


def _bulges(start: IntArray, end: IntArray) -> FloatArray:
    """Bend parallel segments apart, and self-loops aside."""
    low, high = np.minimum(start, end), np.maximum(start, end)
    order = np.lexsort((high, low))
    key = np.stack((low[order], high[order]), axis=1)
    new = np.ones(len(order), np.bool_)
    new[1:] = np.any(key[1:] != key[:-1], axis=1)
    group = np.cumsum(new) - 1
    number = np.arange(len(order)) - np.flatnonzero(new)[group] if len(order) else np.zeros(0, np.int64)
    several = np.bincount(group)[group] if len(order) else number
    bulge = np.zeros(len(order))
    bulge[order] = 0.06 * (number - 0.5 * (several - 1))
    bulge[start == end] += 0.06
    return bulge
