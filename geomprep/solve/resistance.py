"""Effective resistance between nodes: what one would measure between two taps."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from geomprep.solve.edges import FloatArray
from geomprep.solve.equations import factorise, flows

__all__ = ["effective_resistance"]


def effective_resistance(
    n_nodes: int,
    from_node: npt.ArrayLike,
    to_node: npt.ArrayLike,
    conductance: npt.ArrayLike,
    pairs: npt.ArrayLike,
) -> FloatArray:
    """Return the resistance between pairs of nodes, all other nodes left alone.

    Parameters
    ----------
    n_nodes : int
    from_node, to_node : (e,) int array
    conductance : (e,) float array
    pairs : (p, 2) int array

    Returns
    -------
    (p,) float array
        Head difference per unit flow sent in at the first node and taken out at the
        second; 0 for a node and itself, inf where no path joins the two.

    Raises
    ------
    ModelError
        As :func:`geomprep.solve.factorise`.

    Notes
    -----
    The definition is that of Klein and Randic, J. Math. Chem. 12 (1993) 81,
    doi:10.1007/BF01164627. The value is the power lost at unit flow, a sum of positive
    terms: a difference of heads would lose the digits of small resistances.

    Examples
    --------
    >>> effective_resistance(3, [0, 0, 1], [1, 1, 1], [1.0, 3.0, 9.0], [[0, 1], [1, 1], [0, 2]])
    array([0.25, 0.  ,  inf])
    """
    ends = np.asarray(pairs, dtype=np.int64).reshape(-1, 2)
    network = factorise(n_nodes, from_node, to_node, conductance, [], still_parts=True)
    open_edge = network.conductance > 0
    found = np.full(len(ends), np.inf)
    found[ends[:, 0] == ends[:, 1]] = 0.0
    joined = (network.part[ends[:, 0]] == network.part[ends[:, 1]]) & (ends[:, 0] != ends[:, 1])
    for row in np.flatnonzero(joined):
        inflow = np.zeros(n_nodes)
        inflow[ends[row]] = 1.0, -1.0
        flow = flows(network, [], inflow)[open_edge]
        found[row] = np.sum(flow**2 / network.conductance[open_edge])
    return found
