"""Sparse equations of flow networks on plain arrays; knows no vessels."""

from geomprep.solve.equations import (
    Factorised,
    factorise,
    flows,
    heads,
    heads_and_flows,
    net_outflow,
    parts,
    steady_heads,
    with_far_nodes,
)

__all__ = [
    "Factorised",
    "factorise",
    "flows",
    "heads",
    "heads_and_flows",
    "net_outflow",
    "parts",
    "steady_heads",
    "with_far_nodes",
]
