"""Tables for people and spreadsheets: the network as CSV, units in the header."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Mapping, Sequence
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

from geomprep.atomic import write_atomic
from geomprep.export.context import ExportContext
from geomprep.model import BASIS_NAMES, NODE_ROLES, VESSEL_CLASSES, Network, SteadyState

__all__ = ["table_texts", "write_tables"]

Columns = Mapping[str, Sequence[object] | npt.NDArray[Any]]


def write_tables(folder: Path, network: Network, state: SteadyState, context: ExportContext) -> tuple[Path, ...]:
    """Write nodes, segments, stations, findings and repairs as CSV files.

    Parameters
    ----------
    folder : Path
        Must exist.
    network : Network
        With every table filled.
    state : SteadyState
    context : ExportContext

    Returns
    -------
    tuple of Path
        Files written.

    Raises
    ------
    InputError
        The folder is not writable or full.
    """
    written = []
    for name, text in table_texts(network, state, context).items():
        write_atomic(folder / name, text.encode())
        written.append(folder / name)
    return tuple(written)


def table_texts(network: Network, state: SteadyState, context: ExportContext) -> dict[str, str]:
    """Return the CSV text of every table by file name.

    Numbers are written with as many digits as give them back exactly.
    """
    return {
        "nodes.csv": _csv(_node_columns(network, state)),
        "segments.csv": _csv(_segment_columns(network, state)),
        "stations.csv": _csv(_station_columns(network)),
        "findings.csv": _csv(_finding_columns(context)),
        "repairs.csv": _csv(_repair_columns(context)),
    }


def _csv(columns: Columns) -> str:
    """Columns as CSV with one header line."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(columns)
    writer.writerows(zip(*(_cells(column) for column in columns.values()), strict=True))
    return out.getvalue()


def _cells(column: Sequence[object] | npt.NDArray[Any]) -> Iterable[object]:
    """Values of a column; numbers as Python numbers, which print in full."""
    return column.tolist() if isinstance(column, np.ndarray) else column


def _named(codes: npt.NDArray[Any], names: Sequence[str]) -> npt.NDArray[Any]:
    """Names of codes."""
    named: npt.NDArray[Any] = np.array(names, dtype=object)[codes]
    return named


def _node_columns(network: Network, state: SteadyState) -> Columns:
    """One row per node."""
    nodes = network.nodes
    x, y, z = nodes.position.T
    return {
        "id": nodes.id,
        "role": _named(nodes.role, NODE_ROLES),
        "x [m]": x,
        "y [m]": y,
        "z [m]": z,
        "height [m]": nodes.height,
        "pressure [Pa]": state.pressure,
    }


def _segment_columns(network: Network, state: SteadyState) -> Columns:
    """One row per segment."""
    segments, measures, lumped = network.segments, network.measures, network.lumped
    columns: dict[str, Sequence[object] | npt.NDArray[Any]] = {
        "id": segments.id,
        "name": segments.name,
        "vessel class": _named(segments.vessel_class, VESSEL_CLASSES),
        "from node": network.nodes.id[segments.from_node],
        "to node": network.nodes.id[segments.to_node],
    }
    if measures is not None:
        columns |= {
            "length [m]": measures.length,
            "volume [m3]": measures.volume,
            "radius at from [m]": measures.radius_at_from,
            "radius at to [m]": measures.radius_at_to,
            "radius for resistance [m]": measures.radius_for_resistance,
            "radius for volume [m]": measures.radius_for_volume,
            "minimum radius [m]": measures.minimum_radius,
            "median radius [m]": measures.median_radius,
            "taper [1]": measures.taper,
            "tortuosity [1]": measures.tortuosity,
        }
    if lumped is not None:
        columns |= {
            "resistance [Pa.s/m3]": lumped.resistance,
            "inertance [Pa.s2/m3]": lumped.inertance,
            "compliance [m3/Pa]": lumped.compliance,
        }
    return {**columns, "flow [m3/s]": state.flow, "Strahler order": segments.strahler_order}


def _station_columns(network: Network) -> Columns:
    """One row per station."""
    stations, walls = network.stations, network.walls
    x, y, z = stations.position.T
    columns: dict[str, Sequence[object] | npt.NDArray[Any]] = {
        "segment": network.segments.id[stations.segment],
        "distance [m]": stations.distance,
        "x [m]": x,
        "y [m]": y,
        "z [m]": z,
        "radius [m]": stations.radius,
        "area [m2]": stations.area,
        "basis of radius": _named(stations.basis, BASIS_NAMES),
    }
    if walls is not None:
        columns |= {
            "reference area [m2]": walls.reference_area,
            "stiffness [Pa]": walls.stiffness,
            "reference transmural [Pa]": walls.reference_transmural,
            "imaging transmural [Pa]": walls.imaging_transmural,
        }
    return columns


def _finding_columns(context: ExportContext) -> Columns:
    """One row per finding."""
    findings = context.findings
    return {
        "kind": [one.kind for one in findings],
        "severity": [str(one.severity) for one in findings],
        "message": [one.message for one in findings],
        "where": [one.where for one in findings],
        "value": [_or_empty(one.value) for one in findings],
        "limit": [_or_empty(one.limit) for one in findings],
        "unit": [one.unit for one in findings],
        "source": [one.source for one in findings],
    }


def _repair_columns(context: ExportContext) -> Columns:
    """One row per repair."""
    repairs = context.repairs
    return {
        "id": [one.id for one in repairs],
        "kind": [one.kind for one in repairs],
        "choice": [one.choice for one in repairs],
        "decided by": [one.verdict_by for one in repairs],
        "reason": [one.reason for one in repairs],
        "score": [_or_empty(one.score) for one in repairs],
        "x [m]": [one.position[0] for one in repairs],
        "y [m]": [one.position[1] for one in repairs],
        "z [m]": [one.position[2] for one in repairs],
        "conductance before at 1 Pa.s [m3/(Pa.s)]": [_or_empty(one.conductance_before) for one in repairs],
        "conductance after at 1 Pa.s [m3/(Pa.s)]": [_or_empty(one.conductance_after) for one in repairs],
        "options": [" | ".join(one.options) for one in repairs],
    }


def _or_empty(value: float | None) -> object:
    """A number, or an empty cell."""
    return "" if value is None else value
