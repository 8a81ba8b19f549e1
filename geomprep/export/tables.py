"""Tables for people and spreadsheets: the network as CSV, units in the header."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

from geomprep.atomic import write_atomic
from geomprep.export.companion import MOST_STATIONS_INSIDE
from geomprep.export.context import ExportContext
from geomprep.model import BASIS_NAMES, NODE_ROLES, VESSEL_CLASSES, Network, SteadyState

__all__ = ["table_texts", "write_tables"]

_ROWS_AT_ONCE = 10_000

Columns = Mapping[str, Sequence[object] | npt.NDArray[Any]]


def write_tables(folder: Path, network: Network, state: SteadyState, context: ExportContext) -> tuple[Path, ...]:
    """Write nodes, segments, stations, findings and repairs as CSV files.

    Above 200,000 stations these stand in the companion of the network file and in ``lines.vtp`` only.

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
    if len(network.stations) > MOST_STATIONS_INSIDE:
        (folder / "stations.csv").unlink(missing_ok=True)  # of an earlier, smaller build
    return tuple(written)


def table_texts(network: Network, state: SteadyState, context: ExportContext) -> dict[str, str]:
    """Return the CSV text of every table by file name.

    Numbers are written with as many digits as give them back exactly.
    """
    few = len(network.stations) <= MOST_STATIONS_INSIDE
    texts = {
        "nodes.csv": _csv(_node_columns(network, state)),
        "segments.csv": _csv(_segment_columns(network, state)),
        "findings.csv": _csv(_finding_columns(context)),
        "repairs.csv": _csv(_repair_columns(context)),
    }
    return texts | ({"stations.csv": _csv(_station_columns(network))} if few else {})


def _csv(columns: Columns) -> str:
    """Columns as CSV (RFC 4180, lines ended by a line feed) with one header line."""
    header = ",".join(_quoted(name) for name in columns)
    count = max(map(len, columns.values()), default=0)
    blocks = [header]
    for start in range(0, count, _ROWS_AT_ONCE):  # the cells of all rows as texts would need much room
        cells = (_cells(column[start : start + _ROWS_AT_ONCE]) for column in columns.values())
        blocks.append("\n".join(map(",".join, zip(*cells, strict=True))))
    return "\n".join(blocks) + "\n"


def _cells(column: Sequence[object] | npt.NDArray[Any]) -> list[str]:
    """Texts of a column; numbers with the fewest digits that give them back exactly."""
    if isinstance(column, np.ndarray) and column.dtype.kind in "fiu":
        import orjson

        if len(column) == 0:
            return []
        return orjson.dumps(np.ascontiguousarray(column), option=orjson.OPT_SERIALIZE_NUMPY)[1:-1].decode().split(",")
    texts = list(map(str, column))
    whole = "\n".join(texts)
    plain = whole.count("\n") < max(len(texts), 1) and not any(sign in whole for sign in ',"\r')
    return texts if plain else list(map(_quoted, texts))


def _quoted(text: str) -> str:
    """A text as one cell."""
    if any(sign in text for sign in ',"\n\r'):
        return '"' + text.replace('"', '""') + '"'
    return text


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
