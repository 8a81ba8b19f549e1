"""The closing lines of a build: what was read, changed, found, and what to do next."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from pathlib import Path

from geomprep.findings import Finding, Severity
from geomprep.model import Network, Repair, SteadyState
from geomprep.units import format_quantity

__all__ = ["summary_lines"]


def summary_lines(
    network: Network,
    state: SteadyState,
    counts: tuple[int, int],
    record: tuple[Sequence[Finding], Sequence[Repair]],
    folder: Path | None,
) -> tuple[str, ...]:
    """Return at most eight lines that close a build.

    Parameters
    ----------
    network : Network
    state : SteadyState
    counts : (int, int)
        Points and lines read.
    record : (findings, repairs)
    folder : Path, optional
        Where the results lie; None when nothing was written.

    Returns
    -------
    tuple of str
    """
    findings, repairs = record
    points, lines = counts
    length = float(network.measures.length.sum()) if network.measures else 0.0
    open_decisions = [repair for repair in repairs if repair.verdict_by == "open"]
    kinds = Counter(finding.severity for finding in findings)
    worst = [finding for finding in findings if finding.severity is not Severity.NOTE]
    loops = len(network.segments) - len(network.nodes) + _parts(network)
    rows = [
        f"read       {points:,} points on {lines:,} lines",
        f"network    {len(network.nodes):,} nodes, {len(network.segments):,} segments, {loops} loop(s), "
        f"{len(network.inlets or ())} inlet(s), {len(network.outlets or ())} outlet(s), {length:.3g} m of vessels",
        _repair_line(repairs),
        _decision_line(open_decisions),
        f"flow       {format_quantity(float(state.inlet_flow.sum()), 'mL/min')} in, "
        f"{format_quantity(float(state.outlet_flow.sum()), 'mL/min')} out, mass balance to {state.mass_residual:.1e}",
        f"findings   {kinds[Severity.ERROR]} error(s), {kinds[Severity.WARNING]} warning(s), "
        f"{kinds[Severity.NOTE]} note(s)" + (f"; first: {worst[0].message}" if worst else ""),
    ]
    if folder is not None:
        rows.append(f"results    {folder}")
        rows.append(f"next       geomprep validate {folder / 'network.json'}")
    return tuple(rows)


def _parts(network: Network) -> int:
    """Number of connected parts."""
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import connected_components

    ends = network.segments.from_node, network.segments.to_node
    links = coo_array(([1] * len(ends[0]), ends), shape=(len(network.nodes), len(network.nodes)))
    return int(connected_components(links, directed=False)[0])


def _repair_line(repairs: Sequence[Repair]) -> str:
    """How many repairs of which kind."""
    done = Counter(repair.kind for repair in repairs if repair.verdict_by != "open")
    if not done:
        return "repaired   nothing needed it"
    return "repaired   " + ", ".join(f"{count} x {kind}" for kind, count in sorted(done.items()))


def _decision_line(open_decisions: Sequence[Repair]) -> str:
    """How many decisions a person still has to take."""
    if not open_decisions:
        return "decisions  none open"
    shown = ", ".join(repair.id for repair in open_decisions[:3])
    return f"decisions  {len(open_decisions)} open, left as in the input: {shown}"
