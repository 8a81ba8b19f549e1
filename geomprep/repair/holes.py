"""Holes of a mask: two arms side by side that are one vessel, filled with their conductance kept."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from geomprep.errors import InputError
from geomprep.model import Basis, FloatArray, IntArray, PointGraph, Repair, anchor_ids
from geomprep.repair.branches import Branches, conductance
from geomprep.repair.edits import without_edges
from geomprep.repair.records import Change, recorded
from geomprep.repair.steps import Given, StepResult
from geomprep.repair.verdicts import Verdict

__all__ = ["HoleSettings", "fill_holes"]

_OPTIONS = _, _FILL = "leave", "fill"
_LOOKED_AT = 1.5
_SAMPLES = 9
_ONE_LUMEN = 0.5
"""Arms closer than this part of their smaller radius carry the radius of one and the same lumen."""


@dataclass(frozen=True)
class HoleSettings:
    """When two arms are one vessel.

    Attributes
    ----------
    use : bool
        False leaves all loops.
    apart_below : float
        Arms are one vessel where they are nowhere farther apart than this many sums of their radii …
    longest : float
        … and no longer than this many of these sums. Longer ones may be a real division.

    Raises
    ------
    InputError
        A limit lies outside its range.
    """

    use: bool = True
    apart_below: float = 0.8
    longest: float = 5.0

    def __post_init__(self) -> None:
        """Refuse limits outside their range."""
        if not 0.0 < self.apart_below <= 1.0:
            raise InputError(f"repair.holes.apart_below = {self.apart_below:g}: must be above 0 and at most 1")
        if not 0.0 < self.longest <= 20.0:
            raise InputError(f"repair.holes.longest = {self.longest:g}: must be above 0 and at most 20")


@dataclass(frozen=True, eq=False)
class _Pairs:
    """Pairs of chains between the same two junctions, the first the better conductor."""

    chain: IntArray  # (p, 2)
    turned: IntArray  # (p,) 1 where the second runs the other way
    apart: FloatArray  # largest distance in sums of both radii
    nearness: FloatArray  # largest distance in the smaller radius
    length: FloatArray  # of the longer arm in sums of both radii
    conductance: FloatArray  # (p, 2)


def fill_holes(graph: PointGraph, settings: HoleSettings, given: Given) -> StepResult:
    """Replace two arms whose tubes overlap by one vessel of their common conductance on their middle line.

    Where the arms lie so close that both carry the radius of the whole lumen, as around the corner of a
    voxel path, the better conductor alone is kept.

    Parameters
    ----------
    graph : PointGraph
    settings : HoleSettings
    given : Given

    Returns
    -------
    StepResult

    Examples
    --------
    A vessel whose middle is drawn as two arms 0.6 mm apart:

    >>> from geomprep.model import Centrelines
    >>> from geomprep.repair import join
    >>> t = np.linspace(0, 1, 9)
    >>> arms = [np.stack((x * np.sin(np.pi * t), 0 * t, 10 + 4 * t), axis=1) * 1e-3 for x in (0.3, -0.3)]
    >>> ends = [np.array([[0, 0, a], [0, 0, a + 5], [0, 0, a + 10.0]]) * 1e-3 for a in (0, 14)]
    >>> graph = join(Centrelines.of_lines([*ends, *arms], 1e-3)).graph
    >>> fill_holes(graph, HoleSettings(), Given()).graph.n_edges
    12
    """
    repairs: list[Repair] = []
    seen: set[str] = set()
    while settings.use:
        graph_after, found = _round(graph, settings, given, len(repairs), seen)
        repairs += found
        if graph_after is graph:
            break
        graph = graph_after
    return StepResult(graph, tuple(repairs))


def _round(
    graph: PointGraph, settings: HoleSettings, given: Given, number: int, seen: set[str]
) -> tuple[PointGraph, list[Repair]]:
    """Fill one pair of arms between each two junctions."""
    branches = given.branches(graph)
    pairs = _pairs(branches, settings)
    if len(pairs.apart) == 0:
        return graph, []
    ids = anchor_ids("hole", graph.raw_points, graph.source_point[_anchors(branches, pairs)])
    proposed = (pairs.apart <= settings.apart_below) & (pairs.length <= settings.longest)
    proposed &= ~branches.protected(pairs.chain[:, 1])
    dropped_by = np.full(graph.n_edges, -1, np.int64)
    points, radius, basis = graph.points.copy(), graph.radius.copy(), graph.radius_basis.copy()
    repairs: list[Repair] = []
    for row, key in enumerate(ids.tolist()):
        if key in seen or not given.verdicts.wanted(key, bool(proposed[row])):
            continue
        verdict = given.verdicts.settle(key, _OPTIONS, _FILL)
        filled = verdict.choice == _FILL
        if filled:
            dropped_by[branches.chain_edges(pairs.chain[row, 1:])[0]] = number + len(repairs)
            inner, place, size = _filled(branches, pairs, row)
            points[inner], radius[inner], basis[inner] = place, size, Basis.INTERPOLATED
        else:
            seen.add(key)
        repairs.append(_record(branches, pairs, row, key, verdict))
    if (dropped_by < 0).all():
        return graph, repairs
    return without_edges(replace(graph, points=points, radius=radius, radius_basis=basis), dropped_by), repairs


def _pairs(branches: Branches, settings: HoleSettings) -> _Pairs:
    """Two shortest chains between each pair of junctions, where they are short enough to be looked at."""
    graph, ends = branches.graph, branches.ends
    size = 2.0 * graph.radius[ends].max(axis=1)
    chosen = np.flatnonzero((branches.length <= _LOOKED_AT * settings.longest * size) & (ends[:, 0] != ends[:, 1]))
    low, high = ends[chosen].min(axis=1), ends[chosen].max(axis=1)
    order = chosen[np.lexsort((branches.length[chosen], high, low))]
    key = ends[order].min(axis=1) * np.int64(graph.n_points) + ends[order].max(axis=1)
    first = np.flatnonzero(np.diff(key, prepend=-1))
    first = first[np.append(key[1:] == key[:-1], False)[first]]
    chain = np.stack((order[first], order[first + 1]), axis=1) if len(first) else np.empty((0, 2), np.int64)
    flow = np.stack([branches.chain_conductance(chain[:, arm]) for arm in (0, 1)], axis=1)
    swap = _worse_first(branches, chain, flow)
    chain, flow = np.where(swap[:, None], chain[:, ::-1], chain), np.where(swap[:, None], flow[:, ::-1], flow)
    turned = (ends[chain[:, 0], 0] != ends[chain[:, 1], 0]).astype(np.int64)
    apart, nearness, total = _apart(branches, chain, turned)
    return _Pairs(chain, turned, apart, nearness, branches.length[chain].max(axis=1) / total, flow)


def _worse_first(branches: Branches, chain: IntArray, flow: FloatArray) -> np.ndarray:
    """Where the first arm should be the second: an arm with points between its ends leads, then the better conductor."""
    inner = np.diff(branches.cut.offsets)[chain] > 2
    return np.where(inner[:, 0] == inner[:, 1], flow[:, 1] > flow[:, 0], inner[:, 1])


def _apart(branches: Branches, chain: IntArray, turned: IntArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Largest distance between arms, in sums of radii and in the smaller radius, and the mean sum of radii."""
    count = len(chain)
    part = np.tile(np.linspace(0.0, 1.0, _SAMPLES), count)
    every = np.repeat(np.arange(count), _SAMPLES)
    place, size = [], []
    for arm, side in ((0, np.zeros(count, np.int64)), (1, turned)):
        where = chain[every, arm], side[every], part * branches.length[chain[every, arm]]
        place.append(branches.at(*where, branches.graph.points))
        size.append(branches.at(*where, branches.graph.radius))
    distance = np.linalg.norm(place[0] - place[1], axis=1)
    total = size[0] + size[1]
    shape = (count, _SAMPLES)
    return (
        (distance / total).reshape(shape).max(axis=1),
        (distance / np.minimum(*size)).reshape(shape).max(axis=1),
        total.reshape(shape).mean(axis=1),
    )


def _anchors(branches: Branches, pairs: _Pairs) -> IntArray:
    """Points whose raw coordinates name a pair: both junctions and the middle of each arm."""
    offsets, point = branches.cut.offsets, branches.cut.point
    middle = point[(offsets[pairs.chain] + offsets[pairs.chain + 1] - 1) // 2]
    return np.concatenate((branches.ends[pairs.chain[:, 0]], middle), axis=1)


def _filled(branches: Branches, pairs: _Pairs, row: int) -> tuple[IntArray, FloatArray, FloatArray]:
    """Points inside the first arm, where they come to lie, and their radius."""
    graph, chain = branches.graph, pairs.chain[row]
    rows, _ = branches.rows(chain[:1])
    point = branches.cut.point[rows]
    own = graph.points[point], graph.radius[point]
    inner = point[1:-1]
    if pairs.nearness[row] < _ONE_LUMEN or len(inner) == 0:
        return inner, own[0][1:-1], own[1][1:-1]
    part = branches.along[rows] / branches.length[chain[0]]
    where = np.full(len(point), chain[1]), np.full(len(point), pairs.turned[row]), part * branches.length[chain[1]]
    weight = pairs.conductance[row] / pairs.conductance[row].sum()
    place = weight[0] * own[0] + weight[1] * branches.at(*where, graph.points)
    place[[0, -1]] = own[0][[0, -1]]
    scale = _scale(place, own[1], float(pairs.conductance[row].sum()))
    return inner, place[1:-1], scale * own[1][1:-1]


def _scale(points: FloatArray, radius: FloatArray, wanted: float) -> float:
    """Factor on the radii between the ends with which a line has a certain conductance."""
    from scipy.optimize import brentq

    offsets = np.array([0, len(points)])

    def beyond(scale: float) -> float:
        size = np.concatenate((radius[:1], scale * radius[1:-1], radius[-1:]))
        return float(conductance(points, size, offsets)[0] / wanted - 1.0)

    return float(brentq(beyond, 0.2, 5.0)) if beyond(0.2) < 0.0 < beyond(5.0) else 1.0


def _record(branches: Branches, pairs: _Pairs, row: int, key: str, verdict: Verdict) -> Repair:
    """The repair of one pair of arms."""
    graph, one = branches.graph, pairs.nearness[row] < _ONE_LUMEN
    first, second = (branches.cut.point[branches.rows(pairs.chain[row, arm : arm + 1])[0]] for arm in (0, 1))
    both = float(pairs.conductance[row].sum())
    reason = (
        f"two arms of {1e3 * branches.length[pairs.chain[row]].max():.3g} mm are at most {pairs.apart[row]:.2g} sums "
        f"of their radii apart: {'one lumen drawn twice' if one else 'one vessel'}"
    )
    return recorded(
        "hole",
        key,
        _OPTIONS,
        verdict,
        Change(
            reason=reason,
            place=graph.points[first[len(first) // 2]],
            conductance=(both, float(pairs.conductance[row, 0]) if one else both),
            raw=graph.source_point[second[1:-1]],
        ),
    )
