"""Total resistance of outlets from flows and a mean pressure, by one linear solve."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from geomprep.assign.end_settings import CalibrationSettings, OutletSettings
from geomprep.assign.ends import Ends
from geomprep.assign.labels import end_segment, node_label
from geomprep.assign.losses import blood_column, losses_text, node_parts, solve_imaged
from geomprep.assign.splits import Unshared, exponent_value, outlet_shares
from geomprep.errors import CaseError, ModelError
from geomprep.model import FloatArray, IntArray, Network, end_arrays
from geomprep.solve import Boundary, Solution
from geomprep.units import format_quantity

__all__ = ["LEAST_REMAINING", "Calibrated", "calibrate"]

LEAST_REMAINING: Final = 0.01
"""Part of the pressure difference from inlet to far side that must be left at an outlet."""

_FLOWS_AGREE = 1e-6


@dataclass(frozen=True, eq=False)
class Calibrated:
    """What calibration found for the outlets that state no resistance.

    Attributes
    ----------
    rows : (c,) int array
        Rows of these outlets, in the order of ``ends.outlet_nodes``.
    share : (c,) float array
    flow : (c,) float array
        Target outflow, m³/s.
    pressure : (c,) float array
        Node pressure while those flows leave, Pa.
    resistance : (c,) float array
        Total to the far pressure, Pa·s/m³.
    exponent_key : str
        Literature row of the exponent; empty where none was used.
    """

    rows: IntArray
    share: FloatArray
    flow: FloatArray
    pressure: FloatArray
    resistance: FloatArray
    exponent_key: str


def calibrate(
    network: Network,
    ends: Ends,
    entries: Sequence[OutletSettings],
    settings: CalibrationSettings,
    stated: tuple[FloatArray, FloatArray],
    least_remaining: float = LEAST_REMAINING,
) -> Calibrated:
    """Find the total resistance of outlets that state none.

    The target flows leave at these outlets, the first inlet of each connected part stands at
    the mean pressure, all other ends are as stated, and R = (p_node − p_far)/Q.

    Parameters
    ----------
    network : Network
        With measures, blood, inlets and node heights.
    ends : Ends
    entries : sequence of OutletSettings
        Settings of every outlet node, in the order of ``ends.outlet_nodes``.
    settings : CalibrationSettings
    stated : (o,) and (o,) float array
        Pressure behind every outlet, and its total resistance: 0 where the node itself is held,
        NaN where it is to be found.
    least_remaining : float
        A smaller part of the pressure difference from inlet to far side, left at an outlet, is
        refused: the resistance of the outlet would be an accident of the radii.

    Returns
    -------
    Calibrated

    Raises
    ------
    CaseError
        The flows cannot be found from what is stated, or contradict each other.
    ModelError
        A resistance comes out too small or negative: the path of losses is named.
    """
    far_pressure, resistance = stated
    rows = np.flatnonzero(np.isnan(resistance))
    total = _total_flow(network, ends, entries, settings, rows)
    share, key = _shares(network, ends, entries, settings, (rows, total))
    flow = share * total
    boundary = _boundary(network, ends, settings, stated)
    boundary.inflow[len(ends.inlet_nodes) + rows] = -flow
    _check_reached(network, ends, boundary, rows)
    found = solve_imaged(network, boundary)
    _check_inflow(network, found)
    pressure = found.head - blood_column(network, network.nodes.height)
    node, far = ends.outlet_nodes[rows], far_pressure[rows]
    least = least_remaining * (pressure[ends.inlet_nodes].max() - far)
    _check_remaining(network, (node, flow, far, least), pressure, found)
    return Calibrated(rows, share, flow, pressure[node], (pressure[node] - far) / flow, key)


def _total_flow(
    network: Network,
    ends: Ends,
    entries: Sequence[OutletSettings],
    settings: CalibrationSettings,
    rows: IntArray,
) -> float:
    """Stated total flow, else the flows of these outlets, else those of all inlets."""
    if settings.total_flow is not None:
        return settings.total_flow
    own = [entries[row].mean_flow for row in rows.tolist()]
    if None not in own:
        return float(sum(flow or 0.0 for flow in own))
    flows = [inlet.mean_flow for inlet in network.inlets or ()]
    if not flows or None in flows or len(rows) < len(entries):
        node = int(ends.outlet_nodes[rows[own.index(None)]])
        raise CaseError(
            f"calibration.total_flow: missing; outlet {node_label(network, node)} needs it for its share (the inlet flows "
            "stand for it only where every inlet states one and no outlet states its own pressure or resistance)"
        )
    return float(sum(flow or 0.0 for flow in flows))


def _shares(
    network: Network,
    ends: Ends,
    entries: Sequence[OutletSettings],
    settings: CalibrationSettings,
    wanted: tuple[IntArray, float],
) -> tuple[FloatArray, str]:
    """Share of each outlet to calibrate, and the literature key of the exponent."""
    rows, total = wanted
    own = [entries[row] for row in rows.tolist()]
    flows = np.array([np.nan if entry.mean_flow is None else entry.mean_flow for entry in own], dtype=np.float64)
    shares = np.array([np.nan if entry.share is None else entry.share for entry in own], dtype=np.float64)
    stated = np.where(np.isnan(shares), flows / total, shares)
    node = ends.outlet_nodes[rows[np.isnan(stated)]]
    if network.measures is None:
        raise ModelError("shares by radius need measures; measure the segments first")
    radius = network.measures.median_radius[end_segment(network, node)[0]]
    exponent, key = exponent_value(settings.exponent)
    labels = tuple(node_label(network, one) for one in node.tolist())
    return outlet_shares(stated, settings.split or "shares", Unshared(radius, exponent, labels)), key


def _boundary(
    network: Network, ends: Ends, settings: CalibrationSettings, stated: tuple[FloatArray, FloatArray]
) -> Boundary:
    """Ends while calibrating: the first inlet of each part holds the mean pressure."""
    node, inflow, pressure, _ = end_arrays(network.inlets or (), ())
    if settings.mean_pressure is not None:
        for row in _first_inlets(network, node).tolist():
            if np.isnan(inflow[row]) and not np.isclose(pressure[row], settings.mean_pressure, rtol=1e-9, atol=0.0):
                raise CaseError(
                    f"calibration.mean_pressure = {format_quantity(settings.mean_pressure, 'mmHg')}: inlet "
                    f"{node_label(network, int(node[row]))} states {format_quantity(float(pressure[row]), 'mmHg')}; "
                    "keep one of them"
                )
            inflow[row], pressure[row] = np.nan, settings.mean_pressure
    far_pressure, resistance = stated
    node = np.concatenate((node, ends.outlet_nodes))
    return Boundary(
        node=node,
        inflow=np.concatenate((inflow, np.full(len(resistance), np.nan))),
        head=np.concatenate((pressure, far_pressure)) + blood_column(network, network.nodes.height)[node],
        resistance=np.concatenate((np.zeros(len(inflow)), resistance)),
    )


def _first_inlets(network: Network, inlet_nodes: IntArray) -> IntArray:
    """Row of the first inlet of each connected part."""
    first = np.unique(node_parts(network)[inlet_nodes], return_index=True)[1]
    return np.sort(first).astype(np.int64)


def _check_reached(network: Network, ends: Ends, boundary: Boundary, rows: IntArray) -> None:
    """Refuse outlets that no inlet reaches, and parts whose level no pressure sets."""
    part = node_parts(network)
    node = ends.outlet_nodes[rows]
    lost = node[~np.isin(part[node], part[ends.inlet_nodes])]
    if lost.size:
        raise ModelError(
            f"outlet {node_label(network, int(lost[0]))}: no inlet reaches it, so that no flow can leave there; "
            "join it to the rest, or hold a fixed pressure there"
        )
    level = part[boundary.node[np.isnan(boundary.inflow)]]
    open_level = node[~np.isin(part[node], level)]
    if open_level.size:
        raise CaseError(
            f"calibration.mean_pressure: missing; nothing else sets the pressure before outlet "
            f"{node_label(network, int(open_level[0]))}"
        )


def _check_inflow(network: Network, found: Solution) -> None:
    """Refuse a total flow that the stated inlet flows contradict."""
    for row, inlet in enumerate(network.inlets or ()):
        got = float(found.inflow[row])
        if inlet.mean_flow is not None and abs(got - inlet.mean_flow) > _FLOWS_AGREE * abs(inlet.mean_flow):
            raise CaseError(
                f"calibration: the outlets take {format_quantity(got, 'mL/min', 7)} from inlet "
                f"{node_label(network, inlet.node)}, which states {format_quantity(inlet.mean_flow, 'mL/min', 7)}; "
                "make total_flow and the inlet flows agree, or leave total_flow out"
            )


def _check_remaining(
    network: Network,
    outlets: tuple[IntArray, FloatArray, FloatArray, FloatArray],
    pressure: FloatArray,
    found: Solution,
) -> None:
    """Refuse an outlet at which too little pressure is left, with the way on which it is lost."""
    node, flow, far, least = outlets
    remaining = pressure[node] - far
    bad = np.flatnonzero(~((remaining > 0) & (remaining >= least)))
    if bad.size == 0:
        return
    row = int(bad[np.argmin(remaining[bad] / flow[bad])])
    others = f" ({bad.size - 1} more outlets fail too)" if bad.size > 1 else ""
    leaving = format_quantity(float(flow[row]), "mL/min")
    before, behind = (format_quantity(float(value), "mmHg") for value in (pressure[node[row]], far[row]))
    raise ModelError(
        f"outlet {node_label(network, int(node[row]))}: with {leaving} its pressure would be {before} against {behind} "
        f"behind it, a resistance of {format_quantity(float(remaining[row] / flow[row]), 'mmHg*s/mL')}{others}: the "
        "geometry cannot carry this flow (a radius too small, a missing way, a wrong unit). Lost on the way: "
        f"{losses_text(network, found.flow, int(node[row]))}"
    )
