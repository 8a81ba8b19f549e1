"""A network between its ends: heads held, flows sent in, resistances to far heads."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from geomprep.errors import ModelError
from geomprep.solve.edges import FloatArray, IntArray, net_outflow, with_far_nodes
from geomprep.solve.equations import factorise, heads_and_flows

__all__ = ["Boundary", "Solution", "solve_between"]


@dataclass(frozen=True, eq=False)
class Boundary:
    """What stands at the ends of a network, one row per end.

    Attributes
    ----------
    node : (m,) int array
    inflow : (m,) float array
        Flow that enters from outside (negative: leaves); NaN where a head is given.
    head : (m,) float array
        Head behind the end; not read where a flow is given.
    resistance : (m,) float array
        Resistance between the node and that head; 0 holds the node at the head itself.
    """

    node: IntArray
    inflow: FloatArray
    head: FloatArray
    resistance: FloatArray


@dataclass(frozen=True, eq=False)
class Solution:
    """Heads and flows between the ends.

    Attributes
    ----------
    head : (n,) float array
    flow : (e,) float array
        Positive from → to.
    inflow : (m,) float array
        Flow into the network at each end.
    imbalance : float
        Largest unbalanced flow at any node, the flows at the ends counted.
    """

    head: FloatArray
    flow: FloatArray
    inflow: FloatArray
    imbalance: float


def solve_between(
    n_nodes: int, from_node: npt.ArrayLike, to_node: npt.ArrayLike, conductance: npt.ArrayLike, boundary: Boundary
) -> Solution:
    """Solve a network between its ends.

    Parameters
    ----------
    n_nodes : int
    from_node, to_node : (e,) int array
    conductance : (e,) float array
    boundary : Boundary

    Returns
    -------
    Solution

    Raises
    ------
    ModelError
        As :func:`geomprep.solve.factorise`: a part of the network reaches no head, among
        others; a resistance is negative or a node is held twice.

    Examples
    --------
    >>> ends = Boundary(np.array([0, 1]), np.array([2.0, np.nan]), np.array([0.0, 10.0]), np.array([0.0, 4.0]))
    >>> found = solve_between(2, [0], [1], [0.5], ends)
    >>> found.head.tolist(), found.inflow.round(9).tolist()
    ([22.0, 18.0], [2.0, -2.0])
    """
    given = np.isfinite(boundary.inflow)
    far = ~given & (boundary.resistance != 0)
    held = ~given & (boundary.resistance == 0)
    if not (boundary.resistance[far] > 0).all():
        raise ModelError(f"resistance {boundary.resistance[far].min():g} at an end: it must be 0 or above")
    size, tail, head, value = with_far_nodes(
        n_nodes, (from_node, to_node, conductance), boundary.node[far], 1.0 / boundary.resistance[far]
    )
    network = factorise(size, tail, head, value, np.concatenate((boundary.node[held], np.arange(n_nodes, size))))
    source = np.bincount(boundary.node[given], boundary.inflow[given], size).astype(np.float64)
    found, flow = heads_and_flows(network, np.concatenate((boundary.head[held], boundary.head[far])), source)
    n_edges = len(tail) - np.count_nonzero(far)
    out = net_outflow(size, tail, head, flow)[:n_nodes] - source[:n_nodes]
    inflow = boundary.inflow.copy()
    inflow[held] = out[boundary.node[held]]
    inflow[far] = -flow[n_edges:]
    out[boundary.node[held]] = 0.0
    return Solution(found[:n_nodes], flow[:n_edges], inflow, float(np.abs(out).max(initial=0.0)))
