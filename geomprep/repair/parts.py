"""Parts of the graph that hang together with nothing else."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from geomprep.curves import piece_integrals
from geomprep.findings import Finding, Severity
from geomprep.model import VESSEL_CLASSES, FloatArray, IntArray, PointGraph, Uint8Array
from geomprep.repair.steps import Given, StepResult

__all__ = ["PartSettings", "components", "report_parts"]

_LISTED = 100


def components(n_points: int, edges: IntArray) -> tuple[int, IntArray]:
    """Number of connected components and the component of each point."""
    matrix = coo_array((np.ones(len(edges), np.int8), (edges[:, 0], edges[:, 1])), shape=(n_points, n_points))
    count, label = connected_components(matrix, directed=False)
    return int(count), label.astype(np.int64)


@dataclass(frozen=True)
class PartSettings:
    """Whether parts are reported.

    Attributes
    ----------
    use : bool
        False reports none.
    """

    use: bool = True


def report_parts(graph: PointGraph, settings: PartSettings, given: Given) -> StepResult:
    """Report every connected part but the longest of each vessel class.

    Parameters
    ----------
    graph : PointGraph
    settings : PartSettings
    given : Given

    Returns
    -------
    StepResult
        The graph given. Longest first; beyond 100 the rest is summed up in one finding.

    Examples
    --------
    >>> from geomprep.model import Centrelines
    >>> from geomprep.repair import join
    >>> z = np.linspace(0, 60e-3, 61)[:, None] * [0, 0, 1.0]
    >>> graph = join(Centrelines.of_lines([z, z[:21] + [30e-3, 0, 0]], 1e-3)).graph
    >>> report_parts(graph, PartSettings(), Given()).findings[0].value
    0.02
    """
    count, label = components(graph.n_points, graph.edges)
    if count < 2 or not settings.use:
        return StepResult(graph)
    part = label[graph.edges[:, 0]]
    ends, size = graph.points[graph.edges], graph.radius[graph.edges]
    step = np.linalg.norm(ends[:, 1] - ends[:, 0], axis=1)
    length = np.bincount(part, step, minlength=count).astype(np.float64)
    volume = np.bincount(part, piece_integrals(step, size[:, 0], size[:, 1])[:, 0], minlength=count).astype(np.float64)
    code = np.zeros(count, np.uint8)
    np.maximum.at(code, label, graph.vessel_class)
    rest = _all_but_longest(code, length)
    place = np.empty(count, np.int64)
    place[part[::-1]] = graph.edges[::-1, 0]
    found = [
        _part_finding(graph.points[place[number]], float(length[number]), float(volume[number]), int(code[number]))
        for number in rest[:_LISTED].tolist()
    ]
    return StepResult(graph, (), (*found, *_rest_finding(length[rest[_LISTED:]], volume[rest[_LISTED:]])))


def _all_but_longest(code: Uint8Array, length: FloatArray) -> IntArray:
    """Parts that are not the longest of their class, longest first."""
    order = np.lexsort((np.arange(len(length)), -length, code))
    main = np.ones(len(length), np.bool_)
    main[1:] = np.diff(code[order].astype(np.int64)) != 0
    rest = order[~main]
    return rest[np.argsort(-length[rest], kind="stable")]


def _part_finding(place: FloatArray, length: float, volume: float, code: int) -> Finding:
    """One part that is not connected with the largest of its class."""
    x, y, z = place.tolist()
    of = "" if code == 0 else f" of {VESSEL_CLASSES[code]} lines"
    return Finding(
        "isolated part",
        Severity.WARNING,
        f"a part{of} is not connected with the largest one: "
        f"length {1e3 * length:.4g} mm, volume {1e9 * volume:.4g} mm³",
        position=(x, y, z),
        value=length,
        unit="m",
    )


def _rest_finding(length: FloatArray, volume: FloatArray) -> tuple[Finding, ...]:
    """All smaller parts in one sentence."""
    if len(length) == 0:
        return ()
    return (
        Finding(
            "isolated part",
            Severity.WARNING,
            f"{len(length)} smaller parts more: length {1e3 * length.sum():.4g} mm, "
            f"volume {1e9 * volume.sum():.4g} mm³ together",
            value=float(length.sum()),
            unit="m",
        ),
    )
