"""An arterial tree with a tree of veins running beside it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from phantoms.draft import Draft
from phantoms.trees import Growth, grow
from phantoms.truth import ARTERY, VEIN, Truth, arc

__all__ = ["paired_trees"]


def paired_trees(
    seed: int,
    growth: Growth | None = None,
    classes: tuple[int, int] = (ARTERY, VEIN),
    root_radius: float | None = None,
) -> Truth:
    """Return two trees that run side by side, all the way from their trunks to their twigs.

    Each vein lies off its artery by 1.1 to 1.4 times the sum of both radii and 0.2 mm, and is
    wider by a fifth to a third. The roots are the trunk ends of both; a vein is drawn from its
    trunk outwards too.

    Parameters
    ----------
    seed : int
    growth : Growth, optional
        Rules of the arteries.
    classes : (int, int)
        Class of the first tree and of its companion; equal ones make two like vessels side by side.
    root_radius : float, optional
        Of the first tree in mm; 1.5 to 2.6 at random.
    """
    for attempt in range(300):
        rng = np.random.default_rng([seed, attempt, 5])
        flat = np.array([0.0, 1.0, 0.0])
        base = growth or Growth(depth=3, exponent=rng.uniform(2.33, 3.0))
        rules = replace(base, flat=flat, gap=max(base.gap, 1.5), twigs=0.0)
        draft = Draft()
        grow(
            draft, rng, draft.node(np.zeros(3)), np.array([0.0, 0.0, 1.0]), root_radius or rng.uniform(1.5, 2.6), rules
        )
        if len(draft.rows) < 5:
            continue
        draft.rows[:] = [replace(row, vessel_class=classes[0]) for row in draft.rows]
        first = len(draft.rows)
        root = _companion(draft, rng, flat, classes[1])
        if not draft.collisions(first, base.gap if growth else 0.15):
            return draft.truth("pair", seed, (0, root))
    raise RuntimeError(f"seed {seed}: no pair of trees without collisions in 300 attempts")


def _companion(draft: Draft, rng: np.random.Generator, flat: np.ndarray, vessel_class: int) -> int:
    """Draw the second tree beside the first (in place); return its root."""
    wider = rng.uniform(1.2, 1.33)
    arteries = draft.rows.copy()
    room = np.zeros(len(draft.nodes))
    for row in arteries:
        for node, radius in ((row.start, row.radius[0]), (row.end, row.radius[-1])):
            room[node] = max(room[node], radius * (1 + wider) + 0.2)
    room *= rng.uniform(1.1, 1.4)
    shift = len(draft.nodes)
    for node, offset in enumerate(room):
        draft.node(draft.nodes[node] + offset * flat)
    for row in arteries:
        t = (arc(row.points) / arc(row.points)[-1])[:, None]
        offset = room[row.start] + (room[row.end] - room[row.start]) * t * t * (3 - 2 * t)
        ends = (row.start + shift, row.end + shift)
        draft.add(ends, row.points + offset * flat, wider * row.radius, row.name, vessel_class)
    return shift
