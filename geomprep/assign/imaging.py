"""Transmural pressure at imaging: the state at which the walls had the area that the image shows."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from geomprep.assign.calibration import calibrate
from geomprep.assign.end_settings import CalibrationSettings, OutletSettings
from geomprep.assign.ends import Ends
from geomprep.assign.gravity import Gravity, heights
from geomprep.assign.labels import end_segment
from geomprep.assign.losses import blood_column, solve_imaged
from geomprep.assign.origins import origins_by_rows
from geomprep.assign.outlets import completed_entries, far_pressures, stated_totals
from geomprep.curves import resistance_share
from geomprep.errors import OpenQuestions, Question
from geomprep.model import VESSEL_CLASSES, Basis, BoolArray, FloatArray, IntArray, Network, Origin, end_arrays
from geomprep.solve import Boundary

__all__ = ["ImagingPressures", "ImagingResult", "imaging_transmural"]


@dataclass(frozen=True)
class ImagingPressures:
    """Pressures at imaging that the case states, Pa; no venous pressure = from a steady solve."""

    venous: float | None = None
    arterial: float | None = None


@dataclass(frozen=True, eq=False)
class ImagingResult:
    """Transmural pressure of every station at imaging.

    Attributes
    ----------
    transmural : (k,) float array
        Inside minus outside, Pa.
    described : str
        Where it comes from, in words.
    origins : tuple of Origin
    """

    transmural: FloatArray
    described: str
    origins: tuple[Origin, ...]


def imaging_transmural(
    network: Network,
    ends: Ends,
    outlets: Sequence[OutletSettings],
    pressures: ImagingPressures,
    field: Gravity,
    external: FloatArray,
    calibration: CalibrationSettings | None = None,
) -> ImagingResult:
    """Find the transmural pressure of every station while the image was taken.

    The stated mean pressure of arteries (and of vessels of unknown class) holds at the height of
    their first inlet, a stated pressure of veins at the height of their first outlet; elsewhere
    the column of blood between is counted. So the result does not depend on where the
    coordinates have their origin. Veins without a stated pressure take that of a linear steady solve on the imaged
    areas, between the inlets and what stands behind the outlets.

    Parameters
    ----------
    network : Network
        With measures, blood and inlets; heights in the posture of the image.
    ends : Ends
    outlets : sequence of OutletSettings
        Entries in the order of the case.
    pressures : ImagingPressures
    field : Gravity
        Gravity in the posture of the image.
    external : (k,) float array
        Pressure outside each station, Pa.
    calibration : CalibrationSettings, optional
        Finds outlet resistances for the steady solve where outlets state none. A windkessel that
        states only its peripheral resistance is solved without the first one, which the
        walls are yet to give.

    Returns
    -------
    ImagingResult

    Raises
    ------
    OpenQuestions
        There are arteries and no arterial pressure is stated.
    CaseError
        An outlet lacks what the steady solve needs.
    ModelError
        A part with veins reaches no pressure, or the geometry cannot carry the flow.
    """
    vein = (network.segments.vessel_class == VESSEL_CLASSES.index("vein"))[network.stations.segment]
    if pressures.arterial is None and not vein.all():
        text = "at which mean pressure were the arteries imaged? Their areas belong to it"
        raise OpenQuestions([Question("imaging_state.arterial_pressure", text)])
    inside = np.zeros(len(network.stations))
    said: list[str] = []
    rows: list[tuple[Basis, str, BoolArray]] = []
    if pressures.arterial is not None and not vein.all():
        inside[~vein] = _standing(network, ends.inlet_nodes, field, pressures.arterial, ~vein)
        said.append("arteries: the stated mean pressure at the height of their first inlet, with the column of blood")
        rows.append((Basis.DERIVED, f"imaging_state.arterial_pressure, {_ALWAYS}", ~vein))
    if vein.any() and pressures.venous is not None:
        inside[vein] = _standing(network, ends.outlet_nodes, field, pressures.venous, vein)
        said.append("veins: the stated pressure at the height of their first outlet, with the column of blood")
        rows.append((Basis.DERIVED, f"imaging_state.venous_pressure, {_ALWAYS}", vein))
    elif vein.any():
        inside[vein] = _steady_pressure(network, ends, outlets, field, calibration)[vein]
        said.append("veins: a linear steady solve on the imaged areas in the posture of the image")
        rows.append((Basis.DERIVED, f"{_SOLVED}, {_ALWAYS}", vein))
    return ImagingResult(inside - external, "; ".join(said), origins_by_rows("stations.imaging_transmural", rows))


_ALWAYS = "stations.position, blood.density, surroundings.pressure"
_SOLVED = (
    "segments.integrals.inverse_fourth_power, segments.friction_shape, blood.viscosity, "
    "inlets.mean_flow, outlets.far_pressure"
)


def _standing(network: Network, nodes: IntArray, field: Gravity, pressure: float, here: BoolArray) -> FloatArray:
    """Pressure of some stations in a standing column that has a pressure at the first of these nodes among them."""
    station = end_segment(network, nodes)[1]
    own = station[here[station]]
    reference = own[0] if own.size else np.flatnonzero(here)[0]
    column = blood_column(network, heights(field, network.stations.position))
    return np.asarray(pressure - (column[here] - column[reference]), dtype=np.float64)


def _steady_pressure(
    network: Network,
    ends: Ends,
    outlets: Sequence[OutletSettings],
    field: Gravity,
    calibration: CalibrationSettings | None,
) -> FloatArray:
    """Static pressure at every station from a linear solve on the imaged areas."""
    head = solve_imaged(network, _boundary(network, ends, outlets, calibration)).head
    stations, owner = network.stations, network.stations.segment
    part = resistance_share(stations.distance, stations.radius, stations.offsets)
    start, end = head[network.segments.from_node][owner], head[network.segments.to_node][owner]
    column = blood_column(network, heights(field, stations.position))
    return np.asarray(start + (end - start) * part - column, dtype=np.float64)


def _boundary(
    network: Network, ends: Ends, outlets: Sequence[OutletSettings], calibration: CalibrationSettings | None
) -> Boundary:
    """Ends at imaging: inlets as they are, outlets at their pressure or behind their resistance."""
    target = calibration or CalibrationSettings()
    entries = completed_entries(ends, outlets, target)
    far = far_pressures(entries)
    first = np.array([entry.characteristic_resistance or 0.0 for entry in entries], dtype=np.float64)
    total = stated_totals(entries, first)
    if np.isnan(total).any():
        found = calibrate(network, ends, entries, target, (far, total))
        total[found.rows] = found.resistance
    node, inflow, pressure, resistance = end_arrays(network.inlets or (), ())
    node = np.concatenate((node, ends.outlet_nodes))
    return Boundary(
        node=node,
        inflow=np.concatenate((inflow, np.full(len(total), np.nan))),
        head=np.concatenate((pressure, far)) + blood_column(network, network.nodes.height)[node],
        resistance=np.concatenate((resistance, total)),
    )
