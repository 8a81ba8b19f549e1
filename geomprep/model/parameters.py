"""Small records that a network carries beside its arrays: blood, laws, surroundings, ends."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["Blood", "Inlet", "Outlet", "Surroundings", "TubeLaw"]


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
