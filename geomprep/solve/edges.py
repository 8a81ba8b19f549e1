"""Edges of a flow network as plain arrays: parts, balance, nodes behind outlets."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from geomprep.errors import ModelError

__all__ = ["FloatArray", "IntArray", "checked_edges", "net_outflow", "parts", "with_far_nodes"]

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]


def checked_edges(
    n_nodes: int, from_node: npt.ArrayLike, to_node: npt.ArrayLike, conductance: npt.ArrayLike
) -> tuple[IntArray, IntArray, FloatArray]:
    """Return ends and conductances as arrays; refuse what no network can have.

    Raises
    ------
    ModelError
        Lengths differ, a node number is out of range, or a conductance is negative or not finite.

    Examples
    --------
    >>> checked_edges(2, [0], [1], [3])
    (array([0]), array([1]), array([3.]))
    >>> checked_edges(2, [0], [1], [-3])
    Traceback (most recent call last):
    geomprep.errors.ModelError: conductance of edge 0 is -3; it must be a finite number and not negative
    """
    tail, head = np.asarray(from_node, dtype=np.int64).ravel(), np.asarray(to_node, dtype=np.int64).ravel()
    value = np.asarray(conductance, dtype=np.float64).ravel()
    if not len(tail) == len(head) == len(value):
        raise ModelError(f"{len(tail)} from nodes, {len(head)} to nodes, {len(value)} conductances; they must agree")
    ends = np.concatenate((tail, head))
    if ends.size and not (ends.min() >= 0 and ends.max() < n_nodes):
        raise ModelError(f"an edge names a node outside 0…{n_nodes - 1}; nodes are numbered from 0")
    bad = np.flatnonzero(~(np.isfinite(value) & (value >= 0)))
    if bad.size:
        raise ModelError(
            f"conductance of edge {bad[0]} is {value[bad[0]]:g}; it must be a finite number and not negative"
        )
    return tail, head, value


def parts(n_nodes: int, from_node: npt.ArrayLike, to_node: npt.ArrayLike, conductance: npt.ArrayLike) -> IntArray:
    """Return the number of the connected part of each node; edges of conductance 0 do not connect.

    Parameters
    ----------
    n_nodes : int
    from_node, to_node : (e,) int array
    conductance : (e,) float array

    Returns
    -------
    (n_nodes,) int array
        Parts are numbered from 0 in the order of their lowest node.

    Examples
    --------
    >>> parts(4, [0, 3], [1, 2], [1.0, 1.0])
    array([0, 0, 1, 1])
    >>> parts(2, [0], [1], [0.0])
    array([0, 1])
    """
    open_edge = np.asarray(conductance, dtype=np.float64) > 0
    tail = np.asarray(from_node, dtype=np.int64)[open_edge]
    head = np.asarray(to_node, dtype=np.int64)[open_edge]
    matrix = coo_array((np.ones(len(tail), np.int8), (tail, head)), shape=(n_nodes, n_nodes))
    label = connected_components(matrix, directed=False)[1]
    _, first, inverse = np.unique(label, return_index=True, return_inverse=True)
    return np.argsort(np.argsort(first, kind="stable"), kind="stable")[inverse].astype(np.int64)


def net_outflow(n_nodes: int, from_node: IntArray, to_node: IntArray, flow: FloatArray) -> FloatArray:
    """Return the sum of the flows that leave each node minus those that arrive.

    Examples
    --------
    >>> net_outflow(3, np.array([0, 1]), np.array([1, 2]), np.array([2.0, 2.0]))
    array([ 2.,  0., -2.])
    """
    out, into = np.bincount(from_node, flow, n_nodes), np.bincount(to_node, flow, n_nodes)
    return np.asarray(out - into, dtype=np.float64)


def with_far_nodes(
    n_nodes: int,
    edges: tuple[npt.ArrayLike, npt.ArrayLike, npt.ArrayLike],
    ground_node: npt.ArrayLike,
    ground_conductance: npt.ArrayLike,
) -> tuple[int, IntArray, IntArray, FloatArray]:
    """Add a node of its own behind each grounded conductance, such as an outlet resistance.

    Parameters
    ----------
    n_nodes : int
    edges : tuple of (e,) arrays
        From node, to node, conductance.
    ground_node : (k,) int array
        Nodes that are joined to a far head.
    ground_conductance : (k,) float array

    Returns
    -------
    n_nodes : int
        Grown by k; the far nodes are the last k, and the caller fixes their heads.
    from_node, to_node : (e + k,) int array
    conductance : (e + k,) float array
        The last k edges run from the network to the far nodes.

    Examples
    --------
    >>> with_far_nodes(2, ([0], [1], [3.0]), [1], [5.0])
    (3, array([0, 1]), array([1, 2]), array([3., 5.]))
    """
    ground = np.asarray(ground_node, dtype=np.int64)
    far = np.arange(n_nodes, n_nodes + len(ground))
    return (
        n_nodes + len(ground),
        np.concatenate((np.asarray(edges[0], dtype=np.int64), ground)),
        np.concatenate((np.asarray(edges[1], dtype=np.int64), far)),
        np.concatenate((np.asarray(edges[2], dtype=np.float64), np.asarray(ground_conductance, dtype=np.float64))),
    )
