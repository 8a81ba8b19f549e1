"""Compliance of windkessel outlets: stated, from a time constant, or a share of a total."""

from __future__ import annotations

import numpy as np

from geomprep.assign.end_settings import CalibrationSettings, OutletSettings
from geomprep.assign.ends import Ends
from geomprep.assign.labels import node_label, segment_label
from geomprep.errors import CaseError, ModelError
from geomprep.model import VESSEL_CLASSES, FloatArray, Network
from geomprep.units import format_quantity

__all__ = ["outlet_compliance"]


def outlet_compliance(
    network: Network,
    ends: Ends,
    entries: list[OutletSettings],
    target: CalibrationSettings,
    resistances: tuple[FloatArray, FloatArray],
) -> FloatArray:
    """Return the compliance of every outlet, NaN where its model has none.

    A time constant τ gives C = τ/R2: with the inflow stopped the pressure of a windkessel falls with
    exp(−t/(R2 C)). A total compliance is that of arteries and outlets together: what the arterial
    segments hold is taken off and the rest is shared in proportion to 1/(R1 + R2), which
    is Alastruey et al. 2008 (Commun Comput Phys 4:317-336; memory).

    Parameters
    ----------
    network : Network
        With lumped values.
    ends : Ends
    entries : list of OutletSettings
        One per outlet node.
    target : CalibrationSettings
    resistances : (o,) and (o,) float array
        Total and characteristic resistance; NaN where there is none.

    Returns
    -------
    (o,) float array
        m³/Pa.

    Raises
    ------
    CaseError
        A windkessel has no compliance and the case does not say how to find it.
    ModelError
        The segments already hold more than the total.
    """
    total, characteristic = resistances
    windkessel = np.isfinite(characteristic)
    stated = np.array([np.nan if entry.compliance is None else entry.compliance for entry in entries], dtype=np.float64)
    open_rows = np.flatnonzero(windkessel & np.isnan(stated))
    if open_rows.size == 0:
        return np.where(windkessel, stated, np.nan)
    if target.time_constant is not None:
        peripheral = np.array([entry.peripheral_resistance or np.nan for entry in entries], dtype=np.float64)
        second = np.where(np.isfinite(peripheral), peripheral, total - characteristic)
        stated[open_rows] = target.time_constant / second[open_rows]
    elif target.compliance is not None:
        conductance = 1.0 / total[open_rows]
        rest = _remainder(network, target.compliance - float(np.nansum(np.where(windkessel, stated, 0.0))))
        stated[open_rows] = rest * conductance / conductance.sum()
    else:
        node = int(ends.outlet_nodes[open_rows[0]])
        raise CaseError(
            f"outlet {node_label(network, node)}: a three-element windkessel needs a compliance; state it there, or "
            "compliance or time_constant in [calibration]"
        )
    return np.where(windkessel, stated, np.nan)


def _remainder(network: Network, total: float) -> float:
    """What a total compliance leaves for the outlets."""
    arteries = network.segments.vessel_class == VESSEL_CLASSES.index("artery")
    held = float(network.lumped.compliance[arteries].sum()) if network.lumped else 0.0
    if held >= total:
        largest = int(np.argmax(np.where(arteries, network.lumped.compliance, 0.0))) if network.lumped else 0
        raise ModelError(
            f"calibration.compliance: {format_quantity(total, 'mL/mmHg')} is left for arteries and outlets, but the "
            f"arterial segments alone hold {format_quantity(held, 'mL/mmHg')} (most in "
            f"{segment_label(network, largest)}); the walls are too soft for it, or it is not that of "
            "this part of the body"
        )
    return total - held
