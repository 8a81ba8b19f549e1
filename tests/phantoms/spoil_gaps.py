"""Gaps: between two ends, between an end and a side, and through vessels that run side by side."""

from __future__ import annotations

import numpy as np

from phantoms.draft import unit
from phantoms.lines import Defect, Spoiled
from phantoms.truth import ARTERY, arc

__all__ = ["gaps", "slab_gaps"]

_LEFT = 5.0  # radii of vessel that stay on either side of a gap, so that its direction can be seen


def gaps(
    lines: Spoiled, rng: np.random.Generator, strength: float = 10.0, count: int = 3, side: float = 0.35
) -> Spoiled:
    """Leave out stretches of vessels.

    Label: kind ``gap``; `raw` is (open end, other open end) or (open end, a point at the joint on
    the other vessel); answer ``bridge``, in veins ``ask``. Facts: `side` (bool), `length` (m, between
    the two points), `in_radii` (over the mean of both radii), `segment`, `other` (segment on
    the far side), `vessel_class`, `ends` (2, 3).

    Parameters
    ----------
    strength : float
        Longest gap in radii; lengths are uniform from 1 radius on.
    count : int
        How many, as far as there is room.
    side : float
        Share of gaps from an end to a side.
    """
    for _ in range(count):
        to_side = rng.random() < side
        length = rng.uniform(1.0, strength)
        for _ in range(40):
            i = int(rng.integers(len(lines.lines)))
            if lines.line_segment[i] < 0 or lines.truth.names[lines.line_segment[i]] == "fenestration":
                continue
            made = _side_gap(lines, i, length) if to_side else _end_gap(lines, i, length, rng.random())
            if made is not None:
                lines = made
                break
    return lines


def _end_gap(lines: Spoiled, i: int, length: float, where: float) -> Spoiled | None:
    """Cut a stretch of so many radii out of a line; None where it does not fit."""
    line = lines.lines[i]
    along, radius = arc(lines.points[line]), lines.radius[line]
    r = float(radius.mean())
    room = along[-1] - (2 * _LEFT + length) * r
    if room <= 0:
        return None
    begin = _LEFT * r + where * room
    a = int(np.searchsorted(along, begin, side="right")) - 1
    b = int(np.argmin(np.abs(along - along[a] - length * r)))
    return _cut(lines, i, a, b) if b > a + 1 else None


def _cut(lines: Spoiled, i: int, a: int, b: int) -> Spoiled | None:
    """Leave out what lies between two positions of a line; None where another defect is near."""
    line, segment = lines.lines[i], int(lines.line_segment[i])
    ends = int(line[a]), int(line[b])
    place, length = (
        lines.points[list(ends)].mean(axis=0),
        float(np.linalg.norm(np.diff(lines.points[list(ends)], axis=0))),
    )
    mean = float(lines.radius[list(ends)].mean())
    reach = length / 2 + 4 * mean
    if not lines.clear(place, reach):
        return None
    out = lines.with_lines((line[: a + 1], line[b:]), segment, int(lines.line_class[i]), instead_of=i)
    return out.with_defect(_label(lines, ends, place, reach, (segment, segment), False))


def _label(
    lines: Spoiled,
    ends: tuple[int, int],
    place: np.ndarray,
    reach: float,
    segments: tuple[int, int],
    side: bool,
) -> Defect:
    """The label of a gap."""
    length = float(np.linalg.norm(lines.points[ends[0]] - lines.points[ends[1]]))
    kind = int(lines.truth.vessel_class[segments[0]])
    facts = {
        "side": side,
        "length": length,
        "in_radii": length / float(lines.radius[list(ends)].mean())
        if not side
        else length / float(lines.radius[ends[0]]),
        "segment": segments[0],
        "other": segments[1],
        "vessel_class": kind,
        "ends": lines.points[list(ends)].copy(),
    }
    return Defect("gap", place, reach, ends, "bridge" if kind == ARTERY else "ask", facts)


def _side_gap(lines: Spoiled, i: int, length: float) -> Spoiled | None:
    """Take a branch off the vessel it leaves; the gap is counted in radii of the branch from the parent's axis."""
    truth, segment, line = lines.truth, int(lines.line_segment[i]), lines.lines[i]
    node = int(truth.segments[segment, 0])
    around = [j for j in range(truth.n_segments) if j != segment and node in truth.segments[j]]
    if truth.degree[node] != 3 or not np.allclose(lines.points[line[0]], truth.nodes[node]):
        return None
    if not _goes_on(truth, node, around, segment):
        return None
    along, r, parent = arc(lines.points[line]), float(lines.radius[line].mean()), float(truth.node_radius[node])
    wanted = max(length * r, 1.2 * parent)
    if along[-1] - wanted < _LEFT * r:
        return None
    b = int(np.searchsorted(along, wanted))
    others = (other[k] for other in lines.lines for k in (0, -1) if other is not line)
    joint = next((int(point) for point in others if _at(lines, point, node)), -1)
    if joint < 0:
        return None
    ends = int(line[b]), joint
    place = lines.points[list(ends)].mean(axis=0)
    reach = along[b] / 2 + 4 * parent
    if not lines.clear(place, reach):
        return None
    out = lines.with_lines((line[b:],), segment, int(lines.line_class[i]), instead_of=i)
    return out.with_defect(_label(lines, ends, place, reach, (segment, around[0]), True))


def _at(lines: Spoiled, point: int, node: int) -> bool:
    """Whether a raw point lies at a node of the truth."""
    return bool(np.allclose(lines.points[point], lines.truth.nodes[node], atol=1e-9))


def _goes_on(truth: object, node: int, around: list[int], branch: int) -> bool:
    """Whether the other two segments go straight on and neither is thinner than the branch."""
    ways, radii = [], []
    for segment in around:
        rows = truth.rows(segment)
        points, radius = truth.points[rows], truth.radius[rows]
        if truth.segments[segment, 1] == node:
            points, radius = points[::-1], radius[::-1]
        far = int(np.searchsorted(arc(points), 2 * radius[0]))
        ways.append(unit(points[min(far, len(points) - 1)] - points[0]))
        radii.append(radius[0])
    own = truth.radius[truth.rows(branch)][0]
    return bool(ways[0] @ ways[1] < -0.7 and min(radii) > 0.95 * own)


def slab_gaps(
    lines: Spoiled, rng: np.random.Generator, strength: float = 6.0, count: int = 1, within: float = 6.0
) -> Spoiled:
    """Lose a slab of the image across vessels that run side by side: each of two or more gets a gap.

    Labels as of :func:`gaps`, one per vessel, with the fact `slab` (number of vessels cut).

    Parameters
    ----------
    strength : float
        Thickness of the slab in radii of the vessel it is centred on, uniform from 2 on.
    count : int
        How many slabs, as far as vessels run side by side.
    within : float
        How far off another vessel may run, in radii.
    """
    for _ in range(count):
        for _ in range(60):
            made = _slab(lines, rng, rng.uniform(2.0, strength), within)
            if made is not None:
                lines = made
                break
    return lines


def _slab(lines: Spoiled, rng: np.random.Generator, length: float, within: float) -> Spoiled | None:
    """One slab about a random place of a random line; None where fewer than two vessels are cut cleanly."""
    i = int(rng.integers(len(lines.lines)))
    line = lines.lines[i]
    if lines.line_segment[i] < 0 or len(line) < 12:
        return None
    k = int(rng.integers(4, len(line) - 4))
    centre, r = lines.points[line[k]], float(lines.radius[line[k]])
    normal = unit(lines.points[line[k + 1]] - lines.points[line[k - 1]])
    cuts = []
    for j, other in enumerate(lines.lines):
        height = (lines.points[other] - centre) @ normal
        off = np.linalg.norm(lines.points[other] - centre - height[:, None] * normal, axis=1)
        inside = np.flatnonzero((np.abs(height) < length * r / 2) & (off < within * r))
        if len(inside) == 0 or lines.line_segment[j] < 0:
            continue
        a, b = int(inside[0]) - 1, int(inside[-1]) + 1
        if not _clean(lines, other, height, a, b):
            return None
        cuts.append((lines.line_segment[j], a, b))
    if len(cuts) < 2 or not lines.clear(centre, (length / 2 + within) * r):
        return None
    return _cut_all(lines, cuts, centre, (length / 2 + within) * r)


def _clean(lines: Spoiled, line: np.ndarray, height: np.ndarray, a: int, b: int) -> bool:
    """Whether a line goes straight through the slab with enough of it left on both sides."""
    if a < 0 or b >= len(line) or height[a] * height[b] > 0:
        return False
    along, r = arc(lines.points[line]), float(lines.radius[line].mean())
    straight = np.linalg.norm(lines.points[line[b]] - lines.points[line[a]]) > 0.8 * (along[b] - along[a])
    return bool(straight and along[a] > _LEFT * r and along[-1] - along[b] > _LEFT * r)


def _cut_all(lines: Spoiled, cuts: list[tuple[int, int, int]], centre: np.ndarray, reach: float) -> Spoiled | None:
    """Cut several lines; each label holds the whole slab as its reach."""
    out = lines
    for segment, a, b in cuts:
        i = int(np.flatnonzero(out.line_segment == segment)[0])
        if np.count_nonzero(out.line_segment == segment) != 1:
            return None
        line = out.lines[i]
        ends = int(line[a]), int(line[b])
        label = _label(out, ends, centre, reach, (int(segment), int(segment)), False)
        label.facts["slab"] = len(cuts)
        out = out.with_lines((line[: a + 1], line[b:]), int(segment), int(out.line_class[i]), instead_of=i)
        out = out.with_defect(label)
    return out
