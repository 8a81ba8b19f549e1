"""Validate a network file by itself: structure, ranges, meaning, the steady check solved again."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Final

import numpy as np

from geomprep.errors import NetworkFileError
from geomprep.export.checks.basis import basis_faults
from geomprep.export.checks.ends import end_faults
from geomprep.export.checks.faults import Fault
from geomprep.export.checks.geometry import height_faults, junction_area_faults, measure_faults
from geomprep.export.checks.meaning import (
    identity_faults,
    incidence_faults,
    reference_faults,
    station_faults,
)
from geomprep.export.checks.ranges import length_faults, range_faults
from geomprep.export.checks.schema import schema_faults
from geomprep.export.checks.steady import lumped_faults, steady_faults
from geomprep.export.checks.walls import wall_faults
from geomprep.export.companion import read_companion
from geomprep.export.decode import decoded, structured

__all__ = ["SMALL_FILE", "ValidationReport", "document_faults", "validate_network"]

Check = Callable[[Mapping[str, Any]], Iterator[Fault]]

SMALL_FILE: Final = 1_000_000
"""Bytes up to which a file that passes is held against the JSON Schema too."""

# each round rests on what the rounds before it have made sure of
_ROUNDS: Final[tuple[tuple[Check, ...], ...]] = (
    (length_faults, range_faults),
    (identity_faults, reference_faults),
    (incidence_faults, end_faults, height_faults, station_faults),
    (measure_faults, junction_area_faults, wall_faults, lumped_faults, basis_faults),
    (steady_faults,),
)


@dataclass(frozen=True)
class ValidationReport:
    """What validation found.

    Attributes
    ----------
    faults : tuple of Fault
        Empty for a valid file.
    said : str
        What the file holds, in one line.
    """

    faults: tuple[Fault, ...]
    said: str

    @property
    def valid(self) -> bool:
        """True where there is no fault."""
        return not self.faults


def validate_network(path: str | os.PathLike[str]) -> ValidationReport:
    """Validate a network file and its companion.

    Parameters
    ----------
    path : path
        The JSON file; a companion lies beside it.

    Returns
    -------
    ValidationReport

    Raises
    ------
    NetworkFileError
        The file cannot be read at all.

    Examples
    --------
    >>> validate_network("no-such-network.json")
    Traceback (most recent call last):
    geomprep.errors.NetworkFileError: no-such-network.json: cannot be read (No such file or directory)
    """
    file = Path(path)
    try:
        data = file.read_bytes()
    except OSError as fault:
        raise NetworkFileError(f"{file}: cannot be read ({fault.strerror}); check name and folder") from fault
    value, faults = decoded(data)
    if faults:
        return ValidationReport(tuple(faults), "")
    found, said = document_faults(value, file.parent)
    if not found and len(data) <= SMALL_FILE:
        found = tuple(schema_faults(value))
    return ValidationReport(found, said if not found else "")


def document_faults(value: Any, folder: Path) -> tuple[tuple[Fault, ...], str]:
    """Find the faults of a decoded network file.

    Parameters
    ----------
    value : object
        Decoded JSON.
    folder : Path
        Where a companion lies.

    Returns
    -------
    faults : tuple of Fault
        Of the first round of checks that finds any: later rounds rest on earlier ones.
    said : str
        What the file holds.
    """
    flat, faults = structured(value)
    if faults:
        return tuple(faults), ""
    if "stations.companion" in flat:
        try:
            flat["stations"] = {**flat["stations"], **read_companion(folder, flat["stations.companion"])}
        except NetworkFileError as fault:
            return (Fault("companion", "stations.companion", str(fault)),), ""
    for checks in _ROUNDS:
        with np.errstate(all="ignore"):  # numbers of a broken file may overflow; what is not finite fails its check
            found = tuple(fault for check in checks for fault in check(flat))
        if found:
            return found, ""
    return (), _said(flat)


def _said(flat: Mapping[str, Any]) -> str:
    """Sizes of a valid file."""
    return (
        f"{len(flat['nodes']['id'])} nodes, {len(flat['segments']['id'])} segments, "
        f"{len(flat['stations']['distance'])} stations; its steady check was solved again"
    )
