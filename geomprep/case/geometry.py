"""The first half of a build: from files to an oriented, named, measured network."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, fields

from geomprep.anatomy import NamedPoint, name_segments, read_names
from geomprep.assign import Ends, resolve_ends
from geomprep.case.sections import Case
from geomprep.errors import CaseError, OpenQuestions, Question
from geomprep.files import FileContents, read_files
from geomprep.files.meaning import to_centrelines
from geomprep.findings import Finding
from geomprep.measure import junctions, measure_segments
from geomprep.model import Centrelines, Network, PointGraph, Repair, concatenate
from geomprep.repair import JoinSettings, join
from geomprep.segments import leave_out_unreached, order_segments, orient, resample, split
from geomprep.units import length_factor

__all__ = ["Drawn", "Inputs", "draw_network", "read_inputs"]

Progress = Callable[[str, float], None]


@dataclass(frozen=True, eq=False)
class Inputs:
    """The files of a case, read and given their meaning."""

    contents: tuple[FileContents, ...]
    centrelines: Centrelines
    findings: tuple[Finding, ...]


@dataclass(frozen=True, eq=False)
class Drawn:
    """A network of geometry alone, with the record of how it was drawn.

    Attributes
    ----------
    network : Network
        Oriented, named, ordered, measured; no parameters yet.
    graph : PointGraph
        The joined graph that it was cut from.
    ends : Ends
        Which open ends are inlets and outlets.
    findings : tuple of Finding
    repairs : tuple of Repair
    """

    network: Network
    graph: PointGraph
    ends: Ends
    findings: tuple[Finding, ...]
    repairs: tuple[Repair, ...]


def read_inputs(case: Case) -> Inputs:
    """Read all files of a case and give their numbers a meaning.

    Parameters
    ----------
    case : Case

    Returns
    -------
    Inputs

    Raises
    ------
    FileError
        A file cannot be read or holds no vessels.
    OpenQuestions
        All that the case leaves open about all its files.
    CaseError
        Inputs state different frames.
    """
    contents = read_files([case.folder / statement.file for statement in case.inputs])
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
    return Inputs(tuple(contents), concatenate(parts), tuple(findings))


def draw_network(case: Case, centrelines: Centrelines, progress: Progress) -> Drawn:
    """Join, split, name, orient and measure.

    Parameters
    ----------
    case : Case
    centrelines : Centrelines
    progress : callable
        Called with the stage and the part done, 0 to 1.

    Returns
    -------
    Drawn
    """
    progress("join", 0.3)
    joined = join(centrelines, join_settings(case))
    progress("split", 0.5)
    network = _resampled(case, split(joined.graph))
    named = name_segments(network, _names(case))
    ends = resolve_ends(named.network, case.inlets, case.outlets, _metres_per_unit(case))
    reached = leave_out_unreached(named.network, ends.inlet_nodes, joined.graph.raw_points)
    if reached.repairs:
        ends = resolve_ends(reached.network, case.inlets, case.outlets, _metres_per_unit(case))
    progress("orient", 0.6)
    network = orient(ends.network, ends.inlet_nodes, ends.outlet_nodes)
    ordered = order_segments(network, ends.inlet_nodes, ends.outlet_nodes)
    network = junctions(measure_segments(ordered.network))
    findings = (*joined.findings, *named.findings, *ends.findings, *ordered.findings)
    return Drawn(network, joined.graph, ends, findings, (*joined.repairs, *reached.repairs))


def join_settings(case: Case) -> JoinSettings:
    """Settings of the join step: what the case states, defaults for the rest."""
    stated = {field.name: getattr(case.join, field.name) for field in fields(case.join)}
    return JoinSettings(**{name: value for name, value in stated.items() if value is not None})


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
