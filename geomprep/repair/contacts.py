"""Places where two vessels may only touch: short links between them, and points that both pass through."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.model import FloatArray, IntArray
from geomprep.repair.branches import Branches

__all__ = ["Contacts", "link_contacts", "shared_contacts"]

_SPAN = 3.0
"""Radii over which the direction of a vessel is fitted on either side of a contact."""
_BESIDE = 2.0
"""Radii from a contact at which the radius of a vessel is read."""
_PAIRINGS = np.array([[0, 1, 2, 3], [0, 2, 1, 3], [0, 3, 1, 2]])


@dataclass(frozen=True, eq=False)
class Contacts:
    """Candidates, one a row.

    Attributes
    ----------
    nodes : (q, 2) int array
        Points on the two vessels; twice the same point where they share it.
    link : (q,) int array
        Chain between them, −1 for a shared point.
    arms, sides : (q, 4) int array
        Chains and their ends: the first two are one vessel, the last two the other.
    bend : (q, 2) float array
        Angle by which each vessel turns there, rad.
    ratio : (q, 2) float array
        Radii of each vessel on its two sides, the larger over the smaller.
    size : (q, 2) float array
        Geometric mean of these radii, m.
    outside : (q,) float array
        Length of the link outside both tubes in its own radii; 0 for a shared point.
    other_bend : (q,) float array
        Larger turn of the best pairing among the others, rad; π for a link.
    other : (q, 4) int array
        Order of the arms in that pairing.
    """

    nodes: IntArray
    link: IntArray
    arms: IntArray
    sides: IntArray
    bend: FloatArray
    ratio: FloatArray
    size: FloatArray
    outside: FloatArray
    other_bend: FloatArray
    other: IntArray


def _arms_at(branches: Branches, count: int) -> tuple[IntArray, IntArray, IntArray]:
    """Points where so many chains meet, and these chains and their ends, (m, count)."""
    at = branches.ends.ravel()
    order = np.argsort(at, kind="stable")
    order = order[branches.degree[at[order]] == count].reshape(-1, count)
    return at[order[:, 0]] if len(order) else np.empty(0, np.int64), order // 2, order % 2


def _passing(branches: Branches, arms: IntArray, sides: IntArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Turn, ratio of radii and mean radius of vessels made of two arms, each (q, 2) for arms (q, 4)."""
    graph = branches.graph
    chain, side = arms.ravel(), sides.ravel()
    near = graph.radius[branches.ends[chain, side]]
    beside = np.minimum(_BESIDE * near, branches.length[chain])
    size = branches.at(chain, side, beside, graph.radius).reshape(-1, 2)
    way = branches.way_out(chain, side, _SPAN * near).reshape(-1, 2, 3)
    cosine = -np.einsum("qd,qd->q", way[:, 0], way[:, 1])
    bend = np.arccos(np.clip(cosine, -1.0, 1.0))
    ratio = size.max(axis=1) / size.min(axis=1)
    return bend.reshape(-1, 2), ratio.reshape(-1, 2), np.sqrt(size[:, 0] * size[:, 1]).reshape(-1, 2)


def link_contacts(branches: Branches, outside_below: float) -> Contacts:
    """Short chains between two points at which one vessel each goes on.

    Parameters
    ----------
    branches : Branches
    outside_below : float
        Longest part outside both tubes, in radii of the link.
    """
    node, chain, side = _arms_at(branches, 3)
    row = np.full(branches.graph.n_points, -1, np.int64)
    row[node] = np.arange(len(node))
    ends = branches.ends
    tubes = branches.graph.radius[ends].sum(axis=1)
    short = np.flatnonzero((row[ends] >= 0).all(axis=1) & (ends[:, 0] != ends[:, 1]) & (branches.length < 4.0 * tubes))
    own = _own_radius(branches, short)
    outside = np.maximum(branches.length[short] - tubes[short], 0.0) / own
    kept = outside <= outside_below
    short, outside = short[kept], outside[kept]
    arms, sides = (np.empty((len(short), 4), np.int64) for _ in range(2))
    for end in (0, 1):
        at = row[ends[short, end]]
        away = (chain[at] != short[:, None]) | (side[at] != end)
        arms[:, 2 * end : 2 * end + 2] = chain[at][away].reshape(-1, 2)
        sides[:, 2 * end : 2 * end + 2] = side[at][away].reshape(-1, 2)
    apart = (arms[:, :2, None] != arms[:, None, 2:]).all(axis=(1, 2))  # else both are arms of one loop
    short, outside, arms, sides = short[apart], outside[apart], arms[apart], sides[apart]
    bend, ratio, size = _passing(branches, arms, sides)
    order = np.tile(np.arange(4), (len(short), 1))
    return Contacts(ends[short], short, arms, sides, bend, ratio, size, outside, np.full(len(short), np.pi), order)


def _own_radius(branches: Branches, chain: IntArray) -> FloatArray:
    """Radius of chains halfway."""
    side = np.zeros(len(chain), np.int64)
    middle: FloatArray = branches.at(chain, side, 0.5 * branches.length[chain], branches.graph.radius)
    return middle


def shared_contacts(branches: Branches) -> Contacts:
    """Points where four chains meet, paired as two vessels that turn least there."""
    node, chain, side = _arms_at(branches, 4)
    different = (np.diff(np.sort(chain, axis=1), axis=1) > 0).all(axis=1)
    node, chain, side = node[different], chain[different], side[different]
    count = len(node)
    bends, ratios, sizes = [], [], []
    for pairing in _PAIRINGS:
        bend, ratio, size = _passing(branches, chain[:, pairing], side[:, pairing])
        bends.append(bend)
        ratios.append(ratio)
        sizes.append(size)
    bend, ratio, size = np.stack(bends), np.stack(ratios), np.stack(sizes)
    cost = (bend**2).sum(axis=2) + (np.log(ratio) ** 2).sum(axis=2)
    best, second = np.argsort(cost, axis=0, kind="stable")[:2] if count else np.empty((2, 0), np.int64)
    each = np.arange(count)
    first, other = _PAIRINGS[best], _PAIRINGS[second]
    return Contacts(
        np.stack((node, node), axis=1),
        np.full(count, -1),
        np.take_along_axis(chain, first, axis=1),
        np.take_along_axis(side, first, axis=1),
        bend[best, each],
        ratio[best, each],
        size[best, each],
        np.zeros(count),
        bend[second, each].max(axis=1) if count else np.zeros(0),
        np.argsort(first, axis=1)[each[:, None], other] if count else np.empty((0, 4), np.int64),
    )
