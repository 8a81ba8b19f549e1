"""Names from a table: each row is a name and a point that lies on the vessel."""

from __future__ import annotations

import csv
import dataclasses
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from scipy.spatial import cKDTree

from geomprep.errors import InputError
from geomprep.findings import Finding, Severity
from geomprep.model import FloatArray, IntArray, Network, texts

__all__ = ["NamedPoint", "NamingResult", "name_segments", "read_names"]

_FAR_IN_RADII = 2.0
_NEIGHBOURS = 16


@dataclass(frozen=True)
class NamedPoint:
    """A vessel name and a place on that vessel, in metres."""

    name: str
    position: tuple[float, float, float]


@dataclass(frozen=True)
class NamingResult:
    """A network with names, and what was doubtful about them."""

    network: Network
    findings: tuple[Finding, ...]


def read_names(file: Path, metres_per_unit: float) -> tuple[NamedPoint, ...]:
    """Read a table of names: CSV with the columns name, x, y, z in the unit of the centreline file.

    Parameters
    ----------
    file : Path
    metres_per_unit : float

    Raises
    ------
    InputError
        The file is missing, lacks a column, or holds a row that is no point.
    """
    try:
        text = file.read_text(encoding="utf-8-sig")
    except (OSError, UnicodeDecodeError) as fault:
        raise InputError(f"names = '{file.name}': cannot be read ({fault}); give a UTF-8 CSV file") from fault
    reader = csv.DictReader(text.splitlines())
    missing = [column for column in ("name", "x", "y", "z") if column not in (reader.fieldnames or [])]
    if missing:
        raise InputError(f"names = '{file.name}': column {missing[0]} is missing; the first line must be name,x,y,z")
    return tuple(_named_point(row, number, file.name, metres_per_unit) for number, row in enumerate(reader, 2))


def _named_point(row: dict[str, str | None], line: int, file: str, factor: float) -> NamedPoint:
    """One row as a named point."""
    try:
        x, y, z = (float(row[axis] or "") * factor for axis in ("x", "y", "z"))
    except ValueError as fault:
        raise InputError(f"names = '{file}', line {line}: x, y, z must be numbers; got {row}") from fault
    if not np.isfinite([x, y, z]).all() or not (row["name"] or "").strip():
        raise InputError(f"names = '{file}', line {line}: a name and three finite numbers are needed; got {row}")
    return NamedPoint((row["name"] or "").strip(), (x, y, z))


def name_segments(network: Network, points: Sequence[NamedPoint]) -> NamingResult:
    """Give each named point's name to the segment whose centreline passes nearest.

    A point farther than two radii from any centreline names nothing and leaves a finding. Where two
    different names fall on one segment, the nearer one stands and a finding says so.

    Parameters
    ----------
    network : Network
    points : sequence of NamedPoint

    Returns
    -------
    NamingResult
    """
    if not points or len(network.segments) == 0:
        return NamingResult(network, ())
    places = np.array([point.position for point in points])
    segment, distance, radius = _nearest_segment(network, places)
    findings = []
    name = np.array(network.segments.name, dtype=object)
    taken: dict[int, str] = {}
    for row in np.argsort(distance, kind="stable").tolist():
        label, target = points[row].name, int(segment[row])
        if distance[row] > _FAR_IN_RADII * radius[row]:
            findings.append(_far(points[row], float(distance[row]), float(radius[row])))
        elif taken.get(target, label) != label:
            findings.append(_twice(points[row], taken[target], str(network.segments.id[target])))
        else:
            taken[target] = label
            name[target] = label
    segments = dataclasses.replace(network.segments, name=texts("name", name))
    return NamingResult(dataclasses.replace(network, segments=segments), tuple(findings))


def _nearest_segment(network: Network, places: FloatArray) -> tuple[IntArray, FloatArray, FloatArray]:
    """Segment nearest to each place, the distance to its centreline and its radius there.

    The nearest station is not always on the nearest segment: the pieces beside several near
    stations are measured.
    """
    stations = network.stations
    count = min(_NEIGHBOURS, len(stations))
    _, near = cKDTree(stations.position).query(places, k=count)
    near = near.reshape(len(places), count)
    owner = stations.segment[near]
    best = np.full(near.shape, np.inf)
    for shift in (-1, 0):
        low = np.clip(near + shift, stations.offsets[owner], stations.offsets[owner + 1] - 2)
        best = np.minimum(best, _piece_distance(stations.position, low, places))
    choice = np.argmin(best, axis=1)
    row = np.arange(len(places))
    return owner[row, choice], best[row, choice], stations.radius[near[row, choice]]


def _piece_distance(position: FloatArray, low: IntArray, places: FloatArray) -> FloatArray:
    """Distance of each place to the straight pieces that start at stations `low`, (q, c)."""
    start = position[low]
    along = position[low + 1] - start
    offset = places[:, None, :] - start
    size = np.maximum(np.einsum("qci,qci->qc", along, along), np.finfo(float).tiny)
    share = np.clip(np.einsum("qci,qci->qc", offset, along) / size, 0.0, 1.0)
    distance: FloatArray = np.linalg.norm(offset - share[..., None] * along, axis=2)
    return distance


def _far(point: NamedPoint, distance: float, radius: float) -> Finding:
    """A name whose point lies on no vessel."""
    return Finding(
        "name far from vessels",
        Severity.WARNING,
        f"The point of '{point.name}' lies {1e3 * distance:.1f} mm from the nearest centreline "
        f"(radius {1e3 * radius:.1f} mm there); the name was not used.",
        position=point.position,
        value=distance,
        limit=_FAR_IN_RADII * radius,
        unit="m",
    )


def _twice(point: NamedPoint, other: str, segment: str) -> Finding:
    """A name whose segment already has another."""
    return Finding(
        "two names on one segment",
        Severity.WARNING,
        f"'{point.name}' and '{other}' fall on the same segment; '{other}' lies nearer and was kept.",
        where=segment,
        position=point.position,
    )
