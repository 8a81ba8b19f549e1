"""Flow through the imaged network: resistances, a solve between its ends, where pressure is lost."""

from __future__ import annotations

import numpy as np

from geomprep.assign.labels import segment_label
from geomprep.errors import ModelError
from geomprep.laws.lumped import resistance
from geomprep.model import FloatArray, IntArray, Network
from geomprep.solve import Boundary, Solution, parts, solve_between
from geomprep.units import STANDARD_GRAVITY, format_quantity

__all__ = ["blood_column", "losses_text", "node_parts", "path_of_losses", "segment_resistance", "solve_imaged"]


def segment_resistance(network: Network) -> FloatArray:
    """Return the resistance of every segment on its imaged radii and outlines, Pa·s/m³.

    Raises
    ------
    ModelError
        The network has no measures or no blood yet.
    """
    if network.measures is None or network.blood is None:
        raise ModelError("resistances need measures and blood; measure the segments and assign blood first")
    blood = network.blood
    circular = resistance(network.measures.inverse_fourth_power, blood.viscosity, blood.velocity_profile)
    return circular * network.segments.friction_shape


def blood_column(network: Network, height: FloatArray) -> FloatArray:
    """Return ρ g z of blood at heights, Pa.

    Raises
    ------
    ModelError
        The network has no blood yet.
    """
    if network.blood is None:
        raise ModelError("a column of blood needs its density; assign blood first")
    return network.blood.density * STANDARD_GRAVITY * height


def node_parts(network: Network) -> IntArray:
    """Return the number of the connected part of each node, (n,)."""
    segments = network.segments
    return parts(len(network.nodes), segments.from_node, segments.to_node, np.ones(len(segments)))


def solve_imaged(network: Network, boundary: Boundary) -> Solution:
    """Solve the linear flow on the imaged radii.

    Parameters
    ----------
    network : Network
        With `measures` and `blood`.
    boundary : Boundary
        Heads in Pa, the column of blood at the end's height included.

    Returns
    -------
    Solution

    Raises
    ------
    ModelError
        A connected part reaches no pressure, which is named.
    """
    part = node_parts(network)
    held = part[boundary.node[~np.isfinite(boundary.inflow)]]
    loose = np.flatnonzero(~np.isin(part, held))
    if loose.size:
        raise ModelError(
            f"the part of the network with node {network.nodes.id[loose[0]]} reaches no pressure: put an outlet or an "
            "inlet pressure there, or leave the part out"
        )
    segments = network.segments
    conductance = 1.0 / segment_resistance(network)
    return solve_between(len(network.nodes), segments.from_node, segments.to_node, conductance, boundary)


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
    seen: set[int] = set()
    while node not in seen:
        seen.add(node)
        arriving = np.flatnonzero((head == node) & (flow != 0) & (tail != node))
        if arriving.size:
            path.append(int(arriving[np.argmax(np.abs(flow[arriving]))]))
            node = int(tail[path[-1]])
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
        for row in order[:most].tolist()
    ]
    if len(path) > most:
        rest = float(loss[order[most:]].sum())
        shown.append(f"{len(path) - most} more {format_quantity(rest, 'mmHg', 3)}")
    return ", ".join(shown) or "no segment brings blood here"
