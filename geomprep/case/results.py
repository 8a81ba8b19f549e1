"""What a build writes: the network file, tables, lines for a viewer, an overview picture."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from geomprep.curves import resistance_share
from geomprep.errors import InputError
from geomprep.export import ExportContext, write_network, write_overview, write_tables
from geomprep.files import write_lines
from geomprep.model import FloatArray, Network, SteadyState
from geomprep.units import STANDARD_GRAVITY

__all__ = ["station_pressure", "write_results"]


def write_results(
    folder: Path, network: Network, state: SteadyState, context: ExportContext, station_height: FloatArray
) -> None:
    """Write all results of a build into a folder, each file whole or not at all.

    The network file comes last: as long as it is the old one, the old result stands.

    Parameters
    ----------
    folder : Path
        Made where it does not exist.
    network : Network
    state : SteadyState
    context : ExportContext
    station_height : (k,) float array
        Height of every station in metres, for the pressure on the lines.

    Raises
    ------
    InputError
        The folder cannot be made or written, or the disk is full.
    """
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as fault:
        raise InputError(f"{folder}: cannot be made ({fault.strerror}); choose another folder with -o") from fault
    write_tables(folder, network, state, context)
    _write_lines(folder / "lines.vtp", network, state, station_height)
    write_overview(folder / "overview.svg", network, state, context)
    write_network(folder / "network.json", network, state, context)


def station_pressure(network: Network, state: SteadyState, station_height: FloatArray) -> FloatArray:
    """Return the static pressure at every station, Pa.

    Between its two nodes the total head of a segment falls with ∫ds/r⁴; the column of blood
    at each station's own height is then taken off.

    Parameters
    ----------
    network : Network
        With blood.
    state : SteadyState
    station_height : (k,) float array

    Returns
    -------
    (k,) float array
    """
    stations, segments = network.stations, network.segments
    part = resistance_share(stations.distance, stations.radius, stations.offsets)
    owner = stations.segment
    weight = _column_weight(network)
    head = state.pressure + weight * network.nodes.height
    start, end = head[segments.from_node][owner], head[segments.to_node][owner]
    pressure: FloatArray = start + (end - start) * part - weight * station_height
    return pressure


def _column_weight(network: Network) -> float:
    """Weight of the column of blood per metre of height, Pa/m."""
    return STANDARD_GRAVITY * network.blood.density if network.blood else 0.0


def _write_lines(file: Path, network: Network, state: SteadyState, station_height: FloatArray) -> None:
    """Segments as poly-lines in metres with what a viewer may colour them by."""
    stations, segments = network.stations, network.segments
    pressure = station_pressure(network, state, station_height)
    write_lines(
        file,
        stations.position,
        np.arange(len(stations)),
        stations.offsets,
        {
            "radius": stations.radius,
            "area": stations.area,
            "arc_length": stations.distance,
            "pressure": pressure,
        },
        {
            "segment": np.arange(len(segments)),
            "vessel_class": segments.vessel_class,
            "flow": state.flow,
            "strahler_order": segments.strahler_order,
        },
    )
