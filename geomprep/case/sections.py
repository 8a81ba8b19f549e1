"""The sections of a case file as frozen records, quantities in SI."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from geomprep.files.statement import InputStatement

__all__ = [
    "AnatomySection",
    "BloodSection",
    "CalibrationSection",
    "Case",
    "CaseSection",
    "ImagingStateSection",
    "InletSection",
    "InputStatement",
    "JoinSection",
    "OutletSection",
    "RadiusSection",
    "ReplaySection",
    "SegmentsSection",
    "StationSpacing",
    "SurroundingsSection",
    "WallsSection",
]


@dataclass(frozen=True)
class CaseSection:
    """``[case]``: names, the question and the postures."""

    name: str | None = None
    subject: str | None = None
    question: str | None = None
    imaged_in: str | None = None
    model_as: str | None = None


@dataclass(frozen=True)
class ImagingStateSection:
    """``[imaging_state]``: pressures while imaged, Pa; no venous pressure = from a steady solve."""

    venous_pressure: float | None = None
    arterial_pressure: float | None = None
    intracranial_pressure: float | None = None
    right_atrial_pressure: float | None = None


@dataclass(frozen=True)
class JoinSection:
    """``[repair.join]``: parts of the local radius; None leaves the default of the step."""

    tolerance: float | None = None
    copies_within: float | None = None
    joints_within: float | None = None


@dataclass(frozen=True)
class RadiusSection:
    """``[repair.radius]``: None leaves the default of the step."""

    use: bool | None = None
    spike_ratio: float | None = None
    end_ratio: float | None = None


@dataclass(frozen=True)
class ReplaySection:
    """``[repair.replay]``: a network file whose verdicts and settings hold, relative to the folder of the case."""

    network: str | None = None


@dataclass(frozen=True)
class StationSpacing:
    """Distance between stations: a part of the local radius, or a length in metres."""

    of_radius: float | None = None
    length: float | None = None


@dataclass(frozen=True)
class SegmentsSection:
    """``[segments]``: no spacing = stations as drawn."""

    station_spacing: StationSpacing | None = None
    vessels_start_at: str = "lumen exit"


@dataclass(frozen=True)
class AnatomySection:
    """``[anatomy]``: a file of names and places, relative to the folder of the case."""

    names: str | None = None


@dataclass(frozen=True)
class WallsSection:
    """``[walls.<class or vessel>]``: wall law constants, SI."""

    stiffness: str | None = None
    wave_speed: float | None = None
    young_modulus: float | None = None
    wall_thickness: float | None = None
    poisson_ratio: float | None = None
    reference_state: str | None = None


@dataclass(frozen=True)
class BloodSection:
    """``[blood]``: None takes the published value."""

    density: float | None = None
    viscosity: float | None = None
    velocity_profile: float | None = None


@dataclass(frozen=True)
class SurroundingsSection:
    """``[surroundings.<id>]``: Pa, m, kg/m³; no fluid density = the same pressure everywhere."""

    pressure: float
    reference_height: float = 0.0
    fluid_density: float | None = None
    vessels: tuple[str, ...] = ("all",)


@dataclass(frozen=True)
class InletSection:
    """``[[inlets]]``: one of mean flow (m³/s) and pressure (Pa)."""

    at: str
    mean_flow: float | None = None
    pressure: float | None = None


@dataclass(frozen=True)
class OutletSection:
    """``[[outlets]]``: the model at an open end and its values, SI; None = from calibration."""

    at: str
    model: str | None = None
    pressure: float | None = None
    far_pressure: float | None = None
    resistance: float | None = None
    characteristic_resistance: float | None = None
    peripheral_resistance: float | None = None
    compliance: float | None = None
    mean_flow: float | None = None
    share: float | None = None


@dataclass(frozen=True)
class CalibrationSection:
    """``[calibration]``: what the outlets are set to give together, SI.

    `exponent` is a number, or the key of a literature row as text.
    """

    total_flow: float | None = None
    mean_pressure: float | None = None
    split: str | None = None
    exponent: float | str | None = None
    far_pressure: float = 0.0
    model: str | None = None
    compliance: float | None = None
    time_constant: float | None = None


@dataclass(frozen=True)
class Case:
    """Everything a case file says.

    Attributes
    ----------
    file : str
        Name of the case file.
    folder : pathlib.Path
        Folder of the case file; paths in it are relative to here.
    sha256 : str
        Hash of the bytes of the case file.
    stated : frozenset of str
        Paths of the keys that a person stated, such as ``blood.viscosity`` and
        ``outlets[0].pressure``: their basis is ``user``.
    steps : dict of str to settings
        Settings of every step of :data:`geomprep.repair.STEPS`, by its name.
    """

    file: str
    folder: Path
    sha256: str
    case: CaseSection
    inputs: tuple[InputStatement, ...]
    imaging_state: ImagingStateSection
    join: JoinSection
    radius: RadiusSection
    steps: dict[str, Any]
    replay: ReplaySection
    segments: SegmentsSection
    anatomy: AnatomySection
    walls: dict[str, WallsSection]
    blood: BloodSection
    surroundings: dict[str, SurroundingsSection]
    inlets: tuple[InletSection, ...]
    outlets: tuple[OutletSection, ...]
    calibration: CalibrationSection | None
    stated: frozenset[str] = field(default=frozenset(), repr=False)

    @property
    def name(self) -> str:
        """Name of the case; the stem of its file where none is stated."""
        return self.case.name or Path(self.file).stem
