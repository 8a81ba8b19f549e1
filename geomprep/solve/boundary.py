"""A network between its ends: heads held, flows sent in, resistances to far heads."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from geomprep.solve.edges import FloatArray, IntArray, net_outflow, with_far_nodes
from geomprep.solve.equations import factorise, heads_and_flows

__all__ = ["Boundary", "Solution", "solve_between"]


def _none() -> FloatArray:
    """No values."""
    return np.empty(0)


def _no_nodes() -> IntArray:
    """No nodes."""
    return np.empty(0, np.int64)


@dataclass(frozen=True, eq=False)
class Boundary:
    """What stands at the ends of a network; a node appears in one group at most.

    Attributes
    ----------
    fixed_node, fixed_head : (f,) array
        Nodes whose head is held.
    flow_node, inflow : (i,) array
        Nodes where a flow enters from outside (negative: leaves).
    far_node, far_resistance, far_head : (k,) array
        Nodes joined by a resistance above zero to a far head.
    """

    fixed_node: IntArray = field(default_factory=_no_nodes)
    fixed_head: FloatArray = field(default_factory=_none)
    flow_node: IntArray = field(default_factory=_no_nodes)
    inflow: FloatArray = field(default_factory=_none)
    far_node: IntArray = field(default_factory=_no_nodes)
    far_resistance: FloatArray = field(default_factory=_none)
    far_head: FloatArray = field(default_factory=_none)


@dataclass(frozen=True, eq=False)
class Solution:
    """Heads and flows between the ends.

    Attributes
    ----------
    head : (n,) float array
    flow : (e,) float array
        Positive from → to.
    fixed_inflow : (f,) float array
        Flow into the network at the nodes whose head is held.
    far_outflow : (k,) float array
        Flow out of the network to the far heads.
    imbalance : float
        Largest unbalanced flow at any node.
    """

    head: FloatArray
    flow: FloatArray
    fixed_inflow: FloatArray
    far_outflow: FloatArray
    imbalance: float


def solve_between(
    n_nodes: int,
    from_node: npt.ArrayLike,
    to_node: npt.ArrayLike,
    conductance: npt.ArrayLike,
    boundary: Boundary,
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
        As :func:`geomprep.solve.factorise`; a part of the network reaches neither a
        held head nor a far head.

    Examples
    --------
    >>> ends = Boundary(flow_node=np.array([0]), inflow=np.array([2.0]), far_node=np.array([1]),
    ...                 far_resistance=np.array([3.0]), far_head=np.array([10.0]))
    >>> solve_between(2, [0], [1], [0.5], ends).head
    array([20., 16.])
    """
    size, tail, head, value = with_far_nodes(
        n_nodes, (from_node, to_node, conductance), boundary.far_node, 1.0 / boundary.far_resistance
    )
    n_edges = len(tail) - len(boundary.far_node)
    far = np.arange(n_nodes, size)
    network = factorise(size, tail, head, value, np.concatenate((boundary.fixed_node, far)))
    inflow = np.bincount(boundary.flow_node, boundary.inflow, size).astype(np.float64)
    found, flow = heads_and_flows(network, np.concatenate((boundary.fixed_head, boundary.far_head)), inflow)
    out = net_outflow(size, tail, head, flow)[:n_nodes] - inflow[:n_nodes]
    at_fixed = out[boundary.fixed_node]
    out[boundary.fixed_node] = 0.0
    return Solution(found[:n_nodes], flow[:n_edges], at_fixed, flow[n_edges:], float(np.abs(out).max(initial=0.0)))
