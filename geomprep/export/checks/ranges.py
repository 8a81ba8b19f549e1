"""Range checks from the fields table, on whole columns at once."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np

from geomprep.export.checks.faults import Fault
from geomprep.model import Field, field_tables

__all__ = ["column_lengths", "length_faults", "range_faults"]

_DIMENSIONS = {  # letter -> table and field whose length it is
    "n": ("nodes", "id"),
    "s": ("segments", "id"),
    "k": ("stations", "distance"),
    "j": ("junctions", "node"),
    "t": ("junctions", "segment"),
    "r": ("basis.station_radius", "first"),
}


def column_lengths(flat: Mapping[str, Any]) -> dict[str, int]:
    """Return the length that each letter of a shape stands for."""
    lengths = {letter: len(flat[table][name]) for letter, (table, name) in _DIMENSIONS.items() if table in flat}
    return {**lengths, "i": len(flat["inlets"]), "o": len(flat["outlets"])}


def length_faults(flat: Mapping[str, Any]) -> Iterator[Fault]:
    """Find columns whose length is not that of their table."""
    lengths = column_lengths(flat)
    for name, table in field_tables().items():
        if name in flat and table.type == "object":
            for row in table.fields:
                letter = row.shape[0] if row.shape else ""
                if letter.isalpha() or letter.endswith("+1"):
                    needed = lengths[letter[0]] + letter.count("+1")
                    if len(flat[name][row.name]) != needed:
                        message = f"{len(flat[name][row.name])} rows; {needed} needed"
                        yield Fault("length", row.path, message)


def range_faults(flat: Mapping[str, Any]) -> Iterator[Fault]:
    """Find numbers that are not finite or outside the range of their field, the first row of each field."""
    for name, table in field_tables().items():
        if name not in flat:
            continue
        for row in table.fields:
            if row.type in ("number", "integer"):
                if table.type == "records":
                    yield from _record_faults(row, flat[name])
                else:
                    yield from _column_faults(row, flat[name].get(row.name))


def _record_faults(row: Field, records: list[dict[str, Any]]) -> Iterator[Fault]:
    """Faults of one field of a list of records."""
    if not row.shape and not any(
        _column_faults(row, [value for r in records if (value := r.get(row.name)) is not None])
    ):
        return
    for number, record in enumerate(records):
        for fault in _column_faults(row, record.get(row.name)):
            place = fault.place.removeprefix(row.path)
            yield Fault(fault.word, f"{row.table}[{number}].{row.name}{place}", fault.message)
            return


def _column_faults(row: Field, values: Any) -> Iterator[Fault]:
    """Fault of the first value out of range."""
    if values is None:
        return
    array = np.asarray(values)
    if array.size == 0:
        return
    good = np.isfinite(array)
    if row.low is not None:
        good &= array > row.low if row.above_low else array >= row.low
    if row.high is not None:
        good &= array <= row.high
    if not good.all():
        index = np.argwhere(~good)[0].tolist() if array.ndim else []
        place = row.path + "".join(f"[{i}]" for i in index)
        others = int(array.size - np.count_nonzero(good)) - 1
        more = f" ({others} more in this field)" if others else ""
        yield Fault("range", place, f"{array[tuple(index)]:g} must be finite{_bounds(row)}{more}")


def _bounds(row: Field) -> str:
    """Bounds in words."""
    low = "" if row.low is None else f" and {'>' if row.above_low else '>='} {row.low:g}"
    high = "" if row.high is None else f" and <= {row.high:g}"
    return f"{low}{high} {row.unit if row.unit != '1' else ''}".rstrip()
