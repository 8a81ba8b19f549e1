"""Kissing vessels: a false link or a shared point between two vessels that only pass one another."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from phantoms.draft import node_distances, unit
from phantoms.lines import Defect, Spoiled
from phantoms.truth import arc

__all__ = ["kissing"]


def kissing(
    lines: Spoiled, rng: np.random.Generator, strength: float = 1.4, count: int = 2, shared: float = 0.5
) -> Spoiled:
    """Join vessels where they pass one another.

    Label: kind ``kissing``; `raw` is (point on the first vessel, point on the second, points of the
    link …); answer ``part``. Facts: `style` (``link`` or ``shared point``), `segments`, `classes`,
    `through` (raw points three radii before and after on the first vessel, then on the second),
    `apart` (m, between the true axes), `apart_in_radii` (over the sum of both radii).

    Parameters
    ----------
    strength : float
        Vessels whose axes are farther apart than this many sums of their radii are not joined.
    count : int
        How many, as far as vessels pass one another.
    shared : float
        Share of shared points; both vessels then bend to meet there. The others get a link of one
        or two points.
    """
    for a, b in _passes(lines, strength):
        place = (lines.points[a] + lines.points[b]) / 2
        reach = 4 * float(lines.radius[a] + lines.radius[b])
        if count == 0 or not lines.clear(place, reach):
            continue
        through = (*_either_side(lines, a), *_either_side(lines, b))
        if min(through) < 0:
            continue
        count -= 1
        apart = float(np.linalg.norm(lines.points[a] - lines.points[b]))
        facts = {"segments": (int(lines.segment[a]), int(lines.segment[b])), "through": through, "apart": apart}
        facts["classes"] = tuple(int(lines.truth.vessel_class[segment]) for segment in facts["segments"])
        facts["apart_in_radii"] = apart / float(lines.radius[a] + lines.radius[b])
        if rng.random() < shared:
            lines, raw, facts["style"] = _met(lines, a, b), (a, b), "shared point"
        else:
            lines, raw = _linked(lines, a, b, int(rng.integers(1, 3)))
            facts["style"] = "link"
        lines = lines.with_defect(Defect("kissing", place, reach, raw, "part", facts))
    return lines


def _passes(lines: Spoiled, strength: float) -> list[tuple[int, int]]:
    """Closest raw points of vessels that pass one another, the closest in sums of radii first."""
    from scipy.spatial import cKDTree

    truth = lines.truth
    own = np.flatnonzero(lines.segment >= 0)
    pairs = cKDTree(lines.points[own]).query_pairs(strength * 2 * lines.radius[own].max(), output_type="ndarray")
    a, b = own[pairs[:, 0]], own[pairs[:, 1]]
    ratio = np.linalg.norm(lines.points[a] - lines.points[b], axis=1) / (lines.radius[a] + lines.radius[b])
    keep = (ratio < strength) & (lines.segment[a] != lines.segment[b])
    a, b, ratio = a[keep], b[keep], ratio[keep]
    between = node_distances(len(truth.nodes), truth.segments, truth.lengths)
    ends, length = truth.segments, truth.lengths
    i, j = lines.segment[a], lines.segment[b]
    way = np.full(len(a), np.inf)
    for p, to_p in ((0, lines.along[a]), (1, length[i] - lines.along[a])):
        for q, to_q in ((0, lines.along[b]), (1, length[j] - lines.along[b])):
            way = np.minimum(way, to_p + between[ends[i, p], ends[j, q]] + to_q)
    far = way > 12 * np.maximum(lines.radius[a], lines.radius[b])
    best: dict[tuple[int, int], tuple[float, int, int]] = {}
    for p, q, value in zip(a[far], b[far], ratio[far], strict=True):
        key = tuple(sorted((int(lines.segment[p]), int(lines.segment[q]))))
        best[key] = min(best.get(key, (np.inf, -1, -1)), (float(value), int(p), int(q)))
    return [(p, q) for _, p, q in sorted(best.values())]


def _either_side(lines: Spoiled, point: int) -> tuple[int, int]:
    """Raw points three radii before and after a point on its line; −1 where the line ends before that."""
    for line in lines.lines:
        at = np.flatnonzero(line == point)
        if len(at):
            away = arc(lines.points[line])
            away = away - away[at[0]]
            far = 3 * float(lines.radius[point])
            if away[0] > -far or away[-1] < far:
                return -1, -1
            return int(line[np.searchsorted(away, -far, side="right") - 1]), int(line[np.searchsorted(away, far)])
    return -1, -1


def _met(lines: Spoiled, a: int, b: int) -> Spoiled:
    """Bend both vessels smoothly so that they pass through one place between them."""
    weight = lines.radius[b] / (lines.radius[a] + lines.radius[b])  # the thinner one gives way more
    middle = lines.points[a] * (1 - weight) + lines.points[b] * weight
    points = lines.points.copy()
    for point in (a, b):
        same = lines.segment == lines.segment[point]
        span = 3 * float(lines.radius[a] + lines.radius[b])
        away = np.clip(np.abs(lines.along - lines.along[point]) / span, 0, 1)
        bump = np.where(same, np.cos(np.pi * away / 2) ** 2, 0.0)
        points += np.nan_to_num(bump)[:, None] * (middle - lines.points[point])
        points[point] = middle
    for node in lines.truth.segments.ravel():  # where bends reach a joint, its copies stay at one place
        copies = np.flatnonzero((np.abs(lines.points - lines.truth.nodes[node]) < 1e-9).all(axis=1))
        points[copies] = lines.points[copies]
    return replace(lines, points=points)


def _linked(lines: Spoiled, a: int, b: int, inner: int) -> tuple[Spoiled, tuple[int, ...]]:
    """Draw a short line from a point on one vessel to a point on the other."""
    kind = int(lines.truth.vessel_class[lines.segment[a]])
    t = np.linspace(0, 1, inner + 2)[1:-1, None]
    between = lines.points[a] + t * (lines.points[b] - lines.points[a])
    thin = 0.6 * min(float(lines.radius[a]), float(lines.radius[b]))
    gap = unit(lines.points[b] - lines.points[a])
    between = between + 0.05 * thin * np.roll(gap, 1)
    lines, numbers = lines.with_points(between, thin)
    lines, ends = lines.with_copies(np.array([a, b]))
    lines = lines.with_lines((np.concatenate((ends[:1], numbers, ends[1:])),), -1, kind)
    return lines, (a, b, *map(int, ends[:1]), *map(int, numbers), *map(int, ends[1:]))
