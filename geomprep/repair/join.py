"""Join lines into one graph: the order of the steps."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from geomprep.errors import InputError
from geomprep.findings import Finding, Severity
from geomprep.model import Basis, Centrelines, PointGraph, Repair, anchor_ids
from geomprep.repair.accept import refuse_unusable
from geomprep.repair.classes import class_findings
from geomprep.repair.coincident import join_near_ends
from geomprep.repair.copies import fuse_copies
from geomprep.repair.doubled import single_edges
from geomprep.repair.draft import LEFT_ALONE, Draft, compacted, lengths, merged
from geomprep.repair.ends import join_near_open_ends
from geomprep.repair.joints import join_sides
from geomprep.repair.overlaps import Held
from geomprep.repair.parts import components
from geomprep.repair.radii import settled_radii
from geomprep.repair.runs import laid_in_runs
from geomprep.repair.settings import JoinSettings
from geomprep.repair.start import started
from geomprep.repair.verdicts import Verdicts

__all__ = ["JoinResult", "join"]


@dataclass(frozen=True, eq=False)
class JoinResult:
    """What joining gives.

    Attributes
    ----------
    graph : PointGraph
    repairs : tuple of Repair
        What was changed beyond taking points at one place as one.
    findings : tuple of Finding
    """

    graph: PointGraph
    repairs: tuple[Repair, ...]
    findings: tuple[Finding, ...]


def join(
    centrelines: Centrelines, settings: JoinSettings | None = None, verdicts: Verdicts | None = None
) -> JoinResult:
    """Join lines into one graph of points and edges, within each vessel class.

    In this order: points at identical coordinates are one point; ends that nearly
    coincide merge; an edge drawn several times counts once; runs that are copies of one
    vessel, each sampled in its own way, are fused; open ends join ends and sides of
    lines that they lie on. Arteries join arteries and veins join veins; lines of unknown
    class join any, with a finding.

    Parameters
    ----------
    centrelines : Centrelines
        Lines through points with radii, in SI.
    settings : JoinSettings, optional
        Limits in parts of the local radius.
    verdicts : Verdicts, optional
        Recorded choices, which go before the limits.

    Returns
    -------
    JoinResult
        The graph accounts for every raw point in its `merged_into`.

    Raises
    ------
    InputError
        There is no line, a line has fewer than two points, or a used point has no
        radius above zero.

    Examples
    --------
    >>> import numpy as np
    >>> points = np.array([[0.0, 0, 0], [1, 0, 0], [1, 0, 0], [2, 0, 0]]) * 1e-2
    >>> two = Centrelines(points, [1e-3] * 4, points, [0, 1, 2, 3], [0, 2, 4], [1, 1], [0, 0], [0] * 4)
    >>> join(two).graph.edges.tolist()
    [[0, 1], [1, 2]]
    """
    settings = settings or JoinSettings()
    refuse_unusable(centrelines)
    held, repairs, findings = _drawn(centrelines, settings)
    repairs, found = _nearby(held, repairs, settings, verdicts or Verdicts())
    findings += found
    draft = held.take()
    graph, radius_findings = _finished(draft)
    findings += radius_findings
    findings += class_findings(centrelines.vessel_class, draft.edge_class, draft.edges, draft.points)
    return JoinResult(graph, repairs, findings)


def _drawn(centrelines: Centrelines, settings: JoinSettings) -> tuple[Held, tuple[Repair, ...], tuple[Finding, ...]]:
    """The graph as drawn, points at one place taken as one."""
    draft, findings = started(centrelines)
    draft, found = _coincident(draft, settings)
    draft, repairs = _compacted(laid_in_runs(draft), ())
    return Held(draft), repairs, findings + found


def _coincident(draft: Draft, settings: JoinSettings) -> tuple[Draft, tuple[Finding, ...]]:
    """One point per place, one edge per pair of points."""
    draft, findings = single_edges(draft, settings.radii_agree_within)
    draft, joined, wide = join_near_ends(draft, settings.tolerance)
    findings += wide
    if joined:
        draft, single = single_edges(draft, settings.radii_agree_within)
        findings += (_joined_finding(joined, settings.tolerance), *single)
    return draft, findings


def _nearby(
    held: Held, repairs: tuple[Repair, ...], settings: JoinSettings, verdicts: Verdicts
) -> tuple[tuple[Repair, ...], tuple[Finding, ...]]:
    """Fuse copies of trunks, then join open ends to ends and to sides within a part of the radius."""
    more, findings = fuse_copies(held, settings, verdicts)
    repairs = _settled(held, repairs + more, settings)
    more = join_near_open_ends(held, settings.joints_within, verdicts)
    repairs = _settled(held, repairs + more, settings)
    more = join_sides(held, settings, verdicts)
    return _settled(held, repairs + more, settings), findings


def _settled(held: Held, repairs: tuple[Repair, ...], settings: JoinSettings) -> tuple[Repair, ...]:
    """Single edges, laid in runs, and no points without edges, where a step has changed the draft."""
    if held.laid:
        return repairs
    draft = held.take()
    short = lengths(draft) == 0.0
    if short.any():  # points that a step has moved to one place
        _, label = components(len(draft.points), draft.edges[short])
        draft = merged(draft, label)
    draft, _ = single_edges(draft, settings.radii_agree_within)
    draft, repairs = _compacted(laid_in_runs(draft), repairs)
    held.put(draft)
    return repairs


def _joined_finding(joined: int, tolerance: float) -> Finding:
    """Say how many ends merged within the tolerance."""
    return Finding(
        "near ends merged",
        Severity.NOTE,
        f"{joined} line ends within {tolerance:g} of the radius of another were merged with it",
        value=float(joined),
    )


def _compacted(draft: Draft, repairs: tuple[Repair, ...]) -> tuple[Draft, tuple[Repair, ...]]:
    """Leave out points without edges; record the lines that shrank to one place."""
    if len(draft.edges) == 0:
        raise InputError("every line lies within one point; a network needs at least one line with a length")
    kept, lost = compacted(draft)
    if len(lost) == 0:
        return kept, repairs
    merged_into = kept.merged_into.copy()
    merged_into[lost] = -1 - len(repairs)
    x, y, z = draft.points[draft.merged_into[lost[0]]].tolist()
    record = Repair(
        id=str(anchor_ids("line-of-no-length", draft.raw_points, lost[None])[0]),
        kind="line of no length",
        reason=f"{len(lost)} points belong to lines all of whose points lie at one place",
        position=(x, y, z),
        choice="drop",
        options=("drop",),
        raw_points=tuple(lost.tolist()),
    )
    return replace(kept, merged_into=merged_into), (*repairs, record)


def _finished(draft: Draft) -> tuple[PointGraph, tuple[Finding, ...]]:
    """The point graph of a draft."""
    radii = settled_radii(draft)
    graph = PointGraph(
        points=draft.points,
        radius=radii.radius,
        radius_basis=radii.basis,
        vessel_class=draft.vessel_class,
        input_id=draft.input_id,
        protected=draft.end_state == LEFT_ALONE,
        source_point=draft.source_point,
        edges=draft.edges,
        edge_basis=np.full(len(draft.edges), Basis.MEASURED, np.uint8),
        merged_into=draft.merged_into,
        raw_points=draft.raw_points,
        own_radius_edge=radii.own_edge,
        own_radius_end=radii.own_end,
        own_radius=radii.own_radius,
    )
    return graph, radii.findings
