"""The fields of the network file: one table from which checks, schema and manual are made.

``fields.csv`` has one row per table (empty field) and one per field:

table, field
    Dotted place in the file; the top level is the empty table.
type
    Of a table: ``object`` (one value per field, or columns), ``records`` (a list of
    objects) or ``units`` (fixed by :data:`geomprep.units.UCUM`). Of a field: ``number``,
    ``integer``, ``row`` (row number, from 0, of the table named under choices), ``offsets`` (rising
    from 0 to the dimension named under choices), ``id`` (text, not empty), ``text``, ``choice``, ``sha256``.
unit
    UCUM code.
shape
    Dimensions parted by commas; empty for one value. Letters are the lengths of the tables: n nodes,
    s segments, k stations, j junctions, t segment ends at junctions, i inlets, o outlets, r runs
    of one basis. ``*`` is any length, ``+`` at least one, a number is itself.
required
    ``companion``: required unless the stations stand in a companion file.
low, high
    Inclusive, unless written ``>0``.
basis, basis_detail
    Where the numbers come from when the network does not say; an empty basis must be said by the
    network, ``structure`` marks numbers that the format itself gives (counts, versions, tolerances).
choices
    Words allowed, parted by ``|``; or the table or dimension that row numbers or offsets refer to.
attribute
    Where a :class:`geomprep.model.Network` holds it.
"""

from __future__ import annotations

import csv
import difflib
from dataclasses import dataclass
from functools import cache
from importlib import resources
from typing import Final

from geomprep.errors import InputError

__all__ = ["FIXED_BY_FORMAT", "Field", "FieldTable", "field", "field_tables"]

FIXED_BY_FORMAT: Final = "structure"
"""Basis of numbers that lead to the format itself."""

_NUMERIC = ("number", "integer")


@dataclass(frozen=True)
class Field:
    """One row of the fields table.

    Attributes
    ----------
    table, name : str
    type, unit, shape : str
    required, in_companion, nullable : bool
        `in_companion` fields are required unless the stations stand in a companion file.
    low, high : float, optional
    above_low : bool
        True where `low` itself is refused.
    basis, basis_detail : str
    choices : tuple of str
    attribute, description : str
    """

    table: str
    name: str
    type: str
    unit: str
    shape: tuple[str, ...]
    required: bool
    in_companion: bool
    nullable: bool
    low: float | None
    high: float | None
    above_low: bool
    basis: str
    basis_detail: str
    choices: tuple[str, ...]
    attribute: str
    description: str

    @property
    def path(self) -> str:
        """Table and field, such as ``segments.length``."""
        return f"{self.table}.{self.name}" if self.table else self.name

    @property
    def needs_basis(self) -> bool:
        """True for numbers that must lead to where they come from."""
        return self.type in _NUMERIC and self.basis != FIXED_BY_FORMAT


@dataclass(frozen=True)
class FieldTable:
    """One table of the file with its fields, in the order in which they are written."""

    name: str
    type: str
    required: bool
    description: str
    fields: tuple[Field, ...]


def field_tables() -> dict[str, FieldTable]:
    """Return the tables of the network file by name, in the order of the file.

    Returns
    -------
    dict of str to FieldTable
        A new dict on every call; the rows are shared and frozen.

    Examples
    --------
    >>> tables = field_tables()
    >>> tables["surroundings"].type
    'records'
    >>> [row.name for row in tables["producer"].fields]
    ['name', 'version']
    """
    return dict(_tables())


def field(path: str) -> Field:
    """Return the row of one field.

    Parameters
    ----------
    path : str
        Table and field, such as ``segments.length``.

    Raises
    ------
    InputError
        No such field; the nearest one is named.

    Examples
    --------
    >>> field("segments.length").unit
    'm'
    >>> field("segments.lenght")
    Traceback (most recent call last):
    geomprep.errors.InputError: no field 'segments.lenght' in the network file; nearest is 'segments.length'
    """
    found = _by_path().get(path)
    if found is None:
        near = difflib.get_close_matches(path, _by_path(), n=1, cutoff=0.0)
        raise InputError(f"no field '{path}' in the network file; nearest is '{near[0]}'")
    return found


@cache
def _by_path() -> dict[str, Field]:
    """Fields by table and name."""
    return {row.path: row for table in _tables().values() for row in table.fields}


@cache
def _tables() -> dict[str, FieldTable]:
    """Tables as read from the file, once per process."""
    source = resources.files("geomprep.model").joinpath("fields.csv")
    rows = list(csv.DictReader(source.read_text(encoding="utf-8").splitlines()))
    fields: dict[str, list[Field]] = {}
    for row in rows:
        fields.setdefault(row["table"], [])
        if row["field"]:
            fields[row["table"]].append(_field(row))
    heads = [row for row in rows if not row["field"]]
    return {
        row["table"]: FieldTable(
            row["table"], row["type"], row["required"] == "yes", row["description"], tuple(fields[row["table"]])
        )
        for row in heads
    }


def _field(row: dict[str, str]) -> Field:
    """Row of the file as a field."""
    return Field(
        table=row["table"],
        name=row["field"],
        type=row["type"],
        unit=row["unit"],
        shape=tuple(row["shape"].split(",")) if row["shape"] else (),
        required=row["required"] == "yes",
        in_companion=row["required"] == "companion",
        nullable=row["nullable"] == "yes",
        low=float(row["low"].lstrip(">")) if row["low"] else None,
        high=float(row["high"]) if row["high"] else None,
        above_low=row["low"].startswith(">"),
        basis=row["basis"],
        basis_detail=row["basis_detail"],
        choices=tuple(row["choices"].split("|")) if row["choices"] else (),
        attribute=row["attribute"],
        description=row["description"],
    )
