"""What a case states about inlets, outlets and their calibration, SI; None where nothing is stated."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["CalibrationSettings", "InletSettings", "OutletSettings"]


@dataclass(frozen=True)
class InletSettings:
    """One ``[[inlets]]`` entry: exactly one of mean flow (m³/s) and pressure (Pa).

    Attributes
    ----------
    at : str
        See :func:`geomprep.assign.find_node`.
    mean_flow, pressure : float, optional
        At each node that `at` names.
    """

    at: str
    mean_flow: float | None = None
    pressure: float | None = None


@dataclass(frozen=True)
class OutletSettings:
    """One ``[[outlets]]`` entry.

    Attributes
    ----------
    at : str
        See :func:`geomprep.assign.find_node`.
    model : str, optional
        A key of :data:`geomprep.assign.OUTLET_MODELS`; that of the calibration where None.
    pressure : float, optional
        Held at the node by the model ``fixed pressure``.
    far_pressure : float, optional
        Behind the resistance; that of the calibration, else that of the atmosphere, where None.
    resistance : float, optional
        Total to the far pressure.
    characteristic_resistance : float, optional
        First resistance of a windkessel; ρ c/A where None.
    peripheral_resistance : float, optional
        Second resistance of a windkessel.
    compliance : float, optional
    mean_flow, share : float, optional
        Outflow, or its part of the total flow, for calibration.
    """

    at: str
    model: str | None = None
    pressure: float | None = None
    far_pressure: float | None = None
    resistance: float | None = None
    characteristic_resistance: float | None = None
    peripheral_resistance: float | None = None
    compliance: float | None = None
    mean_flow: float | None = None
    share: float | None = None


@dataclass(frozen=True)
class CalibrationSettings:
    """``[calibration]``: what the outlets are set to give together.

    Attributes
    ----------
    total_flow : float, optional
        Out of the calibrated outlets; the sum of the inlet flows where None.
    mean_pressure : float, optional
        At the first inlet of each connected part.
    split : str, optional
        A key of :data:`geomprep.assign.SPLIT_RULES`; ``shares`` where None.
    exponent : float or str, optional
        Of the radius power: a number, or the key of a literature row.
    far_pressure : float, optional
        Of outlets that state none; the atmosphere where None.
    model : str, optional
        Of outlets that state none.
    compliance : float, optional
        Total of vessels and outlets; what the segments hold is taken off, the rest is shared in
        proportion to the conductance of each outlet.
    time_constant : float, optional
        Peripheral resistance times compliance of every outlet: with the inflow stopped, the
        pressure of a windkessel falls with exp(−t/(R2 C)), R1 has no part in it.
    """

    total_flow: float | None = None
    mean_pressure: float | None = None
    split: str | None = None
    exponent: float | str | None = None
    far_pressure: float | None = None
    model: str | None = None
    compliance: float | None = None
    time_constant: float | None = None
