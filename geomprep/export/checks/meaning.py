"""Whether the tables of a network file mean something together: ids, references, ends, stations."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any, Final

import numpy as np

from geomprep.export.checks.faults import Fault
from geomprep.export.checks.ranges import column_lengths
from geomprep.model import Field, field_tables

__all__ = ["identity_faults", "incidence_faults", "reference_faults", "station_faults"]

_EXACT: Final = 1e-9


def identity_faults(flat: Mapping[str, Any]) -> Iterator[Fault]:
    """Find ids that stand twice in one table."""
    for name in ("nodes", "segments"):
        yield from _repeated(f"{name}.id", flat[name]["id"])
    for name in ("tube_laws", "surroundings", "repairs"):
        yield from _repeated(f"{name}.id", [record["id"] for record in flat[name]])
    yield from _repeated("sources.key", [record["key"] for record in flat["sources"]])


def _repeated(place: str, names: list[str]) -> Iterator[Fault]:
    """Fault of the first name that stands twice."""
    seen: set[str] = set()
    for row, name in enumerate(names):
        if name in seen:
            yield Fault("identity", f"{place}[{row}]", f"'{name}' stands twice; ids must be unique")
            return
        seen.add(name)


def reference_faults(flat: Mapping[str, Any]) -> Iterator[Fault]:
    """Find row numbers, offsets and ids that lead nowhere."""
    lengths = column_lengths(flat)
    for name, table in field_tables().items():
        if name not in flat:
            continue
        for row in table.fields:
            if row.type == "row":
                yield from _row_faults(row, flat[name], _rows_of(flat, row.choices[0]))
            elif row.type == "offsets":
                yield from _offset_faults(row, flat[name][row.name], lengths[row.choices[0]])
    laws = {record["id"] for record in flat["tube_laws"]}
    for row_number, law in enumerate(flat["segments"]["tube_law"]):
        if law not in laws:
            yield Fault("reference", f"segments.tube_law[{row_number}]", f"'{law}' is no id in tube_laws")
            break
    sources, repairs = ({record[key] for record in flat[name]} for name, key in (("sources", "key"), ("repairs", "id")))
    for number, finding in enumerate(flat["findings"]):
        if finding["source"] and finding["source"] not in sources:
            yield Fault("reference", f"findings[{number}].source", f"'{finding['source']}' is no key in sources")
    for number, repair in enumerate(flat["repairs"]):
        for other in repair["after"]:
            if other not in repairs:
                yield Fault("reference", f"repairs[{number}].after", f"'{other}' is no id in repairs")


def _rows_of(flat: Mapping[str, Any], table: str) -> int:
    """Number of rows of a table, of columns or of records."""
    found = flat[table]
    if isinstance(found, list):
        return len(found)
    return len(next(iter(found.values()))) if table != "stations" else len(found["distance"])


def _row_faults(row: Field, table: Any, count: int) -> Iterator[Fault]:
    """Fault of the first row number beyond its table."""
    records = isinstance(table, list)
    values = np.array([record[row.name] for record in table] if records else table[row.name], dtype=np.int64).ravel()
    bad = np.flatnonzero((values < 0) | (values >= count))
    if bad.size:
        first = int(bad[0])
        place = f"{row.table}[{first}].{row.name}" if records else f"{row.path}[{first}]"
        yield Fault("reference", place, f"row {values[first]} of {row.choices[0]}, which has {count} rows from 0")


def _offset_faults(row: Field, values: Any, end: int) -> Iterator[Fault]:
    """Fault of offsets that do not rise from 0 to the end of what they cut."""
    offsets = np.asarray(values)
    if len(offsets) == 0 or offsets[0] != 0 or offsets[-1] != end or np.any(np.diff(offsets) < 0):
        shown = f"from {offsets[0]} to {offsets[-1]}" if len(offsets) else "empty"
        yield Fault("reference", row.path, f"{shown}; offsets must rise from 0 to {end}")


def incidence_faults(flat: Mapping[str, Any]) -> Iterator[Fault]:
    """Find nodes, segments, junctions, inlets and outlets that do not fit together."""
    segments, nodes = flat["segments"], flat["nodes"]
    ends = np.concatenate((segments["from_node"], segments["to_node"]))
    degree = np.bincount(ends, minlength=len(nodes["id"]))
    yield from _role_faults(flat, degree)
    if np.any(degree == 0):
        first = int(np.argmin(degree))
        yield Fault("incidence", f"nodes.id[{first}]", "no segment ends at this node; leave it out")
    yield from _junction_faults(flat["junctions"], segments, degree)


def _role_faults(flat: Mapping[str, Any], degree: Any) -> Iterator[Fault]:
    """Fault of roles that inlets, outlets and degrees contradict."""
    roles = flat["nodes"]["role"]
    for role in ("inlet", "outlet"):
        named = [record["node"] for record in flat[f"{role}s"]]
        if len(set(named)) < len(named):
            yield Fault("incidence", f"{role}s", f"two {role}s stand at one node")
        said = {row for row, one in enumerate(roles) if one == role}
        for row in sorted(said.symmetric_difference(named))[:1]:
            what = "in nodes.role, but not" if row in said else f"a node whose role is {roles[row]},"
            yield Fault("incidence", f"nodes.role[{row}]", f"{what} in {role}s: make them agree")
    expected = {"interior": degree == 2, "junction": degree >= 3, "open end": degree == 1}
    for row, role in enumerate(roles):
        if role in expected and not expected[role][row]:
            yield Fault(
                "incidence", f"nodes.role[{row}]", f"'{role}' at a node where {degree[row]} segment end(s) meet"
            )
            return


def _junction_faults(junctions: Mapping[str, Any], segments: Mapping[str, Any], degree: Any) -> Iterator[Fault]:
    """Fault of junctions that do not list the segment ends at their nodes."""
    node, offsets = np.asarray(junctions["node"]), np.asarray(junctions["offsets"])
    meeting = np.flatnonzero(degree >= 2)
    if not np.array_equal(np.sort(node), meeting):
        odd = np.setxor1d(node, meeting)
        yield Fault("incidence", "junctions.node", f"node {odd[:1]}: each node with two segment ends or more, once")
        return
    owner = np.repeat(node, np.diff(offsets))
    segment = np.asarray(junctions["segment"])
    starts = np.array([end == "from" for end in junctions["end"]], dtype=np.bool_)
    there = np.where(starts, np.asarray(segments["from_node"])[segment], np.asarray(segments["to_node"])[segment])
    wrong = np.flatnonzero(there != owner)
    if wrong.size:
        yield Fault(
            "incidence", f"junctions.segment[{wrong[0]}]", f"this end of segment {segment[wrong[0]]} is elsewhere"
        )
    elif len(np.unique(2 * segment + starts)) < len(segment) or np.any(np.diff(offsets) != degree[node]):
        yield Fault("incidence", "junctions.segment", "a segment end is listed twice or left out")
    size = np.linalg.norm(junctions["direction"], axis=1)
    bent = np.flatnonzero(np.abs(size - 1.0) > 1e-6)
    if bent.size:
        yield Fault("incidence", f"junctions.direction[{bent[0]}]", f"length {size[bent[0]]:.6g}; 1 is needed")


def station_faults(flat: Mapping[str, Any]) -> Iterator[Fault]:
    """Find stations that do not fit their segment."""
    stations, segments = flat["stations"], flat["segments"]
    offsets, distance = np.asarray(stations["offsets"]), stations["distance"]
    few = np.flatnonzero(np.diff(offsets) < 2)
    if few.size:
        yield Fault("stations", f"segments.id[{few[0]}]", f"{np.diff(offsets)[few[0]]} station(s); 2 are needed")
        return
    first, last = offsets[:-1], offsets[1:] - 1
    checks = {
        "the distance of its first station must be 0": distance[first] != 0,
        "its last station must lie at its length": np.abs(distance[last] / segments["length"] - 1.0) > _EXACT,
        "its first station must lie at from_node, or as far off as is cut": _too_far(flat, first, "from"),
        "its last station must lie at to_node, or as far off as is cut": _too_far(flat, last, "to"),
        "radii.at_from must be the radius of its first station": _differ(_radii(flat, "at_from"), flat, first),
        "radii.at_to must be the radius of its last station": _differ(_radii(flat, "at_to"), flat, last),
    }
    for rule, broken in checks.items():
        if np.any(broken):
            yield Fault("stations", f"segments.id[{int(np.argmax(broken))}]", rule)
    inner = np.ones(len(distance), np.bool_)
    inner[first] = False
    falling = np.flatnonzero(inner & (np.diff(distance, prepend=-1.0) <= 0))
    if falling.size:
        yield Fault("stations", f"stations.distance[{falling[0]}]", "distance must rise along a segment")
    area = np.pi * stations["radius"] ** 2
    off = np.flatnonzero(np.abs(stations["area"] / area - 1.0) > _EXACT)
    if off.size:
        row = off[0]
        yield Fault("stations", f"stations.area[{row}]", f"{stations['area'][row]:.6g}; π radius² is {area[row]:.6g}")


def _radii(flat: Mapping[str, Any], name: str) -> Any:
    """A column of ``segments.radii``."""
    return flat["segments.radii"][name]


def _differ(said: Any, flat: Mapping[str, Any], station: Any) -> Any:
    """Whether radii differ from those of stations."""
    return np.abs(said / flat["stations"]["radius"][station] - 1.0) > _EXACT


def _too_far(flat: Mapping[str, Any], station: Any, end: str) -> Any:
    """Whether stations lie farther from the nodes at an end of their segments than the length cut off there."""
    node = np.asarray(flat["segments"][f"{end}_node"])
    apart = np.linalg.norm(flat["stations"]["position"][station] - flat["nodes"]["position"][node], axis=1)
    return apart > flat["segments.zones"][f"cut_at_{end}"] * (1 + _EXACT) + _EXACT * flat["segments"]["length"]
