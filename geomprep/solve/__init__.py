"""Sparse equations of flow networks on plain arrays; knows no vessels."""

from geomprep.solve.boundary import Boundary, Solution, solve_between
from geomprep.solve.edges import net_outflow, parts, with_far_nodes
from geomprep.solve.equations import Factorised, factorise, flows, heads, heads_and_flows, steady_heads
from geomprep.solve.resistance import effective_resistance

__all__ = [
    "Boundary",
    "Factorised",
    "Solution",
    "effective_resistance",
    "factorise",
    "flows",
    "heads",
    "heads_and_flows",
    "net_outflow",
    "parts",
    "solve_between",
    "steady_heads",
    "with_far_nodes",
]
