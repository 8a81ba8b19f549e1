"""Spurs, copies of trunks, false loops, stray parts: lines that no vessel is behind."""

from __future__ import annotations

import numpy as np

from phantoms.draft import turned, unit
from phantoms.lines import Defect, Spoiled
from phantoms.truth import ARTERY, arc

__all__ = ["cliques", "copies", "holes", "spurs", "stray_parts"]


def _site(
    lines: Spoiled, rng: np.random.Generator, margin: float, length: float = 0.0
) -> tuple[int, int, int, float] | None:
    """A random stretch of a line: (line, first, last position, radius); margins and length in radii."""
    for _ in range(60):
        i = int(rng.choice(len(lines.lines), p=_weights(lines)))
        line = lines.lines[i]
        along, r = arc(lines.points[line]), float(np.median(lines.radius[line]))
        room = along[-1] - (2 * margin + length) * r
        if room <= 0 or lines.truth.names[lines.line_segment[i]] == "fenestration":
            continue
        a = int(np.searchsorted(along, margin * r + rng.random() * room))
        b = int(np.searchsorted(along, along[a] + length * r))
        place = lines.points[line[[a, min(b, len(line) - 1)]]].mean(axis=0)
        if b < len(line) and lines.clear(place, (length / 2 + margin / 2) * r):
            return i, a, b, r
    return None


def _weights(lines: Spoiled) -> np.ndarray:
    """Chance of each line: its number of points, none for false lines."""
    weight = np.array([len(line) for line in lines.lines], float) * (lines.line_segment >= 0)
    return weight / weight.sum()


def spurs(
    lines: Spoiled, rng: np.random.Generator, strength: float = 0.8, count: int = 4, inside: float = 0.5
) -> Spoiled:
    """Plant short branches that leave the axis of a vessel and end in its tube or just outside.

    Label: kind ``spur``; `raw` are its points from the axis to the tip; answer ``drop``. Facts:
    `length`, `outside` (m, beyond the parent's tube), `outside_in_radii` (of its own radius),
    `own_radius`, `parent_radius`.

    Parameters
    ----------
    strength : float
        Longest part outside the parent's tube in own radii.
    count : int
    inside : float
        Share of spurs that end within the tube.
    """
    for _ in range(count):
        site = _site(lines, rng, 3.0)
        if site is None:
            break
        i, k, _, _ = site
        line = lines.lines[i]
        base, parent = lines.points[line[k]], float(lines.radius[line[k]])
        tangent = unit(lines.points[line[k + 1]] - lines.points[line[k - 1]])
        angle = rng.uniform(0.9, np.pi / 2)
        way = turned(tangent, angle, rng.uniform(0, 2 * np.pi))
        own = rng.uniform(0.25, 0.5) * parent
        outside = 0.0 if rng.random() < inside else rng.uniform(0.05, strength) * own
        length = (parent if outside else rng.uniform(0.4, 0.95) * parent) / np.sin(angle) + outside
        t = np.linspace(0, 1, max(3, round(length / 0.4e-3) + 1))
        curve = base + length * t[:, None] * way + np.sin(np.pi * t)[:, None] * rng.normal(0, 0.04 * length, 3)
        curve[0] = base
        lines, numbers = lines.with_points(curve, np.where(t == 0, parent, own))
        facts = {"length": float(length), "outside": outside, "outside_in_radii": outside / own}
        facts |= {"own_radius": own, "parent_radius": parent}
        lines = lines.with_lines((numbers,), -1, int(lines.line_class[i]))
        lines = lines.with_defect(Defect("spur", base, 2 * parent + length, tuple(map(int, numbers)), "drop", facts))
    return lines


def copies(
    lines: Spoiled, rng: np.random.Generator, strength: float = 0.04, count: int = 2, exact: float = 0.5
) -> Spoiled:
    """Draw stretches of vessels a second time, at the same points or beside them.

    Label: kind ``copy``; `raw` are the points of the copy; answer ``fuse``, for a near copy of a
    vein ``ask``. Facts: `exact` (bool), `offset_in_radii` (largest distance from the axis),
    `length`, `segment`.

    Parameters
    ----------
    strength : float
        Largest distance of a near copy from the axis in radii; it starts and ends there, too.
    count : int
    exact : float
        Share of exact copies.
    """
    for _ in range(count):
        site = _site(lines, rng, 1.0, rng.uniform(5.0, 10.0))
        if site is None:
            break
        i, a, b, r = site
        stretch, kind = lines.lines[i][a : b + 1], int(lines.line_class[i])
        same = rng.random() < exact
        place = lines.points[stretch].mean(axis=0)
        reach = float(np.linalg.norm(np.ptp(lines.points[stretch], axis=0))) / 2 + r
        length = float(arc(lines.points[stretch])[-1])
        facts = {"exact": same, "offset_in_radii": 0.0, "length": length, "segment": int(lines.line_segment[i])}
        if same:
            lines, numbers = lines.with_copies(stretch)
        else:
            lines, numbers, facts["offset_in_radii"] = _beside(lines, rng, stretch, strength)
        if rng.random() < 0.5:
            numbers = numbers[::-1]
        lines = lines.with_lines((numbers,), -1, kind)
        answer = "fuse" if same or kind == ARTERY else "ask"
        lines = lines.with_defect(Defect("copy", place, reach, tuple(map(int, numbers)), answer, facts))
    return lines


def _beside(
    lines: Spoiled, rng: np.random.Generator, stretch: np.ndarray, strength: float
) -> tuple[Spoiled, np.ndarray, float]:
    """Points beside a stretch, sampled differently; their largest distance from it in radii."""
    along, radius = arc(lines.points[stretch]), lines.radius[stretch]
    at = np.linspace(0, along[-1], max(4, round(len(stretch) * rng.uniform(0.7, 1.4))))
    axis = np.column_stack([np.interp(at, along, lines.points[stretch, k]) for k in range(3)])
    own = np.interp(at, along, radius)
    tangent = unit(np.gradient(axis, axis=0))
    turn = rng.uniform(0, 2 * np.pi) + np.linspace(0, rng.normal(0, 1.5), len(at))
    side = np.array([turned(t, np.pi / 2, angle) for t, angle in zip(tangent, turn, strict=True)])
    offset = strength * rng.uniform(0.4, 1.0)
    grown, numbers = lines.with_points(axis + offset * own[:, None] * side, own * rng.uniform(0.95, 1.05))
    return grown, numbers, float(offset)


def cliques(lines: Spoiled, rng: np.random.Generator, strength: float = 0.4, count: int = 2) -> Spoiled:
    """Turn junctions of three lines into small triangles, as 26-neighbour graphs have them.

    Label: kind ``clique``; `raw` are the six copies of its three corners; answer ``collapse``.
    Facts: `node`, `size` (m, side of the triangle).

    Parameters
    ----------
    strength : float
        Largest distance of a corner from the junction, in parts of its radius.
    count : int
    """
    truth = lines.truth
    for node in rng.permutation(np.flatnonzero(truth.degree == 3)):
        at = [(i, k) for i, line in enumerate(lines.lines) for k in (0, -1) if _near(lines, line[k], truth.nodes[node])]
        r, place = float(truth.node_radius[node]), truth.nodes[node]
        if count == 0 or len(at) != 3 or not lines.clear(place, 3 * r):
            continue
        lines, count = _clique(lines, at, place, strength * rng.uniform(0.5, 1.0) * r, int(node)), count - 1
    return lines


def _near(lines: Spoiled, point: int, place: np.ndarray) -> bool:
    """Whether a raw point lies at a place."""
    return bool(np.linalg.norm(lines.points[point] - place) < 1e-9)


def _clique(lines: Spoiled, at: list[tuple[int, int]], place: np.ndarray, size: float, node: int) -> Spoiled:
    """Move the three ends apart and join each with each."""
    corners, old, kind = [], list(lines.lines), int(lines.line_class[at[0][0]])
    for i, k in at:
        line = old[i] if k == 0 else old[i][::-1]
        away = np.linalg.norm(lines.points[line] - place, axis=1)
        far = int(np.argmax(away > 1.5 * size)) or len(line) - 1
        corner = place + size * unit(lines.points[line[far]] - place)
        lines, (number,) = lines.with_points(corner[None], lines.radius[line[0]])
        rest = np.append(number, line[far:])
        old[i] = rest if k == 0 else rest[::-1]
        corners.append(int(number))
    lines = _with(lines, old)
    raw = list(corners)
    for a, b in ((0, 1), (1, 2), (2, 0)):
        lines, pair = lines.with_copies(np.array([corners[a], corners[b]]))
        lines = lines.with_lines((pair,), -1, kind)
        raw += map(int, pair)
    side = float(np.linalg.norm(lines.points[corners[0]] - lines.points[corners[1]]))
    facts = {"node": node, "size": side}
    reach = 3 * float(lines.truth.node_radius[node])
    return lines.with_defect(Defect("clique", place, reach, tuple(raw), "collapse", facts))


def _with(lines: Spoiled, changed: list[np.ndarray]) -> Spoiled:
    """The same lines through other points."""
    from dataclasses import replace

    return replace(lines, lines=tuple(changed))


def holes(lines: Spoiled, rng: np.random.Generator, strength: float = 0.3, count: int = 1) -> Spoiled:
    """Split a short stretch into two arms whose tubes overlap, as a hole in the mask does.

    Label: kind ``hole``; `raw` are the points of both arms; answer ``fill``. Facts: `segment`,
    `length`, `apart_in_radii` (largest distance between the arms).

    Parameters
    ----------
    strength : float
        Largest distance of an arm from the axis, in radii. The arms are half as wide as the vessel.
    count : int
    """
    for _ in range(count):
        site = _site(lines, rng, 4.0, rng.uniform(1.5, 3.0))
        if site is None or site[2] - site[1] < 3:
            continue
        i, a, b, r = site
        line, kind = lines.lines[i], int(lines.line_class[i])
        stretch = lines.points[line[a : b + 1]]
        wave = np.sin(np.pi * np.linspace(0, 1, b - a + 1))[1:-1, None]
        side = turned(unit(stretch[-1] - stretch[0]), np.pi / 2, rng.uniform(0, 2 * np.pi))
        out = strength * rng.uniform(0.6, 1.0)
        arms = []
        for sign in (1.0, -1.0):
            lines, numbers = lines.with_points(stretch[1:-1] + sign * out * r * wave * side, 0.5 * r)
            arms.append(numbers)
        lines, ends = lines.with_copies(line[[a, b]])
        changed = list(lines.lines)
        changed[i] = np.concatenate((line[: a + 1], arms[0], line[b:]))
        lines = _with(lines, changed).with_lines((np.concatenate((ends[:1], arms[1], ends[1:])),), -1, kind)
        length = float(arc(stretch)[-1])
        facts = {"segment": int(lines.line_segment[i]), "length": length, "apart_in_radii": 2 * out}
        raw = (*map(int, arms[0]), *map(int, ends), *map(int, arms[1]))
        lines = lines.with_defect(Defect("hole", stretch.mean(axis=0), length / 2 + 2 * r, raw, "fill", facts))
    return lines


def stray_parts(lines: Spoiled, rng: np.random.Generator, strength: float = 8.0, count: int = 2) -> Spoiled:
    """Plant short lines away from all vessels.

    Label: kind ``stray``; `raw` are its points; answer ``drop``. Facts: `length`, `volume`, `radius`.

    Parameters
    ----------
    strength : float
        Longest in mm; the shortest is 1.5 mm.
    count : int
    """
    low, high = lines.points.min(axis=0), lines.points.max(axis=0)
    for _ in range(60 * count):
        if count == 0:
            break
        length, radius = 1e-3 * rng.uniform(1.5, strength), 1e-3 * rng.uniform(0.3, 0.8)
        way = unit(rng.normal(size=3))
        t = np.linspace(-0.5, 0.5, max(4, round(length / 0.5e-3) + 1))
        curve = rng.uniform(low - 5e-3, high + 5e-3) + length * t[:, None] * way
        curve += np.outer(t**2, 0.5 * length * unit(rng.normal(size=3)))
        apart = np.linalg.norm(lines.points[:, None] - curve[None], axis=2) - np.nan_to_num(lines.radius)[:, None]
        if apart.min() < 6e-3:
            continue
        count -= 1
        kind = int(lines.line_class[0])
        lines, numbers = lines.with_points(curve, radius)
        own = float(arc(curve)[-1])
        facts = {"length": own, "volume": np.pi * radius**2 * own, "radius": radius}
        lines = lines.with_lines((numbers,), -1, kind)
        lines = lines.with_defect(Defect("stray", curve.mean(axis=0), own, tuple(map(int, numbers)), "drop", facts))
    return lines
