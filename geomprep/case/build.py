"""The one pipeline that knows the order of the stages: a case in, a checked network out."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from geomprep import __version__
from geomprep.case.decisions import read_decisions
from geomprep.case.file import read_case
from geomprep.case.geometry import Drawn, draw_network
from geomprep.case.parameters import Assigned, assign_parameters
from geomprep.case.results import write_results
from geomprep.case.sections import Case
from geomprep.case.summary import summary_lines
from geomprep.errors import InputError
from geomprep.export import ExportContext, ImagingState
from geomprep.findings import Finding, Severity
from geomprep.flow import steady_state
from geomprep.literature import row, rows
from geomprep.measure import unresolved_finding
from geomprep.model import Basis, Network, Origin, Repair, SteadyState
from geomprep.repair import STEPS

__all__ = ["BuildResult", "build"]

Progress = Callable[[str, float], None]


@dataclass(frozen=True, eq=False)
class BuildResult:
    """What a build made.

    Attributes
    ----------
    network : Network
    state : SteadyState
    findings : tuple of Finding
    repairs : tuple of Repair
    output_folder : pathlib.Path, optional
        Where the results lie; None after a dry run.
    summary : tuple of str
        At most eight lines that close the build.
    """

    network: Network
    state: SteadyState
    findings: tuple[Finding, ...]
    repairs: tuple[Repair, ...]
    output_folder: Path | None
    summary: tuple[str, ...]


def build(
    path: str | Path,
    *,
    output: str | Path | None = None,
    dry_run: bool = False,
    strict: bool = False,
    progress: Progress | None = None,
) -> BuildResult:
    """Build the network of a case and write it beside the case.

    Parameters
    ----------
    path : str or pathlib.Path
        The case file.
    output : str or pathlib.Path, optional
        Folder for the results; ``results`` beside the case file where not given.
    dry_run : bool
        Build and check everything, write nothing.
    strict : bool
        Refuse while decisions are open or findings of severity error are left.
    progress : callable, optional
        Called with the name of a stage and the part done, 0 to 1.

    Returns
    -------
    BuildResult

    Raises
    ------
    InputError
        The case or a file cannot be used, or questions are open; nothing is written.
    ModelError
        Geometry and parameters contradict each other; nothing is written.

    Examples
    --------
    >>> build("no-such-case.toml")
    Traceback (most recent call last):
    geomprep.errors.CaseError: no-such-case.toml: no such file
    """
    step = progress or _quiet
    case = read_case(path)
    drawn = draw_network(case, step)
    step("assign", 0.7)
    assigned = assign_parameters(case, drawn)
    step("steady state", 0.8)
    state = steady_state(assigned.network)
    findings = (*drawn.findings, *assigned.findings, *unresolved_finding(assigned.network, state.flow))
    if strict:
        _refuse_left_over(findings, drawn.repairs)
    folder = None if dry_run else Path(output) if output is not None else case.folder / "results"
    if folder is not None:
        step("write", 0.85)
        context = _context(case, drawn, assigned, findings)
        write_results(folder, assigned.network, state, context, assigned.station_height)
    step("done", 1.0)
    counts = sum(one.points for one in drawn.inputs), sum(one.lines for one in drawn.inputs)
    summary = summary_lines(assigned.network, state, counts, (findings, drawn.repairs), folder)
    return BuildResult(assigned.network, state, findings, drawn.repairs, folder, summary)


def _quiet(stage: str, part: float) -> None:
    """Progress that nobody watches."""


def _refuse_left_over(findings: tuple[Finding, ...], repairs: tuple[Repair, ...]) -> None:
    """What ``strict`` does not let pass."""
    undecided = [repair.id for repair in repairs if repair.verdict_by == "open"]
    if undecided:
        raise InputError(
            f"strict: {len(undecided)} decision(s) are open ({', '.join(undecided[:3])}); decide them, "
            "or build without --strict to leave them as in the input"
        )
    errors = [finding.message for finding in findings if finding.severity is Severity.ERROR]
    if errors:
        raise InputError(f"strict: {len(errors)} finding(s) of severity error; the first: {errors[0]}")


def _context(case: Case, drawn: Drawn, assigned: Assigned, findings: tuple[Finding, ...]) -> ExportContext:
    """Everything that the network file says beside the network."""
    imaging, field = case.imaging_state, assigned.field
    return ExportContext(
        name=case.name,
        subject=case.case.subject or "not stated",
        question=case.case.question or "not stated",
        version=__version__,
        inputs=drawn.inputs,
        imaging_state=ImagingState(
            posture=case.case.imaged_in or "not stated",
            transmural_from=assigned.transmural_from,
            venous_pressure=imaging.venous_pressure,
            arterial_pressure=imaging.arterial_pressure,
            intracranial_pressure=imaging.intracranial_pressure,
            right_atrial_pressure=imaging.right_atrial_pressure,
        ),
        posture=field.posture or "not stated",
        frame=case.inputs[0].frame or "unknown",
        gravity=field.vector,
        reference_height=field.reference,
        case_sha256=case.sha256,
        findings=findings,
        repairs=drawn.repairs,
        decisions=read_decisions(case.folder),
        settings=drawn.settings,
        sources=_sources(assigned.network.origins, findings),
        steps=_STEPS,
    )


_STEPS = (
    "read each file in a contained process and hold what the case states against its numbers",
    "mend radii that are zero, negative, missing, spikes or decayed ends",
    "join points and lines within each vessel class",
    *(row.does for row in STEPS),
    "split into segments between junctions and open ends",
    "take areas of stations from lumen surfaces and masks, where the case states them",
    "turn segments along a linear flow from inlets to outlets",
    "take off what lies inside parents, by the convention of the case",
    "measure segments and junctions",
    "assign blood, surroundings, walls, lumped values, inlets and outlets",
    "solve the linear steady state",
)


def _sources(origins: tuple[Origin, ...], findings: tuple[Finding, ...]) -> tuple[dict[str, object], ...]:
    """Literature rows that a number or a finding leads to, in order of their keys."""
    published = {origin.detail for origin in origins if origin.basis in (Basis.PUBLISHED, Basis.POPULATION)}
    known = {one.key for one in rows()}
    keys = published | ({finding.source for finding in findings if finding.source} & known)
    return tuple(
        {name: getattr(row(key), name) for name in ("key", "citation", "doi", "place", "checked")}
        for key in sorted(keys)
    )
