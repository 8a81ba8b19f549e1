"""How a repair step is run: what it is given, what it leaves, one after the other."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, field, replace
from typing import Any

from geomprep.findings import Finding
from geomprep.model import PointGraph, Repair
from geomprep.repair.branches import Branches
from geomprep.repair.edits import renumbered
from geomprep.repair.verdicts import Verdicts

__all__ = ["Given", "Step", "StepResult", "run_steps"]


@dataclass(frozen=True)
class Given:
    """What a step knows beside the graph.

    Attributes
    ----------
    verdicts : Verdicts
        Recorded choices, which go before every rule.
    voxel : float, optional
        Largest edge of a voxel of the image in metres, where the case states it.
    """

    verdicts: Verdicts = field(default_factory=Verdicts)
    voxel: float | None = None
    _laid: list[Branches] = field(default_factory=list, repr=False, compare=False)

    def branches(self, graph: PointGraph) -> Branches:
        """Return the branches of a graph; those of the last graph asked for are kept, as most steps change nothing."""
        if not (self._laid and self._laid[0].graph is graph):
            self._laid[:] = [Branches.of(graph)]
        return self._laid[0]


@dataclass(frozen=True, eq=False)
class StepResult:
    """What one step, or all of them, made of a graph.

    Attributes
    ----------
    graph : PointGraph
        The graph given, where nothing was changed.
    repairs : tuple of Repair
        Done, declined and open; all that a person can decide on.
    findings : tuple of Finding
    """

    graph: PointGraph
    repairs: tuple[Repair, ...] = ()
    findings: tuple[Finding, ...] = ()


Step = Callable[[PointGraph, Any, Given], StepResult]
"""A step: graph, its settings, what else is known."""


def run_steps(
    graph: PointGraph, steps: Iterable[tuple[Step, Any]], given: Given, before: tuple[Repair, ...] = ()
) -> StepResult:
    """Run steps one after the other and gather what they leave.

    Parameters
    ----------
    graph : PointGraph
    steps : iterable of (Step, settings)
        In order.
    given : Given
    before : tuple of Repair
        Repairs made already, to whose numbers `merged_into` may point.

    Returns
    -------
    StepResult
        With the repairs made before in front.

    Examples
    --------
    >>> import numpy as np
    >>> none, one = np.empty(0), np.zeros((0, 3))
    >>> graph = PointGraph(one, none, none, none, none, none, none, np.empty((0, 2)), none, none, one, none, none, none)
    >>> run_steps(graph, (), Given()).repairs
    ()
    """
    repairs = before
    findings: tuple[Finding, ...] = ()
    for step, settings in steps:
        result = step(graph, settings, given)
        into = renumbered(result.graph.merged_into, graph.merged_into, len(repairs))
        graph = result.graph if result.graph is graph else replace(result.graph, merged_into=into)
        repairs += result.repairs
        findings += result.findings
    return StepResult(graph, repairs, findings)
