"""Connected parts that no inlet reaches: they cannot carry flow and are left out, on record."""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from geomprep.curves import line_sums, piece_integrals, pieces
from geomprep.model import BoolArray, FloatArray, IntArray, Network, Nodes, Repair, Segments, Stations, anchor_ids
from geomprep.solve import parts

__all__ = ["ReachedPart", "kept_segments", "leave_out_unreached"]


@dataclass(frozen=True)
class ReachedPart:
    """What is left of a network, and the record of what was left out."""

    network: Network
    repairs: tuple[Repair, ...]


def leave_out_unreached(network: Network, inlet_nodes: IntArray, raw_points: npt.NDArray[Any]) -> ReachedPart:
    """Leave out every connected part that holds no inlet.

    No blood enters such a part: its flow is zero and its pressure undetermined, and a share of
    the outflow given to one of its open ends would be lost. Each leaves a repair with its length and volume.

    Parameters
    ----------
    network : Network
        Nodes, segments and stations; no later table.
    inlet_nodes : (i,) int array
    raw_points : (n_raw, 3) array
        Raw coordinates, for the ids of the repairs.

    Returns
    -------
    ReachedPart
        The network itself where every part is reached, or where there is no inlet at all.
    """
    segments = network.segments
    part = parts(len(network.nodes), segments.from_node, segments.to_node, np.ones(len(segments)))
    reached = np.zeros(part.max(initial=-1) + 1, np.bool_)
    reached[part[inlet_nodes]] = True
    if reached.all() or not reached.any():
        return ReachedPart(network, ())
    keep = reached[part[segments.from_node]]
    return ReachedPart(kept_segments(network, keep), _records(network, part, reached, raw_points))


def _records(network: Network, part: IntArray, reached: BoolArray, raw_points: npt.NDArray[Any]) -> tuple[Repair, ...]:
    """One repair for each part that is left out."""
    stations, owner = network.stations, part[network.segments.from_node]
    length = np.bincount(owner, stations.distance[stations.offsets[1:] - 1], len(reached))
    volume = np.bincount(owner, _volumes(stations), len(reached))
    count = np.bincount(owner, minlength=len(reached))
    lost = np.flatnonzero(~reached)
    first_node = np.unique(part, return_index=True)[1][lost]  # nodes stand in raw order
    ids = anchor_ids("part", raw_points, network.nodes.source_point[first_node][:, None])
    return tuple(
        Repair(
            id=str(name),
            kind="unreached part",
            reason=f"No inlet reaches a part of {count[row]} segment(s), {1e3 * length[row]:.1f} mm long, "
            f"{1e6 * volume[row]:.3g} mL: it cannot carry flow.",
            position=tuple(network.nodes.position[node].tolist()),
            choice="leave out",
            options=("leave out",),
        )
        for name, row, node in zip(ids, lost.tolist(), first_node.tolist(), strict=True)
    )


def _volumes(stations: Stations) -> FloatArray:
    """Volume of each segment."""
    piece = pieces(stations.offsets)
    step = stations.distance[piece.first + 1] - stations.distance[piece.first]
    values = piece_integrals(step, stations.radius[piece.first], stations.radius[piece.first + 1])
    return line_sums(values[:, 0], piece.starts)


def kept_segments(network: Network, keep: BoolArray) -> Network:
    """Return the network of some segments and the nodes at their ends, renumbered in order.

    Parameters
    ----------
    network : Network
        Nodes, segments and stations; no later table.
    keep : (s,) bool array

    Returns
    -------
    Network
    """
    nodes, segments, stations = network.nodes, network.segments, network.stations
    used = np.zeros(len(nodes), np.bool_)
    used[segments.from_node[keep]] = used[segments.to_node[keep]] = True
    number = np.cumsum(used) - 1
    rows = {field.name: getattr(segments, field.name)[keep] for field in dataclasses.fields(segments)}
    rows |= {name: number[rows[name]] for name in ("from_node", "to_node")}
    station = np.repeat(keep, np.diff(stations.offsets))
    offsets = np.concatenate(([0], np.cumsum(np.diff(stations.offsets)[keep])))
    return dataclasses.replace(
        network,
        nodes=Nodes(**{field.name: getattr(nodes, field.name)[used] for field in dataclasses.fields(nodes)}),
        segments=Segments(**rows),
        stations=Stations(
            offsets, stations.distance[station], stations.position[station], stations.radius[station],
            stations.basis[station],
        ),
    )  # fmt: skip
