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

    Examples
    --------
    >>> import numpy as np
    >>> from geomprep.model import Centrelines
    >>> from geomprep.repair import join
    >>> t = np.linspace(0, 1, 21)
    >>> arms = [np.stack((x * np.sin(np.pi * t), 0 * t, 20 + 10 * t), axis=1) * 1e-3 for x in (3, -3)]
    >>> ends = [np.stack((0 * t, 0 * t, a + 20 * t), axis=1) * 1e-3 for a in (0, 30)]
    >>> graph = join(Centrelines.of_lines([*ends, *arms], 1e-3)).graph
    >>> name_loops(graph, LoopSettings(), Given()).findings[0].message[-29:]
    'again: kept as a fenestration'
    """
    parts, _ = components(graph.n_points, graph.edges)
    loops = graph.n_edges - graph.n_points + parts
    if loops <= 0:
        return StepResult(graph)
    branches = given.branches(graph)
    arms = _arms(branches)
    listed = arms[np.argsort(-branches.length[arms].max(axis=1), kind="stable")[:_LISTED]]
    found = _arm_findings(branches, listed, settings)
    return StepResult(graph, (), (*found, *_rest_finding(loops, loops - len(found))))


def _arms(branches: Branches) -> IntArray:
    """Pairs of chains between the same two junctions, neighbours in length, (p, 2)."""
    low, high = branches.ends.min(axis=1), branches.ends.max(axis=1)
    order = np.lexsort((branches.length, high, low))
    same = (low[order][1:] == low[order][:-1]) & (high[order][1:] == high[order][:-1]) & (low != high)[order][1:]
    return np.stack((order[:-1][same], order[1:][same]), axis=1)


def _arm_findings(branches: Branches, arms: IntArray, settings: LoopSettings) -> list[Finding]:
    """One finding for each two arms between the same two junctions."""
    length = branches.length[arms]
    chain, half = arms.ravel(), 0.5 * length.ravel()
    middle = branches.at(chain, np.zeros_like(chain), half, branches.graph.points).reshape(-1, 2, 3).mean(axis=1)
    size = branches.at(chain, np.zeros_like(chain), half, branches.graph.radius).reshape(-1, 2)
    found = []
    for (one, other), (thick, thin), place in zip(length.tolist(), size.tolist(), middle.tolist(), strict=True):
        name = "fenestration" if max(one, other) <= settings.fenestration_below else "duplication"
        message = (
            f"two arms of {1e3 * one:.3g} and {1e3 * other:.3g} mm, radii {1e3 * thick:.3g} and {1e3 * thin:.3g} mm, "
            f"leave and meet again: kept as a {name}"
        )
        found.append(Finding("loop", Severity.NOTE, message, position=tuple(place), value=max(one, other), unit="m"))
    return found


def _rest_finding(loops: int, rest: int) -> tuple[Finding, ...]:
    """All loops through three and more vessels."""
    if rest <= 0:
        return ()
    message = (
        f"{loops} independent loop(s), {rest} of them through three or more segments (communicating vessels); kept"
    )
    return (Finding("loop", Severity.NOTE, message, value=float(loops)),)
