"""How nodes and segments are called in messages: vessel name first, id beside it."""

from __future__ import annotations

import numpy as np

from geomprep.model import BoolArray, IntArray, Network

__all__ = ["end_segment", "node_label", "open_ends", "segment_label"]


def open_ends(network: Network) -> BoolArray:
    """Return (n,) True at nodes where exactly one segment end lies."""
    ends = np.concatenate((network.segments.from_node, network.segments.to_node))
    return np.asarray(np.bincount(ends, minlength=len(network.nodes)) == 1, dtype=np.bool_)


def end_segment(network: Network, nodes: IntArray) -> tuple[IntArray, IntArray]:
    """Return the segment that ends at each node and its station there.

    Where several segments meet at a node the first of them is taken.

    Parameters
    ----------
    network : Network
    nodes : (k,) int array

    Returns
    -------
    segment : (k,) int array
        −1 where no segment touches the node.
    station : (k,) int array
        Row of the station at that end.
    """
    n_segments = len(network.segments)
    ends = np.concatenate((network.segments.from_node, network.segments.to_node))
    order = np.lexsort((np.tile(np.arange(n_segments), 2), ends))
    at = np.minimum(np.searchsorted(ends[order], nodes), max(len(ends) - 1, 0))
    if len(ends) == 0:
        return np.full(len(nodes), -1), np.full(len(nodes), -1)
    row = order[at]
    segment = np.where(ends[row] == nodes, row % n_segments, -1)
    offsets = network.stations.offsets
    station = np.where(row < n_segments, offsets[row % n_segments], offsets[row % n_segments + 1] - 1)
    return segment.astype(np.int64), np.where(segment >= 0, station, -1).astype(np.int64)


def segment_label(network: Network, segment: int) -> str:
    """Return the name of a segment with its id, or the id alone."""
    name, key = network.segments.name[segment], network.segments.id[segment]
    return f"'{name}' ({key})" if name else str(key)


def node_label(network: Network, node: int) -> str:
    """Return the name of the vessel that ends at a node with the node's id, or the id alone."""
    segment = int(end_segment(network, np.array([node]))[0][0])
    name = network.segments.name[segment] if segment >= 0 else ""
    return f"'{name}' ({network.nodes.id[node]})" if name else str(network.nodes.id[node])
