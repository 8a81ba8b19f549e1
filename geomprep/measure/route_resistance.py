"""Resistance from inlets to outlets, and what one vessel's change does to it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from geomprep.model import FloatArray, IntArray
from geomprep.solve import factorise, flows

__all__ = ["Routes", "effect_of_factor", "route_resistance"]


@dataclass(frozen=True, eq=False)
class Routes:
    """A network as resistances between its ends.

    Attributes
    ----------
    n_nodes : int
    from_node, to_node : (s,) int array
    resistance : (s,) float array
        Pa·s/m³.
    inlets, outlets : (i,) and (o,) int array
        Nodes; none of them in both.
    """

    n_nodes: int
    from_node: IntArray
    to_node: IntArray
    resistance: FloatArray
    inlets: IntArray
    outlets: IntArray


def route_resistance(routes: Routes, factor: npt.ArrayLike = 1.0) -> float:
    """Return the resistance between all inlets together and all outlets together.

    Parameters
    ----------
    routes : Routes
    factor : float or (s,) array_like
        Multiplies the resistance of each segment; infinity closes it.

    Returns
    -------
    float
        Difference of head over flow where all inlets are held at one head and all outlets at another,
        Pa·s/m³; what stands behind the outlets is left out. Infinity where nothing joins them.

    Raises
    ------
    ModelError
        The resistances span too many decades for double precision.

    Notes
    -----
    The power lost at a unit difference, a sum of positive terms, is the conductance: no digits cancel.

    Examples
    --------
    A trunk of 1 and two branches of 2 and 2:

    >>> fork = Routes(4, np.array([0, 1, 1]), np.array([1, 2, 3]), np.array([1.0, 2, 2]), np.array([0]), np.array([2, 3]))
    >>> [round(route_resistance(fork, factor), 9) for factor in (1, [1, 1, np.inf], [np.inf, 1, 1])]
    [2.0, 3.0, inf]
    """
    held = np.concatenate((routes.inlets, routes.outlets))
    head = np.repeat([1.0, 0.0], [len(routes.inlets), len(routes.outlets)])
    resistance = routes.resistance * np.asarray(factor, dtype=np.float64)
    network = factorise(routes.n_nodes, routes.from_node, routes.to_node, 1.0 / resistance, held, still_parts=True)
    flow = flows(network, head)
    open_segment = np.isfinite(resistance)
    conductance = float(np.sum(flow[open_segment] ** 2 * resistance[open_segment]))
    return 1.0 / conductance if conductance > 0 else np.inf


def effect_of_factor(routes: Routes, whole: float, segments: npt.ArrayLike, factor: float) -> float:
    """Return by how much the resistance from inlets to outlets rises when some segments alone are changed.

    Parameters
    ----------
    routes : Routes
    whole : float
        :func:`route_resistance` as it is, Pa·s/m³.
    segments : (k,) int array_like
        Segments whose resistance is multiplied.
    factor : float
        Infinity closes them.

    Returns
    -------
    float
        Pa·s/m³; infinity where they are the only way, NaN where there is none to begin with.

    Examples
    --------
    >>> pair = Routes(2, np.array([0, 0]), np.array([1, 1]), np.array([2.0, 2.0]), np.array([0]), np.array([1]))
    >>> effect_of_factor(pair, 1.0, [0], np.inf), effect_of_factor(pair, 1.0, [0, 1], np.inf)
    (1.0, inf)
    """
    if not np.isfinite(whole):
        return np.nan
    changed = np.ones(len(routes.resistance))
    changed[np.asarray(segments, dtype=np.int64)] = factor
    return route_resistance(routes, changed) - whole
