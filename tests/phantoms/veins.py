"""Venous outflow of the head: two inlets, a confluence, two arms, parallel routes and collaterals."""

from __future__ import annotations

import numpy as np

from phantoms.draft import Draft, even
from phantoms.rings import fenestrate
from phantoms.trees import Growth
from phantoms.truth import VEIN, Truth

__all__ = ["venous_outflow"]

# way points in mm (x to the left, y to the back, z to the head); left side, mirrored for the right
_MIDLINE_INLET = ((0, 66, 62), (0, 82, 48), (0, 93, 26), (0, 95, 8))
_STRAIGHT = ((0, 44, 34), (0, 62, 23), (0, 80, 11))
_ARM = ((12, 93, -3), (29, 85, -4), (43, 71, -5))
_LOWER_ARM = ((52, 54, -8), (51, 41, -15), (44, 34, -29), (36, 29, -40))
_JUGULAR = ((32, 24, -56), (34, 19, -76), (33, 14, -100), (31, 14, -122))
_CORTICAL = ((60, 22, 26), (62, 42, 14), (54, 62, 3))
_OCCIPITAL = ((0, 84, -20), (0, 70, -35))
_MARGINAL = ((11, 63, -46), (19, 56, -52))
_VERTEBRAL = ((31, 42, -70), (29, 38, -96), (28, 34, -122))
_CONDYLAR = ((27, 36, -48),)
_CONFLUENCE, _JOINT, _BULB, _LOW, _PLEXUS = (0, 95, -2), (44, 70, -5), (33, 26, -45), (0, 64, -42), (25, 50, -58)


def venous_outflow(seed: int, smallest: float = 0.8, size: float = 1.0, gap: float = 0.8) -> Truth:
    """Return a net of veins whose root is the start of the midline inlet.

    Parameters
    ----------
    seed : int
    smallest : float
        No vein is thinner, mm.
    size : float
        Factor on all courses, not on radii.
    gap : float
        Room between tubes outside joints, mm.
    """
    for attempt in range(300):
        rng = np.random.default_rng([seed, attempt, 4])
        draft = Draft()
        root = _net(draft, rng, smallest, size)
        if draft.collisions(0, gap):
            continue
        if rng.random() < 0.3:
            rules = Growth(smallest=smallest, exponent=2.5)
            first = len(draft.rows) - 1
            host = next(i for i, row in enumerate(draft.rows) if row.name == "midline inlet")
            fenestrate(draft, rng, host, size * rng.uniform(14, 20), rules)
            if draft.collisions(first, 0.1):
                continue
        return draft.truth("veins", seed, (root,))
    raise RuntimeError(f"seed {seed}: no net without collisions in 300 attempts")


class _Drawer:
    """Draws veins through way points that are shaken once each."""

    def __init__(self, draft: Draft, rng: np.random.Generator, smallest: float, size: float) -> None:
        self.draft, self.rng, self.smallest, self.size = draft, rng, smallest, size

    def node(self, place: tuple[float, ...], side: int = 1) -> int:
        """Add a node near a place."""
        return self.draft.node(self.shaken([place], side, 1.2)[0])

    def shaken(self, places: object, side: int, by: float) -> np.ndarray:
        """Way points on a side, each moved a little."""
        moved = np.asarray(places, dtype=float) + self.rng.normal(0, by, np.shape(places))
        return moved * [side, 1, 1] * self.size

    def vein(self, ends: tuple[int, int], ways: object, radii: tuple[float, float], name: str, side: int = 1) -> None:
        """Draw a vein between two nodes through way points."""
        a, b = (self.draft.nodes[end] for end in ends)
        inner = self.shaken(ways, side, 1.5) if len(ways) else np.empty((0, 3))
        curve = even(_spline(np.vstack((a, inner, b))))
        t = np.linspace(0, 1, len(curve))
        radius = radii[0] + (radii[1] - radii[0]) * t * t * (3 - 2 * t)
        self.draft.add(ends, curve, np.maximum(radius, self.smallest), name, VEIN)


def _spline(points: np.ndarray) -> np.ndarray:
    """Dense points of a smooth curve through way points."""
    from scipy.interpolate import CubicSpline

    chord = np.sqrt(np.linalg.norm(np.diff(points, axis=0), axis=1))  # centripetal: no overshoot
    along = np.concatenate(([0.0], np.cumsum(chord)))
    return CubicSpline(along, points)(np.linspace(0, along[-1], 60 * len(points)))


def _net(draft: Draft, rng: np.random.Generator, smallest: float, size: float) -> int:
    """Draw the whole net; return the root."""
    draw = _Drawer(draft, rng, smallest, size)
    confluence = draw.node(_CONFLUENCE)
    root = draw.node(_MIDLINE_INLET[0])
    midline = rng.uniform(2.8, 3.4)
    draw.vein((root, confluence), _MIDLINE_INLET[1:], (rng.uniform(2.0, 2.6), midline), "midline inlet")
    straight = rng.uniform(1.5, 2.0)
    draw.vein((draw.node(_STRAIGHT[0]), confluence), _STRAIGHT[1:], (straight * 0.9, straight), "straight inlet")
    low = draw.node(_LOW) if rng.random() < 0.7 else -1
    if low >= 0:
        draw.vein((confluence, low), _OCCIPITAL, (rng.uniform(1.0, 1.4), rng.uniform(0.9, 1.2)), "occipital")
    lesser = int(rng.choice((-1, 1), p=(0.35, 0.65)))  # the left arm is more often the lesser one
    for side in (-1, 1):
        _side(draw, side, (confluence, low), rng.uniform(0.55, 0.9) if side == lesser else 1.0)
    return root


def _side(draw: _Drawer, side: int, middle: tuple[int, int], share: float) -> None:
    """Arm, jugular vein, cortical vein, vertebral route and collateral of one side."""
    rng, confluence, low = draw.rng, *middle
    joint, bulb, plexus = (draw.node(place, side) for place in (_JOINT, _BULB, _PLEXUS))
    arm, neck = share * rng.uniform(2.8, 3.3), min(4.0, share * rng.uniform(3.6, 4.4))
    draw.vein((confluence, joint), _ARM, (arm, arm * 0.95), "transverse", side)
    draw.vein((joint, bulb), _LOWER_ARM, (arm, min(4.0, 1.15 * arm)), "sigmoid", side)
    draw.vein((bulb, draw.node(_JUGULAR[-1], side)), _JUGULAR[:-1], (min(4.0, 1.15 * arm), neck), "jugular", side)
    cortical = rng.uniform(1.0, 1.5)
    draw.vein((draw.node(_CORTICAL[0], side), joint), _CORTICAL[1:], (0.85 * cortical, cortical), "cortical", side)
    condylar = rng.uniform(0.9, 1.5)
    draw.vein((bulb, plexus), _CONDYLAR, (condylar, condylar), "collateral", side)
    if low >= 0:
        draw.vein((low, plexus), _MARGINAL, (rng.uniform(0.9, 1.2), rng.uniform(0.9, 1.2)), "marginal", side)
    ways = _VERTEBRAL[:-1]
    draw.vein((plexus, draw.node(_VERTEBRAL[-1], side)), ways, (condylar, rng.uniform(1.3, 1.8)), "vertebral", side)
