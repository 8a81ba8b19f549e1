"""Loops that are left are kept, and named by their shape: fenestration, duplication, communicating vessels."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.errors import InputError
from geomprep.findings import Finding, Severity
from geomprep.model import IntArray, PointGraph
from geomprep.repair.branches import Branches
from geomprep.repair.parts import components
from geomprep.repair.steps import Given, StepResult

__all__ = ["LoopSettings", "name_loops"]

_LISTED = 50


@dataclass(frozen=True)
class LoopSettings:
    """How loops are named.

    Attributes
    ----------
    fenestration_below : float
        Two arms between the same two junctions are called a fenestration up to this length in metres, a
        duplication beyond. A word for the reader: nothing depends on it.

    Raises
    ------
    InputError
        The length is not above zero.
    """

    fenestration_below: float = 20e-3

    def __post_init__(self) -> None:
        """Refuse a length that is none."""
        if not self.fenestration_below > 0.0:
            raise InputError(f"repair.loops.fenestration_below = {self.fenestration_below:g} m: must be above 0")


def name_loops(graph: PointGraph, settings: LoopSettings, given: Given) -> StepResult:
    """Report the loops of a graph; none is ever cut here.

    Parameters
    ----------
    graph : PointGraph
    settings : LoopSettings
    given : Given

    Returns
    -------
    StepResult
        The graph given; one finding for each pair of arms, and one for all other loops.

    Notes
    -----
    Of 80 fenestrations of intracranial arteries 43 were shorter than 5 mm (doi:10.3389/fneur.2022.986167): a
    short loop is no defect for being short.
    """
    parts, _ = components(graph.n_points, graph.edges)
    loops = graph.n_edges - graph.n_points + parts
    if loops <= 0:
        return StepResult(graph)
    branches = Branches.of(graph)
    first, second = _arms(branches)
    longer = np.maximum(branches.length[first], branches.length[second])
    order = np.argsort(-longer, kind="stable")
    found = [_arm_finding(branches, int(first[row]), int(second[row]), settings) for row in order[:_LISTED].tolist()]
    rest = loops - len(found)
    return StepResult(graph, (), (*found, *_rest_finding(loops, rest)))


def _arms(branches: Branches) -> tuple[IntArray, IntArray]:
    """Pairs of chains between the same two junctions, neighbours in length."""
    low, high = branches.ends.min(axis=1), branches.ends.max(axis=1)
    order = np.lexsort((branches.length, high, low))
    same = (low[order][1:] == low[order][:-1]) & (high[order][1:] == high[order][:-1]) & (low != high)[order][1:]
    return order[:-1][same], order[1:][same]


def _arm_finding(branches: Branches, first: int, second: int, settings: LoopSettings) -> Finding:
    """Two arms between the same two junctions."""
    length = branches.length[[first, second]]
    name = "fenestration" if length.max() <= settings.fenestration_below else "duplication"
    side = np.zeros(2, np.int64)
    middle = branches.at(np.array([first, second]), side, 0.5 * length, branches.graph.points)
    size = branches.at(np.array([first, second]), side, 0.5 * length, branches.graph.radius)
    x, y, z = middle.mean(axis=0).tolist()
    return Finding(
        "loop",
        Severity.NOTE,
        f"two arms of {1e3 * length[0]:.3g} and {1e3 * length[1]:.3g} mm, radii {1e3 * size[0]:.3g} and "
        f"{1e3 * size[1]:.3g} mm, leave and meet again: kept as a {name}",
        position=(x, y, z),
        value=float(length.max()),
        unit="m",
    )


def _rest_finding(loops: int, rest: int) -> tuple[Finding, ...]:
    """All loops through three and more vessels."""
    if rest <= 0:
        return ()
    message = (
        f"{loops} independent loop(s), {rest} of them through three or more segments (communicating vessels); kept"
    )
    return (Finding("loop", Severity.NOTE, message, value=float(loops)),)
