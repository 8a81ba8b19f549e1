"""Models that can stand at an outlet: one row each."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

from geomprep.model import Outlet

__all__ = ["OUTLET_MODELS", "OutletModel", "OutletNumbers"]


@dataclass(frozen=True)
class OutletNumbers:
    """Numbers of one outlet, SI; those that its model does not use are NaN.

    Attributes
    ----------
    node : int
    far_pressure : float
    total, characteristic, peripheral : float
        Resistances, Pa·s/m³.
    compliance : float
    share : float, optional
    """

    node: int
    far_pressure: float
    total: float
    characteristic: float
    peripheral: float
    compliance: float
    share: float | None


@dataclass(frozen=True)
class OutletModel:
    """What a model needs and how its record is made.

    Attributes
    ----------
    held : bool
        The node itself stands at a stated pressure; nothing is to be calibrated.
    windkessel : bool
        A characteristic resistance, a peripheral resistance and a compliance.
    record : callable
        Makes the outlet from its numbers.
    """

    held: bool
    windkessel: bool
    record: Callable[[OutletNumbers], Outlet]


def _fixed_pressure(of: OutletNumbers) -> Outlet:
    """The node at a pressure."""
    return Outlet(of.node, "fixed pressure", of.far_pressure)


def _resistance(of: OutletNumbers) -> Outlet:
    """One resistance to the far pressure."""
    return Outlet(of.node, "resistance", of.far_pressure, peripheral_resistance=of.total, share=of.share)


def _windkessel(of: OutletNumbers) -> Outlet:
    """R1, then C beside R2, to the far pressure (Westerhof et al. 2009, doi:10.1007/s11517-008-0359-2)."""
    model = "three-element windkessel"
    return Outlet(of.node, model, of.far_pressure, of.characteristic, of.peripheral, of.compliance, of.share)


OUTLET_MODELS: Final[dict[str, OutletModel]] = {
    "fixed pressure": OutletModel(held=True, windkessel=False, record=_fixed_pressure),
    "resistance": OutletModel(held=False, windkessel=False, record=_resistance),
    "three-element windkessel": OutletModel(held=False, windkessel=True, record=_windkessel),
}
"""Model of ``outlets[].model`` -> what it needs and how it is made."""
