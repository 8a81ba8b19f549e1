"""Copies of a vessel inside its lumen: lines that run along another one with its calibre."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from geomprep.errors import InputError
from geomprep.model import BoolArray, FloatArray, IntArray, PointGraph, Repair, anchor_ids
from geomprep.repair.branches import Branches
from geomprep.repair.edits import without_edges
from geomprep.repair.records import Change, recorded
from geomprep.repair.steps import Given, StepResult
from geomprep.repair.tubes import near_tubes
from geomprep.repair.verdicts import Verdict

__all__ = ["CopySettings", "drop_copies"]

_OPTIONS = _, _DROP = "leave", "drop"
_ARTERY = 1
_BEYOND = 1.25
_ALONG = np.cos(np.radians(30.0))


@dataclass(frozen=True)
class CopySettings:
    """When a line is a copy.

    Attributes
    ----------
    use : bool
        False leaves all lines.
    within : float
        A copy stays within this part of the radius of the vessel that it runs along.
    radius_ratio : float
        Largest ratio of their radii.

    Raises
    ------
    InputError
        A limit lies outside its range.
    """

    use: bool = True
    within: float = 0.6
    radius_ratio: float = 1.6

    def __post_init__(self) -> None:
        """Refuse limits outside their range."""
        if not 0.0 < self.within <= 1.0:
            raise InputError(f"repair.copies.within = {self.within:g}: must be above 0 and at most 1")
        if not 1.0 <= self.radius_ratio <= 3.0:
            raise InputError(f"repair.copies.radius_ratio = {self.radius_ratio:g}: must be between 1 and 3")


def drop_copies(graph: PointGraph, settings: CopySettings, given: Given) -> StepResult:
    """Drop separate lines that run inside a longer vessel of their class from end to end.

    Lines closer than that are fused when lines are joined. What a vessel carries is not changed: the copy
    adds no lumen. In veins, and where the class is not known, a person is asked: split sinuses and doubled
    veins are real.

    Parameters
    ----------
    graph : PointGraph
    settings : CopySettings
    given : Given

    Returns
    -------
    StepResult

    Examples
    --------
    A line 0.5 mm beside an artery of 1 mm radius:

    >>> from geomprep.model import Centrelines
    >>> from geomprep.repair import join
    >>> z = np.linspace(0, 60e-3, 121)[:, None] * [0, 0, 1.0]
    >>> graph = join(Centrelines.of_lines([z, z[40:80:2] + [0.5e-3, 0, 0]], 1e-3)).graph
    >>> drop_copies(graph, CopySettings(), Given()).graph.n_edges
    120
    """
    if not settings.use:
        return StepResult(graph)
    branches = given.branches(graph)
    chosen = _alone(branches)
    if len(chosen) == 0:
        return StepResult(graph)
    apart, ratio = _cover(branches, chosen)
    near = np.flatnonzero((apart <= _BEYOND * settings.within) & (ratio <= _BEYOND * settings.radius_ratio))
    ids = anchor_ids("copy", graph.raw_points, _anchors(branches, chosen[near]))
    repairs: list[Repair] = []
    dropped_by = np.full(graph.n_edges, -1, np.int64)
    protected = graph.protected.copy()
    for row, key in zip(near.tolist(), ids.tolist(), strict=True):
        if not given.verdicts.wanted(key, bool(apart[row] <= settings.within and ratio[row] <= settings.radius_ratio)):
            continue
        chain = chosen[row : row + 1]
        artery = graph.vessel_class[branches.ends[chain[0], 0]] == _ARTERY
        verdict = given.verdicts.settle(key, _OPTIONS, _DROP if artery else None)
        if verdict.choice == _DROP:
            dropped_by[branches.chain_edges(chain)[0]] = len(repairs)
        else:  # no later step bridges or drops what may be a doubled vessel
            protected[branches.ends[chain[0]]] = True
        found = float(apart[row]), float(ratio[row])
        repairs.append(_record(branches, chain, found, key, verdict))
    return StepResult(without_edges(replace(graph, protected=protected), dropped_by), tuple(repairs))


def _alone(branches: Branches) -> IntArray:
    """Chains with two open ends, and so a part of their own, without protected points."""
    alone = np.flatnonzero((branches.degree[branches.ends] == 1).all(axis=1))
    return alone[~branches.protected(alone)]


def _cover(branches: Branches, chosen: IntArray) -> tuple[FloatArray, FloatArray]:
    """Largest distance of each line from longer vessels in their radius, and the median ratio of radii."""
    graph, cut = branches.graph, branches.cut
    piece = np.flatnonzero(branches.chain[1:] == branches.chain[:-1])
    row, owner = branches.rows(chosen)
    point = cut.point[row]
    near = near_tubes(branches, piece, point, chosen[owner], 24)
    mine, theirs = graph.vessel_class[point][:, None], graph.vessel_class[cut.point[near.row]]
    allowed = (mine == theirs) & ~_shorter(branches, chosen, branches.chain[near.row], chosen[owner][:, None])
    allowed &= np.abs((near.way * _tangent(branches, row)[:, None]).sum(axis=2)) >= _ALONG
    apart = np.where(allowed, near.distance / near.radius, np.inf)
    best = np.argmin(apart, axis=1)[:, None]
    radius = np.take_along_axis(near.radius, best, axis=1)[:, 0]
    largest = np.zeros(len(chosen))
    np.maximum.at(largest, owner, np.take_along_axis(apart, best, axis=1)[:, 0])
    log_ratio = np.bincount(owner, np.log(radius / graph.radius[point])) / np.bincount(owner)
    return largest, np.exp(np.abs(log_ratio))


def _shorter(branches: Branches, chosen: IntArray, other: IntArray, own: IntArray) -> BoolArray:
    """Whether another line that stands alone, too, is the shorter of two: it covers nothing."""
    alone = np.zeros(branches.cut.n_chains, np.bool_)
    alone[chosen] = True
    length = branches.length
    shorter: BoolArray = alone[other] & (
        (length[other] < length[own]) | ((length[other] == length[own]) & (other > own))
    )
    return shorter


def _tangent(branches: Branches, row: IntArray) -> FloatArray:
    """Unit vectors along chains at rows, from the row before to the row after."""
    chain = branches.chain[row]
    before = np.maximum(row - 1, branches.cut.offsets[chain])
    after = np.minimum(row + 1, branches.cut.offsets[chain + 1] - 1)
    way = branches.graph.points[branches.cut.point[after]] - branches.graph.points[branches.cut.point[before]]
    tangent: FloatArray = way / np.maximum(np.linalg.norm(way, axis=1), np.finfo(float).tiny)[:, None]
    return tangent


def _anchors(branches: Branches, chain: IntArray) -> IntArray:
    """Raw points at both ends and the middle of each line."""
    offsets, point = branches.cut.offsets, branches.cut.point
    middle = point[(offsets[chain] + offsets[chain + 1] - 1) // 2]
    anchors: IntArray = branches.graph.source_point[np.concatenate((branches.ends[chain], middle[:, None]), axis=1)]
    return anchors


def _record(branches: Branches, chain: IntArray, found: tuple[float, float], key: str, verdict: Verdict) -> Repair:
    """The repair of one line."""
    graph = branches.graph
    point = branches.cut.point[branches.rows(chain)[0]]
    reason = (
        f"a line of {1e3 * branches.length[chain[0]]:.3g} mm runs along another, at most {found[0]:.2g} of its radius "
        f"off the axis, with {found[1]:.2g} times the other radius"
    )
    return recorded(
        "copy of a vessel",
        key,
        _OPTIONS,
        verdict,
        Change(
            reason=reason,
            place=graph.points[point[len(point) // 2]],
            conductance=(float(branches.chain_conductance(chain)[0]), 0.0),
            raw=graph.source_point[point],
        ),
    )
