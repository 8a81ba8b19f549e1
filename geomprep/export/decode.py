"""Bytes of a network file to tables of typed columns, with every fault of structure on the way."""

from __future__ import annotations

import json
import re
from collections.abc import Mapping
from functools import cache
from typing import Annotated, Any, Final, Literal

import msgspec
import numpy as np

from geomprep.export.checks.faults import Fault
from geomprep.model import Field, FieldTable, field_tables
from geomprep.units import UCUM

__all__ = ["decoded", "duplicate_keys", "structured"]

_PYTHON: Final[dict[str, Any]] = {
    "number": float,
    "integer": int,
    "row": int,
    "offsets": int,
    "text": str,
    "id": Annotated[str, msgspec.Meta(min_length=1)],
    "sha256": Annotated[str, msgspec.Meta(pattern="^[0-9a-f]{64}$")],
}
_ARRAY: Final = {"number": np.float64, "integer": np.int64, "row": np.int64, "offsets": np.int64}
_WORDS: Final = (
    ("of length", "length"),
    ("Invalid enum", "choice"),
    ("matching regex", "form"),
    ("out of range", "range"),
    ("Expected", "type"),
)
_TOKEN = re.compile(rb'"(?:[^"\\]|\\.)*"(\s*:)?|[{}]')


def decoded(data: bytes) -> tuple[Any, list[Fault]]:
    """Return the JSON value of bytes, or the fault that makes them no JSON.

    Parameters
    ----------
    data : bytes

    Returns
    -------
    value : object
        None where there is a fault.
    faults : list of Fault
        At most one.

    Examples
    --------
    >>> decoded(b'{"a": [1, 2]}')
    ({'a': [1, 2]}, [])
    >>> [str(fault) for fault in decoded(b'{"a": NaN}')[1]]
    ['json: file: JSON is malformed: invalid character (byte 6)']
    >>> [str(fault) for fault in decoded(b'{"a": 1, "a": 2}')[1]]
    ["duplicate: file: the key 'a' stands twice in one object; keep one"]
    """
    if not data:
        return None, [Fault("json", "", "the file is empty")]
    try:
        value = msgspec.json.decode(data)
    except msgspec.ValidationError as error:
        return None, [_fault(error, "")]
    except (msgspec.DecodeError, RecursionError, UnicodeDecodeError) as error:
        return None, [Fault("json", "", " ".join(str(error).split()))]
    twice = duplicate_keys(data)
    return (value, []) if twice is None else (None, [Fault("duplicate", "", twice)])


def duplicate_keys(data: bytes) -> str | None:
    """Return a sentence on the first key that stands twice in one object of well-formed JSON, or None.

    Decoders keep the last of the two without a word.
    """
    open_objects: list[set[bytes]] = []
    for token in _TOKEN.finditer(data):
        text = token[0]
        if text == b"{":
            open_objects.append(set())
        elif text == b"}":
            open_objects.pop()
        elif token[1] is not None:
            key = text[: text.rindex(b'"') + 1]
            if b"\\" in key:
                key = json.dumps(json.loads(key), ensure_ascii=False).encode("utf-8", "surrogatepass")
            if key in open_objects[-1]:
                return f"the key '{json.loads(key)}' stands twice in one object; keep one"
            open_objects[-1].add(key)
    return None


def structured(value: Any) -> tuple[dict[str, Any], list[Fault]]:
    """Return the tables of a decoded network file by dotted name, with all faults of structure.

    Parameters
    ----------
    value : object
        Decoded JSON.

    Returns
    -------
    tables : dict
        Numbers of tables of columns as arrays, records as they are; incomplete where there are faults.
    faults : list of Fault
        Missing and unknown fields, wrong types, words and lengths.
    """
    flat: dict[str, Any] = {}
    faults: list[Fault] = []
    _read_object(field_tables()[""], value, flat, faults)
    return {name: flat[name] for name in field_tables() if name in flat}, faults


def _read_object(table: FieldTable, value: Any, flat: dict[str, Any], faults: list[Fault]) -> None:
    """Read one object and the tables inside it."""
    if not isinstance(value, dict):
        faults.append(_wrong_kind(table.name, "object", value))
        return
    inner = _inner(table.name)
    flat[table.name] = _read_fields(table, value, table.name, faults, set(inner))
    for key, name in inner.items():
        row = field_tables()[name]
        if key not in value:
            if row.required:
                faults.append(_missing(name))
        elif row.type == "records":
            flat[name] = _read_records(row, value[key], faults)
        elif row.type == "units":
            flat[name] = value[key]
            faults += _unit_faults(name, value[key])
        else:
            _read_object(row, value[key], flat, faults)


@cache
def _inner(outer: str) -> dict[str, str]:
    """Key and dotted name of the tables inside a table."""
    return {name.rpartition(".")[2]: name for name in field_tables() if name and name.rpartition(".")[0] == outer}


def _read_records(table: FieldTable, value: Any, faults: list[Fault]) -> list[dict[str, Any]]:
    """Read a list of objects."""
    if not isinstance(value, list):
        faults.append(_wrong_kind(table.name, "array", value))
        return []
    records = []
    for number, record in enumerate(value):
        place = f"{table.name}[{number}]"
        if isinstance(record, dict):
            records.append(_read_fields(table, record, place, faults, set()))
        else:
            faults.append(_wrong_kind(place, "object", record))
    return records


def _read_fields(
    table: FieldTable, value: Mapping[str, Any], place: str, faults: list[Fault], inner: set[str]
) -> dict[str, Any]:
    """Read the fields of one object."""
    known = {row.name for row in table.fields} | inner
    faults += [
        Fault("unknown", _join(place, key), f"no such field; known are {', '.join(sorted(known))}")
        for key in value
        if key not in known
    ]
    found: dict[str, Any] = {}
    outside = "companion" in value
    for row in table.fields:
        if row.name not in value:
            if row.required or (row.in_companion and not outside):
                faults.append(_missing(_join(place, row.name)))
        elif row.in_companion and outside:
            faults.append(Fault("unknown", row.path, "the column stands in the companion; it cannot stand here too"))
        else:
            _read_field(row, value[row.name], _join(place, row.name), found, faults)
    return found


def _read_field(row: Field, value: Any, place: str, found: dict[str, Any], faults: list[Fault]) -> None:
    """Read one field: typed, columns of numbers as arrays."""
    try:
        typed = msgspec.convert(value, type=_type(row), strict=True)
        column = row.shape and row.shape != ("*",) and typed is not None and row.type in _ARRAY
        found[row.name] = _array(row, typed) if column else typed
    except msgspec.ValidationError as error:
        faults.append(_fault(error, place))
    except OverflowError:
        faults.append(Fault("range", place, "an integer too large for 64 bits"))


def _array(row: Field, typed: Any) -> Any:
    """Column as an array of the shape of its field, empty ones too."""
    tail = tuple(int(part) for part in row.shape[1:])
    return np.array(typed, dtype=_ARRAY[row.type]).reshape(-1, *tail)


@cache
def _type(row: Field) -> Any:
    """Type that a field decodes to."""
    kind: Any = Literal[row.choices] if row.type == "choice" else _PYTHON[row.type]
    for part in reversed(row.shape):
        if part.isdigit():
            kind = tuple[(kind,) * int(part)]  # type: ignore[misc]
        else:
            kind = Annotated[list[kind], msgspec.Meta(min_length=1)] if part == "+" else list[kind]
    return kind | None if row.nullable else kind


def _unit_faults(name: str, value: Any) -> list[Fault]:
    """Faults of the units, which the format fixes."""
    if not isinstance(value, dict):
        return [_wrong_kind(name, "object", value)]
    codes = {kind.replace(" ", "_"): code for kind, code in UCUM.items()}
    faults = [_missing(f"{name}.{kind}") for kind in codes if kind not in value]
    faults += [Fault("unknown", f"{name}.{kind}", "no such kind of quantity") for kind in value if kind not in codes]
    faults += [
        Fault("unit", f"{name}.{kind}", f"{json.dumps(value[kind])}; this format uses {json.dumps(code)}: convert")
        for kind, code in codes.items()
        if kind in value and value[kind] != code
    ]
    return faults


def _fault(error: msgspec.ValidationError, place: str) -> Fault:
    """Fault of a decoder's message."""
    message, _, where = str(error).partition(" - at `$")
    word = next((word for phrase, word in _WORDS if phrase in message), "type")
    return Fault(word, f"{place}{where.rstrip('`')}", message.replace("`", "'"))


def _missing(place: str) -> Fault:
    """Fault of a required field that is not there."""
    return Fault("missing", place, "this field is required")


def _wrong_kind(place: str, needed: str, value: Any) -> Fault:
    """Fault of a value that is no object or no array."""
    return Fault("type", place, f"expected '{needed}', got '{type(value).__name__}'")


def _join(place: str, name: str) -> str:
    """Place of a field."""
    return f"{place}.{name}" if place else name
