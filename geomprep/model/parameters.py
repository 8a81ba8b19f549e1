"""Small records that a network carries beside its arrays: blood, laws, surroundings, ends."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from geomprep.model.arrays import FloatArray, IntArray

__all__ = ["Blood", "Inlet", "Outlet", "Surroundings", "TubeLaw", "end_arrays"]


@dataclass(frozen=True)
class Blood:
    """Blood as one Newtonian fluid.

    Attributes
    ----------
    density : float
        kg/m³.
    viscosity : float
        Pa·s.
    velocity_profile : float
        Exponent z of u(r) = U (z + 2)/z (1 − (r/R)^z); 2 is parabolic.
    """

    density: float
    viscosity: float
    velocity_profile: float


@dataclass(frozen=True)
class TubeLaw:
    """A tube law and its shape parameters; area, stiffness and pressure stand per station.

    Attributes
    ----------
    id : str
        Such as ``artery-power-pair``.
    form : str
        Name of the law in :mod:`geomprep.laws`, such as ``power pair``.
    equation : str
        The law as text, with the names of its parameters.
    m, n : float
        Exponents of the power pair.
    """

    id: str
    form: str
    equation: str
    m: float
    n: float


@dataclass(frozen=True)
class Surroundings:
    """What presses on vessels from outside.

    Attributes
    ----------
    id : str
    pressure : float
        Gauge pressure in Pa at `reference_height`.
    reference_height : float
        Metres, on the scale of node heights.
    fluid_density : float, optional
        Density of the fluid column; None for the same pressure everywhere.
    """

    id: str
    pressure: float
    reference_height: float = 0.0
    fluid_density: float | None = None


@dataclass(frozen=True)
class Inlet:
    """Where blood enters: a mean flow or a pressure.

    Attributes
    ----------
    node : int
    mean_flow : float, optional
        m³/s; None where the pressure is prescribed.
    pressure : float, optional
        Pa; None where the flow is prescribed.
    """

    node: int
    mean_flow: float | None = None
    pressure: float | None = None


@dataclass(frozen=True)
class Outlet:
    """Where blood leaves.

    Attributes
    ----------
    node : int
    model : str
        ``fixed pressure``, ``resistance`` or ``three-element windkessel``.
    far_pressure : float
        Pa, behind the resistance; at the node itself for ``fixed pressure``.
    characteristic_resistance, peripheral_resistance : float, optional
        Pa·s/m³, in series; the first is ρc/A of the segment that ends here.
    compliance : float, optional
        m³/Pa, between the two resistances.
    share : float, optional
        Part of the total outflow that calibration gave it.
    """

    node: int
    model: str
    far_pressure: float
    characteristic_resistance: float | None = None
    peripheral_resistance: float | None = None
    compliance: float | None = None
    share: float | None = None

    @property
    def resistance(self) -> float:
        """Total resistance to the far pressure, Pa·s/m³; 0 for a fixed pressure."""
        return (self.characteristic_resistance or 0.0) + (self.peripheral_resistance or 0.0)


def end_arrays(
    inlets: Sequence[Inlet], outlets: Sequence[Outlet]
) -> tuple[IntArray, FloatArray, FloatArray, FloatArray]:
    """Return what stands at the ends as arrays, one row per end: inlets, then outlets.

    Parameters
    ----------
    inlets : sequence of Inlet
    outlets : sequence of Outlet

    Returns
    -------
    node : (m,) int array
    inflow : (m,) float array
        Prescribed flow into the network, m³/s; NaN where a pressure is prescribed.
    pressure : (m,) float array
        Behind the resistance, Pa; 0 where a flow is prescribed.
    resistance : (m,) float array
        Pa·s/m³; 0 at inlets and where the node itself is held.

    Examples
    --------
    >>> for column in end_arrays([Inlet(0, mean_flow=1e-6)], [Outlet(3, "fixed pressure", 700.0)]):
    ...     print(column.tolist())
    [0, 3]
    [1e-06, nan]
    [0.0, 700.0]
    [0.0, 0.0]
    >>> [len(array) for array in end_arrays([], [])]
    [0, 0, 0, 0]
    """
    node = [*(inlet.node for inlet in inlets), *(outlet.node for outlet in outlets)]
    flow = [np.nan if inlet.mean_flow is None else inlet.mean_flow for inlet in inlets]
    pressure = [0.0 if inlet.pressure is None else inlet.pressure for inlet in inlets]
    resistance = [*(0.0 for _ in inlets), *(outlet.resistance for outlet in outlets)]
    return (
        np.array(node, dtype=np.int64),
        np.array([*flow, *(np.nan for _ in outlets)], dtype=np.float64),
        np.array([*pressure, *(outlet.far_pressure for outlet in outlets)], dtype=np.float64),
        np.array(resistance, dtype=np.float64),
    )
