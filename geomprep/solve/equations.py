"""The steady network equations: conductances between nodes, heads, flows, balance of mass.

With from/to nodes, conductances g and heads h, the flow of an edge is
q = g (h_from − h_to), and at every node whose head is free the flows that leave
it add up to the inflow. The unknown heads solve a symmetric, diagonally dominant
system; it is factorised once by a direct sparse solver with its pivots on the diagonal.

Heads alone cannot carry the flows of wide vessels: where conductances span twelve decades,
the drop along the widest edge lies in the last four digits of the heads. The flows are
therefore corrected beside the heads, each round from the imbalance that the last left behind.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy.sparse import coo_array
from scipy.sparse.linalg import splu

from geomprep.errors import ModelError
from geomprep.solve.edges import FloatArray, IntArray, checked_edges, net_outflow, parts

__all__ = [
    "Factorised",
    "factorise",
    "flows",
    "heads",
    "heads_and_flows",
    "steady_heads",
]

_ROUNDS = 40  # each gains the digits that the span of conductances leaves: sixteen to one
_BALANCED = 1e-9  # imbalance over largest flow above which a result is refused


@dataclass(frozen=True, eq=False)
class Factorised:
    """A factorised network: solve it for any heads and inflows.

    Attributes
    ----------
    n_nodes : int
    from_node, to_node : (e,) int array
    conductance : (e,) float array
    fixed : (f,) int array
        Nodes whose head is given.
    pinned : (p,) int array
        One node of each part that holds no fixed node; its head is 0.
    part : (n,) int array
        Number of the connected part of each node.
    free : (u,) int array
        Nodes whose head is unknown.
    scale : (u,) float array
        About the inverse root of the diagonal, a power of two; rows and columns are multiplied by it.
    factor : object
        The factors of the scaled matrix; None where no head is unknown.
    """

    n_nodes: int
    from_node: IntArray
    to_node: IntArray
    conductance: FloatArray
    fixed: IntArray
    pinned: IntArray
    part: IntArray
    free: IntArray
    scale: FloatArray
    factor: Any


def factorise(
    n_nodes: int,
    from_node: npt.ArrayLike,
    to_node: npt.ArrayLike,
    conductance: npt.ArrayLike,
    fixed: npt.ArrayLike,
    still_parts: bool = False,
) -> Factorised:
    """Factorise the steady equations of a network.

    Parameters
    ----------
    n_nodes : int
    from_node, to_node : (e,) int array
        Ends of each edge; parallel edges and self-loops are allowed.
    conductance : (e,) float array
        m³/(Pa·s) or any unit of flow per head; 0 closes an edge.
    fixed : (f,) int array
        Nodes whose heads will be given.
    still_parts : bool
        What to do with a connected part that holds no fixed node: False refuses it,
        True gives its lowest node head 0, so that nothing flows there unless inflows
        that add up to zero drive it.

    Returns
    -------
    Factorised

    Raises
    ------
    ModelError
        A node number or conductance is impossible, a part has no fixed node, or the
        conductances span more decades than double precision can carry.

    Examples
    --------
    >>> chain = factorise(3, [0, 1], [1, 2], [1.0, 3.0], [0, 2])
    >>> heads(chain, [4.0, 0.0])
    array([4., 1., 0.])
    >>> factorise(2, [0], [1], [1.0], [])
    Traceback (most recent call last):
    geomprep.errors.ModelError: 1 part(s) of the network hold no node of known head; the first holds node 0
    """
    tail, head, value = checked_edges(n_nodes, from_node, to_node, conductance)
    given = np.asarray(fixed, dtype=np.int64).ravel()
    if len(np.unique(given)) < len(given):
        raise ModelError(
            f"node {np.sort(given)[:-1][np.diff(np.sort(given)) == 0][0]} is fixed twice; give it one head"
        )
    if given.size and not (given.min() >= 0 and given.max() < n_nodes):
        raise ModelError(f"a fixed node lies outside 0…{n_nodes - 1}; nodes are numbered from 0")
    part = parts(n_nodes, tail, head, value)
    pinned = _pinned(part, given, still_parts)
    known = np.zeros(n_nodes, np.bool_)
    known[given] = known[pinned] = True
    free = np.flatnonzero(~known)
    scale, factor = _factors(free, n_nodes, tail, head, value)
    return Factorised(n_nodes, tail, head, value, given, pinned, part, free, scale, factor)


def _pinned(part: IntArray, fixed: IntArray, still_parts: bool) -> IntArray:
    """Lowest node of each part without a fixed node."""
    first = np.unique(part, return_index=True)[1]
    held = np.zeros(len(first), np.bool_)
    held[part[fixed]] = True
    pinned = first[~held].astype(np.int64)
    if pinned.size and not still_parts:
        raise ModelError(
            f"{pinned.size} part(s) of the network hold no node of known head; the first holds node {pinned[0]} "
            f"and {np.count_nonzero(part == part[pinned[0]]) - 1} more: give it a head or join it to the rest"
        )
    return pinned


def _factors(free: IntArray, n_nodes: int, tail: IntArray, head: IntArray, value: FloatArray) -> tuple[FloatArray, Any]:
    """Scale and factors of the matrix of free nodes."""
    if free.size == 0:
        return np.empty(0), None
    row = np.full(n_nodes, -1, np.int32)
    row[free] = np.arange(len(free), dtype=np.int32)
    used = (tail != head) & (value > 0)
    i, j, g = row[tail[used]], row[head[used]], value[used]
    diagonal = np.bincount(i[i >= 0], g[i >= 0], len(free)) + np.bincount(j[j >= 0], g[j >= 0], len(free))
    scale = np.ldexp(1.0, -(np.frexp(diagonal)[1] // 2))  # powers of two: scaling rounds nothing
    both = (i >= 0) & (j >= 0)
    i, j = i[both], j[both]
    off = -g[both] * scale[i] * scale[j]
    own = np.arange(len(free), dtype=np.int32)
    entries = (np.concatenate((off, off, diagonal * scale**2)), (np.r_[i, j, own], np.r_[j, i, own]))
    matrix = coo_array(entries, shape=(len(free), len(free))).tocsc()
    try:
        # pivots stay on the diagonal: safe for these matrices, and fill stays as ordered
        options = {"SymmetricMode": True, "Equil": False}
        return scale, splu(matrix, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options=options)
    except RuntimeError as error:
        raise ModelError(_too_wide(value)) from error


def _too_wide(conductance: FloatArray) -> str:
    """Message for conductances that double precision cannot carry."""
    used = conductance[conductance > 0]
    return (
        f"conductances from {used.min():.3g} to {used.max():.3g} span too many decades for double precision; "
        "look for a radius far too small or too large, or close the smallest edges"
    )


def heads_and_flows(
    network: Factorised, fixed_heads: npt.ArrayLike, inflow: npt.ArrayLike | None = None
) -> tuple[FloatArray, FloatArray]:
    """Solve a factorised network for given heads and inflows.

    Parameters
    ----------
    network : Factorised
    fixed_heads : (f,) float array
        Heads of ``network.fixed``, in that order.
    inflow : (n,) float array, optional
        Flow that enters the network at each node from outside; what is given at a
        fixed node has no effect, its head decides.

    Returns
    -------
    heads : (n,) float array
    flows : (e,) float array
        Positive from → to; balanced at free nodes to rounding even where the heads
        cannot resolve the drop along a wide edge.

    Raises
    ------
    ModelError
        A part without fixed node has inflows that do not add up to zero, a value is not
        finite, or the conductances span too many decades.

    Examples
    --------
    >>> pair = factorise(2, [0, 0], [1, 1], [1.0, 3.0], [1])
    >>> head, flow = heads_and_flows(pair, [0.0], [8.0, 0.0])
    >>> head.tolist(), flow.tolist()
    ([2.0, 0.0], [2.0, 6.0])
    """
    given = np.asarray(fixed_heads, dtype=np.float64).ravel()
    source = np.zeros(network.n_nodes) if inflow is None else np.asarray(inflow, dtype=np.float64)
    _check_right_side(network, given, source)
    level = np.zeros(int(network.part.max(initial=-1)) + 1)
    level[network.part[network.fixed[::-1]]] = given[::-1]
    raised = level[network.part]  # heads above one of the part: equal heads then give exactly no flow
    x = np.zeros(network.n_nodes)
    x[network.fixed] = given - raised[network.fixed]
    x[network.free] = _solved(network, source[network.free] - _outflow(network, _flow(network, x)))
    flow = _flow(network, x)
    x, flow = _corrected(network, source, x, flow)
    return raised + x, flow


def _corrected(
    network: Factorised, source: FloatArray, x: FloatArray, flow: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Heads and flows after the imbalance has been sent through the network until none is left."""
    size = np.abs(source).max(initial=0.0)
    before = np.inf
    for _ in range(_ROUNDS):
        left = source[network.free] - _outflow(network, flow)
        imbalance = np.abs(left).max(initial=0.0)
        largest = max(np.abs(flow).max(initial=0.0), size)
        if imbalance <= 4 * np.finfo(np.float64).eps * largest or imbalance > before / 2:
            break
        step = np.zeros(network.n_nodes)
        step[network.free] = _solved(network, left)
        x, flow, before = x + step, flow + _flow(network, step), imbalance
    if not imbalance <= _BALANCED * largest:
        raise ModelError(_too_wide(network.conductance))
    return x, flow


def _check_right_side(network: Factorised, given: FloatArray, source: FloatArray) -> None:
    """Refuse heads and inflows that do not fit the network."""
    if len(given) != len(network.fixed) or source.shape != (network.n_nodes,):
        raise ModelError(
            f"{len(given)} heads for {len(network.fixed)} fixed nodes and {source.shape[0]} inflows "
            f"for {network.n_nodes} nodes given; they must agree"
        )
    if not (np.isfinite(given).all() and np.isfinite(source).all()):
        raise ModelError("a fixed head or an inflow is not a finite number; give each a value")
    for node in network.pinned[np.flatnonzero(_part_inflow(network, source) != 0)].tolist():
        raise ModelError(
            f"the part of the network with node {node} holds no node of known head, and its inflows do not "
            "add up to zero; give it a head or balance its inflows"
        )


def _part_inflow(network: Factorised, source: FloatArray) -> FloatArray:
    """Net inflow of each part without fixed node; 0 where it is within rounding."""
    count = int(network.part.max(initial=-1)) + 1
    net = np.bincount(network.part, source, count)[network.part[network.pinned]].astype(np.float64)
    size = np.bincount(network.part, np.abs(source), count)[network.part[network.pinned]]
    return np.asarray(np.where(np.abs(net) <= _BALANCED * size, 0.0, net), dtype=np.float64)


def _flow(network: Factorised, head: FloatArray) -> FloatArray:
    """Flow of each edge at given heads."""
    return network.conductance * (head[network.from_node] - head[network.to_node])


def _outflow(network: Factorised, flow: FloatArray) -> FloatArray:
    """Net outflow at the free nodes."""
    return net_outflow(network.n_nodes, network.from_node, network.to_node, flow)[network.free]


def _solved(network: Factorised, right: FloatArray) -> FloatArray:
    """Heads of the free nodes for a right side."""
    if network.factor is None:
        return right
    return np.asarray(network.scale * network.factor.solve(network.scale * right), dtype=np.float64)


def heads(network: Factorised, fixed_heads: npt.ArrayLike, inflow: npt.ArrayLike | None = None) -> FloatArray:
    """Return the heads of :func:`heads_and_flows` alone, (n,).

    Examples
    --------
    >>> heads(factorise(2, [0], [1], [2.0], [1]), [1.0], [4.0, 0.0])
    array([3., 1.])
    """
    return heads_and_flows(network, fixed_heads, inflow)[0]


def flows(network: Factorised, fixed_heads: npt.ArrayLike, inflow: npt.ArrayLike | None = None) -> FloatArray:
    """Return the flows of :func:`heads_and_flows` alone, (e,), positive from → to.

    Examples
    --------
    >>> flows(factorise(2, [0], [1], [2.0], [0, 1]), [3.0, 1.0])
    array([4.])
    """
    return heads_and_flows(network, fixed_heads, inflow)[1]


def steady_heads(
    n_nodes: int,
    from_node: npt.ArrayLike,
    to_node: npt.ArrayLike,
    conductance: npt.ArrayLike,
    fixed_nodes: npt.ArrayLike,
    fixed_heads: npt.ArrayLike,
    inflow: npt.ArrayLike | None = None,
) -> FloatArray:
    """Factorise and solve in one call; parts without any fixed node get head 0 everywhere.

    Parameters and errors are those of :func:`factorise` and :func:`heads_and_flows`.

    Returns
    -------
    (n_nodes,) float array
        Heads. Inflows that add up to zero in a part without fixed node are honoured,
        with head 0 at its lowest node.

    Examples
    --------
    >>> steady_heads(5, [0, 1, 3], [1, 2, 4], [1.0, 1.0, 1.0], [0, 2], [2.0, 0.0])
    array([2., 1., 0., 0., 0.])
    >>> steady_heads(0, [], [], [], [], [])
    array([], dtype=float64)
    """
    return heads(factorise(n_nodes, from_node, to_node, conductance, fixed_nodes, True), fixed_heads, inflow)
