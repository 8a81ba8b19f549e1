"""Gaps: open ends that face an open end or the side of a vessel, scored, matched, bridged, asked or left."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.errors import InputError
from geomprep.findings import Finding, Severity
from geomprep.model import FloatArray, PointGraph, Repair, anchor_ids
from geomprep.repair.branches import Branches
from geomprep.repair.bridges import Bridge, bridge_lines, with_bridges
from geomprep.repair.matching import best_matching
from geomprep.repair.open_ends import Links, Tips, end_links, side_links, tips
from geomprep.repair.records import Change, recorded
from geomprep.repair.steps import Given, StepResult
from geomprep.repair.verdicts import Zones

__all__ = ["GapSettings", "close_gaps"]

LEAVE, BRIDGE, THREAD, INTERPOLATE = "leave", "bridge", "thread of one voxel", "interpolate"
_ARTERY = 1
_BEYOND = 1.25
"""Candidates are looked for so much farther than the limit, so that recorded ones are found when it has moved."""
_LENGTH, _ANGLE, _SIDE_ANGLE, _RATIO = 8.0, np.radians(40.0), np.radians(25.0), 0.35
"""Scales of the score: gap in radii, angle at either of two ends, angle before a side, ln of the ratio of radii."""
_ROOT = 0.1
"""ln of the ratio by which a root may be narrower than the widest open end of its part."""


@dataclass(frozen=True)
class GapSettings:
    """When a gap is bridged.

    Attributes
    ----------
    use : bool
        False leaves all gaps.
    accept_above : float
        Score from which a gap in an artery is bridged.
    ask_above : float
        Score from which a person is asked; below, nothing is said. Gaps in veins, and in vessels of no known
        class, are asked at best.
    loop_above : float
        Score that a bridge between two ends needs in the place of `accept_above` where it closes a loop.
    longest : float
        Longest gap in radii.

    Raises
    ------
    InputError
        A value lies outside its range.
    """

    use: bool = True
    accept_above: float = 0.5
    ask_above: float = 0.45
    loop_above: float = 0.6
    longest: float = 10.0

    def __post_init__(self) -> None:
        """Refuse values outside their range."""
        Zones(self.accept_above, self.ask_above)
        if not 0.0 <= self.loop_above <= 1.0:
            raise InputError(f"repair.gaps.loop_above = {self.loop_above:g}: must be between 0 and 1")
        if not 0.0 < self.longest <= 50.0:
            raise InputError(f"repair.gaps.longest = {self.longest:g}: must be above 0 and at most 50")


@dataclass(frozen=True, eq=False)
class _Chosen:
    """Matched candidates with their score, id, and what the rule says of each."""

    links: Links
    score: FloatArray
    ids: list[str]
    proposal: list[str | None]  # None asks


def close_gaps(graph: PointGraph, settings: GapSettings, given: Given) -> StepResult:
    """Bridge gaps between open ends, and between open ends and sides.

    Every open end takes part in one bridge at most: of all sets of such bridges the one of the highest
    total score is taken, not the nearest pair first. Only one vessel class is joined. A gap in a vein is
    never bridged without a decision: the smaller of two sides often shows none of its flow.

    Parameters
    ----------
    graph : PointGraph
    settings : GapSettings
    given : Given

    Returns
    -------
    StepResult

    Notes
    -----
    The score is exp(−½[(d/8)² + (α² + β²)/(40°)² + (ln(a/b)/0.35)²]) with the length d of the gap in mean
    radii, the angles α and β between the link and the way out of each end, and the radii a and b. At a side the
    scale of the angle is 25°, d counts from the vessel's tube, a branch narrower than the vessel is no evidence
    against it, and an end that is not the widest of its part, and so not its root, counts as differing.
    Distance, direction and calibre as evidence are common practice; the scales are set on phantoms.

    Examples
    --------
    An artery of 1 mm radius in two pieces, 4 mm apart:

    >>> from geomprep.model import Centrelines
    >>> from geomprep.repair import join
    >>> z = np.arange(0, 45)[:, None] * [0, 0, 1e-3]
    >>> lines = Centrelines.of_lines([z[:21], z[24:]], 1e-3)
    >>> (repair,) = close_gaps(join(lines).graph, GapSettings(), Given()).repairs
    >>> print(f"{repair.choice} {repair.score:.3f}")
    bridge 0.882
    """
    if not settings.use:
        return StepResult(graph)
    branches = given.branches(graph)
    found = tips(branches)
    links = _candidates(branches, found, settings)
    if len(links.tip) == 0:
        return StepResult(graph)
    chosen = _chosen(graph, found, links, settings, given)
    repairs: list[Repair] = []
    bridges: list[tuple[int, Bridge]] = []
    for row, key in enumerate(chosen.ids):
        options = _options(graph, found, chosen.links, row, given)
        verdict = given.verdicts.settle(key, options, chosen.proposal[row])
        line = _line(graph, found, chosen.links, row, (verdict.choice, given.voxel))
        repairs.append(
            recorded(
                "gap",
                key,
                options,
                verdict,
                Change(
                    reason=_reason(branches, found, chosen, row),
                    place=0.5 * (line.points[0] + line.points[-1]),
                    conductance=(0.0, line.conductance),
                    score=float(chosen.score[row]),
                ),
            )
        )
        if verdict.choice != LEAVE:
            bridges.append((row, line))
    assumed = tuple(
        _assumed(repairs[row]) for row, line in bridges if graph.vessel_class[list(line.ends)].min() != _ARTERY
    )
    return StepResult(with_bridges(graph, [line for _, line in bridges]), tuple(repairs), assumed)


def _candidates(branches: Branches, found: Tips, settings: GapSettings) -> Links:
    """Links worth a score, the best one of each end with each other chain."""
    reach = _BEYOND * settings.longest
    to_ends = end_links(branches.graph, found, reach)
    to_sides = side_links(branches, found, reach)
    score = _score(to_sides)
    order = np.lexsort((branches.graph.source_point[to_sides.point], -score, to_sides.tip))
    first = order[np.flatnonzero(np.diff(to_sides.tip[order], prepend=-1))]
    every = Links(
        *(
            np.concatenate((getattr(to_ends, name), getattr(to_sides, name)[first]))
            for name in Links.__dataclass_fields__
        )
    )
    return every.rows(_score(every) >= 0.75 * min(settings.ask_above, GapSettings.ask_above))


def _score(links: Links) -> FloatArray:
    """Between 0 and 1; a branch that is wider than the side it meets counts as differing."""
    ratio: FloatArray = np.where(links.other >= 0, links.ratio, np.maximum(links.ratio, 0.0))
    spread = np.where(links.other >= 0, _ANGLE, _SIDE_ANGLE)
    cost = (links.in_radii / _LENGTH) ** 2 + (links.angle / spread) ** 2 + (links.far_angle / spread) ** 2
    cost += (ratio / _RATIO) ** 2 + (np.maximum(links.not_root - _ROOT, 0.0) / _RATIO) ** 2
    score: FloatArray = np.exp(-0.5 * cost)
    return score


def _chosen(graph: PointGraph, found: Tips, links: Links, settings: GapSettings, given: Given) -> _Chosen:
    """The best matching, recorded candidates before all others."""
    score = _score(links)
    source = graph.source_point[np.stack((found.point[links.tip], links.point), axis=1)]
    ids = anchor_ids("gap", graph.raw_points, source)
    recorded = np.array([key in given.verdicts.recorded for key in ids.tolist()])
    wanted = (score >= settings.ask_above) & (links.in_radii <= settings.longest)
    allowed = recorded | (wanted & (not given.verdicts.complete))
    weight = score * np.where(links.other >= 0, 2.0, 1.0) + 1e3 * recorded  # a bridge between ends explains both
    taken = np.flatnonzero(allowed)[best_matching(links.rows(allowed), weight[allowed])]
    taken = taken[np.lexsort((taken, -score[taken]))]
    proposal = _proposals(graph, found, links.rows(taken), score[taken], settings)
    listed = [number for number, choice in enumerate(proposal) if choice != LEAVE or recorded[taken[number]]]
    rows = taken[listed]
    return _Chosen(links.rows(rows), score[rows], ids[rows].tolist(), [proposal[number] for number in listed])


def _proposals(
    graph: PointGraph, found: Tips, links: Links, score: FloatArray, settings: GapSettings
) -> list[str | None]:
    """What the rule says of each link, best first: bridge, ask (None) or leave."""
    root: dict[int, int] = {}

    def top(part: int) -> int:
        while part in root:
            part = root[part]
        return part

    proposals: list[str | None] = []
    for row in range(len(score)):
        ends = found.point[links.tip[row]], links.point[row]
        one, other = (top(int(found.part[end])) for end in ends)
        loop, to_side = one == other, links.other[row] < 0
        needed = settings.loop_above if loop else settings.accept_above
        artery = bool((graph.vessel_class[list(ends)] == _ARTERY).all())
        if loop and (to_side or score[row] < needed):
            proposals.append(LEAVE)
        elif artery and score[row] >= needed:
            proposals.append(BRIDGE)
        else:
            proposals.append(None)
        if proposals[-1] == BRIDGE and not loop:
            root[one] = other
    return proposals


def _options(graph: PointGraph, found: Tips, links: Links, row: int, given: Given) -> tuple[str, ...]:
    """What can be done with a gap."""
    if graph.vessel_class[found.point[links.tip[row]]] == _ARTERY:
        return (LEAVE, BRIDGE)
    return (LEAVE, THREAD, INTERPOLATE) if given.voxel else (LEAVE, INTERPOLATE)


def _line(graph: PointGraph, found: Tips, links: Links, row: int, how: tuple[str, float | None]) -> Bridge:
    """The line across a gap; a thread is half a voxel in radius."""
    choice, voxel = how
    tip = int(links.tip[row])
    other = int(links.other[row])
    ways = found.way[tip], found.way[other] if other >= 0 else None
    thin = 0.5 * voxel if choice == THREAD and voxel else None
    return bridge_lines(graph, (int(found.point[tip]), int(links.point[row])), ways, thin)


def _assumed(repair: Repair) -> Finding:
    """What a decided bridge outside arteries is: an assumption."""
    return Finding(
        "bridged by assumption",
        Severity.WARNING,
        f"a stretch that the image does not show is bridged by assumption ({repair.choice}, {repair.id}): what flows there "
        "rests on a decision, not on a measurement",
        where=repair.id,
        position=repair.position,
    )


def _reason(branches: Branches, found: Tips, chosen: _Chosen, row: int) -> str:
    """What speaks for a bridge, and what it would connect."""
    links = chosen.links
    tip, to_side = int(links.tip[row]), links.other[row] < 0
    angles = f"{np.degrees(links.angle[row]):.0f}°"
    if not to_side:
        angles += f" and {np.degrees(links.far_angle[row]):.0f}°"
    what = "an open end and the side of a vessel" if to_side else "two open ends"
    joined = "closes a loop" if links.same_part[row] else f"connects {_smaller_part(branches, found, links, row)}"
    ratio = float(np.exp(-links.ratio[row]))
    return (
        f"{what} lie {1e3 * links.distance[row]:.3g} mm ({links.in_radii[row]:.2g} radii) apart, {angles} off their "
        f"directions, radii {1e3 * found.radius[tip]:.3g} and {1e3 * ratio * found.radius[tip]:.3g} mm; a bridge {joined}"
    )


def _smaller_part(branches: Branches, found: Tips, links: Links, row: int) -> str:
    """Length of the shorter of the two parts that a bridge would join."""
    part = found.part[branches.ends[:, 0]]
    of = [found.part[found.point[links.tip[row]]], found.part[links.point[row]]]
    length = min(float(branches.length[part == number].sum()) for number in of)
    return f"a part of {1e3 * length:.3g} mm"
