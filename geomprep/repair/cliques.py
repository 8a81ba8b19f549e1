"""Voxel cliques: junctions that a skeleton's graph draws as a knot of short edges with loops in it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.errors import InputError
from geomprep.model import BoolArray, FloatArray, IntArray, PointGraph, Repair, anchor_ids
from geomprep.repair.branches import Branches
from geomprep.repair.edits import with_merged_points
from geomprep.repair.parts import components
from geomprep.repair.records import Change, recorded
from geomprep.repair.steps import Given, StepResult
from geomprep.repair.verdicts import Verdict

__all__ = ["CliqueSettings", "collapse_cliques"]

_OPTIONS = _, _COLLAPSE = "leave", "collapse"
_FILLED = 3.0
"""Where lumen fills a knot, it may be so many times wider."""


@dataclass(frozen=True)
class CliqueSettings:
    """When a knot of junctions is one junction.

    Attributes
    ----------
    use : bool
        False leaves them all.
    within : float
        A knot is one junction where it is not wider than this many of its radii, or up to three times as
        wide where lumen fills it: its middle lies within the tube of its nearest point, or a voxel beyond.

    Raises
    ------
    InputError
        The limit lies outside its range.
    """

    use: bool = True
    within: float = 1.0

    def __post_init__(self) -> None:
        """Refuse a limit outside its range."""
        if not 0.0 < self.within <= 2.0:
            raise InputError(f"repair.cliques.within = {self.within:g}: must be above 0 and at most 2")


@dataclass(frozen=True, eq=False)
class _Knots:
    """Groups of points joined by short chains between junctions, with at least one loop each."""

    group: IntArray  # (n,) of each point, −1 for none
    width: FloatArray  # in radii
    hollow: FloatArray  # m, from the tube of the nearest point to the middle
    junctions: IntArray
    loops: IntArray


def collapse_cliques(graph: PointGraph, settings: CliqueSettings, given: Given) -> StepResult:
    """Merge the points of each knot into one junction at their mean place.

    A knot is a set of junctions joined by chains shorter than a radius that hold a loop; two forks that lie
    close without a loop stay two.

    Parameters
    ----------
    graph : PointGraph
    settings : CliqueSettings
    given : Given

    Returns
    -------
    StepResult

    Examples
    --------
    Three branches that end at the corners of a small triangle:

    >>> from geomprep.model import Centrelines
    >>> from geomprep.repair import join
    >>> turn = np.radians([90.0, 210.0, 330.0])
    >>> way = np.stack((np.cos(turn), np.sin(turn), 0 * turn), axis=1)
    >>> corner = 0.4e-3 * way
    >>> branches = [c + np.linspace(0, 15e-3, 31)[:, None] * w for c, w in zip(corner, way, strict=True)]
    >>> sides = [corner[[0, 1]], corner[[1, 2]], corner[[2, 0]]]
    >>> graph = join(Centrelines.of_lines([*branches, *sides], 1e-3)).graph
    >>> collapse_cliques(graph, CliqueSettings(), Given()).repairs[0].choice
    'collapse'
    """
    if not settings.use:
        return StepResult(graph)
    branches = given.branches(graph)
    knots = _knots(branches, settings)
    count = len(knots.width)
    if count == 0:
        return StepResult(graph)
    ids = anchor_ids("clique", graph.raw_points, _anchors(graph, knots))
    filled = knots.hollow <= (given.voxel or 0.0)
    proposed = knots.width <= np.where(filled, _FILLED, 1.0) * settings.within
    repairs: list[Repair] = []
    collapsed = np.zeros(count, np.bool_)
    for number in range(count):
        if given.verdicts.wanted(ids[number], bool(proposed[number])):
            verdict = given.verdicts.settle(ids[number], _OPTIONS, _COLLAPSE)
            collapsed[number] = verdict.choice == _COLLAPSE
            repairs.append(_record(graph, knots, number, ids[number], verdict))
    group = np.where((knots.group >= 0) & collapsed[knots.group], knots.group, -1)
    return StepResult(with_merged_points(graph, group), tuple(repairs))


def _knots(branches: Branches, settings: CliqueSettings) -> _Knots:
    """Connected sets of short chains between junctions that hold a loop."""
    graph, ends = branches.graph, branches.ends
    limit = _FILLED * settings.within * graph.radius[ends].max(axis=1)
    short = np.flatnonzero((branches.degree[ends] >= 3).all(axis=1) & (branches.length <= limit))
    short = short[_on_loops(ends[short])]
    _, label = components(graph.n_points, ends[short])
    at = np.unique(ends[short])
    links = np.bincount(label[ends[short, 0]], minlength=label.max(initial=0) + 1)
    nodes = np.bincount(label[at], minlength=len(links))
    looped = (links >= nodes) & (nodes >= 3)  # arms between two junctions alone are a hole or a loop
    number = np.where(looped, np.cumsum(looped) - 1, -1)
    of_chain = number[label[ends[short, 0]]]
    short, of_chain = short[of_chain >= 0], of_chain[of_chain >= 0]
    group = np.full(graph.n_points, -1, np.int64)
    row, owner = branches.rows(short)
    group[branches.cut.point[row]] = of_chain[owner]
    count = int(looped.sum())
    width, hollow = _sizes(graph, group, count)
    return _Knots(group, width, hollow, nodes[looped], (links - nodes + 1)[looped])


def _on_loops(ends: IntArray) -> BoolArray:
    """Whether each link lies on a loop of the links given."""
    on_loop = np.ones(len(ends), np.bool_)
    while True:  # ends that lead nowhere, so that the search for bridges has little left
        _, place = np.unique(ends[on_loop], return_inverse=True)
        lonely = (np.bincount(place.ravel())[place.reshape(-1, 2)] == 1).any(axis=1) if len(place) else place > 0
        if not lonely.any():
            break
        on_loop[np.flatnonzero(on_loop)[lonely.ravel()]] = False
    if on_loop.any():
        left = np.flatnonzero(on_loop)
        on_loop[left] = ~_are_bridges(ends[left])
    return on_loop


def _are_bridges(ends: IntArray) -> BoolArray:
    """Whether links are the only way between what lies on their two sides."""
    import networkx as nx

    links = nx.MultiGraph(ends.tolist())
    cuts = {frozenset(pair) for pair in nx.bridges(nx.Graph(links))}
    return np.array([frozenset(pair) in cuts and links.number_of_edges(*pair) == 1 for pair in ends.tolist()])


def _sizes(graph: PointGraph, group: IntArray, count: int) -> tuple[FloatArray, FloatArray]:
    """Diagonal of the box around each group in its largest radius, and the room in its middle that no tube fills."""
    inside = np.flatnonzero(group >= 0)
    order = inside[np.argsort(group[inside], kind="stable")]
    starts = np.searchsorted(group[order], np.arange(count))
    if count == 0:
        return np.zeros(0), np.zeros(0)
    place, radius = graph.points[order], graph.radius[order]
    low, high = (operation.reduceat(place, starts) for operation in (np.minimum, np.maximum))
    members = np.diff(np.append(starts, len(order)))
    middle = np.repeat(np.add.reduceat(place, starts) / members[:, None], members, axis=0)
    hollow = np.minimum.reduceat(np.linalg.norm(place - middle, axis=1) - radius, starts)
    return np.linalg.norm(high - low, axis=1) / np.maximum.reduceat(radius, starts), hollow


def _anchors(graph: PointGraph, knots: _Knots) -> IntArray:
    """Raw points of each group, rows filled up with −1."""
    inside = np.flatnonzero((knots.group >= 0) & (graph.source_point >= 0))
    order = inside[np.argsort(knots.group[inside], kind="stable")]
    of = knots.group[order]
    place = np.arange(len(order)) - np.searchsorted(of, of)
    anchors = np.full((len(knots.width), int(place.max(initial=0)) + 1), -1, np.int64)
    anchors[of, place] = graph.source_point[order]
    return anchors


def _record(graph: PointGraph, knots: _Knots, number: int, key: str, verdict: Verdict) -> Repair:
    """The repair of one knot."""
    members = np.flatnonzero(knots.group == number)
    reason = (
        f"{knots.junctions[number]} junctions with {knots.loops[number]} loop(s) between them lie within "
        f"{knots.width[number]:.2g} radii: one junction"
    )
    place, raw = graph.points[members].mean(axis=0), graph.source_point[members]
    return recorded("clique", key, _OPTIONS, verdict, Change(reason=reason, place=place, raw=raw))
