"""Results that stand beside a network."""

from __future__ import annotations

from dataclasses import dataclass

from geomprep.model.arrays import FloatArray

__all__ = ["SteadyState"]


@dataclass(frozen=True, eq=False)
class SteadyState:
    """A solved linear steady state.

    Attributes
    ----------
    pressure : (n,) float array
        Static gauge pressure at nodes, Pa.
    flow : (s,) float array
        Flow in segments, from → to, m³/s.
    inlet_flow, outlet_flow : (i,), (o,) float array
        Into the network at inlets, out of it at outlets, m³/s.
    mass_residual : float
        Largest unbalanced flow at a node over the largest flow of any segment.
    """

    pressure: FloatArray
    flow: FloatArray
    inlet_flow: FloatArray
    outlet_flow: FloatArray
    mass_residual: float
