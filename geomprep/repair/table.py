"""The repair steps after joining: one row each, in the order in which they run."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Final

from geomprep.model import PointGraph, Repair
from geomprep.repair.cliques import CliqueSettings, collapse_cliques
from geomprep.repair.floor import FloorSettings, report_floor
from geomprep.repair.gaps import GapSettings, close_gaps
from geomprep.repair.holes import HoleSettings, fill_holes
from geomprep.repair.inside import CopySettings, drop_copies
from geomprep.repair.kissing import KissingSettings, part_kissing
from geomprep.repair.loops import LoopSettings, name_loops
from geomprep.repair.parts import PartSettings, report_parts
from geomprep.repair.paths import PathSettings, smooth_paths
from geomprep.repair.spurs import SpurSettings, drop_spurs
from geomprep.repair.steps import Given, Step, StepResult, run_steps
from geomprep.repair.stray import StraySettings, drop_stray

__all__ = ["STEPS", "StepRow", "mend_graph"]


@dataclass(frozen=True)
class StepRow:
    """One step: its name in the case file, its settings, its function, what it does in a line."""

    name: str
    settings: type[Any]
    step: Step
    does: str


STEPS: Final[tuple[StepRow, ...]] = (
    StepRow("cliques", CliqueSettings, collapse_cliques, "collapse knots of short edges at junctions"),
    StepRow("kissing", KissingSettings, part_kissing, "part vessels that only touch"),
    StepRow("holes", HoleSettings, fill_holes, "fill holes between two arms of one vessel"),
    StepRow("spurs", SpurSettings, drop_spurs, "drop branches that end in the tube of their parent"),
    StepRow("copies", CopySettings, drop_copies, "drop lines that run inside another vessel"),
    StepRow("gaps", GapSettings, close_gaps, "bridge gaps from end to end and from end to side"),
    StepRow("stray", StraySettings, drop_stray, "drop short parts that hang together with nothing"),
    StepRow("paths", PathSettings, smooth_paths, "smooth jagged paths by the noise declared"),
    StepRow("parts", PartSettings, report_parts, "report parts that hang together with nothing else"),
    StepRow("loops", LoopSettings, name_loops, "name the loops that are kept"),
    StepRow("floor", FloorSettings, report_floor, "report radii at the floor of partial volume"),
)
"""In this order: what a step leaves is what the next one sees."""


def mend_graph(
    graph: PointGraph, settings: Mapping[str, Any], given: Given, before: tuple[Repair, ...] = ()
) -> StepResult:
    """Run every step of the table on a graph.

    Parameters
    ----------
    graph : PointGraph
    settings : mapping of str to settings
        By the name of the step; defaults for those left out.
    given : Given
        Recorded verdicts and what is known of the image.
    before : tuple of Repair
        Repairs made already, to whose numbers `merged_into` may point.

    Returns
    -------
    StepResult
        Repairs made before in front.

    Examples
    --------
    >>> import numpy as np
    >>> none, one = np.empty(0), np.zeros((0, 3))
    >>> graph = PointGraph(one, none, none, none, none, none, none, np.empty((0, 2)), none, none, one, none, none, none)
    >>> mend_graph(graph, {}, Given()).findings
    ()
    """
    return run_steps(graph, ((row.step, settings.get(row.name) or row.settings()) for row in STEPS), given, before)
