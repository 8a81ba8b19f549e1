"""Reading a network file back for a comparison: valid files of this format only."""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from geomprep.errors import NetworkFileError
from geomprep.export.companion import read_companion
from geomprep.export.decode import decoded, structured
from geomprep.export.validate import document_faults
from geomprep.measure.comparison import Vessels
from geomprep.measure.route_resistance import Routes
from geomprep.model import VESSEL_CLASSES, IntArray, Stations, field, texts

__all__ = ["ReadNetwork", "network_path", "read_network"]


@dataclass(frozen=True, eq=False)
class ReadNetwork:
    """A network as its file says.

    Attributes
    ----------
    file : str
        As the person named it, completed where that was a folder.
    tables : mapping
        Tables of the file by dotted name; columns of numbers are arrays.
    vessels : Vessels
    routes : Routes
    """

    file: str
    tables: Mapping[str, Any]
    vessels: Vessels
    routes: Routes

    @property
    def segment_ids(self) -> list[str]:
        """Ids of the segments."""
        return list(self.tables["segments"]["id"])


def network_path(given: str | os.PathLike[str]) -> Path:
    """Return the network file that a person means: the file itself, or the one in a folder of results or of a case.

    Parameters
    ----------
    given : path

    Raises
    ------
    NetworkFileError
        A folder holds none.

    Examples
    --------
    >>> network_path("before/network.json").name
    'network.json'
    """
    path = Path(given)
    if not path.is_dir():
        return path
    for candidate in (path / "network.json", path / "results" / "network.json"):
        if candidate.is_file():
            return candidate
    raise NetworkFileError(f"{path}: holds no network.json; build the case first, or name the file")


def read_network(given: str | os.PathLike[str]) -> ReadNetwork:
    """Read and validate a network file.

    Parameters
    ----------
    given : path
        The file, or a folder that holds it.

    Returns
    -------
    ReadNetwork

    Raises
    ------
    NetworkFileError
        There is none, it is of another version of the format, or it is not valid.

    Examples
    --------
    >>> read_network("no-such-network.json")
    Traceback (most recent call last):
    geomprep.errors.NetworkFileError: no-such-network.json: cannot be read (No such file or directory)
    """
    path = network_path(given)
    try:
        value, faults = decoded(path.read_bytes())
    except OSError as fault:
        raise NetworkFileError(f"{path}: cannot be read ({fault.strerror}); check name and folder") from fault
    if faults:
        raise NetworkFileError(f"{path}: {faults[0]}; give a network file written by 'geomprep build'")
    _check_format(path, value)
    found, _ = document_faults(value, path.parent)
    if found:
        more = f" and {len(found) - 1} more fault(s)" if len(found) > 1 else ""
        raise NetworkFileError(f"{path}: not valid ({found[0]}){more}; 'geomprep validate {path}' lists all")
    return _network(path, value)


def _check_format(path: Path, value: Any) -> None:
    """Refuse what is no network file, or one of another version."""
    for key in ("format", "format_version"):
        (needed,) = field(key).choices
        said = value.get(key) if isinstance(value, dict) else None
        if said != needed:
            shown = "missing" if said is None else f"'{str(said)[:40]}'"
            raise NetworkFileError(
                f"{path}: {key} is {shown}, '{needed}' is needed; build it again with this version of geomprep"
            )


def _network(path: Path, value: Any) -> ReadNetwork:
    """Vessels and routes of a valid file."""
    tables, _ = structured(value)
    segments, stations = tables["segments"], tables["stations"]
    if "stations.companion" in tables:
        stations = {**stations, **read_companion(path.parent, tables["stations.companion"])}
    names = texts("name", np.array(segments["name"], dtype=object))
    ends = np.asarray(segments["from_node"], dtype=np.int64), np.asarray(segments["to_node"], dtype=np.int64)
    vessels = Vessels(
        stations=Stations(
            offsets=stations["offsets"],
            distance=stations["distance"],
            position=stations["position"],
            radius=stations["radius"],
            basis=np.zeros(len(stations["distance"]), np.uint8),
        ),
        from_node=ends[0],
        to_node=ends[1],
        name=names,
        vessel_class=np.array([VESSEL_CLASSES.index(word) for word in segments["vessel_class"]], dtype=np.uint8),
    )
    inlets = _nodes(tables["inlets"])
    routes = Routes(
        n_nodes=len(tables["nodes"]["id"]),
        from_node=ends[0],
        to_node=ends[1],
        resistance=np.asarray(tables["segments.lumped"]["resistance"], dtype=np.float64),
        inlets=inlets,
        outlets=np.setdiff1d(_nodes(tables["outlets"]), inlets),
    )
    return ReadNetwork(str(path), tables, vessels, routes)


def _nodes(records: list[dict[str, Any]]) -> IntArray:
    """Nodes of inlets or outlets, each once."""
    return np.unique(np.array([record["node"] for record in records], dtype=np.int64))
