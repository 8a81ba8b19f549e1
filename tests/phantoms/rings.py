"""Arterial rings with feeding and leaving vessels, and fenestrations in them."""

from __future__ import annotations

import numpy as np

from phantoms.draft import Draft, Row, even, turned, unit
from phantoms.trees import Growth, grow
from phantoms.truth import Truth, arc

__all__ = ["fenestrate", "fenestration_length", "ring"]

_STATIONS = 9
# radius in mm at the ring's nodes: front joint, sides, back joint; thin links between
_WIDE = ((0.9, 1.3), (0.9, 1.3), (1.1, 1.5), (0.6, 0.9), (1.0, 1.3), (1.0, 1.3), (0.6, 0.9), (1.1, 1.5))


def ring(seed: int, growth: Growth | None = None, size: float = 1.0, fenestrations: int | None = None) -> Truth:
    """Return a ring fed by three vessels from below, with trees outwards and two vessels side by side in front.

    Parameters
    ----------
    seed : int
    growth : Growth, optional
        Rules of the trees and holes; no radius falls below its `smallest`.
    size : float
        1: a perimeter of 80 to 97 mm. Published mean 88.6 mm (jkns.or.kr number 4459, SEEN
        through the reference notes).
    fenestrations : int, optional
        How many; 0 to 2 at random. Half are shorter than 5 mm, see :func:`fenestration_length`.

    Raises
    ------
    ValueError
        The lengths drawn do not fit any vessel as wide as the smallest.
    """
    rules = growth or Growth(depth=1, length=(8.0, 13.0))
    wish = np.random.default_rng([seed, 6])  # apart from the attempts: a redrawn ring keeps its fenestrations
    count = int(wish.integers(3)) if fenestrations is None else fenestrations
    lengths = sorted((fenestration_length(wish) for _ in range(count)), reverse=True)
    if count and lengths[-1] < _shortest(rules.smallest, rules):
        raise ValueError(f"no vessel of {rules.smallest:g} mm or more can hold a fenestration of {lengths[-1]:.1f} mm")
    for attempt in range(300):
        rng = np.random.default_rng([seed, attempt, 3])
        draft = Draft()
        corners = _corners(draft, rng, size)
        _sides(draft, rng, corners, rules)
        fed = _feeders(draft, rng, corners, rules)
        if draft.collisions(0, rules.gap) or not _outward(draft, rng, corners, rules):
            continue
        if all(any(_try_fenestration(draft, rng, rules, length) for _ in range(15)) for length in lengths):
            return draft.truth("ring", seed, (fed,))
    raise RuntimeError(f"seed {seed}: no ring without collisions in 300 attempts")


def _corners(draft: Draft, rng: np.random.Generator, size: float) -> list[int]:
    """Eight nodes around an ellipse, number 0 in front."""
    a, b = size * rng.uniform(12.0, 14.5), size * rng.uniform(13.5, 16.5)
    angle = np.array([-0.13, 0.13, 0.95, 1.75, 2.72, 3.56, 4.53, 5.33]) + rng.normal(0, 0.02, 8)
    lift = size * rng.normal(0, 0.8, 8)
    return [draft.node([a * np.sin(t), b * np.cos(t), z]) for t, z in zip(angle, lift, strict=True)]


def _sides(draft: Draft, rng: np.random.Generator, corners: list[int], growth: Growth) -> None:
    """The sides of the ring as one closed smooth curve, cut at its corners."""
    from scipy.interpolate import CubicSpline

    places = np.array([draft.nodes[corner] for corner in corners])
    turn = np.arange(len(corners) + 1)
    closed = CubicSpline(turn, np.vstack((places, places[:1])), bc_type="periodic")
    for i, bounds in enumerate(_WIDE):
        curve = even(closed(np.linspace(i, i + 1, 200)))
        middle = closed(i + 0.5) - places.mean(axis=0)
        wave = np.sin(np.pi * arc(curve) / arc(curve)[-1])[:, None] ** 2
        curve = even(curve + wave * rng.normal(0, 0.05 * np.linalg.norm(middle), 3))
        radius = max(growth.smallest, rng.uniform(*bounds))
        draft.add((corners[i], corners[(i + 1) % len(corners)]), curve, radius, "ring")


def _feeders(draft: Draft, rng: np.random.Generator, corners: list[int], growth: Growth) -> int:
    """Two vessels that rise at the sides and one that rises to the middle of the back; the root is the last."""
    for corner in (corners[2], corners[7]):
        _rising(draft, rng, corner, max(growth.smallest, rng.uniform(1.6, 2.2)))
    back = draft.nodes[corners[4]] / 2 + draft.nodes[corners[5]] / 2
    host = next(i for i, row in enumerate(draft.rows) if (row.start, row.end) == (corners[4], corners[5]))
    row = draft.rows.pop(host)
    at = int(np.argmin(np.linalg.norm(row.points - back, axis=1)))
    joint = draft.node(row.points[at])
    draft.add((row.start, joint), row.points[: at + 1], row.radius[: at + 1], "ring")
    draft.add((joint, row.end), row.points[at:], row.radius[at:], "ring")
    return _rising(draft, rng, joint, max(growth.smallest, rng.uniform(1.4, 1.8)))


def _rising(draft: Draft, rng: np.random.Generator, corner: int, radius: float) -> int:
    """Add a vessel from below to a node, drawn from its far end; return that end."""
    place = draft.nodes[corner]
    length = rng.uniform(9, 12) * radius
    outwards = unit(place * [1, 1, 0]) * 0.25
    low = place + length * unit(outwards + np.array([0, 0, -1]) + rng.normal(0, 0.08, 3))
    t = np.linspace(0, 1, 50)[:, None]
    sway = np.sin(np.pi * t) * rng.normal(0, 0.06 * length, 3)
    curve = even(low + t * (place - low) + sway)
    end = draft.node(low)
    draft.add((end, corner), curve, np.linspace(1.05, 1.0, len(curve)) * radius, "feeding")
    return end


def _outward(draft: Draft, rng: np.random.Generator, corners: list[int], growth: Growth) -> bool:
    """Trees at the other corners; those in front run side by side. False where one has no room."""
    for number in (3, 4, 5, 6):
        place = draft.nodes[corners[number]]
        way = unit(unit(place * [1, 1, 0]) + np.array([0, 0, rng.uniform(0.3, 0.7)]))
        radius = max(growth.smallest * 1.2, rng.uniform(0.8, 1.3))
        if not any(
            grow(draft, rng, corners[number], turned(way, 0.15, rng.uniform(0, 6)), radius, growth) for _ in "12345"
        ):
            return False
    return _front_pair(draft, rng, corners, growth)


def _front_pair(draft: Draft, rng: np.random.Generator, corners: list[int], growth: Growth) -> bool:
    """Two vessels that leave in front and run up side by side."""
    first = len(draft.rows)
    radius = max(growth.smallest * 1.2, rng.uniform(0.9, 1.2))
    length = rng.uniform(15, 22) * radius
    apart = (2 * radius + growth.gap) * rng.uniform(1.05, 1.25)
    left, right = draft.nodes[corners[0]], draft.nodes[corners[1]]
    middle = (left + right) / 2
    sway = rng.normal(0, 0.1, 3) * length
    for corner, side in ((corners[0], -1.0), (corners[1], 1.0)):
        place = draft.nodes[corner]
        t = np.linspace(0, 1, 80)[:, None]
        course = middle + length * (t * [0, 0.35, 0.9] + t**2 * [0, -0.25, 0.15]) + np.sin(np.pi * t) * sway * [0, 1, 1]
        blend = np.clip(t / 0.35, 0, 1) ** 2 * (3 - 2 * np.clip(t / 0.35, 0, 1))
        curve = even((1 - blend) * (place - middle) + blend * [side * apart / 2, 0, 0] + course)
        curve[:, 0] += side * 0.04 * arc(curve) * np.clip(arc(curve) / length - 0.6, 0, None)
        own = radius * rng.uniform(0.9, 1.0)
        own = max(own, growth.smallest)
        draft.add((corner, draft.node(curve[-1])), curve, own, "front")
    return draft.collisions(first, growth.gap) == 0


def fenestration_length(rng: np.random.Generator) -> float:
    """Length of a fenestration in mm, 2 to 12.

    Of 80 published, 43 were below 5 mm, 12 from 5 to 10 and 25 of 10 mm or more
    (doi:10.3389/fneur.2022.986167, SEEN through the reference notes).
    """
    low, high = ((2.0, 5.0), (5.0, 10.0), (10.0, 12.0))[rng.choice(3, p=np.array([43, 12, 25]) / 80)]
    return float(rng.uniform(low, high))


def _try_fenestration(draft: Draft, rng: np.random.Generator, growth: Growth, length: float) -> bool:
    """Put a fenestration into a random segment that can hold it (in place)."""
    hosts = [i for i, row in enumerate(draft.rows) if _holds(row, length, growth)]
    if not hosts:
        return False
    before = draft.rows.copy(), draft.nodes.copy()
    first = len(draft.rows) - 1
    fenestrate(draft, rng, int(rng.choice(hosts)), length, growth)
    if draft.collisions(first, 0.1):
        draft.rows[:], draft.nodes[:] = before
        return False
    return True


def _holds(row: Row, length: float, growth: Growth) -> bool:
    """Whether a segment has room for a fenestration beyond its branching zones, and is thin enough for it."""
    radius = float(row.radius.mean())
    return row.name in ("ring", "trunk", "daughter", "front", "feeding") and (
        length >= _shortest(radius, growth) and arc(row.points)[-1] >= length + 6 * radius
    )


def _shortest(radius: float, growth: Growth) -> float:
    """Shortest fenestration that a vessel can hold without arms that leave it square."""
    return 3.0 * radius + 2.0 * (growth.hole - 0.2)


def fenestrate(draft: Draft, rng: np.random.Generator, host: int, length: float, growth: Growth) -> None:
    """Replace the middle of a segment by two arms around a hole (in place)."""
    row = draft.rows.pop(host)
    along = arc(row.points)
    margin = 2.5 * row.radius.max()
    begin = rng.uniform(margin, along[-1] - length - margin)
    i, j = np.searchsorted(along, (begin, begin + length))
    a, b = draft.node(row.points[i]), draft.node(row.points[j])
    draft.add((row.start, a), row.points[: i + 1], row.radius[: i + 1], row.name, row.vessel_class)
    draft.add((b, row.end), row.points[j:], row.radius[j:], row.name, row.vessel_class)
    share = rng.uniform(0.4, 0.6)
    tangent = unit(row.points[j] - row.points[i])
    side = turned(tangent, np.pi / 2, rng.uniform(0, 2 * np.pi))
    whole = row.radius[(i + j) // 2]
    first, second = (max(growth.smallest, whole * part ** (1 / growth.exponent)) for part in (share, 1 - share))
    hole = 0.35 * min(first, second) + growth.hole
    wave = np.sin(np.pi * np.linspace(0, 1, j - i + 1))[:, None]
    for own, sign in ((first, 1.0), (second, -1.0)):
        curve = even(row.points[i : j + 1] + sign * wave * side * (first + second + hole) / 2)
        draft.add((a, b), curve, own, "fenestration", row.vessel_class)
