"""The neutral network file: written whole or not at all, equal bytes for equal input."""

from __future__ import annotations

import os
from collections.abc import Iterator, Mapping
from itertools import chain
from math import isfinite
from pathlib import Path
from typing import Any

import numpy as np

from geomprep.atomic import atomic_writer
from geomprep.errors import NetworkFileError
from geomprep.export.blocks import filled_tables
from geomprep.export.checks.basis import basis_faults
from geomprep.export.checks.ranges import range_faults
from geomprep.export.companion import MOST_STATIONS_INSIDE, companion_fields, remove_companions, write_companion
from geomprep.export.context import ExportContext
from geomprep.model import Network, SteadyState

__all__ = ["encode", "neutral_document", "write_network"]


def neutral_document(network: Network, state: SteadyState, context: ExportContext) -> dict[str, Any]:
    """Return the network file as nested dicts, blocks and fields in the order of the fields table.

    Columns are numpy arrays or lists of text; the stations stand inside, however many there are.

    Parameters
    ----------
    network : Network
        With every table filled.
    state : SteadyState
        Linear steady state of that network.
    context : ExportContext

    Returns
    -------
    dict

    Raises
    ------
    InputError
        A table is missing or a number has no basis.
    NetworkFileError
        A number is not finite or lies outside the range of its field: field and row are named.
    """
    flat = filled_tables(network, state, context)
    for fault in (*range_faults(flat), *basis_faults(flat)):
        raise NetworkFileError(f"the network cannot be written: {fault}")
    return _nested(flat)


def _nested(flat: Mapping[str, Any]) -> dict[str, Any]:
    """Tables by dotted name put into one another."""
    document: dict[str, Any] = dict(flat[""])
    for name, table in flat.items():
        if name:
            *outer, last = name.split(".")
            place = document
            for part in outer:
                place = place[part]
            place[last] = dict(table) if isinstance(table, dict) else table
    return document


def write_network(
    path: str | os.PathLike[str], network: Network, state: SteadyState, context: ExportContext
) -> tuple[Path, ...]:
    """Write the network file, and its companion when there are more than 200,000 stations.

    A killed run leaves the old result or the new one: the companion carries its hash in its
    name and comes first, the network file that names it follows, companions of earlier results go last.

    Parameters
    ----------
    path : path
        Target, such as ``results/network.json``; its folder must exist.
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
        A table is missing, a number has no basis, or the folder is not writable or full.
    NetworkFileError
        A number is not finite or lies outside its range.
    """
    target = Path(path)
    document = neutral_document(network, state, context)
    written: tuple[Path, ...] = (target,)
    keep = None
    if len(network.stations) > MOST_STATIONS_INSIDE:
        block = write_companion(target.parent, document["stations"])
        inside = {name: value for name, value in document["stations"].items() if name not in _COMPANION_NAMES}
        document["stations"] = {**inside, "companion": block}
        keep = block["file"]
        written = (target.parent / keep, target)
    _refuse_infinite("", document)
    with atomic_writer(target) as stream:
        for piece in _pieces(document):
            stream.write(piece)
    remove_companions(target.parent, keep)
    return written


_COMPANION_NAMES = frozenset(row.name for row in companion_fields())


def encode(document: Mapping[str, Any]) -> bytes:
    r"""Return a document of dicts, lists, texts, numbers and arrays as UTF-8 JSON.

    Raises
    ------
    NetworkFileError
        A number anywhere in it is not finite: JSON has no word for it.

    Examples
    --------
    >>> encode({"length": np.array([0.25, 1.0])})
    b'{"length":[0.25,1.0]}\n'
    >>> encode({"nodes": {"height": [0.0, float("nan")]}})
    Traceback (most recent call last):
    geomprep.errors.NetworkFileError: nodes.height[1]: nan cannot be written; every number must be finite
    """
    _refuse_infinite("", document)
    return b"".join(_pieces(document))


def _pieces(document: Mapping[str, Any]) -> Iterator[bytes]:
    """The document table by table, so that the text of a large one need not be held whole."""
    import orjson

    before = b"{"
    for name, value in document.items():
        yield before + orjson.dumps(name) + b":"
        yield orjson.dumps(value, option=orjson.OPT_SERIALIZE_NUMPY)
        before = b","
    yield b"}\n" if document else b"{}\n"


def _refuse_infinite(place: str, value: Any) -> None:
    """Raise on the first number that is not finite (the encoder would write null)."""
    if isinstance(value, Mapping):
        for key, inner in value.items():
            _refuse_infinite(f"{place}.{key}" if place else str(key), inner)
    elif isinstance(value, np.ndarray):
        if value.dtype.kind == "f" and not np.isfinite(value).all():
            row = np.argwhere(~np.isfinite(value))[0].tolist()
            raise NetworkFileError(
                f"{place}{''.join(f'[{i}]' for i in row)}: {value[tuple(row)]} cannot be written; "
                "every number must be finite"
            )
    elif isinstance(value, list | tuple):
        if _all_finite(value):
            return
        for number, inner in enumerate(value):
            _refuse_infinite(f"{place}[{number}]", inner)
    elif isinstance(value, float | np.floating) and not np.isfinite(value):
        raise NetworkFileError(f"{place}: {value} cannot be written; every number must be finite")


def _all_finite(rows: list[Any] | tuple[Any, ...]) -> bool:
    """Whether a list of texts, or of flat records of texts and numbers, holds finite numbers only."""
    kinds = set(map(type, rows))
    if kinds <= {str}:
        return True
    if kinds != {dict}:
        return False
    values = list(chain.from_iterable(row.values() for row in rows))
    if not set(map(type, values)) <= {str, int, float, bool, type(None)}:
        return False
    return all(map(isfinite, (value for value in values if type(value) is float)))
