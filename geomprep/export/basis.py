"""The basis block: where every number of the file comes from."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np

from geomprep.errors import InputError
from geomprep.export.context import ExportContext
from geomprep.model import (
    BASIS_NAMES,
    BoolArray,
    Field,
    IntArray,
    Network,
    Origin,
    Uint8Array,
    field,
    field_tables,
)

__all__ = ["basis_tables", "filled_rows", "runs"]

_RADIUS = "stations.radius"


def basis_tables(network: Network, context: ExportContext, flat: Mapping[str, Any]) -> dict[str, Any]:
    """Return the tables ``basis.fields`` and ``basis.station_radius``.

    What the network says of a field (its origins, later ones over earlier ones) comes first; rows
    of which it says nothing take the basis of the fields table.

    Raises
    ------
    InputError
        A field with numbers has neither, or an origin names an unknown field.
    """
    said: dict[str, list[Origin]] = {}
    for origin in network.origins:
        said.setdefault(_path(origin.field), []).append(origin)
    entries: list[dict[str, Any]] = []
    for table in field_tables().values():
        for row in table.fields:
            if row.needs_basis and row.path != _RADIUS and table.name in flat:
                entries += _entries(row, filled_rows(flat[table.name], row), said.get(row.path, []))
    radius = _station_runs(network.stations.basis, context)
    return {"basis": {}, "basis.fields": entries, "basis.station_radius": radius}


def filled_rows(table: Any, row: Field) -> BoolArray:
    """Return which rows of a field hold a number; one row for a single value.

    Parameters
    ----------
    table : dict or list of dict
        Table of the file.
    row : Field

    Returns
    -------
    (rows,) bool array
    """
    if isinstance(table, list):
        return np.array([record.get(row.name) is not None for record in table], dtype=np.bool_)
    value = table.get(row.name)
    if row.shape and row.shape[0].isalpha():
        return np.ones(0 if value is None else len(value), np.bool_)
    return np.array([value is not None])


def runs(codes: IntArray) -> tuple[IntArray, IntArray]:
    """Return first and last row of each run of equal codes.

    Examples
    --------
    >>> runs(np.array([4, 4, 7]))
    (array([0, 2]), array([1, 2]))
    >>> runs(np.array([], dtype=int))
    (array([], dtype=int64), array([], dtype=int64))
    """
    if len(codes) == 0:
        return np.empty(0, np.int64), np.empty(0, np.int64)
    first = np.r_[0, np.flatnonzero(np.diff(codes)) + 1]
    return first, np.r_[first[1:], len(codes)] - 1


def _path(name: str) -> str:
    """Place in the file of a field that an origin names by its place or by its attribute."""
    attributes = {row.attribute: row.path for table in field_tables().values() for row in table.fields}
    return attributes[name] if name in attributes else field(name).path


def _entries(row: Field, filled: BoolArray, origins: list[Origin]) -> Iterator[dict[str, Any]]:
    """Entries of one field, none where it holds no number."""
    if not filled.any():
        return
    choice = np.full(len(filled), -1, np.int64)
    for number, origin in enumerate(origins):
        choice[_rows(row, origin, len(filled))] = number
    if np.any(filled & (choice < 0)) and not row.basis:
        raise InputError(
            f"{row.path} row {np.flatnonzero(filled & (choice < 0))[0]} has no basis; "
            "the stage that sets it must say where it comes from (an Origin)"
        )
    for number in (np.flatnonzero(np.bincount(choice[filled] + 1)) - 1).tolist():
        kind, detail = row.basis, row.basis_detail
        if number >= 0:
            kind, detail = BASIS_NAMES[origins[number].basis], origins[number].detail
        rows = [] if np.all(choice[filled] == number) else _row_runs(filled & (choice == number))
        yield {"field": row.path, "basis": kind, "detail": detail, "rows": rows}


def _rows(row: Field, origin: Origin, count: int) -> slice | IntArray:
    """Rows that an origin speaks of."""
    if not origin.rows:
        return slice(None)
    rows = np.asarray(origin.rows, dtype=np.int64)
    if rows.min() < 0 or rows.max() >= count:
        raise InputError(f"the basis of {row.path} names row {rows.max()}, but there are {count} rows")
    return rows


def _row_runs(chosen: BoolArray) -> list[list[int]]:
    """First and last row of each run of chosen rows."""
    first, last = runs(chosen.astype(np.int64))
    kept = chosen[first]
    return np.column_stack((first[kept], last[kept])).tolist()  # type: ignore[no-any-return]


def _station_runs(basis: Uint8Array, context: ExportContext) -> dict[str, Any]:
    """Runs of stations whose radius has one basis and one repair."""
    repair = np.full(len(basis), -1, np.int64)
    if context.station_repair is not None:
        repair[:] = context.station_repair
    first, last = runs(basis.astype(np.int64) * (len(context.repairs) + 1) + repair + 1)
    names = ["", *(row.id for row in context.repairs)]
    return {
        "first": first,
        "last": last,
        "basis": [BASIS_NAMES[code] for code in basis[first].tolist()],
        "repair": [names[number + 1] for number in repair[first].tolist()],
    }
