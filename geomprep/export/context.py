"""What a network file says beside the network: who asks what, from which files, with which choices."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

from geomprep.errors import InputError
from geomprep.findings import Finding
from geomprep.model import Decision, IntArray, Repair

__all__ = ["ExportContext", "ImagingState", "InputRecord", "SettingRecord"]


@dataclass(frozen=True)
class InputRecord:
    """One file that was read.

    Attributes
    ----------
    name : str
        File name without its folder, so that a result does not depend on where it was made.
    sha256 : str
        64 hexadecimal digits.
    length_unit, size_array, size_means, frame : str
        As the case states them; `frame` is ``unknown`` where nobody said.
    points, lines : int
    """

    name: str
    sha256: str
    length_unit: str
    size_array: str
    size_means: str
    frame: str
    points: int
    lines: int


@dataclass(frozen=True)
class SettingRecord:
    """One setting of a repair step, its value as JSON text."""

    step: str
    key: str
    value: str


@dataclass(frozen=True)
class ImagingState:
    """What pressed on the walls when the image was taken; pressures in Pa, None where not used."""

    posture: str
    transmural_from: str
    cardiac_phase: str | None = None
    venous_pressure: float | None = None
    arterial_pressure: float | None = None
    intracranial_pressure: float | None = None
    right_atrial_pressure: float | None = None


@dataclass(frozen=True)
class ExportContext:
    """Everything in a network file that is not the network itself.

    Attributes
    ----------
    name, subject, question : str
    version : str
        Version of geomprep.
    inputs : tuple of InputRecord
        In the order of ``segments.input_id``.
    imaging_state : ImagingState
    posture : str
        Posture that the model stands for.
    frame : str
        ``LPS``, ``RAS`` …, or ``unknown``.
    gravity : tuple of float
        m/s² in that frame; zeros where no gravity is modelled.
    reference_height : str
        Plane from which heights are counted.
    case_sha256 : str, optional
    cautions : tuple of str
        Beside those that every file carries.
    findings : tuple of Finding
    repairs : tuple of Repair
    decisions : tuple of Decision
    settings : tuple of SettingRecord
        Of every repair step.
    sources : tuple of mapping
        Literature rows in use, each with key, citation, doi, place and checked.
    steps : tuple of str
        What was done, one sentence each, in order.
    station_repair : (k,) int array, optional
        Row in `repairs` that made the radius of each station, −1 for none.
    """

    name: str
    subject: str
    question: str
    version: str
    inputs: tuple[InputRecord, ...]
    imaging_state: ImagingState
    posture: str
    frame: str = "unknown"
    gravity: tuple[float, float, float] = (0.0, 0.0, 0.0)
    reference_height: str = "none: no gravity is modelled"
    case_sha256: str | None = None
    cautions: tuple[str, ...] = ()
    findings: tuple[Finding, ...] = ()
    repairs: tuple[Repair, ...] = ()
    decisions: tuple[Decision, ...] = ()
    settings: tuple[SettingRecord, ...] = ()
    sources: tuple[Mapping[str, object], ...] = ()
    steps: tuple[str, ...] = ()
    station_repair: IntArray | None = field(default=None, repr=False)

    def __post_init__(self) -> None:
        """Refuse sources and stations that point nowhere."""
        for row in self.sources:
            missing = [key for key in ("key", "citation", "doi", "place", "checked") if key not in row]
            if missing:
                raise InputError(f"source {row.get('key', row)}: {', '.join(missing)} missing")
        if self.station_repair is not None and np.any(np.asarray(self.station_repair) >= len(self.repairs)):
            raise InputError(f"station_repair names a repair beyond the {len(self.repairs)} given")
