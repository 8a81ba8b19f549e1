"""Spurs: short branches that end inside the vessel they leave, or hardly outside it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.errors import InputError
from geomprep.model import FloatArray, IntArray, PointGraph, Repair, anchor_ids
from geomprep.repair.branches import Branches
from geomprep.repair.edits import without_edges
from geomprep.repair.records import Change, recorded
from geomprep.repair.steps import Given, StepResult
from geomprep.repair.tubes import near_tubes
from geomprep.repair.verdicts import Verdict

__all__ = ["SpurSettings", "drop_spurs"]

_OPTIONS = _LEAVE, _DROP = "leave", "drop"
_LOOKED_AT = 1.5
"""Branches that must reach farther beyond the parent's tube than this many times the limit are not looked at."""


@dataclass(frozen=True)
class SpurSettings:
    """When a branch is a spur.

    Attributes
    ----------
    use : bool
        False leaves all branches.
    outside_below : float
        A branch whose part outside the parent's tube is shorter than this many of its own radii is a spur.

    Raises
    ------
    InputError
        The limit lies outside its range.
    """

    use: bool = True
    outside_below: float = 1.0

    def __post_init__(self) -> None:
        """Refuse a limit outside its range."""
        if not 0.0 < self.outside_below <= 5.0:
            raise InputError(f"repair.spurs.outside_below = {self.outside_below:g}: must be above 0 and at most 5")


@dataclass(frozen=True, eq=False)
class _Candidates:
    """Terminal chains, how far they reach beyond the parent's tube, and their own radius."""

    chain: IntArray
    side: IntArray  # of the open end
    outside: FloatArray
    own: FloatArray
    parent: FloatArray


def drop_spurs(graph: PointGraph, settings: SpurSettings, given: Given) -> StepResult:
    """Drop spurs from the shortest on, one at each junction at a time.

    A skeleton's branch starts on the axis of its parent; only what lies outside the parent's tube
    can be vessel. After each removal what is left of a fork is one vessel with its parent, so that of
    a terminal fork one arm always stays.

    Parameters
    ----------
    graph : PointGraph
    settings : SpurSettings
    given : Given

    Returns
    -------
    StepResult

    Notes
    -----
    The idea of measuring a branch in its own widths and pruning iteratively: Drees et al. 2021,
    doi:10.1186/s12859-021-04262-w. Protected points are never dropped.

    Examples
    --------
    A branch of 2.2 mm on an artery of 2 mm radius lies 0.2 mm outside its tube:

    >>> from geomprep.model import Centrelines
    >>> from geomprep.repair import join
    >>> trunk = np.linspace(0, 40e-3, 41)[:, None] * [0, 0, 1.0]
    >>> branch = [0, 0, 20e-3] + np.linspace(0, 2.2e-3, 8)[:, None] * [1.0, 0, 0]
    >>> lines = Centrelines.of_lines([trunk, branch], [2e-3, 0.5e-3])
    >>> drop_spurs(join(lines).graph, SpurSettings(), Given()).repairs[0].choice
    'drop'
    """
    repairs: list[Repair] = []
    declined: set[str] = set()
    while settings.use:
        dropped_by, found = _round(graph, settings, given, len(repairs), declined)
        repairs += found
        if (dropped_by < 0).all():
            break
        graph = without_edges(graph, dropped_by)
    return StepResult(graph, tuple(repairs))


def _round(
    graph: PointGraph, settings: SpurSettings, given: Given, number: int, declined: set[str]
) -> tuple[IntArray, list[Repair]]:
    """Drop the shortest spur at each junction; (repair of each edge or −1, repairs)."""
    branches = given.branches(graph)
    found = _candidates(branches, settings, given)
    tip = branches.ends[found.chain, found.side]
    base = branches.ends[found.chain, 1 - found.side]
    ids = anchor_ids("spur", graph.raw_points, graph.source_point[np.stack((base, tip), axis=1)])
    proposed = found.outside < _limit(settings, found, given)
    dropped_by = np.full(graph.n_edges, -1, np.int64)
    repairs: list[Repair] = []
    taken: set[int] = set()
    for row in np.lexsort((tip, found.outside / found.own)).tolist():
        key, at = ids[row], int(base[row])
        if at in taken or key in declined or not given.verdicts.wanted(key, bool(proposed[row])):
            continue
        verdict = given.verdicts.settle(key, _OPTIONS, _DROP)
        repair = _record(branches, found, row, key, verdict)
        if verdict.choice == _LEAVE:
            declined.add(key)
        else:
            taken.add(at)
            edges, _ = branches.chain_edges(found.chain[row : row + 1])
            dropped_by[edges] = number + len(repairs)
        repairs.append(repair)
    return dropped_by, repairs


def _limit(settings: SpurSettings, found: _Candidates, given: Given) -> FloatArray:
    """Length outside the parent's tube up to which each candidate is a spur."""
    return np.maximum(settings.outside_below * found.own, 2.0 * (given.voxel or 0.0))


def _candidates(branches: Branches, settings: SpurSettings, given: Given) -> _Candidates:
    """Unprotected terminal chains that do not reach far beyond the widest vessel at their base."""
    graph, degree = branches.graph, branches.degree
    is_open = degree[branches.ends] == 1
    side = np.where(is_open[:, 1], 1, 0)
    rows = np.arange(len(side))
    tip, base = branches.ends[rows, side], branches.ends[rows, 1 - side]
    limit = np.maximum(settings.outside_below * graph.radius[tip], 2.0 * (given.voxel or 0.0))
    reach = 2.0 * graph.radius[base] + _LOOKED_AT * limit
    chosen = np.flatnonzero((is_open.sum(axis=1) == 1) & (degree[base] >= 3) & (branches.length < reach))
    chosen = chosen[~branches.protected(chosen)]
    side, base = side[chosen], base[chosen]
    if len(chosen) == 0:
        return _Candidates(chosen, side, np.zeros(0), np.zeros(0), np.zeros(0))
    outside, own, parent = _beyond_parent(branches, chosen, side, base)
    return _Candidates(chosen, side, outside, own, parent)


def _beyond_parent(
    branches: Branches, chosen: IntArray, side: IntArray, base: IntArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Length outside all other vessels at the base, own radius there, radius of the parent."""
    graph = branches.graph
    row, owner = branches.rows(chosen)
    point = branches.cut.point[row]
    excess = _excess(branches, chosen, (point, owner))
    excess[point == base[owner]] = np.minimum(excess[point == base[owner]], 0.0)
    step = np.diff(branches.along[row], append=0.0)
    same = np.append(owner[1:] == owner[:-1], False)
    low, high = np.minimum(excess[:-1], excess[1:]), np.maximum(excess[:-1], excess[1:])
    share = np.append(np.clip(high / np.maximum(high - low, 1e-30), 0.0, 1.0), 0.0)
    outside = np.bincount(owner[same], (step * share)[same], minlength=len(chosen)).astype(np.float64)
    tip = branches.ends[chosen, side]
    beyond = excess > 0
    count = np.bincount(owner[beyond], minlength=len(chosen))
    total = np.bincount(owner[beyond], graph.radius[point[beyond]], minlength=len(chosen))
    own: FloatArray = np.where(count > 0, total / np.maximum(count, 1), graph.radius[tip])
    return outside, own, graph.radius[base]


def _excess(branches: Branches, chosen: IntArray, places: tuple[IntArray, IntArray]) -> FloatArray:
    """Distance of points from the nearest other vessel less its radius there; infinite where none is near."""
    cut = branches.cut
    row = np.flatnonzero(branches.chain[1:] == branches.chain[:-1])
    among = np.zeros(cut.n_chains, np.bool_)
    among[chosen] = True
    excess = np.full(len(places[0]), np.inf)
    for rows, count in ((row[~among[branches.chain[row]]], 6), (row[among[branches.chain[row]]], 24)):
        if len(rows):
            near = near_tubes(branches, rows, places[0], chosen[places[1]], count)
            excess = np.minimum(excess, (near.distance - near.radius).min(axis=1))
    return excess


def _record(branches: Branches, found: _Candidates, row: int, key: str, verdict: Verdict) -> Repair:
    """The repair of one spur."""
    graph, chain = branches.graph, found.chain[row : row + 1]
    point = branches.cut.point[branches.rows(chain)[0]]
    reason = (
        f"a branch of {1e3 * branches.length[found.chain[row]]:.3g} mm reaches {1e3 * found.outside[row]:.3g} mm "
        f"beyond the tube of its parent (radius {1e3 * found.parent[row]:.3g} mm); its own radius is "
        f"{1e3 * found.own[row]:.3g} mm"
    )
    return recorded(
        "spur",
        key,
        _OPTIONS,
        verdict,
        Change(
            reason=reason,
            place=graph.points[branches.ends[found.chain[row], found.side[row]]],
            conductance=(float(branches.chain_conductance(chain)[0]), 0.0),
            raw=graph.source_point[point[branches.degree[point] < 3]],
        ),
    )
