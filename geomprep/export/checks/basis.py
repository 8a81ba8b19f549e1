"""Every number has a basis, and every basis leads somewhere."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np

from geomprep.export.basis import filled_rows
from geomprep.export.checks.faults import Fault
from geomprep.model import Field, field_tables

__all__ = ["basis_faults"]

_RADIUS = "stations.radius"
_FROM_FIELDS = ("derived", "interpolated")
_FROM_SOURCES = ("published", "population")


def basis_faults(flat: Mapping[str, Any]) -> Iterator[Fault]:
    """Find numbers without a basis, and bases that lead nowhere.

    A measured number leads to an input, a published one to a row of sources, a derived one to
    fields of this file (and through them to something that is not derived), a user's to a key.
    """
    fields = {row.path: row for table in field_tables().values() for row in table.fields if table.name in flat}
    entries: dict[str, list[dict[str, Any]]] = {}
    for number, entry in enumerate(flat["basis.fields"]):
        entries.setdefault(entry["field"], []).append(entry)
        yield from _detail_faults(flat, fields, f"basis.fields[{number}]", entry)
    for row in fields.values():
        if row.needs_basis and row.path != _RADIUS:
            yield from _cover_faults(row, filled_rows(flat[row.table], row), entries.get(row.path, []))
    yield from _circles(entries, fields)
    yield from _station_faults(flat)


def _detail_faults(
    flat: Mapping[str, Any], fields: Mapping[str, Field], place: str, entry: Mapping[str, Any]
) -> Iterator[Fault]:
    """Faults of what one entry leads to."""
    path, kind, detail = entry["field"], entry["basis"], entry["detail"]
    if path not in fields or fields[path].type not in ("number", "integer"):
        yield Fault("basis", place, f"'{path}' is no field with numbers in this file")
    elif kind in _FROM_FIELDS:
        for name in detail.split(", "):
            if name not in fields:
                yield Fault("basis", place, f"{path} is {kind} from '{name}', which is no field of this file")
    elif kind in _FROM_SOURCES:
        if detail not in {row["key"] for row in flat["sources"]}:
            yield Fault("basis", place, f"{path} is {kind} by '{detail}', which is no key in sources")
    elif not detail.strip():
        yield Fault("basis", place, f"{path} is {kind}, but nothing says from where")
    if kind == "measured" and not flat["provenance.inputs"]:
        yield Fault("basis", place, f"{path} is measured, but provenance names no input")


def _cover_faults(row: Field, filled: Any, entries: list[dict[str, Any]]) -> Iterator[Fault]:
    """Fault of the first row that no entry, or more than one, speaks of."""
    count = np.zeros(len(filled), np.int64)
    for entry in entries:
        for first, last in entry["rows"]:
            if not first <= last < len(filled):
                message = f"{row.path}: rows {first} to {last} named, but there are {len(filled)} rows"
                yield Fault("basis", "basis.fields", message)
                return
            count[first : last + 1] += 1
    general = sum(len(entry["rows"]) == 0 for entry in entries)
    if general > 1 or np.any(count > 1):
        yield Fault("basis", "basis.fields", f"{row.path} has more than one basis for the same row")
    bare = filled & (count == 0)
    if not general and bare.any():
        yield Fault("basis", _place(row, int(np.flatnonzero(bare)[0])), "this number has no basis in basis.fields")


def _place(row: Field, number: int) -> str:
    """Field and row of a number."""
    return f"{row.path}[{number}]" if row.shape and row.shape[0].isalpha() else row.path


def _circles(entries: Mapping[str, list[dict[str, Any]]], fields: Mapping[str, Field]) -> Iterator[Fault]:
    """Find derived fields from which no way leads to anything but derived fields."""
    sources: dict[str, set[str]] = {}
    grounded = {path for path, row in fields.items() if not row.needs_basis} | {_RADIUS}
    for path, rows in entries.items():
        if any(entry["basis"] not in _FROM_FIELDS for entry in rows):
            grounded.add(path)
        sources[path] = {name for entry in rows for name in entry["detail"].split(", ")}
    waiting = set(sources) - grounded
    while reached := {path for path in waiting if sources[path] & grounded}:
        grounded |= reached
        waiting -= reached
    for path in sorted(waiting & set(fields)):
        yield Fault("basis", "basis.fields", f"{path} is derived in a circle and leads to no number that is not")


def _station_faults(flat: Mapping[str, Any]) -> Iterator[Fault]:
    """Find gaps in the runs of the radius, and runs that lead nowhere."""
    runs, count = flat["basis.station_radius"], len(flat["stations"]["distance"])
    first, last = np.asarray(runs["first"]), np.asarray(runs["last"])
    starts = np.r_[0, last[:-1] + 1] if len(last) else np.zeros(0, np.int64)
    if len(first) == 0 or np.any(first != starts) or np.any(last < first) or last[-1] != count - 1:
        message = f"runs must follow one another from station 0 to station {count - 1}"
        yield Fault("basis", "basis.station_radius", message)
    repairs = {row["id"] for row in flat["repairs"]}
    for number, (kind, repair) in enumerate(zip(runs["basis"], runs["repair"], strict=True)):
        place = f"basis.station_radius.repair[{number}]"
        if repair and repair not in repairs:
            yield Fault("basis", place, f"'{repair}' is no id in repairs")
        elif kind in _FROM_SOURCES and not repair:
            yield Fault("basis", place, f"a {kind} radius must name the repair that set it")
        elif kind == "measured" and not flat["provenance.inputs"]:
            yield Fault("basis", place, "a measured radius, but provenance names no input")
