"""The linear steady state: resistances of segments, heights of nodes, what stands at the ends."""

from __future__ import annotations

import numpy as np

from geomprep.errors import ModelError
from geomprep.model import FloatArray, IntArray, Network, SteadyState, end_arrays
from geomprep.solve import Boundary, parts, solve_between
from geomprep.units import STANDARD_GRAVITY

__all__ = ["steady_state"]


def steady_state(network: Network) -> SteadyState:
    """Solve the steady flow of a network with constant resistances.

    Total head p + ρ g z drives the flow, so that pressures at nodes are static and contain
    the column of blood between them. Any number of loops is allowed.

    Parameters
    ----------
    network : Network
        With `blood`, `lumped`, `inlets` and `outlets`.

    Returns
    -------
    SteadyState

    Raises
    ------
    ModelError
        A table is missing, a connected part reaches no pressure, or a resistance is too
        extreme for double precision.

    Notes
    -----
    Each segment: (p + ρ g z)_from − (p + ρ g z)_to = R Q; each node: what flows in flows out. A
    far pressure stands at the height of its outlet node.

    Examples
    --------
    >>> from geomprep.model import Nodes, Segments, Stations
    >>> empty = np.empty((0, 3))
    >>> nodes = Nodes([], empty, [], [], [])
    >>> segments = Segments(*[[] for _ in range(9)])
    >>> steady_state(Network(nodes, segments, Stations([0], [], empty, [], [])))
    Traceback (most recent call last):
    geomprep.errors.ModelError: the steady state needs blood, lumped, inlets, outlets; assign them first
    """
    missing = [name for name in ("blood", "lumped", "inlets", "outlets") if getattr(network, name) is None]
    if missing:
        raise ModelError(f"the steady state needs {', '.join(missing)}; assign them first")
    column = network.blood.density * STANDARD_GRAVITY * network.nodes.height  # type: ignore[union-attr]
    conductance = 1.0 / network.lumped.resistance  # type: ignore[union-attr]
    node, inflow, pressure, resistance = end_arrays(network.inlets or (), network.outlets or ())
    ends = Boundary(node, inflow, pressure + column[node], resistance)
    edges = network.segments.from_node, network.segments.to_node, conductance
    _check_references(network, edges, ends)
    found = solve_between(len(network.nodes), *edges, ends)
    largest = max(np.abs(found.flow).max(initial=0.0), np.abs(found.inflow).max(initial=0.0))
    n_inlets = len(network.inlets)  # type: ignore[arg-type]
    return SteadyState(
        pressure=found.head - column,
        flow=found.flow,
        inlet_flow=found.inflow[:n_inlets],
        outlet_flow=-found.inflow[n_inlets:],
        mass_residual=found.imbalance / largest if largest > 0 else 0.0,
    )


def _check_references(network: Network, edges: tuple[IntArray, IntArray, FloatArray], ends: Boundary) -> None:
    """Refuse a connected part that holds no pressure, naming it."""
    part = parts(len(network.nodes), *edges)
    held = np.zeros(part.max(initial=-1) + 1, np.bool_)
    held[part[ends.node[~np.isfinite(ends.inflow)]]] = True
    loose = np.flatnonzero(~held)
    if loose.size:
        inside = np.flatnonzero(part[edges[0]] == loose[0])
        names = [network.segments.name[row] or network.segments.id[row] for row in inside[:3].tolist()]
        more = f" and {len(inside) - 3} more" if len(inside) > 3 else ""
        node = network.nodes.id[np.flatnonzero(part == loose[0])[0]]
        raise ModelError(
            f"{len(loose)} part(s) of the network reach no pressure; the first holds {node} and "
            f"{', '.join(names) or 'no segment'}{more}: put an outlet or an inlet pressure there, or remove the part"
        )
