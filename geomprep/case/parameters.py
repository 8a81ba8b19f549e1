"""The second half of a build: everything that a network carries besides its shape."""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass
from typing import TypeVar

from geomprep.assign import (
    BloodSettings,
    CalibrationSettings,
    Gravity,
    ImagingPressures,
    ImagingResult,
    InletSettings,
    OutletSettings,
    SurroundingsSettings,
    WallSettings,
    assign_blood,
    assign_inlets,
    assign_outlets,
    assign_walls,
    gravity,
    heights,
    imaged_wave_speed,
    imaging_transmural,
    lump,
    station_surroundings,
    surroundings_at_imaging,
    with_heights,
)
from geomprep.case.geometry import Drawn
from geomprep.case.sections import Case
from geomprep.findings import Finding
from geomprep.model import FloatArray, Network, Origin

__all__ = ["Assigned", "assign_parameters"]

Settings = TypeVar("Settings")


@dataclass(frozen=True, eq=False)
class Assigned:
    """A network with every table filled.

    Attributes
    ----------
    network : Network
    field : Gravity
        Gravity in the posture of the model.
    transmural_from : str
        Where the transmural pressure at imaging comes from, in words.
    station_height : (k,) float array
        Metres, in the posture of the model.
    findings : tuple of Finding
    """

    network: Network
    field: Gravity
    transmural_from: str
    station_height: FloatArray
    findings: tuple[Finding, ...]


def assign_parameters(case: Case, drawn: Drawn) -> Assigned:
    """Give a drawn network blood, surroundings, walls, ends and lumped values.

    Parameters
    ----------
    case : Case
    drawn : Drawn

    Returns
    -------
    Assigned

    Raises
    ------
    OpenQuestions, CaseError, ModelError
        What is missing, contradicts itself, or cannot carry the flow.
    """
    findings: list[Finding] = []
    blood, blood_origins = assign_blood(BloodSettings(**dataclasses.asdict(case.blood)))
    network = _with(drawn.network, blood_origins, blood=blood)
    inlets, inlet_origins, seen = assign_inlets(drawn.ends, _settings(case.inlets, InletSettings))
    findings += seen
    network = _with(network, inlet_origins, inlets=inlets)
    network, imaged = _walls(case, drawn, network, findings)
    field = gravity(case.inputs[0].frame, _model_posture(case))
    findings += field.findings
    network = with_heights(network, field)
    result = assign_outlets(
        network,
        drawn.ends,
        _settings(case.outlets, OutletSettings),
        _calibration(case),
        imaged_wave_speed(network),
    )
    findings += result.findings
    network = _with(network, result.origins, outlets=result.outlets)
    return Assigned(network, field, imaged.described, heights(field, network.stations.position), tuple(findings))


def _walls(case: Case, drawn: Drawn, network: Network, findings: list[Finding]) -> tuple[Network, ImagingResult]:
    """Surroundings, pressure at imaging, tube laws and lumped values, in the posture of the image."""
    field = gravity(case.inputs[0].frame, _imaged_posture(case))
    at_imaging = with_heights(network, field)
    stated = {name: _one(section, SurroundingsSettings) for name, section in case.surroundings.items()}
    while_imaged, seen = surroundings_at_imaging(stated, case.imaging_state.intracranial_pressure)
    findings += seen
    outside = station_surroundings(network, stated, field)
    pressing = outside if while_imaged == stated else station_surroundings(network, while_imaged, field)
    imaged = imaging_transmural(
        at_imaging,
        drawn.ends,
        _settings(case.outlets, OutletSettings),
        ImagingPressures(case.imaging_state.venous_pressure, case.imaging_state.arterial_pressure),
        field,
        pressing.external_pressure,
        _calibration(case),
    )
    settings = {name: _one(section, WallSettings) for name, section in case.walls.items()}
    walls, wall_origins, seen = assign_walls(network, settings, imaged.transmural, outside.index)
    findings += [*outside.findings, *seen]
    network = _with(network, outside.origins, surroundings=outside.surroundings)
    network = _with(network, (*wall_origins, *imaged.origins), walls=walls)
    lumped, lumped_origins = lump(network)
    return _with(network, lumped_origins, lumped=lumped), imaged


def _calibration(case: Case) -> CalibrationSettings | None:
    """Settings of the calibration; a far pressure that nobody stated is left to its stage."""
    if case.calibration is None:
        return None
    settings = CalibrationSettings(**dataclasses.asdict(case.calibration))
    stated = "calibration.far_pressure" in case.stated
    return settings if stated else dataclasses.replace(settings, far_pressure=None)


def _with(network: Network, origins: tuple[Origin, ...], **tables: object) -> Network:
    """The network with tables and their origins added."""
    return dataclasses.replace(network, origins=(*network.origins, *origins), **tables)  # type: ignore[arg-type]


def _one(section: object, kind: type[Settings]) -> Settings:
    """A section of the case as the settings of its stage; both have the same fields."""
    fields = {field.name for field in dataclasses.fields(kind)}  # type: ignore[arg-type]
    return kind(**{name: value for name, value in vars(section).items() if name in fields})


def _settings(sections: tuple[object, ...], kind: type[Settings]) -> list[Settings]:
    """Sections of the case as settings of their stage."""
    return [_one(section, kind) for section in sections]


def _imaged_posture(case: Case) -> str | None:
    """Posture at imaging; that of the model where none is stated."""
    return case.case.imaged_in or case.case.model_as


def _model_posture(case: Case) -> str | None:
    """Posture that the model stands for; that of the image where none is stated."""
    return case.case.model_as or case.case.imaged_in
