"""The repair steps after joining: one function and one row each, in the order in which they run."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from geomprep.findings import Finding
from geomprep.model import PointGraph, Repair
from geomprep.repair.verdicts import Verdicts

__all__ = ["Step", "StepResult", "run_steps"]


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


Step = Callable[[PointGraph, Verdicts], StepResult]
"""A step with its settings bound."""


def run_steps(graph: PointGraph, steps: tuple[Step, ...], verdicts: Verdicts) -> StepResult:
    """Run steps one after the other and gather what they leave.

    Parameters
    ----------
    graph : PointGraph
    steps : tuple of Step
        In order.
    verdicts : Verdicts
        Recorded choices, which go before every rule.

    Returns
    -------
    StepResult

    Examples
    --------
    >>> import numpy as np
    >>> none, one = np.empty(0), np.zeros((0, 3))
    >>> graph = PointGraph(one, none, none, none, none, none, none, np.empty((0, 2)), none, none, one, none, none, none)
    >>> run_steps(graph, (), Verdicts()).repairs
    ()
    """
    repairs: tuple[Repair, ...] = ()
    findings: tuple[Finding, ...] = ()
    for step in steps:
        result = step(graph, verdicts)
        graph = result.graph
        repairs += result.repairs
        findings += result.findings
    return StepResult(graph, repairs, findings)
