"""Shapes whose length, curvature and resistance are known in closed form."""

from __future__ import annotations

import numpy as np

from phantoms.draft import STEP, Draft
from phantoms.truth import ARTERY, Truth

__all__ = ["cone", "fork", "helix", "torus"]


def cone(length: float, radius: tuple[float, float], direction: tuple[float, float, float] = (0, 0, 1)) -> Truth:
    """A straight vessel along a direction from the origin, lengths in mm."""
    draft = Draft()
    way = np.asarray(direction, float) / np.linalg.norm(direction)
    t = np.linspace(0, 1, round(length / STEP) + 1)
    draft.add(
        (draft.node(np.zeros(3)), draft.node(length * way)), t[:, None] * length * way, _between(radius, t), "cone"
    )
    return draft.truth("cone", 0, (0,))


def helix(curve_radius: float, pitch: float, turns: float, radius: float = 1.0) -> Truth:
    """A helix about z, lengths in mm; one turn is √((2π a)² + pitch²) long."""
    angle = np.linspace(0, 2 * np.pi * turns, round(turns * np.hypot(2 * np.pi * curve_radius, pitch) / STEP) + 1)
    points = np.column_stack((curve_radius * np.cos(angle), curve_radius * np.sin(angle), pitch * angle / (2 * np.pi)))
    draft = Draft()
    draft.add((draft.node(points[0]), draft.node(points[-1])), points, radius, "helix")
    return draft.truth("helix", 0, (0,))


def fork(lengths: tuple[float, float, float], radii: tuple[float, float, float], half_angle: float) -> Truth:
    """A straight trunk along z and two straight daughters in the plane of x and z, lengths in mm."""
    draft = Draft()
    start, centre = draft.node(np.zeros(3)), draft.node([0, 0, lengths[0]])
    ways = ((0, 0, 1), (np.sin(half_angle), 0, np.cos(half_angle)), (-np.sin(half_angle), 0, np.cos(half_angle)))
    for i, (length, radius, way) in enumerate(zip(lengths, radii, ways, strict=True)):
        base = draft.nodes[centre if i else start]
        t = np.linspace(0, 1, round(length / STEP) + 1)[:, None]
        end = draft.node(base + length * np.array(way)) if i else centre
        draft.add(
            (centre if i else start, end), base + t * length * np.array(way), radius, "daughter" if i else "trunk"
        )
    return draft.truth("fork", 0, (start,))


def torus(curve_radius: float, radius: float, stem: float) -> Truth:
    """A round ring in the plane of x and y with a straight stem on either side, lengths in mm."""
    draft = Draft()
    left, right = draft.node([-curve_radius, 0, 0]), draft.node([curve_radius, 0, 0])
    for sign in (1, -1):
        angle = np.linspace(np.pi, 0, round(np.pi * curve_radius / STEP) + 1)
        half = np.column_stack((np.cos(angle), sign * np.sin(angle), np.zeros_like(angle)))
        draft.add((left, right), curve_radius * half, radius, "ring")
    t = np.linspace(0, 1, round(stem / STEP) + 1)[:, None]
    for node, side in ((left, -1.0), (right, 1.0)):
        points = np.array([side, 0, 0]) * (curve_radius + stem * t)
        end = draft.node(points[-1])
        draft.add((node, end), points, radius, "stem", ARTERY)
    return draft.truth("torus", 0, (2,))


def _between(radius: tuple[float, float], t: np.ndarray) -> np.ndarray:
    """Radius linear between two values."""
    return radius[0] + (radius[1] - radius[0]) * t
