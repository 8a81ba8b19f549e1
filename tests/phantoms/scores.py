"""Scores of repairs by the labels of planted defects, and greedy joining for comparison."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from geomprep.model import Basis, Centrelines, PointGraph
from phantoms.judge import matched, shape_of
from phantoms.lines import Defect, Spoiled
from phantoms.truth import Truth

__all__ = [
    "Score",
    "bridges_in",
    "greedy_bridges",
    "kissing_left",
    "score_bridges",
    "spurs_left",
    "total",
    "true_ends_lost",
]


@dataclass(frozen=True)
class Score:
    """Counts of right, false and missed answers."""

    right: int
    false: int
    missed: int

    @property
    def precision(self) -> float:
        """Right of all given; 1 where none is given."""
        return self.right / (self.right + self.false) if self.right + self.false else 1.0

    @property
    def recall(self) -> float:
        """Right of all wanted; 1 where none is wanted."""
        return self.right / (self.right + self.missed) if self.right + self.missed else 1.0

    @property
    def balanced(self) -> float:
        """Harmonic mean of precision and recall."""
        both = self.precision + self.recall
        return 2 * self.precision * self.recall / both if both else 0.0


def total(scores: list[Score]) -> Score:
    """Add counts."""
    return Score(*(sum(getattr(score, name) for score in scores) for name in ("right", "false", "missed")))


def bridges_in(graph: PointGraph) -> np.ndarray:
    """(b, 2, 3) places at both ends of every run of interpolated edges in a graph.

    Only runs between points that came from the file count as bridges.
    """
    import networkx as nx

    added = graph.edges[graph.edge_basis == Basis.INTERPOLATED]
    runs = nx.Graph(added.tolist())
    found = []
    for part in nx.connected_components(runs):
        ends = sorted(point for point in part if graph.source_point[point] >= 0)
        found += [(graph.points[a], graph.points[b]) for a, b in pairwise(ends)]
    return np.array(found).reshape(-1, 2, 3)


def score_bridges(
    spoiled: Spoiled, bridges: np.ndarray, longest: float = np.inf, answers: tuple[str, ...] = ("bridge",)
) -> Score:
    """Score bridges by the labelled gaps.

    A bridge is right when its ends lie at the labelled ends: within half a radius at an open
    end, and at a side within two radii of the vessel there (and half the gap at least).

    Parameters
    ----------
    spoiled : Spoiled
    bridges : (b, 2, 3) array
        Places at both ends, metres.
    longest : float
        Gaps of more radii are not wanted, yet not wrong to bridge either.
    answers : tuple of str
        Which gaps are wanted; bridges of other gaps are false.
    """
    gaps = [defect for defect in spoiled.of_kind("gap") if defect.answer in answers]
    left, right, spare = list(bridges), 0, 0
    for gap in sorted(gaps, key=lambda defect: defect.facts["in_radii"]):
        fits = [k for k, bridge in enumerate(left) if _fits(spoiled, gap, bridge)]
        wanted = gap.facts["in_radii"] <= longest
        if fits:
            left.pop(fits[0])
            right, spare = right + wanted, spare + (not wanted)
    wanted = sum(gap.facts["in_radii"] <= longest for gap in gaps)
    return Score(right, len(left), wanted - right)


def _fits(spoiled: Spoiled, gap: Defect, bridge: np.ndarray) -> bool:
    """Whether a bridge joins the two ends of a gap."""
    first, second = spoiled.points[list(gap.raw)]
    own, other = (spoiled.true_radius[raw] for raw in gap.raw)
    far = max(2 * other, 0.5 * gap.facts["length"]) if gap.facts["side"] else 0.5 * other
    apart = np.linalg.norm(bridge[:, None] - np.array([first, second])[None], axis=2)
    straight = apart[0, 0] < 0.5 * own and apart[1, 1] < far
    return bool(straight or (apart[1, 0] < 0.5 * own and apart[0, 1] < far))


def greedy_bridges(centrelines: Centrelines, reach: float = 6.0, sides: bool = True) -> np.ndarray:
    """(b, 2, 3) bridges by joining the nearest first: the baseline that a repair must beat.

    Every open end may be joined once, to another open end or to any point of another line (or farther
    along its own than `reach`), within one class, nearest first.

    Parameters
    ----------
    reach : float
        Longest bridge in radii of the open end.
    sides : bool
        False: ends to ends only.
    """
    shape = shape_of(centrelines)
    tips = np.flatnonzero(shape.degree == 1)
    kind = _class_of(centrelines, shape.points)
    own = _own_run(shape, tips, reach)
    candidates = []
    for i, tip in enumerate(tips):
        apart = np.linalg.norm(shape.points - shape.points[tip], axis=1)
        near = (apart < reach * shape.radius[tip]) & (kind == kind[tip]) & ~own[i]
        if not sides:
            near &= shape.degree == 1
        candidates += [(float(apart[j]), int(tip), int(j)) for j in np.flatnonzero(near)]
    used: set[int] = set()
    bridges = []
    for _, a, b in sorted(candidates):
        if a in used or b in used:
            continue
        used.add(a)
        if shape.degree[b] == 1:
            used.add(b)
        bridges.append((shape.points[a], shape.points[b]))
    return np.array(bridges).reshape(-1, 2, 3)


def _class_of(centrelines: Centrelines, places: np.ndarray) -> np.ndarray:
    """Class of the lines at each place."""
    line = np.repeat(np.arange(centrelines.n_lines), np.diff(centrelines.offsets))
    order = {tuple(place): k for k, place in enumerate(places.tolist())}
    kind = np.zeros(len(places), int)
    for point, number in zip(centrelines.connectivity, line, strict=True):
        kind[order[tuple(centrelines.points[point].tolist())]] = centrelines.vessel_class[number]
    return kind


def _own_run(shape: object, tips: np.ndarray, reach: float) -> np.ndarray:
    """(t, n) whether a point is on the own run of a tip, within the reach and half as much again along it."""
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import dijkstra

    ends = shape.points[shape.edges]
    length = np.linalg.norm(ends[:, 0] - ends[:, 1], axis=1)
    n = len(shape.points)
    matrix = coo_array((length, shape.edges.T), shape=(n, n)).tocsr()
    limit = 1.5 * reach * shape.radius[tips]
    way = dijkstra(matrix, directed=False, indices=tips, limit=float(limit.max()))
    return way < limit[:, None]


def spurs_left(spoiled: Spoiled, graph: PointGraph) -> int:
    """Planted spurs whose tip is still an open end of the graph."""
    ends = shape_of(graph).open_ends
    left = 0
    for spur in spoiled.of_kind("spur"):
        tip, base = spoiled.points[spur.raw[-1]], spoiled.points[spur.raw[0]]
        left += bool((np.linalg.norm(ends - tip, axis=1) < 0.5 * np.linalg.norm(tip - base)).any())
    return left


def true_ends_lost(truth: Truth, graph: PointGraph, names: tuple[str, ...] = ("twig", "daughter")) -> tuple[int, int]:
    """(lost, all): open ends of true segments of some names that the graph lacks, within two radii."""
    ends = [
        int(node)
        for segment, pair in enumerate(truth.segments)
        for node in pair
        if truth.names[segment] in names and truth.degree[node] == 1
    ]
    if not ends:
        return 0, 0
    return len(matched(truth.nodes[ends], shape_of(graph).open_ends, 2 * truth.node_radius[ends]).missed), len(ends)


def kissing_left(spoiled: Spoiled, graph: PointGraph) -> int:
    """Planted contacts at which the two vessels are still joined within four sums of their radii."""
    import networkx as nx

    left = 0
    for contact in spoiled.of_kind("kissing"):
        near = np.linalg.norm(graph.points - contact.place, axis=1) < contact.reach
        inside = nx.Graph(graph.edges[near[graph.edges].all(axis=1)].tolist())
        first, _, second, _ = (_point_at(graph, spoiled, raw) for raw in contact.facts["through"])
        left += first in inside and second in inside and nx.has_path(inside, first, second)
    return left


def _point_at(graph: PointGraph, spoiled: Spoiled, raw: int) -> int:
    """Graph point nearest to a raw point."""
    return int(np.argmin(np.linalg.norm(graph.points - spoiled.points[raw], axis=1)))
