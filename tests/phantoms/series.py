"""Repair whole series of phantoms under the settings that ship, and hold the outcome against the truth."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, field, replace

import numpy as np

from geomprep.model import PointGraph, Repair, chains
from geomprep.repair import Given, RadiusSettings, Verdicts, join, mend_graph, mend_radii
from phantoms.cases import Case, cases
from phantoms.judge import comparable, compare, resistance_errors, shape_of
from phantoms.lines import drawn
from phantoms.scores import (
    Score,
    bridges_in,
    greedy_bridges,
    kissing_left,
    score_bridges,
    spurs_left,
    true_ends_lost,
)
from phantoms.truth import Truth

__all__ = [
    "Kissing",
    "Mended",
    "Spurs",
    "Voxels",
    "clean_repairs",
    "gap_scores",
    "kissing",
    "mended",
    "mixed_bridges",
    "radius_errors",
    "spurs",
    "voxels",
]


@dataclass(frozen=True, eq=False)
class Mended:
    """A case after all repairs."""

    case: Case
    graph: PointGraph
    repairs: tuple[Repair, ...]

    @property
    def done(self) -> list[Repair]:
        """Repairs that changed something."""
        return [repair for repair in self.repairs if repair.choice != repair.options[0] or len(repair.options) == 1]


def mended(case: Case, verdicts: Verdicts | None = None, **settings: object) -> Mended:
    """Mend radii, join and run every step, with the settings that ship unless others are given."""
    known = verdicts or Verdicts()
    radius = mend_radii(case.centrelines, settings.get("radius") or RadiusSettings(), known)
    joined = join(radius.centrelines, settings.get("join"), known)
    voxel = float(case.voxels.voxel.max()) if case.voxels is not None else None
    result = mend_graph(joined.graph, settings, Given(known, voxel), (*joined.repairs, *radius.repairs))
    return Mended(case, result.graph, result.repairs)


def clean_repairs(kind: str, first: int, n: int) -> Counter[str]:
    """Repairs done or asked about in phantoms without any defect; should be none."""
    found = Counter()
    for case in cases(kind, first, n):
        found.update(repair.kind for repair in mended(case).repairs)
    return found


def gap_scores(kind: str, first: int, n: int, longest: float = 6.0) -> tuple[list[Score], list[Score]]:
    """Scores of bridges up to so many radii: those of the repair, and of joining the nearest first."""
    own, greedy = [], []
    for case in cases(kind, first, n):
        own.append(score_bridges(case.spoiled, bridges_in(mended(case).graph), longest=longest))
        greedy.append(score_bridges(case.spoiled, greedy_bridges(case.centrelines), longest=longest))
    return own, greedy


def mixed_bridges(kind: str, first: int, n: int) -> int:
    """Edges between an artery and a vein."""
    count = 0
    for case in cases(kind, first, n):
        graph = mended(case).graph
        pair = np.sort(graph.vessel_class[graph.edges], axis=1)
        count += int(((pair[:, 0] == 1) & (pair[:, 1] == 2)).sum())
    return count


@dataclass
class Spurs:
    """Planted spurs, those left, true ends and those lost."""

    planted: int = 0
    left: int = 0
    ends: int = 0
    lost: int = 0


def spurs(first: int, n: int) -> Spurs:
    """How many spurs go and how many true branches with them."""
    total = Spurs()
    for case in cases("spurs", first, n):
        graph = mended(case).graph
        lost, ends = true_ends_lost(case.truth, graph)
        total.planted += len(case.spoiled.of_kind("spur"))
        total.left += spurs_left(case.spoiled, graph)
        total.ends += ends
        total.lost += lost
    return total


@dataclass
class Kissing:
    """Planted contacts, those still joined, false partings, cases."""

    planted: int = 0
    left: int = 0
    false: int = 0
    cases: int = 0


def kissing(kind: str, first: int, n: int) -> Kissing:
    """How many contacts are parted, and how many true joins with them."""
    total = Kissing()
    for case in cases(kind, first, n):
        result = mended(case)
        planted, left = len(case.spoiled.of_kind("kissing")), kissing_left(case.spoiled, result.graph)
        parted = sum(repair.kind == "kissing vessels" for repair in result.done)
        total.planted += planted
        total.left += left
        total.false += max(0, parted - (planted - left))
        total.cases += 1
    return total


def radius_errors(first: int, n: int) -> np.ndarray:
    """Relative error of the resistance of every segment after outliers of the radius are mended, against the clean lines."""
    errors = []
    for case in cases("radius", first, n):
        clean = join(drawn(case.truth).centrelines()).graph
        found = join(mend_radii(case.centrelines, RadiusSettings(), Verdicts()).centrelines).graph
        errors.append(_per_chain(found) / _per_chain(clean) - 1.0)
    return np.concatenate(errors)


def _per_chain(graph: PointGraph) -> np.ndarray:
    """Resistance of each chain, in the order of the edges of the lines."""
    cut = chains(graph.n_points, graph.edges)
    return np.add.reduceat(shape_of(graph).resistance[cut.edge], cut.edge_offsets[:-1])


@dataclass
class Voxels:
    """Voxel phantoms: exact topologies, those whose skeleton reaches all open ends, and errors of resistance."""

    cases: int = 0
    exact: int = 0
    reached: int = 0
    exact_reached: int = 0
    faults: Counter[str] = field(default_factory=Counter)
    errors: list[np.ndarray] = field(default_factory=list)
    errors_reached: list[np.ndarray] = field(default_factory=list)


def voxels(kind: str, first: int, n: int, noise: float = 0.35) -> Voxels:
    """Mend skeletons of masks; the noise of their positions is a part of the voxel."""
    from geomprep.repair.paths import PathSettings

    total = Voxels()
    for case in cases(kind, first, n):
        if not comparable(case.truth):
            continue
        edge = float(case.voxels.voxel.max())
        graph = mended(case, paths=PathSettings(noise * edge)).graph
        found = compare(case.truth, graph, slack=2 * edge)
        ends = case.truth.nodes[case.truth.open_ends]
        near = np.linalg.norm(case.centrelines.points[:, None] - ends[None], axis=2).min(axis=0)
        reached = bool((near <= 2 * case.truth.node_radius[case.truth.open_ends] + 2 * edge).all())
        total.cases += 1
        total.exact += found.exact
        total.reached += reached
        total.exact_reached += found.exact and reached
        if not found.exact:
            total.faults[_fault(found, reached)] += 1
        else:
            true = case.voxels.axis_radius()
            total.errors.append(resistance_errors(true, graph))
            total.errors_reached.append(resistance_errors(as_far_as(true, graph), graph))
    return total


def _fault(found: object, reached: bool) -> str:
    """What is wrong, in a word."""
    if not reached:
        return "the skeleton does not reach an open end"
    if found.true_parts != found.found_parts:
        return "parts"
    if found.true_loops != found.found_loops:
        return "loops"
    return "junctions" if not found.junctions.exact else "open ends"


def as_far_as(truth: Truth, graph: PointGraph) -> Truth:
    """The truth cut off at its open ends where the graph ends: what thinning took off is left out on both sides."""
    ends = shape_of(graph).open_ends
    pieces, radii, nodes = [], [], truth.nodes.copy()
    for segment, pair in enumerate(truth.segments):
        rows = truth.rows(segment)
        points, radius = truth.points[rows], truth.radius[rows]
        first, last = 0, len(points) - 1
        for side, node in enumerate(pair):
            if truth.degree[node] == 1:
                tip = ends[np.argmin(np.linalg.norm(ends - truth.nodes[node], axis=1))]
                row = int(np.argmin(np.linalg.norm(points - tip, axis=1)))
                first, last = (min(row, last - 1), last) if side == 0 else (first, max(row, first + 1))
                nodes[node] = points[first if side == 0 else last]
        pieces.append(points[first : last + 1])
        radii.append(radius[first : last + 1])
    offsets = np.concatenate(([0], np.cumsum([len(piece) for piece in pieces])))
    return replace(truth, points=np.concatenate(pieces), radius=np.concatenate(radii), offsets=offsets, nodes=nodes)
