"""Points at one place: identical coordinates anywhere, nearly identical line ends."""

from __future__ import annotations

import numpy as np
from scipy.cluster.hierarchy import fcluster, linkage
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components
from scipy.spatial import KDTree

from geomprep.findings import Finding, Severity
from geomprep.model import FloatArray, IntArray
from geomprep.repair.classes import may_join
from geomprep.repair.draft import Draft, degree, merged, point_radius

__all__ = ["group_pairs", "join_near_ends", "near_pairs", "same_place"]


def same_place(points: FloatArray) -> tuple[IntArray, IntArray]:
    """Group points whose coordinates are the same numbers.

    Parameters
    ----------
    points : (n, 3) float array
        Finite coordinates; −0.0 counts as 0.0.

    Returns
    -------
    label : (n,) int array
        Group of each point.
    first : (g,) int array
        Member of each group with the smallest number.

    Examples
    --------
    >>> label, first = same_place(np.array([[1.0, 0, 0], [0, 0, 0], [1, 0, -0.0]]))
    >>> bool(label[0] == label[2] != label[1])
    True
    >>> same_place(np.empty((0, 3)))[1].size
    0
    """
    bits = (np.ascontiguousarray(points, dtype=np.float64) + 0.0).view(np.uint64)
    key = bits[:, 0] * _MIX[0] + bits[:, 1] * _MIX[1] + bits[:, 2] * _MIX[2]
    key ^= key >> np.uint64(29)
    order = np.argsort(key)
    equal_key = key[order[1:]] == key[order[:-1]]
    left, right = order[:-1][equal_key], order[1:][equal_key]
    if not np.array_equal(bits.take(left, axis=0), bits.take(right, axis=0)):  # two places share a key
        order = np.lexsort((bits[:, 2], bits[:, 1], bits[:, 0]))
        equal_key = (bits[order[1:]] == bits[order[:-1]]).all(axis=1)
    new = np.ones(len(points), np.bool_)
    new[1:] = ~equal_key
    label = np.empty(len(points), np.int64)
    label[order] = np.cumsum(new) - 1
    starts = np.flatnonzero(new)
    first = np.minimum.reduceat(order, starts) if len(starts) else order
    return label, first.astype(np.int64)


_MIX = np.array([0x9E3779B97F4A7C15, 0xC2B2AE3D27D4EB4F, 0x165667B19E3779F9], np.uint64)


def join_near_ends(draft: Draft, within: float) -> tuple[Draft, int, tuple[Finding, ...]]:
    """Merge ends and junctions that lie nearly at one place.

    Parameters
    ----------
    draft : Draft
    within : float
        Largest distance as a part of the smaller radius of the two.

    Returns
    -------
    Draft
        Merged points lie at the mean of their members.
    joined : int
        Number of points that merged into another.
    findings : tuple of Finding
        Groups that a chain of near points makes wider than twice the distance; only
        members closer than that have been merged there.
    """
    ends = degree(draft)
    end = np.flatnonzero((ends != 2) & (ends > 0))
    radius = point_radius(draft)[end]
    pairs = near_pairs(draft.points[end], radius, within)
    pairs = pairs[may_join(draft.vessel_class[end[pairs[:, 0]]], draft.vessel_class[end[pairs[:, 1]]])]
    if len(pairs) == 0:
        return draft, 0, ()
    group, wide = group_pairs(draft.points[end], radius, pairs, within)
    label = np.arange(len(draft.points))
    leader = np.full(int(group.max()) + 1, len(label))
    np.minimum.at(leader, group, end)
    label[end] = leader[group]
    _, label = np.unique(label, return_inverse=True)
    joined = len(draft.points) - int(label.max()) - 1
    return merged(draft, label), joined, tuple(_wide_finding(draft, end[members], within) for members in wide)


def near_pairs(points: FloatArray, radius: FloatArray, within: float) -> IntArray:
    """Pairs of points closer than a part of the smaller of their radii, (p, 2)."""
    if len(points) < 2 or within <= 0:
        return np.empty((0, 2), np.int64)
    tree = KDTree(points, balanced_tree=False, compact_nodes=False)
    pairs = tree.query_pairs(within * float(radius.max()), output_type="ndarray").astype(np.int64)
    apart = np.linalg.norm(points[pairs[:, 0]] - points[pairs[:, 1]], axis=1)
    near: IntArray = pairs[apart <= within * np.minimum(radius[pairs[:, 0]], radius[pairs[:, 1]])]
    return near


def group_pairs(
    points: FloatArray, radius: FloatArray, pairs: IntArray, within: float
) -> tuple[IntArray, list[IntArray]]:
    """Group of each point from pairs; groups that chains make too wide are cut, and listed."""
    n = len(points)
    matrix = coo_array((np.ones(len(pairs), np.int8), (pairs[:, 0], pairs[:, 1])), shape=(n, n))
    count, group = connected_components(matrix, directed=False)
    group = group.astype(np.int64)
    members = np.bincount(group)
    wide = []
    for number in np.flatnonzero(members > 2):
        which = np.flatnonzero(group == number)
        limit = 2.0 * within * float(radius[which].min())
        if np.linalg.norm(points[which, None] - points[None, which], axis=2).max() <= limit:
            continue
        # no two members of one complete-linkage cluster are further apart than the limit
        part = fcluster(linkage(points[which], "complete"), limit, "distance")
        group[which] = np.where(part == 1, number, count + part)
        count += int(part.max()) + 1
        wide.append(which)
    return group, wide


def _wide_finding(draft: Draft, members: IntArray, within: float) -> Finding:
    """Say that a chain of near points is wider than two distances."""
    place = draft.points[members]
    width = float(np.linalg.norm(place[:, None] - place[None], axis=2).max())
    return Finding(
        kind="wide group of points",
        severity=Severity.WARNING,
        message=(
            f"{len(members)} line ends, each within {within:g} of the radius of the next, spread over "
            f"{1e3 * width:.3g} mm; only those closer than twice that distance were merged"
        ),
        position=(float(place[0, 0]), float(place[0, 1]), float(place[0, 2])),
        value=width,
        unit="m",
    )
