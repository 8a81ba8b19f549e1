"""How segment ends meet at nodes: directions and areas, for solvers that add losses."""

from __future__ import annotations

import dataclasses

import numpy as np

from geomprep.curves import interpolate
from geomprep.model import FloatArray, IntArray, Junctions, Network

__all__ = ["junctions"]

_REACH_IN_RADII = 2.0


def junctions(network: Network) -> Network:
    """Add the junction table: every node where two or more segment ends meet.

    The direction of an end is that of the chord from the node to the place two radii along the
    segment, or halfway where the segment is shorter than four radii.

    Parameters
    ----------
    network : Network

    Returns
    -------
    Network
        With `junctions` filled; nodes in order, ends by segment number.
    """
    segments = network.segments
    n_segments = len(segments)
    node = np.concatenate((segments.from_node, segments.to_node))
    segment = np.tile(np.arange(n_segments), 2)
    end = np.repeat(np.array([0, 1]), n_segments)
    degree = np.bincount(node, minlength=len(network.nodes))
    meeting = np.flatnonzero(degree >= 2)
    rows = np.flatnonzero(degree[node] >= 2)
    rows = rows[np.lexsort((end[rows], segment[rows], node[rows]))]
    segment, end = segment[rows], end[rows]
    table = Junctions(
        node=meeting,
        offsets=np.concatenate(([0], np.cumsum(degree[meeting]))).astype(np.int64),
        segment=segment,
        end=end.astype(np.uint8),
        direction=_directions(network, segment, end),
        area=np.pi * network.stations.radius[_end_station(network, segment, end)] ** 2,
    )
    return dataclasses.replace(network, junctions=table)


def _end_station(network: Network, segment: IntArray, end: IntArray) -> IntArray:
    """Station at an end of a segment."""
    offsets = network.stations.offsets
    return np.where(end == 0, offsets[segment], offsets[segment + 1] - 1)


def _directions(network: Network, segment: IntArray, end: IntArray) -> FloatArray:
    """Unit vector from the node into each segment."""
    stations = network.stations
    length = stations.distance[stations.offsets[1:] - 1][segment]
    here = _end_station(network, segment, end)
    reach = np.minimum(_REACH_IN_RADII * stations.radius[here], 0.5 * length)
    at = np.where(end == 0, reach, length - reach)
    inside = interpolate(stations.distance, stations.position, stations.offsets, segment, at)
    chord = inside - stations.position[here]
    size = np.linalg.norm(chord, axis=1, keepdims=True)
    return chord / np.where(size > 0, size, 1.0)
