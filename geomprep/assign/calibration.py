"""Total resistance of outlets from flows and a mean pressure, by one linear solve."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.assign.end_settings import CalibrationSettings, OutletSettings
from geomprep.assign.ends import Ends
from geomprep.assign.labels import end_segment, node_label
from geomprep.assign.losses import losses_text, segment_resistance
from geomprep.assign.splits import Unshared, exponent_value, outlet_shares
from geomprep.errors import CaseError, ModelError
from geomprep.model import FloatArray, IntArray, Network
from geomprep.solve import Boundary, Solution, parts, solve_between
from geomprep.units import STANDARD_GRAVITY, format_quantity

__all__ = ["Calibrated", "calibrate"]

_FLOW_AGREES = 1e-3


@dataclass(frozen=True, eq=False)
class Calibrated:
    """What calibration found for some outlets.

    Attributes
    ----------
    rows : (c,) int array
        Rows of the outlets, in the order of ``ends.outlet_nodes``.
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
    entries: list[OutletSettings],
    settings: CalibrationSettings,
    far_pressure: FloatArray,
    rows: IntArray,
) -> Calibrated:
    """Find the total resistance of outlets that state none.

    The target flows leave at the outlets, the first inlet of each connected part stands at the
    mean pressure, and R = (p_node − p_far)/Q.

    Parameters
    ----------
    network : Network
        With measures, blood, inlets and node heights.
    ends : Ends
    entries : list of OutletSettings
        Settings of every outlet node, in the order of ``ends.outlet_nodes``.
    settings : CalibrationSettings
    far_pressure : (o,) float array
        Behind every outlet, Pa; at the node for a fixed pressure.
    rows : (c,) int array
        Outlets to calibrate.

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
    total = _total_flow(network, settings)
    share, key = _shares(network, ends, entries, settings, rows, total)
    flow = share * total
    boundary = _boundary(network, ends, entries, settings, far_pressure)
    boundary.inflow[len(ends.inlet_nodes) + rows] = -flow
    segments = network.segments
    conductance = 1.0 / segment_resistance(network)
    found = solve_between(len(network.nodes), segments.from_node, segments.to_node, conductance, boundary)
    _check_inflow(network, found)
    node = ends.outlet_nodes[rows]
    pressure = found.head[node] - _column(network)[node]
    resistance = (pressure - far_pressure[rows]) / flow
    _check_resistance(network, ends, rows, (found, flow, resistance, far_pressure))
    return Calibrated(rows, share, flow, pressure, resistance, key)


def _column(network: Network) -> FloatArray:
    """ρ g z of every node, Pa."""
    density = network.blood.density if network.blood else 0.0
    return density * STANDARD_GRAVITY * network.nodes.height


def _total_flow(network: Network, settings: CalibrationSettings) -> float:
    """Stated total flow, else the sum of the inlet flows."""
    if settings.total_flow is not None:
        return settings.total_flow
    flows = [inlet.mean_flow for inlet in network.inlets or ()]
    if not flows or any(flow is None for flow in flows):
        raise CaseError(
            "calibration.total_flow: missing, and not every inlet states a mean_flow; give one or the other"
        )
    return float(sum(flow for flow in flows if flow is not None))


def _shares(
    network: Network,
    ends: Ends,
    entries: list[OutletSettings],
    settings: CalibrationSettings,
    rows: IntArray,
    total: float,
) -> tuple[FloatArray, str]:
    """Share of each outlet to calibrate, and the literature key of the exponent."""
    stated = np.full(len(rows), np.nan)
    for place, row in enumerate(rows.tolist()):
        entry = entries[row]
        if entry.share is not None:
            stated[place] = entry.share
        elif entry.mean_flow is not None:
            stated[place] = entry.mean_flow / total
    unshared = rows[np.isnan(stated)]
    exponent, key = exponent_value(settings.exponent)
    segment, _ = end_segment(network, ends.outlet_nodes[unshared])
    radius = network.measures.median_radius[segment] if network.measures else np.zeros(0)
    labels = tuple(node_label(network, node) for node in ends.outlet_nodes[unshared].tolist())
    return outlet_shares(stated, settings.split or "shares", Unshared(radius, exponent, labels)), key


def _boundary(
    network: Network,
    ends: Ends,
    entries: list[OutletSettings],
    settings: CalibrationSettings,
    far_pressure: FloatArray,
) -> Boundary:
    """Ends while calibrating: the first inlet of each part holds the mean pressure."""
    inlets = network.inlets or ()
    column = _column(network)
    flow = np.array([np.nan if inlet.mean_flow is None else inlet.mean_flow for inlet in inlets])
    pressure = np.array([0.0 if inlet.pressure is None else inlet.pressure for inlet in inlets])
    if settings.mean_pressure is not None:
        first = _first_inlets(network, ends.inlet_nodes)
        flow[first], pressure[first] = np.nan, settings.mean_pressure
    elif np.isfinite(flow).all():
        raise CaseError("calibration.mean_pressure: missing, and no inlet states a pressure; outlets need one of them")
    resistance = [entry.resistance or (entry.characteristic_resistance or 0.0) + (entry.peripheral_resistance or 0.0)
                  for entry in entries]  # fmt: skip
    return Boundary(
        node=np.concatenate((ends.inlet_nodes, ends.outlet_nodes)),
        inflow=np.concatenate((flow, np.full(len(entries), np.nan))),
        head=np.concatenate((pressure + column[ends.inlet_nodes], far_pressure + column[ends.outlet_nodes])),
        resistance=np.concatenate((np.zeros(len(inlets)), np.array(resistance, dtype=np.float64))),
    )


def _first_inlets(network: Network, inlet_nodes: IntArray) -> IntArray:
    """Row of the first inlet of each connected part."""
    segments = network.segments
    part = parts(len(network.nodes), segments.from_node, segments.to_node, np.ones(len(segments)))
    return np.sort(np.unique(part[inlet_nodes], return_index=True)[1]).astype(np.int64)


def _check_inflow(network: Network, found: Solution) -> None:
    """Refuse a total flow that the stated inlet flows contradict."""
    for row, inlet in enumerate(network.inlets or ()):
        if inlet.mean_flow is None:
            continue
        got = float(found.inflow[row])
        if abs(got - inlet.mean_flow) > _FLOW_AGREES * abs(inlet.mean_flow):
            raise CaseError(
                f"calibration: the outlets take {format_quantity(got, 'mL/min')} from inlet "
                f"{node_label(network, inlet.node)}, which states {format_quantity(inlet.mean_flow, 'mL/min')}; "
                "make total_flow and the inlet flows agree, or state the flow once"
            )


def _check_resistance(
    network: Network,
    ends: Ends,
    rows: IntArray,
    values: tuple[Solution, FloatArray, FloatArray, FloatArray],
) -> None:
    """Refuse a resistance that is not above zero, with the way on which the pressure is lost."""
    found, flow, resistance, far_pressure = values
    bad = np.flatnonzero(~(resistance > 0))
    if bad.size == 0:
        return
    place = int(bad[np.argmin(resistance[bad])])
    node = int(ends.outlet_nodes[rows[place]])
    pressure = far_pressure[rows[place]] + resistance[place] * flow[place]
    raise ModelError(
        f"outlet {node_label(network, node)}: {format_quantity(float(flow[place]), 'mL/min')} would leave it at "
        f"{format_quantity(float(pressure), 'mmHg')}, not above its far pressure of "
        f"{format_quantity(float(far_pressure[rows[place]]), 'mmHg')}: its resistance would be "
        f"{format_quantity(float(resistance[place]), 'mmHg*s/mL')}. The geometry cannot carry this flow "
        f"(a radius too small, a missing way, a wrong unit). "
        f"Losses on the way: {losses_text(network, found.flow, node)}"
    )
