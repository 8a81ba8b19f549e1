"""Compliance of windkessel outlets: stated, from a time constant, or a share of a total."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from geomprep.assign.end_settings import CalibrationSettings, OutletSettings
from geomprep.assign.ends import Ends
from geomprep.assign.labels import node_label, segment_label
from geomprep.errors import CaseError, ModelError
from geomprep.model import VESSEL_CLASSES, BoolArray, FloatArray, Network
from geomprep.units import format_quantity

__all__ = ["outlet_compliance"]


def outlet_compliance(
    network: Network,
    ends: Ends,
    entries: Sequence[OutletSettings],
    target: CalibrationSettings,
    needs: tuple[BoolArray, FloatArray, FloatArray],
) -> FloatArray:
    """Return the compliance of every outlet, NaN where its model has none.

    A time constant τ gives C = τ/R2: with the inflow stopped the pressure of a windkessel falls with
    exp(−t/(R2 C)); R1 has no part in it. A total compliance is that of vessels and outlets
    together: what the segments hold (all but veins) and what outlets state is taken off, and the rest is
    shared in proportion to 1/(R1 + R2), so that (R1 + R2) C is the same at every outlet
    (Alastruey et al. 2008, Commun Comput Phys 4:317-336; from memory).

    Parameters
    ----------
    network : Network
        With lumped values.
    ends : Ends
    entries : sequence of OutletSettings
        One per outlet node.
    target : CalibrationSettings
    needs : (o,) bool array, (o,) and (o,) float array
        Which outlets have a compliance; total and peripheral resistance.

    Returns
    -------
    (o,) float array
        m³/Pa.

    Raises
    ------
    CaseError
        A windkessel has no compliance and the case does not say how to find it.
    ModelError
        The segments and the stated outlets already hold the total.
    """
    windkessel, total, peripheral = needs
    stated = np.array([np.nan if entry.compliance is None else entry.compliance for entry in entries], dtype=np.float64)
    stated[~windkessel] = np.nan
    open_rows = np.flatnonzero(windkessel & np.isnan(stated))
    if open_rows.size == 0:
        return stated
    if target.time_constant is not None:
        stated[open_rows] = target.time_constant / peripheral[open_rows]
    elif target.compliance is not None:
        conductance = 1.0 / total[open_rows]
        rest = _remainder(network, target.compliance, float(np.nansum(stated)))
        stated[open_rows] = rest * conductance / conductance.sum()
    else:
        node = int(ends.outlet_nodes[open_rows[0]])
        raise CaseError(
            f"outlet {node_label(network, node)}: a three-element windkessel needs a compliance; state it there, or "
            "compliance or time_constant in [calibration]"
        )
    return stated


def _remainder(network: Network, total: float, outlets: float) -> float:
    """What a total compliance leaves once segments and stated outlets have theirs."""
    if network.lumped is None:
        raise ModelError("a total compliance needs what the segments hold; find the lumped values first")
    counted = network.segments.vessel_class != VESSEL_CLASSES.index("vein")
    held = np.where(counted, network.lumped.compliance, 0.0)
    rest = total - float(held.sum()) - outlets
    if rest <= 0:
        stated = f" and the stated outlets {format_quantity(outlets, 'mL/mmHg')}" if outlets > 0 else ""
        raise ModelError(
            f"calibration.compliance = {format_quantity(total, 'mL/mmHg')}: the segments alone hold "
            f"{format_quantity(float(held.sum()), 'mL/mmHg')}{stated} (most in "
            f"{segment_label(network, int(np.argmax(held)))}), nothing is left for the outlets: the walls are too soft, "
            "or this total is not that of these vessels"
        )
    return rest
