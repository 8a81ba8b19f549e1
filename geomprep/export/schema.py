"""JSON Schema (draft 2020-12) of the network file, made from the fields table."""

from __future__ import annotations

import json
from collections.abc import Mapping
from typing import Any, Final

from geomprep.model import Field, FieldTable, field_tables
from geomprep.units import UCUM

__all__ = ["schema", "schema_text"]

_DIALECT: Final = "https://json-schema.org/draft/2020-12/schema"
_SHA256: Final = "^[0-9a-f]{64}$"


def schema() -> dict[str, Any]:
    """Return the JSON Schema of the network file.

    It knows fields, types, words allowed, ranges, and lengths that do not depend on other fields; what
    takes two fields to see (equal lengths, ids, balance of flow) is left to the validator.

    Examples
    --------
    >>> schema()["properties"]["blood"]["properties"]["density"]["unit"]
    'kg/m3'
    """
    root = _object(field_tables()[""], field_tables())
    return {"$schema": _DIALECT, "title": "geomprep network 1.0", **root}


def schema_text() -> str:
    """Return the schema as the text of the shipped file ``network.schema.json``."""
    return json.dumps(schema(), indent=1, ensure_ascii=False) + "\n"


def _object(table: FieldTable, tables: Mapping[str, FieldTable]) -> dict[str, Any]:
    """Schema of one object with the tables inside it."""
    inner = {name.rpartition(".")[2]: row for name, row in tables.items() if name and _outer(name) == table.name}
    properties = {row.name: _field(row) for row in table.fields}
    properties |= {name: _table(row, tables) for name, row in inner.items()}
    required = [row.name for row in table.fields if row.required]
    required += [name for name, row in inner.items() if row.required]
    found: dict[str, Any] = {
        "type": "object",
        "description": table.description,
        "properties": properties,
        "required": required,
        "additionalProperties": False,
    }
    moved = [row.name for row in table.fields if row.in_companion]
    if moved:
        found["if"] = {"required": ["companion"]}
        found["then"] = {"properties": dict.fromkeys(moved, False)}
        found["else"] = {"required": moved}
    return found


def _outer(name: str) -> str:
    """Table in which a table lies."""
    return name.rpartition(".")[0]


def _table(table: FieldTable, tables: Mapping[str, FieldTable]) -> dict[str, Any]:
    """Schema of a table of any type."""
    if table.type == "records":
        item = _object(table, tables)
        return {"type": "array", "description": item.pop("description"), "items": item}
    if table.type == "units":
        codes = {kind.replace(" ", "_"): {"const": code} for kind, code in UCUM.items()}
        return {
            "type": "object",
            "description": table.description,
            "properties": codes,
            "required": list(codes),
            "additionalProperties": False,
        }
    return _object(table, tables)


def _field(row: Field) -> dict[str, Any]:
    """Schema of one field: one value, or arrays of them."""
    found = _value(row)
    for part in reversed(row.shape):
        found = {"type": "array", "items": found}
        if part.isdigit():
            found |= {"minItems": int(part), "maxItems": int(part)}
        elif part == "+":
            found["minItems"] = 1
    if row.nullable:
        found["type"] = [found["type"], "null"]
    return {"description": row.description, **({"unit": row.unit} if row.unit else {}), **found}


def _value(row: Field) -> dict[str, Any]:
    """Schema of a single value."""
    if row.type in ("number", "integer"):
        return {"type": row.type, **_bounds(row)}
    if row.type in ("row", "offsets"):
        return {"type": "integer", "minimum": 0}
    if row.type == "choice":
        return {"type": "string", "enum": list(row.choices)}
    return {"type": "string", **({"minLength": 1} if row.type == "id" else {}),
            **({"pattern": _SHA256} if row.type == "sha256" else {})}  # fmt: skip


def _bounds(row: Field) -> dict[str, float]:
    """Bounds of a number."""
    found = {}
    if row.low is not None:
        found["exclusiveMinimum" if row.above_low else "minimum"] = row.low
    if row.high is not None:
        found["maximum"] = row.high
    return found
