"""The first half of a build: from files to an oriented, named, measured network."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

from geomprep.anatomy import NamedPoint, name_segments, read_names
from geomprep.assign import Ends, coordinates, resolve_ends
from geomprep.case.image_areas import with_image_areas
from geomprep.case.replay import RepairRules, repair_rules
from geomprep.case.sections import Case
from geomprep.errors import CaseError, OpenQuestions, Question
from geomprep.export import InputRecord, SettingRecord
from geomprep.files import FileContents, read_files
from geomprep.files.meaning import to_centrelines
from geomprep.findings import Finding
from geomprep.measure import (
    Convention,
    ZoneSettings,
    describe,
    junction_zones,
    junctions,
    measure_segments,
    trimmed,
    zone_findings,
)
from geomprep.model import BoolArray, Centrelines, FloatArray, Network, Repair, concatenate
from geomprep.repair import OPEN, Given, StepResult, join, mend_graph, mend_radii
from geomprep.segments import leave_out_unreached, order_segments, orient, resample, split
from geomprep.units import length_factor

__all__ = ["Drawn", "draw_network", "draw_repairs"]

_MOST_OVERLAPS = 20_000
"""Segments up to which the volumes that vessels share at junctions are measured; beyond, that takes minutes."""

Progress = Callable[[str, float], None]


@dataclass(frozen=True, eq=False)
class Drawn:
    """A network of geometry alone, with the record of how it was drawn.

    Attributes
    ----------
    network : Network
        Oriented, named, ordered, measured; no parameters yet.
    ends : Ends
        Which open ends are inlets and outlets.
    inputs : tuple of InputRecord
        What was read, in the order of the case.
    findings : tuple of Finding
    repairs : tuple of Repair
    settings : tuple of SettingRecord
        Of every repair step.
    """

    network: Network
    ends: Ends
    inputs: tuple[InputRecord, ...]
    findings: tuple[Finding, ...]
    repairs: tuple[Repair, ...]
    settings: tuple[SettingRecord, ...]


@dataclass(frozen=True, eq=False)
class _Cut:
    """A network fresh from its graph; points and graph are given back to the machine by then."""

    network: Network
    raw_points: npt.NDArray[Any]
    inputs: tuple[InputRecord, ...]
    findings: tuple[Finding, ...]
    repairs: tuple[Repair, ...]
    settings: tuple[SettingRecord, ...]


def draw_network(case: Case, progress: Progress) -> Drawn:
    """Read, join, split, name, orient and measure.

    Parameters
    ----------
    case : Case
    progress : callable
        Called with the stage and the part done, 0 to 1.

    Returns
    -------
    Drawn

    Raises
    ------
    FileError
        A file cannot be read or holds no vessels.
    OpenQuestions
        All that the case leaves open about all its files.
    CaseError
        Inputs state different frames, or an end cannot be found.
    """
    cut = _cut(case, progress)
    try:
        return _with_ends(case, cut, progress)
    except CaseError as fault:
        asked = sum(repair.verdict_by == OPEN for repair in cut.repairs)
        if not asked:
            raise
        hint = (
            f"{asked} decision(s) on repairs are open and may be why: 'geomprep decide {case.file} --list' shows them"
        )
        raise CaseError(f"{fault} ({hint})") from fault


def draw_repairs(case: Case) -> tuple[Repair, ...]:
    """Repairs of the lines of a case, whether or not inlets and outlets can be found yet.

    Parameters
    ----------
    case : Case

    Raises
    ------
    FileError, OpenQuestions, CaseError
        As :func:`draw_network`, but for the ends.
    """
    return _joined(case, repair_rules(case), lambda stage, part: None)[0].repairs


def _with_ends(case: Case, cut: _Cut, progress: Progress) -> Drawn:
    """Name, orient and measure a network fresh from its graph."""
    named = name_segments(cut.network, _names(case))
    ends = resolve_ends(named.network, case.inlets, case.outlets, _metres_per_unit(case))
    reached = leave_out_unreached(named.network, ends.inlet_nodes, cut.raw_points)
    if reached.repairs:
        ends = resolve_ends(reached.network, case.inlets, case.outlets, _metres_per_unit(case))
    progress("orient", 0.6)
    network = orient(ends.network, ends.inlet_nodes, ends.outlet_nodes)
    ordered = order_segments(network, ends.inlet_nodes, ends.outlet_nodes)
    progress("measure", 0.65)
    network, zones = _trimmed(case, ordered.network)
    network = junctions(measure_segments(network))
    network, quality = describe(network, _voxel(case))
    findings = (*cut.findings, *named.findings, *ends.findings, *ordered.findings, *zones, *quality)
    return Drawn(network, ends, cut.inputs, findings, (*cut.repairs, *reached.repairs), cut.settings)


def _trimmed(case: Case, network: Network) -> tuple[Network, tuple[Finding, ...]]:
    """Take off what lies inside parents, by the convention of the case."""
    convention = Convention[case.segments.vessels_start_at.upper().replace(" ", "_")]
    few = len(network.segments) <= _MOST_OVERLAPS
    zones = junction_zones(network, ZoneSettings(convention, change_points=False, volumes=few))
    return trimmed(network, zones), zone_findings(zones, network.segments.id.tolist())


def _cut(case: Case, progress: Progress) -> _Cut:
    """Join the lines of all files and cut the graph into segments."""
    rules = repair_rules(case)
    joined, records, seen = _joined(case, rules, progress)
    progress("split", 0.5)
    network, measured = with_image_areas(case, _resampled(case, split(joined.graph)))
    unknown = rules.verdicts.unknown(repair.id for repair in joined.repairs)
    return _Cut(
        network,
        joined.graph.raw_points,
        records,
        (*seen, *joined.findings, *unknown, *measured),
        joined.repairs,
        rules.records,
    )


def _joined(
    case: Case, rules: RepairRules, progress: Progress
) -> tuple[StepResult, tuple[InputRecord, ...], tuple[Finding, ...]]:
    """Read all files of a case, give their numbers a meaning, join their lines."""
    progress("read", 0.05)
    contents = read_files([case.folder / statement.file for statement in case.inputs])
    records = _input_records(case, contents)
    centrelines, findings = _centrelines(case, contents)
    del contents
    progress("join", 0.3)
    centrelines, radius_repairs = _mended(centrelines, rules)
    joined = join(centrelines, rules.settings["join"], rules.verdicts)
    del centrelines
    progress("repair", 0.45)
    # those of joining first: raw points that it dropped name its repairs by their number
    before, seen = (*joined.repairs, *radius_repairs), joined.findings
    graph = replace(joined.graph, protected=joined.graph.protected | _named_points(case, joined.graph.points))
    del joined
    whole = mend_graph(graph, rules.settings, Given(rules.verdicts, _voxel(case)), before)
    return replace(whole, findings=(*seen, *whole.findings)), records, findings


def _mended(centrelines: Centrelines, rules: RepairRules) -> tuple[Centrelines, tuple[Repair, ...]]:
    """Centrelines with their radii mended, and the record of it."""
    mended = mend_radii(centrelines, rules.settings["radius"], rules.verdicts)
    return mended.centrelines, mended.repairs


def _voxel(case: Case) -> float | None:
    """Largest voxel edge that the case states."""
    edges = [edge for statement in case.inputs for edge in statement.voxel or ()]
    return max(edges, default=None)


def _centrelines(case: Case, contents: list[FileContents]) -> tuple[Centrelines, tuple[Finding, ...]]:
    """Lines of all files in SI, or every open question about every file at once."""
    frames = {statement.frame for statement in case.inputs}
    if len(frames) > 1:
        shown = ", ".join(sorted(str(frame) for frame in frames))
        raise CaseError(f"{case.file}: inputs state different frames ({shown}); bring them into one frame first")
    posture = case.case.model_as or case.case.imaged_in
    parts: list[Centrelines] = []
    findings: list[Finding] = []
    questions: list[Question] = []
    for number, (content, statement) in enumerate(zip(contents, case.inputs, strict=True)):
        findings += content.findings
        try:
            lines, seen = to_centrelines(content, statement, key=f"input[{number}]", posture=posture, number=number)
        except OpenQuestions as left:
            questions += left.questions
        else:
            parts.append(lines)
            findings += seen
    if questions:
        raise OpenQuestions(questions)
    return concatenate(parts), tuple(findings)


def _input_records(case: Case, contents: list[FileContents]) -> tuple[InputRecord, ...]:
    """One record per file, without its folder."""
    return tuple(
        InputRecord(
            name=Path(statement.file).name,
            sha256=content.sha256,
            length_unit=statement.length_unit or "",
            size_array=statement.size_array or "the only array of sizes",
            size_means=statement.size_means or "",
            frame=statement.frame or "unknown",
            points=content.n_points,
            lines=content.n_lines,
        )
        for statement, content in zip(case.inputs, contents, strict=True)
    )


def _named_points(case: Case, points: FloatArray) -> BoolArray:
    """Points that stand nearest to a name or to a place of an inlet or outlet: repairs leave their vessels alone."""
    factor = _metres_per_unit(case)
    places = [point.position for point in _names(case)]
    at = [end.at for end in case.inlets] + [end.at for end in case.outlets]
    places += [tuple(place.tolist()) for text in at if (place := coordinates(text, factor)) is not None]
    named = np.zeros(len(points), np.bool_)
    for spot in places:
        named[np.argmin(((points - np.array(spot)) ** 2).sum(axis=1))] = True
    return named


def _resampled(case: Case, network: Network) -> Network:
    """Stations as drawn, or at the spacing that the case states."""
    spacing = case.segments.station_spacing
    if spacing is None or (spacing.of_radius is None and spacing.length is None):
        return network
    if spacing.of_radius is not None:
        return resample(network, spacing.of_radius, in_radii=True)
    return resample(network, float(spacing.length or 0.0))


def _metres_per_unit(case: Case) -> float:
    """Factor of the first input's unit, in which a case gives places."""
    return length_factor(case.inputs[0].length_unit or "", "input[0].length_unit")


def _names(case: Case) -> tuple[NamedPoint, ...]:
    """Named points of the case's table, in metres."""
    if case.anatomy.names is None:
        return ()
    return read_names(case.folder / case.anatomy.names, _metres_per_unit(case))
