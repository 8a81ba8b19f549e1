"""Sparse equations of flow networks on plain arrays; knows no vessels."""

from geomprep.solve.edges import net_outflow, parts, with_far_nodes
from geomprep.solve.equations import Factorised, factorise, flows, heads, heads_and_flows, steady_heads
from geomprep.solve.resistance import effective_resistance

__all__ = [
    "Factorised",
    "effective_resistance",
    "factorise",
    "flows",
    "heads",
    "heads_and_flows",
    "net_outflow",
    "parts",
    "steady_heads",
    "with_far_nodes",
]
