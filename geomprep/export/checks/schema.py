"""A second opinion on structure: the shipped JSON Schema, checked by jsonschema."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any, Final

from geomprep.export.checks.faults import Fault
from geomprep.export.schema import schema

__all__ = ["schema_faults"]

_WORDS: Final = {
    "required": "missing",
    "additionalProperties": "unknown",
    "type": "type",
    "enum": "choice",
    "const": "unit",
    "pattern": "form",
    "minItems": "length",
    "maxItems": "length",
    "minLength": "length",
    "minimum": "range",
    "maximum": "range",
    "exclusiveMinimum": "range",
}
"""Keyword of the schema -> word of the fault."""


def schema_faults(value: Any) -> Iterator[Fault]:
    """Find what the JSON Schema of the network file refuses.

    About a thousand times slower than the checks made from the same fields table, so it is
    run on small files only.

    Parameters
    ----------
    value : object
        Decoded JSON.

    Yields
    ------
    Fault

    Examples
    --------
    >>> str(next(schema_faults([])))
    "type: file: [] is not of type 'object'"
    """
    import jsonschema

    for error in jsonschema.Draft202012Validator(schema()).iter_errors(value):
        # a column beside its companion meets the schema `false`, which has no keyword
        word = _WORDS.get(str(error.validator), "unknown")
        yield Fault(word, _place(error.absolute_path), error.message)


def _place(path: Any) -> str:
    """Table, field and row as the other checks write them."""
    parts = [f"[{part}]" if isinstance(part, int) else f".{part}" for part in path]
    return "".join(parts).removeprefix(".")
