"""Segments between their ends: resistances, and the path on which pressure is lost."""

from __future__ import annotations

import numpy as np

from geomprep.assign.labels import segment_label
from geomprep.errors import ModelError
from geomprep.laws.lumped import resistance
from geomprep.model import FloatArray, IntArray, Network
from geomprep.units import format_quantity

__all__ = ["losses_text", "path_of_losses", "segment_resistance"]


def segment_resistance(network: Network) -> FloatArray:
    """Return the resistance of every segment on its imaged radii, Pa·s/m³.

    Raises
    ------
    ModelError
        The network has no measures or no blood yet.
    """
    if network.measures is None or network.blood is None:
        raise ModelError("resistances need measures and blood; measure the segments and assign blood first")
    return resistance(network.measures.inverse_fourth_power, network.blood.viscosity, network.blood.velocity_profile)


def path_of_losses(network: Network, flow: FloatArray, node: int) -> IntArray:
    """Follow the blood that arrives at a node back to where it comes from.

    At every node the segment that brings most is followed. The loss between two places is the
    same on every way, so one way tells where it arises.

    Parameters
    ----------
    network : Network
    flow : (s,) float array
        Positive from → to.
    node : int

    Returns
    -------
    (p,) int array
        Segments from the far end to the node; empty where nothing arrives.
    """
    segments = network.segments
    head = np.where(flow >= 0, segments.to_node, segments.from_node)
    tail = np.where(flow >= 0, segments.from_node, segments.to_node)
    path: list[int] = []
    seen = {node}
    while True:
        arriving = np.flatnonzero((head == node) & (flow != 0) & (tail != node))
        if arriving.size == 0:
            break
        row = int(arriving[np.argmax(np.abs(flow[arriving]))])
        node = int(tail[row])
        if node in seen:
            break
        seen.add(node)
        path.append(row)
    return np.array(path[::-1], dtype=np.int64)


def losses_text(network: Network, flow: FloatArray, node: int, most: int = 4) -> str:
    """Write the losses on the way to a node, the largest first.

    Parameters
    ----------
    network : Network
        With `measures` and `blood`.
    flow : (s,) float array
    node : int
    most : int
        Segments to name.

    Returns
    -------
    str
        Such as ``'trunk' (segment-1a) 61 mmHg, 'branch' (segment-2b) 3 mmHg``.
    """
    path = path_of_losses(network, flow, node)
    loss = segment_resistance(network)[path] * np.abs(flow[path])
    order = np.argsort(-loss, kind="stable")
    shown = [
        f"{segment_label(network, int(path[row]))} {format_quantity(float(loss[row]), 'mmHg', 3)}"
        for row in order[:most]
    ]
    more = loss[order[most:]].sum()
    if len(path) > most:
        shown.append(f"{len(path) - most} more {format_quantity(float(more), 'mmHg', 3)}")
    return ", ".join(shown) or "no segment brings blood here"
