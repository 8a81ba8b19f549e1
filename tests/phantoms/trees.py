"""Random arterial trees in space whose radii follow Murray's relation; vessels that pass them by."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from phantoms.draft import Draft, bent, even, turned, unit
from phantoms.truth import ARTERY, VEIN, Truth

__all__ = ["Growth", "crossing_vessels", "grow", "murray_tree"]


@dataclass(frozen=True)
class Growth:
    """How a tree grows, lengths in mm.

    Attributes
    ----------
    smallest : float
        No vessel is thinner; a branching that would need a thinner one is not made.
    depth : int
        Branchings after one another.
    gap : float
        Room between tubes outside branching zones.
    length : (float, float)
        Shortest and longest segment, in radii of the segment.
    twigs : float
        Share of branchings at which a thin short branch leaves a vessel that goes on.
    flat : (3,) array, optional
        Normal of the layer that the tree keeps to.
    hole : float
        Room between the walls of the arms of a fenestration, in mm, beside 0.35 of the thinner arm's radius.
    exponent : float
        r₀ˣ = r₁ˣ + r₂ˣ. The range 2.33 (above 1 mm) to 3 (least work) is Nakamura and
        Awa 2014, PMC3966250, SEEN through the reference notes.
    """

    smallest: float = 0.5
    depth: int = 4
    gap: float = 0.8
    length: tuple[float, float] = (8.0, 15.0)
    twigs: float = 0.2
    flat: np.ndarray | None = None
    hole: float = 0.2
    exponent: float = 2.7


def murray_tree(seed: int, root_radius: float | None = None, growth: Growth | None = None) -> Truth:
    """Return a random tree; its tubes touch in branching zones only.

    Parameters
    ----------
    seed : int
    root_radius : float, optional
        In mm; 1.8 to 3.5 at random.
    growth : Growth, optional
        With a random exponent when left out.
    """
    for attempt in range(50):
        rng = np.random.default_rng([seed, attempt, 1])
        radius = root_radius or rng.uniform(1.8, 3.5)
        rules = growth or Growth(exponent=rng.uniform(2.33, 3.0))
        draft = Draft()
        grow(draft, rng, draft.node(np.zeros(3)), np.array([0.0, 0.0, 1.0]), radius, rules)
        if len(draft.rows) >= 7:
            return draft.truth("tree", seed, (0,))
    raise RuntimeError(f"seed {seed}: no tree of seven segments in 50 attempts")


def grow(
    draft: Draft, rng: np.random.Generator, node: int, direction: np.ndarray, radius: float, growth: Growth
) -> bool:
    """Grow a trunk and its branches from a node (in place); return whether the trunk found room."""
    first = len(draft.rows)
    end, leaving = _segment(draft, rng, (node, direction, radius), growth, "trunk")
    if draft.collisions(first, growth.gap):
        del draft.rows[first:], draft.nodes[end:]
        return False
    tips = [(end, leaving, draft.rows[-1].radius[-1], growth.depth)]
    while tips:
        node, direction, radius, left = tips.pop(0)
        for _ in range(12 if left else 0):
            first, known = len(draft.rows), len(draft.nodes)
            made = _fork(draft, rng, (node, direction, radius), growth)
            if made and not draft.collisions(first, growth.gap):
                tips += [(*tip, left - 1) for tip in made if tip[2] > 0]
                break
            del draft.rows[first:], draft.nodes[known:]
    return True


_Tip = tuple[int, np.ndarray, float]


def _fork(draft: Draft, rng: np.random.Generator, tip: _Tip, growth: Growth) -> list[_Tip]:
    """Two daughters, or a twig and the vessel that goes on; empty where they would be too thin."""
    node, direction, radius = tip
    if rng.random() < growth.twigs:
        return _twig(draft, rng, tip, growth)
    ratio = rng.uniform(0.6, 1.0)
    large = radius * (1 + ratio**growth.exponent) ** (-1 / growth.exponent)
    small = ratio * large
    if small < growth.smallest:
        return []
    azimuth = rng.uniform(0, 2 * np.pi)
    made = []
    for own, other, side in ((large, small, 0.0), (small, large, np.pi)):
        angle = max(_least_work_angle(radius, own, other) + rng.normal(0, 0.12), 0.3)
        way = _flattened(turned(direction, angle, azimuth + side), growth)
        end, leaving = _segment(draft, rng, (node, way, own), growth, "daughter")
        made.append((end, leaving, float(draft.rows[-1].radius[-1])))
    return made


def _twig(draft: Draft, rng: np.random.Generator, tip: _Tip, growth: Growth) -> list[_Tip]:
    """A short thin branch that ends two and a half to six of its radii outside the tube of its parent."""
    node, direction, radius = tip
    own = max(growth.smallest, rng.uniform(0.25, 0.45) * radius)
    if own > 0.6 * radius:
        return []
    goes_on = (radius**growth.exponent - own**growth.exponent) ** (1 / growth.exponent)
    angle, azimuth = rng.uniform(1.0, 1.5), rng.uniform(0, 2 * np.pi)
    way = turned(direction, angle, azimuth)
    length = radius / np.sin(angle) + rng.uniform(2.5, 6.0) * own
    start = draft.nodes[node]
    curve = bent(start, way, turned(way, rng.uniform(0, 0.3), rng.uniform(0, 2 * np.pi)), length)
    draft.add((node, draft.node(curve[-1])), curve, own, "twig")
    onward = _flattened(turned(direction, rng.uniform(0, 0.2), azimuth + np.pi), growth)
    end, leaving = _segment(draft, rng, (node, onward, goes_on), growth, "daughter")
    return [(end, leaving, float(draft.rows[-1].radius[-1]))]


def _segment(draft: Draft, rng: np.random.Generator, tip: _Tip, growth: Growth, name: str) -> tuple[int, np.ndarray]:
    """Add one curved, slightly tapering segment; return its end node and the direction there."""
    node, direction, radius = tip
    length = rng.uniform(*growth.length) * radius
    leaving = _flattened(turned(direction, rng.uniform(0, 0.6), rng.uniform(0, 2 * np.pi)), growth)
    curve = bent(draft.nodes[node], direction, leaving, length)
    last = max(rng.uniform(0.92, 1.0) * radius, growth.smallest)
    end = draft.node(curve[-1])
    draft.add((node, end), curve, np.linspace(radius, min(last, radius), len(curve)), name)
    return end, leaving


def _least_work_angle(parent: float, own: float, other: float) -> float:
    """Angle to the parent's direction by least tube volume, Murray 1926 (J Gen Physiol 9:835), from MEMORY."""
    cosine = (parent**4 + own**4 - other**4) / (2 * parent**2 * own**2)
    return float(np.arccos(np.clip(cosine, 0.1, 1.0)))


def _flattened(direction: np.ndarray, growth: Growth) -> np.ndarray:
    """Direction bent towards the layer of the tree, where it keeps to one."""
    if growth.flat is None:
        return direction
    return unit(direction - 0.75 * (direction @ growth.flat) * growth.flat)


def crossing_vessels(
    seed: int, root_radius: float | None = None, growth: Growth | None = None, classes: tuple[int, ...] = (ARTERY, VEIN)
) -> Truth:
    """Return a tree and one to three single vessels that touch it in passing, each a part of its own.

    The wall of a passing vessel comes within 2 to 12 % of the sum of both radii to the wall of the tree,
    at 35° to 90°, and its radius differs by a quarter or more. Their classes are drawn from `classes`.
    """
    tree = murray_tree(seed, root_radius, growth)
    for attempt in range(200):
        rng = np.random.default_rng([seed, attempt, 2])
        draft, roots = thawed(tree), [0]
        for _ in range(int(rng.integers(1, 4))):
            first, known = len(draft.rows), len(draft.nodes)
            _passing(draft, rng, int(rng.choice(classes)))
            if draft.collisions(first, 0.01):
                del draft.rows[first:], draft.nodes[known:]
            else:
                roots.append(known)
        if len(roots) > 1:
            return draft.truth("crossing", seed, tuple(roots))
    raise RuntimeError(f"seed {seed}: no room for a passing vessel in 200 attempts")


def _passing(draft: Draft, rng: np.random.Generator, vessel_class: int) -> None:
    """Add a vessel that passes a random place of the tree."""
    row = draft.rows[int(rng.integers(sum(row.name != "passing" for row in draft.rows)))]
    at = int(rng.uniform(0.35, 0.65) * len(row.points))
    radius = row.radius[at] * (rng.uniform(0.45, 0.75) if rng.random() < 0.5 else rng.uniform(1.3, 1.7))
    radius = float(np.clip(radius, 0.5, 4.0))
    tangent = unit(row.points[at + 1] - row.points[at - 1])
    side = turned(tangent, np.pi / 2, rng.uniform(0, 2 * np.pi))
    centre = row.points[at] + side * (row.radius[at] + radius) * rng.uniform(1.02, 1.12)
    across = rng.uniform(0.6, np.pi / 2)
    way = np.cos(across) * tangent + np.sin(across) * np.cross(tangent, side)
    far, s = rng.uniform(9, 14) * radius, np.linspace(-1, 1, 80)[:, None]
    curve = even(centre + far * s * way + side * rng.uniform(0.02, 0.06) * far * s**2)
    draft.add((draft.node(curve[0]), draft.node(curve[-1])), curve, radius, "passing", vessel_class)


def thawed(truth: Truth) -> Draft:
    """A truth as a draft again, to be added to."""
    draft = Draft([node * 1e3 for node in truth.nodes])
    for i, (a, b) in enumerate(truth.segments):
        rows = truth.rows(i)
        draft.add(
            (a, b), truth.points[rows] * 1e3, truth.radius[rows] * 1e3, truth.names[i], int(truth.vessel_class[i])
        )
    return draft
