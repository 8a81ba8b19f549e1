"""Strahler and Horsfield orders, and generations, on trees."""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import breadth_first_order, connected_components

from geomprep.findings import Finding, Severity
from geomprep.model import IntArray, Network

__all__ = ["OrderResult", "order_segments"]


@dataclass(frozen=True)
class OrderResult:
    """A network with orders, and the parts where they are undefined."""

    network: Network
    findings: tuple[Finding, ...]


def order_segments(network: Network, inlet_nodes: IntArray, outlet_nodes: IntArray) -> OrderResult:
    """Number segments by Strahler and Horsfield order and by generation.

    Each connected part that is a tree is rooted at its only inlet (arteries) or else at its
    only outlet (veins). A part with a loop, or with several of both, has no orders; a finding says so.

    Parameters
    ----------
    network : Network
    inlet_nodes, outlet_nodes : (i,), (o,) int array

    Returns
    -------
    OrderResult

    Notes
    -----
    Strahler, numbered from 1: an end segment has order 1; a parent has the largest order among its
    daughters, one more where that largest occurs at least twice. Horsfield: an end
    segment has order 1; a parent one more than the largest of its daughters. Generation: 0 at the root,
    one more past every branching [1]_.

    References
    ----------
    .. [1] Horsfield K. Morphometry of the small pulmonary arteries in man. Circ Res 42:593-597, 1978.
       doi:10.1161/01.RES.42.5.593
    """
    n_nodes = len(network.nodes)
    ends = network.segments.from_node, network.segments.to_node
    links = coo_array((np.ones(len(ends[0]), np.int8), ends), shape=(n_nodes, n_nodes)).tocsr()
    count, part = connected_components(links, directed=False)
    loops = np.bincount(part[ends[0]], minlength=count) - np.bincount(part, minlength=count) + 1
    roots = _roots(part, count, inlet_nodes, outlet_nodes)
    tree = (loops == 0) & (roots >= 0)
    strahler, horsfield, generation = _order_trees(network, roots[tree])
    segments = dataclasses.replace(
        network.segments, strahler_order=strahler, horsfield_order=horsfield, generation=generation
    )
    findings = [_undefined(int(number), count, int(loops[number])) for number in np.flatnonzero(~tree)]
    return OrderResult(dataclasses.replace(network, segments=segments), tuple(findings))


def _roots(part: IntArray, count: int, inlet_nodes: IntArray, outlet_nodes: IntArray) -> IntArray:
    """The only inlet of each part, else its only outlet, else −1."""
    root = np.full(count, -1, np.int64)
    for nodes in (outlet_nodes, inlet_nodes):
        single = np.bincount(part[nodes], minlength=count) == 1
        here = nodes[single[part[nodes]]]
        root[part[here]] = here
    return root


def _undefined(number: int, count: int, loops: int) -> Finding:
    """Say why a part has no orders."""
    which = "the network" if count == 1 else f"part {number + 1} of {count}"
    why = f"it has {loops} loop(s)" if loops else "it has neither a single inlet nor a single outlet"
    return Finding("orders undefined", Severity.NOTE, f"Strahler and Horsfield orders are undefined on {which}: {why}.")


def _order_trees(network: Network, roots: IntArray) -> IntArray:
    """Orders and generation of all segments below the roots, (3, s); −1 elsewhere."""
    start, end = network.segments.from_node, network.segments.to_node
    orders = np.full((3, len(start)), -1, np.int64)
    if len(roots) == 0:
        return orders
    top = len(network.nodes)  # one node above all roots, so that a single walk serves every tree
    tail, head = np.concatenate((start, np.full(len(roots), top))), np.concatenate((end, roots))
    links = coo_array((np.ones(len(tail), np.int8), (tail, head)), shape=(top + 1, top + 1)).tocsr()
    visited, parent = breadth_first_order(links, top, directed=False)
    above = _segment_above(start, end, parent)
    below = [node for node in visited.tolist() if node != top and parent[node] != top]
    _fill_orders(below, parent, above, orders)
    degree = np.bincount(np.concatenate((start, end)), minlength=top)
    for node in below:
        up = int(parent[node])
        orders[2, above[node]] = 0 if parent[up] == top else orders[2, above[up]] + (degree[up] > 2)
    return orders


def _fill_orders(below: list[int], parent: IntArray, above: IntArray, orders: IntArray) -> None:
    """Strahler and Horsfield orders, from the ends to the roots (in place)."""
    daughters: dict[int, list[int]] = {}
    for node in reversed(below):
        segments = daughters.pop(node, [])
        orders[0, above[node]] = _strahler([int(orders[0, segment]) for segment in segments])
        orders[1, above[node]] = 1 + max((int(orders[1, segment]) for segment in segments), default=0)
        daughters.setdefault(int(parent[node]), []).append(int(above[node]))


def _segment_above(start: IntArray, end: IntArray, parent: IntArray) -> IntArray:
    """Segment that leads from each node to its parent in the walk; −1 where there is none."""
    above = np.full(len(parent), -1, np.int64)
    segment = np.arange(len(start))
    down = parent[end] == start
    above[end[down]] = segment[down]
    up = parent[start] == end
    above[start[up]] = segment[up]
    return above


def _strahler(daughters: list[int]) -> int:
    """Order of a parent; an end segment has none and gets 1."""
    if not daughters:
        return 1
    largest = max(daughters)
    return largest + (daughters.count(largest) >= 2)
