"""Transmural pressure at imaging: the state at which the walls had the area that the image shows."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from geomprep.assign.end_settings import OutletSettings
from geomprep.assign.ends import Ends
from geomprep.assign.gravity import Gravity, heights
from geomprep.assign.losses import segment_resistance
from geomprep.curves import resistance_share
from geomprep.errors import ModelError, OpenQuestions, Question
from geomprep.model import VESSEL_CLASSES, Basis, FloatArray, Network, Origin
from geomprep.solve import Boundary, solve_between
from geomprep.units import STANDARD_GRAVITY

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
) -> ImagingResult:
    """Find the transmural pressure of every station while the image was taken.

    Arteries stand at the stated mean pressure, at the height 0, and the column of blood is taken
    off above it; veins at a stated pressure in the same way, or at the pressures of a linear steady solve on the
    imaged areas between the inlets and the pressures behind the outlets.

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

    Returns
    -------
    ImagingResult

    Raises
    ------
    OpenQuestions
        There are arteries and no arterial pressure is stated.
    ModelError
        A part with veins reaches no pressure.
    """
    vein = (network.segments.vessel_class == VESSEL_CLASSES.index("vein"))[network.stations.segment]
    if pressures.arterial is None and not vein.all():
        text = "at which mean pressure were the arteries imaged? Their areas belong to it"
        raise OpenQuestions([Question("imaging_state.arterial_pressure", text)])
    weight = _weight(network)
    height = heights(field, network.stations.position)
    inside = np.full(len(network.stations), pressures.arterial or 0.0) - weight * height
    parts = ["arteries: the stated mean pressure less the column of blood above height 0"] if not vein.all() else []
    key = "imaging_state.arterial_pressure"
    if vein.any():
        if pressures.venous is not None:
            inside[vein] = pressures.venous - weight * height[vein]
            parts.append("veins: the stated pressure less the column of blood above height 0")
            key = "imaging_state.venous_pressure"
        else:
            inside[vein] = _steady_pressure(network, ends, outlets, height)[vein]
            parts.append("veins: a linear steady solve on the imaged areas in the posture of the image")
    return ImagingResult(inside - external, "; ".join(parts), _origins(vein.all(), pressures, key))


def _origins(all_veins: bool, pressures: ImagingPressures, key: str) -> tuple[Origin, ...]:
    """Basis of the transmural pressure at imaging."""
    if all_veins and pressures.venous is None:
        solved = "segments.integrals.inverse_fourth_power, inlets.mean_flow, outlets.far_pressure"
        detail = f"{solved}, nodes.height, surroundings.pressure"
    else:
        detail = f"{key}, nodes.height, surroundings.pressure"
    return (Origin("stations.imaging_transmural", Basis.DERIVED, detail),)


def _weight(network: Network) -> float:
    """ρ g of blood, Pa per metre of height."""
    if network.blood is None:
        raise ModelError("the pressure at imaging needs the density of blood; assign blood first")
    return network.blood.density * STANDARD_GRAVITY


def _steady_pressure(network: Network, ends: Ends, outlets: Sequence[OutletSettings], height: FloatArray) -> FloatArray:
    """Static pressure at every station from a linear solve on the imaged areas."""
    segments, weight = network.segments, _weight(network)
    column = weight * network.nodes.height
    boundary = _boundary(network, ends, [outlets[entry] for entry in ends.outlet_entries.tolist()], column)
    conductance = 1.0 / segment_resistance(network)
    head = solve_between(len(network.nodes), segments.from_node, segments.to_node, conductance, boundary).head
    stations, owner = network.stations, network.stations.segment
    part = resistance_share(stations.distance, stations.radius, stations.offsets)
    start, end = head[segments.from_node][owner], head[segments.to_node][owner]
    pressure: FloatArray = start + (end - start) * part - weight * height
    return pressure


def _boundary(network: Network, ends: Ends, entries: list[OutletSettings], column: FloatArray) -> Boundary:
    """Ends at imaging: inlets as they are, outlets at their pressure or behind their resistance."""
    inlets = network.inlets or ()
    flow = [np.nan if inlet.mean_flow is None else inlet.mean_flow for inlet in inlets]
    pressure = [0.0 if inlet.pressure is None else inlet.pressure for inlet in inlets]
    far = [entry.pressure if entry.pressure is not None else entry.far_pressure or 0.0 for entry in entries]
    resistance = [
        entry.resistance or (entry.characteristic_resistance or 0.0) + (entry.peripheral_resistance or 0.0)
        for entry in entries
    ]
    node = np.concatenate((ends.inlet_nodes, ends.outlet_nodes))
    return Boundary(
        node=node,
        inflow=np.array([*flow, *(np.nan for _ in entries)], dtype=np.float64),
        head=np.array([*pressure, *far], dtype=np.float64) + column[node],
        resistance=np.array([*(0.0 for _ in inlets), *resistance], dtype=np.float64),
    )
