"""The blocks of the network file, filled from the network, a steady state and the context."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Mapping
from functools import cache
from pathlib import PurePath
from typing import Any

import numpy as np

from geomprep.errors import InputError
from geomprep.export.basis import basis_tables
from geomprep.export.context import ExportContext
from geomprep.export.texts import CAUTIONS, CONVENTIONS, EQUATIONS, IMAGED, TOLERANCE
from geomprep.laws.blood import momentum_factor
from geomprep.model import (
    NODE_ROLES,
    PROFILE_KINDS,
    RESOLUTION_LEVELS,
    VESSEL_CLASSES,
    Field,
    Network,
    SteadyState,
    Walls,
    field_tables,
)
from geomprep.units import UCUM

__all__ = ["Flat", "filled_tables"]

Flat = dict[str, Any]
"""Tables by dotted name: a dict of values and columns, or a list of dicts."""

_NEEDED = {
    "measures": "measure the segments",
    "junctions": "measure the junctions",
    "blood": "assign blood",
    "surroundings": "assign surroundings",
    "walls": "assign walls",
    "lumped": "assign lumped values",
    "inlets": "assign inlets",
    "outlets": "assign outlets",
}
_END_NAMES = ("from", "to")


def filled_tables(network: Network, state: SteadyState, context: ExportContext) -> Flat:
    """Return all tables of the file by dotted name, in the order of the fields table.

    Numbers stay in arrays; texts and small records are plain Python.

    Raises
    ------
    InputError
        A table of the network is still missing, or a number has no basis.
    """
    for name, remedy in _NEEDED.items():
        if getattr(network, name) is None:
            raise InputError(f"the network has no {name} yet: {remedy} before exporting")
    flat: Flat = {}
    for name, table in field_tables().items():
        if name in _MAKERS:
            given = _MAKERS[name](network, state, context)
        elif table.type == "object" and not name.startswith("basis") and name != "stations.companion":
            given = {}
        else:
            continue
        if given is None:  # a table that this network has no numbers for
            continue
        flat[name] = given if table.type != "object" else _completed(network, table.fields, given)
    flat.update(basis_tables(network, context, flat))
    return {name: flat[name] for name in field_tables() if name in flat}


def _completed(network: Network, fields: tuple[Field, ...], given: Mapping[str, Any]) -> dict[str, Any]:
    """Values given, and for the other fields what the network holds under their attribute."""
    return {row.name: given[row.name] if row.name in given else _held(network, row) for row in fields}


def _held(network: Network, row: Field) -> Any:
    """Value of the network's attribute, texts as a list."""
    holder, name = row.attribute.split(".")
    value = getattr(getattr(network, holder), name)
    if not isinstance(value, np.ndarray):
        return value
    if row.type == "number":
        return _without_negative_zeros(np.ascontiguousarray(value))
    return value.tolist() if value.dtype == object else np.ascontiguousarray(value)


def _without_negative_zeros(values: np.ndarray[Any, Any]) -> np.ndarray[Any, Any]:
    """The same numbers, and the same array where none is a negative zero."""
    if values.dtype == np.float64 and not (values.view(np.int64) == np.iinfo(np.int64).min).any():
        return values
    return values + 0.0


def _named(codes: np.ndarray[Any, Any], names: tuple[str, ...]) -> list[str]:
    """Names of codes."""
    return np.array(names, dtype=object)[codes].tolist()  # type: ignore[no-any-return]


def _root(network: Network, state: SteadyState, context: ExportContext) -> Flat:
    """What kind of file it is, about whom and for what."""
    return {
        "format": "geomprep network",
        "format_version": "1.0",
        "name": context.name,
        "subject": context.subject,
        "question": context.question,
        "cautions": [*CAUTIONS, *(text for text in context.cautions if text not in CAUTIONS)],
    }


def _conventions(network: Network, state: SteadyState, context: ExportContext) -> Flat:
    """Fixed sentences, and frame, posture, gravity of the case."""
    own = {key: getattr(context, key) for key in ("frame", "posture", "reference_height")}
    start = network.cuts.convention if network.cuts is not None else "node"
    return {
        **own,
        "vessels_start_at": start,
        "gravity": np.asarray(context.gravity, dtype=np.float64) + 0.0,
        **CONVENTIONS,
    }


def _blood(network: Network, state: SteadyState, context: ExportContext) -> Flat:
    """Blood with the two factors that follow from its profile."""
    blood = _table(network.blood)
    profile = blood["velocity_profile"]
    friction = 2.0 * (profile + 2.0)
    return {**blood, "momentum_factor": momentum_factor(profile), "friction_factor": friction}


def _tube_laws(network: Network, state: SteadyState, context: ExportContext) -> list[Flat]:
    """Laws in use."""
    return [_table(law) for law in _walls(network).laws]


def _nodes(network: Network, state: SteadyState, context: ExportContext) -> Flat:
    """Roles by name."""
    return {"role": _named(network.nodes.role, NODE_ROLES)}


def _segments(network: Network, state: SteadyState, context: ExportContext) -> Flat:
    """Classes and laws by name."""
    walls = _walls(network)
    return {
        "vessel_class": _named(network.segments.vessel_class, VESSEL_CLASSES),
        "tube_law": _named(walls.law, tuple(law.id for law in walls.laws)),
    }


def _zones(network: Network, state: SteadyState, context: ExportContext) -> Flat:
    """What was cut off; nothing where no stage has cut."""
    if network.cuts is not None:
        return {"kind": _named(network.cuts.link, ("vessel", "link"))}
    none = np.zeros(len(network.segments))
    kind = ["vessel"] * len(network.segments)
    return {"cut_at_from": none, "cut_at_to": none, "share_inside": none, "kind": kind}


def _profile(network: Network, state: SteadyState, context: ExportContext) -> Flat | None:
    """Forms by name."""
    return None if network.profiles is None else {"kind": _named(network.profiles.kind, PROFILE_KINDS)}


def _resolution(network: Network, state: SteadyState, context: ExportContext) -> Flat | None:
    """Levels by name."""
    return None if network.resolution is None else {"level": _named(network.resolution.level, RESOLUTION_LEVELS)}


def _junctions(network: Network, state: SteadyState, context: ExportContext) -> Flat:
    """Ends by name."""
    return {} if network.junctions is None else {"end": _named(network.junctions.end, _END_NAMES)}


def _steady_check(network: Network, state: SteadyState, context: ExportContext) -> Flat:
    """The steady state with its equations."""
    return {
        "equations": EQUATIONS,
        "tolerance": TOLERANCE,
        "pressure": state.pressure + 0.0,
        "flow": state.flow + 0.0,
        "inlet_flow": state.inlet_flow + 0.0,
        "outlet_flow": state.outlet_flow + 0.0,
    }


def _inputs(network: Network, state: SteadyState, context: ExportContext) -> list[Flat]:
    """Files read, by name alone."""
    return [{**dataclasses.asdict(row), "name": PurePath(row.name).name} for row in context.inputs]


def _sources(network: Network, state: SteadyState, context: ExportContext) -> list[Flat]:
    """Literature rows, the five columns of the format, by key."""
    names = [row.name for row in field_tables()["sources"].fields]
    rows = {str(row["key"]): {name: str(row[name]) for name in names} for row in context.sources}
    return [rows[key] for key in sorted(rows)]


def _walls(network: Network) -> Walls:
    """Walls, which :func:`filled_tables` has made sure of."""
    if network.walls is None:
        raise InputError("the network has no walls yet: assign walls before exporting")
    return network.walls


def _table(record: Any) -> Flat:
    """Fields of a small record."""
    return {name: getattr(record, name) for name in _names(record.__class__)}


@cache
def _names(kind: type[Any]) -> tuple[str, ...]:
    """Names of the fields of a kind of record; there may be thousands of one kind."""
    return tuple(item.name for item in dataclasses.fields(kind))


_MAKERS: dict[str, Callable[[Network, SteadyState, ExportContext], Any]] = {
    "": _root,
    "producer": lambda network, state, context: {"name": "geomprep", "version": context.version},
    "units": lambda network, state, context: {kind.replace(" ", "_"): code for kind, code in UCUM.items()},
    "conventions": _conventions,
    "imaging_state": lambda network, state, context: _table(context.imaging_state),
    "blood": _blood,
    "surroundings": lambda network, state, context: [_table(row) for row in network.surroundings or ()],
    "tube_laws": _tube_laws,
    "nodes": _nodes,
    "segments": _segments,
    "segments.zones": _zones,
    "segments.profile": _profile,
    "segments.bending": lambda network, state, context: None if network.bending is None else {},
    "segments.resolution": _resolution,
    "segments.intervals": lambda network, state, context: None if network.intervals is None else {},
    "segments.lumped": lambda network, state, context: {"at_state": IMAGED},
    "junctions": _junctions,
    "narrowings": lambda network, state, context: (
        None if network.narrowings is None else [_table(row) for row in network.narrowings]
    ),
    "inlets": lambda network, state, context: [_table(row) for row in network.inlets or ()],
    "outlets": lambda network, state, context: [_table(row) for row in network.outlets or ()],
    "steady_check": _steady_check,
    "findings": lambda network, state, context: [_table(row) for row in context.findings],
    "repairs": lambda network, state, context: [_table(row) for row in context.repairs],
    "decisions": lambda network, state, context: [_table(row) for row in context.decisions],
    "sources": _sources,
    "provenance": lambda network, state, context: {"case_sha256": context.case_sha256, "steps": list(context.steps)},
    "provenance.inputs": _inputs,
    "provenance.settings": lambda network, state, context: [_table(row) for row in context.settings],
}
"""Table -> what is not simply an attribute of the network."""
