"""Cut a point graph into segments between junctions and open ends."""

from __future__ import annotations

import numpy as np

from geomprep.curves import arc_length
from geomprep.model import (
    BoolArray,
    Chains,
    FloatArray,
    IntArray,
    Network,
    Nodes,
    PointGraph,
    Segments,
    Stations,
    anchor_ids,
    chains,
    degrees,
    raw_order,
)

__all__ = ["split"]

_INTERIOR, _JUNCTION, _OPEN_END = 0, 1, 2


def split(graph: PointGraph) -> Network:
    """Cut a point graph into a network of nodes, segments and stations.

    Nodes stand at every point whose degree is not 2 and at one point of each closed ring.
    Nodes and segments come in an order taken from the raw coordinates alone, so that the order of
    points and lines in a file leaves no trace. Segments run from the node that comes first to
    the other; :func:`geomprep.segments.orient` turns them along the flow.

    Parameters
    ----------
    graph : PointGraph
        Every edge of non-zero length.

    Returns
    -------
    Network
        With nodes, segments and stations; names are empty, orders −1.

    Examples
    --------
    >>> from geomprep.model import PointGraph
    >>> none = np.empty(0)
    >>> graph = PointGraph(
    ...     points=np.array([[0.0, 0, 0], [1, 0, 0], [2, 0, 0]]), radius=[1.0, 1, 1], radius_basis=[0, 0, 0],
    ...     vessel_class=[1, 1, 1], input_id=[0, 0, 0], protected=[False] * 3, source_point=[0, 1, 2],
    ...     edges=[[0, 1], [1, 2]], edge_basis=[0, 0], merged_into=[0, 1, 2],
    ...     raw_points=np.array([[0.0, 0, 0], [1, 0, 0], [2, 0, 0]]),
    ...     own_radius_edge=none, own_radius_end=none, own_radius=none)
    >>> split(graph)
    Network(2 nodes, 1 segments, 3 stations)
    """
    cut = _canonical_chains(graph)
    rank = _raw_rank(graph, _deciding_points(cut))
    node_point = _node_points(cut, rank)
    node_of = np.full(graph.n_points, -1, np.int64)
    node_of[node_point] = np.arange(len(node_point))
    cut, own = _directed(graph, cut, rank)
    order = _segment_order(cut, node_of, rank)
    cut, own = _taken(cut, own, order)
    return Network(
        nodes=_nodes(graph, node_point),
        segments=_segments(graph, cut, node_of),
        stations=_stations(graph, cut, own),
    )


def _raw_rank(graph: PointGraph, which: IntArray) -> IntArray:
    """Rank of some graph points by their raw coordinates; inserted points by their position, last."""
    rank = np.full(graph.n_points, -1, np.int64)
    named = np.zeros(graph.n_points, np.bool_)
    named[which] = True
    which = np.flatnonzero(named)
    known, inserted = which[graph.source_point[which] >= 0], which[graph.source_point[which] < 0]
    order = known[raw_order(graph.raw_points, graph.source_point[known])]
    rank[order] = np.arange(len(order))
    rank[inserted[raw_order(graph.points, inserted)]] = len(order) + np.arange(len(inserted))
    return rank


def _deciding_points(cut: Chains) -> IntArray:
    """Points whose raw coordinates decide the order of nodes and segments and their direction."""
    first, last = cut.offsets[:-1], cut.offsets[1:] - 1
    return np.concatenate([cut.point[row] for row in (first, last, first + 1, last - 1, *_halfway(cut))])


def _halfway(cut: Chains) -> tuple[IntArray, IntArray]:
    """Rows of the two middle points of each chain; one point twice where its number is odd."""
    total = cut.offsets[:-1] + cut.offsets[1:] - 1
    return total // 2, (total + 1) // 2


def _canonical_chains(graph: PointGraph) -> Chains:
    """Chains whose closed rings begin at the point that comes first in raw order."""
    cut = chains(graph.n_points, graph.edges)
    if not cut.ring.any():
        return cut
    on_ring = np.repeat(cut.ring, np.diff(cut.offsets))
    rank = _raw_rank(graph, cut.point[on_ring])
    stop = np.zeros(graph.n_points, np.bool_)
    for ring in np.flatnonzero(cut.ring):
        around = cut.point[cut.offsets[ring] : cut.offsets[ring + 1]]
        stop[around[np.argmin(rank[around])]] = True
    return chains(graph.n_points, graph.edges, stop)


def _node_points(cut: Chains, rank: IntArray) -> IntArray:
    """Graph points that become nodes, in raw order."""
    named = np.zeros(len(rank), np.bool_)
    named[cut.point[cut.offsets[:-1]]] = named[cut.point[cut.offsets[1:] - 1]] = True
    ends = np.flatnonzero(named)
    return ends[np.argsort(rank[ends], kind="stable")]


def _directed(graph: PointGraph, cut: Chains, rank: IntArray) -> tuple[Chains, FloatArray]:
    """Turn every chain to start at its earlier end; also give each end's own radius (c, 2)."""
    first, last = cut.offsets[:-1], cut.offsets[1:] - 1
    near, far = rank[cut.point[first]], rank[cut.point[last]]
    # a closed segment has one node: its neighbour points decide the direction
    second, before_last = rank[cut.point[first + 1]], rank[cut.point[last - 1]]
    turn = (near > far) | ((near == far) & (second > before_last))
    own = _own_radii(graph, cut)
    own[turn] = own[turn, ::-1]
    return Chains(
        _flipped(cut.point, cut.offsets, turn), cut.offsets, _flipped(cut.edge, cut.edge_offsets, turn), cut.ring
    ), own


def _flipped(values: IntArray, offsets: IntArray, turn: BoolArray) -> IntArray:
    """Reverse the rows of the lines marked in `turn`."""
    index = np.arange(len(values))
    lengths = np.diff(offsets)
    mirrored = np.repeat(offsets[:-1] + offsets[1:] - 1, lengths) - index
    return values[np.where(np.repeat(turn, lengths), mirrored, index)]


def _own_radii(graph: PointGraph, cut: Chains) -> FloatArray:
    """Radius that the drawn line had at each end of each chain, (c, 2)."""
    first, last = cut.offsets[:-1], cut.offsets[1:] - 1
    own = np.stack((graph.radius[cut.point[first]], graph.radius[cut.point[last]]), axis=1)
    if len(graph.own_radius) == 0:
        return own
    stated = np.full((graph.n_edges, 2), np.nan)
    stated[graph.own_radius_edge, graph.own_radius_end] = graph.own_radius
    edge_first, edge_last = cut.edge[cut.edge_offsets[:-1]], cut.edge[cut.edge_offsets[1:] - 1]
    for column, edge, point, inner in (
        (0, edge_first, cut.point[first], cut.point[first + 1]),
        (1, edge_last, cut.point[last], cut.point[last - 1]),
    ):
        # a self-loop edge has its point at both ends: the inner point tells them apart
        end = np.where((graph.edges[edge, 0] == point) & (graph.edges[edge, 1] == inner), 0, 1)
        value = stated[edge, end]
        own[:, column] = np.where(np.isnan(value), own[:, column], value)
    return own


def _segment_order(cut: Chains, node_of: IntArray, rank: IntArray) -> IntArray:
    """Canonical order of segments: by nodes, then by the point halfway."""
    first, last = cut.offsets[:-1], cut.offsets[1:] - 1
    near, far = (rank[cut.point[row]] for row in _halfway(cut))
    middle = np.minimum(near, far)
    return np.lexsort((middle, node_of[cut.point[last]], node_of[cut.point[first]])).astype(np.int64)


def _taken(cut: Chains, own: FloatArray, order: IntArray) -> tuple[Chains, FloatArray]:
    """Chains in another order."""
    counts = np.diff(cut.offsets)[order]
    offsets = np.concatenate(([0], np.cumsum(counts))).astype(np.int64)
    rows = np.repeat(cut.offsets[order] - offsets[:-1], counts) + np.arange(offsets[-1])
    edge_counts = counts - 1
    edge_offsets = offsets - np.arange(len(offsets))
    edge_rows = np.repeat(cut.edge_offsets[order] - edge_offsets[:-1], edge_counts) + np.arange(edge_offsets[-1])
    return Chains(cut.point[rows], offsets, cut.edge[edge_rows], cut.ring[order]), own[order]


def _nodes(graph: PointGraph, node_point: IntArray) -> Nodes:
    """Table of nodes; open ends have degree 1."""
    degree = degrees(graph.n_points, graph.edges)[node_point]
    role = np.select([degree == 1, degree == 2], [_OPEN_END, _INTERIOR], _JUNCTION)
    anchor = graph.source_point[node_point]
    return Nodes(
        id=anchor_ids("node", graph.raw_points, anchor[:, None]),
        position=graph.points[node_point],
        height=np.zeros(len(node_point)),
        role=role.astype(np.uint8),
        source_point=anchor,
    )


def _segments(graph: PointGraph, cut: Chains, node_of: IntArray) -> Segments:
    """Table of segments; ids hang on both ends and the points halfway."""
    first, last = cut.offsets[:-1], cut.offsets[1:] - 1
    halfway = _halfway(cut)
    anchors = np.stack([graph.source_point[cut.point[row]] for row in (first, last, *halfway)], axis=1)
    undefined = np.full(cut.n_chains, -1)
    return Segments(
        id=anchor_ids("segment", graph.raw_points, anchors),
        name=np.full(cut.n_chains, "", dtype=object),
        from_node=node_of[cut.point[first]],
        to_node=node_of[cut.point[last]],
        vessel_class=graph.vessel_class[cut.point[halfway[0]]],
        input_id=graph.input_id[cut.point[halfway[0]]],
        strahler_order=undefined,
        horsfield_order=undefined,
        generation=undefined,
    )


def _stations(graph: PointGraph, cut: Chains, own: FloatArray) -> Stations:
    """Table of stations: every point of every chain, with each end's own radius."""
    radius = graph.radius[cut.point]
    radius[cut.offsets[:-1]] = own[:, 0]
    radius[cut.offsets[1:] - 1] = own[:, 1]
    position = graph.points.take(cut.point, axis=0)
    return Stations(
        offsets=cut.offsets,
        distance=arc_length(position, cut.offsets),
        position=position,
        radius=radius,
        basis=graph.radius_basis[cut.point],
    )
