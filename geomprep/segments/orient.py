"""Turn segments so that from → to is the way blood runs."""

from __future__ import annotations

import dataclasses

import numpy as np

from geomprep.curves import line_sums, piece_integrals, pieces
from geomprep.model import BoolArray, FloatArray, IntArray, Network, Stations
from geomprep.solve import steady_heads

__all__ = ["orient", "turned"]

_SMALL_FLOW = 1e-9


def orient(network: Network, inlet_nodes: IntArray, outlet_nodes: IntArray) -> Network:
    """Turn every segment along a linear flow from the inlets to the outlets.

    Conductances are those of the radius profiles at a viscosity of 1 Pa·s, heads are 1 at
    inlets and 0 at outlets; any number of loops is allowed. A flow below 1e-9 of the
    largest takes its direction from the order of the nodes.

    Parameters
    ----------
    network : Network
        Fresh from :func:`geomprep.segments.split`.
    inlet_nodes, outlet_nodes : (i,), (o,) int array

    Returns
    -------
    Network
        The same segments and ids, some of them turned.
    """
    ends = network.segments.from_node, network.segments.to_node
    conductance = np.pi / (8.0 * _inverse_fourth_power(network.stations))
    fixed = np.concatenate((inlet_nodes, outlet_nodes)).astype(np.int64)
    level = np.concatenate((np.ones(len(inlet_nodes)), np.zeros(len(outlet_nodes))))
    head = steady_heads(len(network.nodes), *ends, conductance, fixed, level)
    flow = conductance * (head[ends[0]] - head[ends[1]])
    largest = np.abs(flow).max(initial=0.0)
    return turned(network, flow < -_SMALL_FLOW * largest)


def _inverse_fourth_power(stations: Stations) -> FloatArray:
    """∫ds/r⁴ per segment."""
    piece = pieces(stations.offsets)
    step = stations.distance[piece.first + 1] - stations.distance[piece.first]
    values = piece_integrals(step, stations.radius[piece.first], stations.radius[piece.first + 1])
    return line_sums(values[:, 3], piece.starts)


def turned(network: Network, turn: BoolArray) -> Network:
    """Return the network with the marked segments running the other way."""
    segments, stations = network.segments, network.stations
    lengths = np.diff(stations.offsets)
    index = np.arange(len(stations))
    mirrored = np.repeat(stations.offsets[:-1] + stations.offsets[1:] - 1, lengths) - index
    backwards = np.repeat(turn, lengths)
    row = np.where(backwards, mirrored, index)
    whole = np.repeat(stations.distance[stations.offsets[1:] - 1], lengths)
    distance = np.where(backwards, whole - stations.distance[row], stations.distance)
    distance[stations.offsets[:-1]] = 0.0
    return dataclasses.replace(
        network,
        segments=dataclasses.replace(
            segments,
            from_node=np.where(turn, segments.to_node, segments.from_node),
            to_node=np.where(turn, segments.from_node, segments.to_node),
        ),
        stations=Stations(
            offsets=stations.offsets,
            distance=distance,
            position=stations.position[row],
            radius=stations.radius[row],
            basis=stations.basis[row],
        ),
    )
