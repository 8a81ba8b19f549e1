"""Which ends meet at a junction, which of them is the parent, and how their radii compare."""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from geomprep.errors import InputError
from geomprep.measure.tube_overlap import Axes, EndPairs, Ends
from geomprep.model import BoolArray, FloatArray, IntArray, Network, Uint8Array

__all__ = [
    "Forks",
    "JunctionKind",
    "ParentRule",
    "bends_from_parent",
    "calibre",
    "end_pairs",
    "forks",
    "murray",
    "parents",
]


class JunctionKind(IntEnum):
    """How a junction is built: a parent that passes, a trunk that parts, or ends without a rank."""

    PASSING_PARENT = 0
    SYMMETRIC = 1
    EQUAL_ENDS = 2


@dataclass(frozen=True)
class ParentRule:
    """What makes the continuation of a vessel through a junction clear; the numbers are judgements.

    Attributes
    ----------
    angle_scale, radius_scale : float
        Bend between two ends, rad, that weighs as much as this ratio of their radii. The misfit of a pair
        is (bend/angle scale)² + (ln ratio/ln radius scale)².
    clear_by : float
        Lead in misfit of the best pair over the next.
    worst : float
        Misfit above which the best pair is no continuation.
    least_radius : float
        Part of the largest radius that one end of the parent must have.
    """

    angle_scale: float = float(np.radians(30))
    radius_scale: float = 1.5
    clear_by: float = 0.5
    worst: float = 4.0
    least_radius: float = 0.9

    def __post_init__(self) -> None:
        for name, above in {"angle_scale": 0, "radius_scale": 1, "clear_by": 0, "worst": 0}.items():
            if not above < getattr(self, name) < np.inf:
                raise InputError(f"{name} = {getattr(self, name)}: a finite number above {above} is needed")
        if not 0 <= self.least_radius <= 1:
            raise InputError(f"least_radius = {self.least_radius}: a part of the largest radius, 0 to 1, is needed")


@dataclass(frozen=True, eq=False)
class Forks:
    """Junctions, the nodes that make them and the ends that meet there.

    Attributes
    ----------
    node : (v,) int array
    node_offsets : (j + 1,) int array
        Junction i owns nodes ``node_offsets[i]:node_offsets[i + 1]``.
    offsets : (j + 1,) int array
        Junction i owns ends ``offsets[i]:offsets[i + 1]``, two or more.
    ends : Ends
        t rows, by junction, segment and end.
    inner : (s,) bool array
        Segments between forks of one junction; their ends are not listed.
    """

    node: IntArray
    node_offsets: IntArray
    offsets: IntArray
    ends: Ends
    inner: BoolArray

    @property
    def junction(self) -> IntArray:
        """(t,) junction number of each end."""
        return np.repeat(np.arange(len(self.offsets) - 1), np.diff(self.offsets))


def forks(network: Network, within: float) -> Forks:
    """List the nodes where three ends or more meet; forks close together are one junction.

    Parameters
    ----------
    network : Network
    within : float
        Forks joined by a segment not longer than this many times the larger radius at them are one.

    Returns
    -------
    Forks

    Examples
    --------
    >>> from geomprep.model import Nodes, Segments, Stations
    >>> x = np.array([[0.0, 0, 0], [9, 0, 0], [-9, 0, 0], [0, 9, 0]])
    >>> names, to, zero = ["a", "b", "c"], np.array([1, 2, 3]), np.zeros(3, int)
    >>> segments = Segments(names, names, zero, to, zero, zero, zero, zero, zero)
    >>> stations = Stations([0, 2, 4, 6], [0.0, 9] * 3, x[[0, 1, 0, 2, 0, 3]], np.ones(6), np.zeros(6))
    >>> found = forks(Network(Nodes(list("ijkl"), x, x[:, 2], x[:, 2], np.arange(4)), segments, stations), 1.0)
    >>> found.node.tolist(), found.offsets.tolist(), found.ends.segment.tolist()
    ([0], [0, 3], [0, 1, 2])
    """
    length = network.stations.distance[network.stations.offsets[1:] - 1]
    label, inner = _groups(network, length, within)
    ends, node, node_offsets, offsets = _ends(network, length, label, inner)
    return Forks(node, node_offsets, offsets, ends, inner)


def _groups(network: Network, length: FloatArray, within: float) -> tuple[IntArray, BoolArray]:
    """Junction number of each node (−1 no fork), and the segments that lie between forks of one junction."""
    first, second, stations = network.segments.from_node, network.segments.to_node, network.stations
    n = len(network.nodes)
    fork = np.bincount(np.concatenate((first, second)), minlength=n) >= 3
    widest = np.zeros(n)
    np.maximum.at(widest, first, stations.radius[stations.offsets[:-1]])
    np.maximum.at(widest, second, stations.radius[stations.offsets[1:] - 1])
    inner = fork[first] & fork[second] & (first != second)
    inner &= length <= within * np.maximum(widest[first], widest[second])
    joined = coo_array((np.ones(inner.sum()), (first[inner], second[inner])), shape=(n, n))
    label = connected_components(joined, directed=False)[1] if n else np.zeros(0, np.int64)
    return np.where(fork, label, -1), inner


def _ends(
    network: Network, length: FloatArray, label: IntArray, inner: BoolArray
) -> tuple[Ends, IntArray, IntArray, IntArray]:
    """Ends of segments at junctions of two ends or more, and the nodes of each junction."""
    s, stations = len(network.segments), network.stations
    segment, end = np.tile(np.arange(s), 2), np.repeat(np.array([0, 1]), s)
    group = label[np.concatenate((network.segments.from_node, network.segments.to_node))]
    group[inner[segment]] = -1
    count = np.bincount(group[group >= 0], minlength=len(label))
    rows = np.flatnonzero((group >= 0) & (count[group] >= 2))
    rows = rows[np.lexsort((end[rows], segment[rows], group[rows]))]
    kept, junction = np.unique(group[rows], return_inverse=True)
    node = np.flatnonzero(np.isin(label, kept))
    node = node[np.argsort(label[node], kind="stable")]
    segment, end = segment[rows], end[rows]
    here = np.where(end == 0, stations.offsets[segment], stations.offsets[segment + 1] - 1)
    offsets = np.searchsorted(junction, np.arange(len(kept) + 1))
    widest = np.maximum.reduceat(stations.radius[here], offsets[:-1]) if len(kept) else np.zeros(0)
    table = Ends(segment, end, length[segment], widest[junction])
    return table, node, np.searchsorted(label[node], np.append(kept, len(label))), offsets


def calibre(axes: Axes, ends: Ends) -> tuple[FloatArray, FloatArray]:
    """Return the median radius and the direction of each end beyond its junction.

    Both are taken from one to three radii of the junction away from the node, at most from a quarter to
    half of the segment: close to the node the radius and the line are those of the parent.

    Parameters
    ----------
    axes : Axes
    ends : Ends

    Returns
    -------
    radius : (t,) float array
        m.
    direction : (t, 3) float array
        Unit vectors into the segments.

    Examples
    --------
    >>> from geomprep.model import Stations
    >>> line = Axes.of(Stations([0, 2], [0.0, 8.0], [[0.0, 0, 0], [8, 0, 0]], [2.0, 1.0], [0, 0]))
    >>> radius, direction = calibre(line, Ends(np.array([0]), np.array([1]), np.array([8.0]), np.array([1.0])))
    >>> radius.tolist(), direction.tolist()  # two from the end
    ([1.25], [[-1.0, 0.0, 0.0]])
    """
    near, far = np.minimum(ends.widest, 0.25 * ends.length), np.minimum(3 * ends.widest, 0.5 * ends.length)
    at = near[:, None] + (far - near)[:, None] * np.linspace(0.0, 1.0, 9)
    values = axes.sampled(ends.segment[:, None], ends.end[:, None], at)
    chord = values[:, -1, :3] - values[:, 0, :3]
    size = np.linalg.norm(chord, axis=1, keepdims=True)
    return np.asarray(np.median(values[:, :, 3], axis=1)), chord / np.where(size > 0, size, 1.0)


def _pairs(offsets: IntArray) -> tuple[IntArray, IntArray, IntArray]:
    """Both ends of every pair at a junction, and the junction."""
    junction = np.repeat(np.arange(len(offsets) - 1), np.diff(offsets))
    row = np.arange(len(junction))
    later = offsets[junction + 1] - row - 1
    first = np.repeat(row, later)
    second = first + 1 + np.arange(len(first)) - np.repeat(np.cumsum(later) - later, later)
    return first, second, junction[first]


def parents(
    offsets: IntArray, radius: FloatArray, direction: FloatArray, rule: ParentRule
) -> tuple[Uint8Array, BoolArray]:
    """Choose the ends of each junction that make the parent.

    Pairs with an end near the largest radius compete. One clear best pair is a parent that passes. Else the
    one end that all good pairs share is a trunk that parts there. Else no end ranks above the others.

    Parameters
    ----------
    offsets : (j + 1,) int array
        Junction i owns ends ``offsets[i]:offsets[i + 1]``, two or more.
    radius : (t,) float array
        m.
    direction : (t, 3) float array
        Unit vectors away from the junction.
    rule : ParentRule

    Returns
    -------
    kind : (j,) uint8 array
        :class:`JunctionKind`.
    is_parent : (t,) bool array

    Examples
    --------
    >>> away = np.array([[-1.0, 0, 0], [0.8, 0.6, 0], [0.8, -0.6, 0]])
    >>> kind, is_parent = parents(np.array([0, 3]), np.array([2.0, 1.6, 1.6]), away, ParentRule())
    >>> JunctionKind(kind[0]).name, is_parent.tolist()
    ('SYMMETRIC', [True, False, False])
    """
    first, second, junction = _pairs(offsets)
    n, count = len(offsets) - 1, np.diff(offsets)
    if n == 0:
        return np.zeros(0, np.uint8), np.zeros(0, np.bool_)
    bend = _bend(direction[first], direction[second])
    ratio = np.log(radius[first] / radius[second]) / np.log(rule.radius_scale)
    largest = np.maximum.reduceat(radius, offsets[:-1])
    fit = np.maximum(radius[first], radius[second]) >= rule.least_radius * largest[junction]
    cost = np.where(fit, (bend / rule.angle_scale) ** 2 + ratio**2, np.inf)
    best = np.minimum.reduceat(cost, np.searchsorted(junction, np.arange(n)))
    good = fit & ((cost < (best + rule.clear_by)[junction]) | (best > rule.worst)[junction])
    n_good = np.bincount(junction[good], minlength=n)
    size = len(radius)
    uses = np.bincount(first[good], minlength=size) + np.bincount(second[good], minlength=size)
    shared = uses == np.repeat(n_good, count)
    one = np.add.reduceat(shared.astype(np.int64), offsets[:-1]) > 0
    kind = np.where(n_good == 1, JunctionKind.PASSING_PARENT, np.where(one, JunctionKind.SYMMETRIC, 2))
    return kind.astype(np.uint8), shared


def _bend(one: FloatArray, other: FloatArray) -> FloatArray:
    """Angle between one direction and the continuation of the other, rad; exact for small angles."""
    return np.asarray(2 * np.arctan2(np.linalg.norm(one + other, axis=-1), np.linalg.norm(one - other, axis=-1)))


def end_pairs(offsets: IntArray, kind: Uint8Array, is_parent: BoolArray) -> EndPairs:
    """List beside each branch the parent, and every other branch of its junction.

    Parameters
    ----------
    offsets : (j + 1,) int array
    kind : (j,) uint8 array
    is_parent : (t,) bool array
        From :func:`parents`.

    Returns
    -------
    EndPairs

    Examples
    --------
    >>> pairs = end_pairs(np.array([0, 3]), np.zeros(1, np.uint8), np.array([True, True, False]))
    >>> pairs.owner.tolist(), pairs.first.tolist(), pairs.second.tolist()
    ([2], [0], [1])
    """
    first, second, junction = _pairs(offsets)
    free = ~(is_parent[first] | is_parent[second])
    first, second = (np.concatenate(x) for x in ((first[free], second[free]), (second[free], first[free])))
    equal = kind[np.tile(junction[free], 2)] == JunctionKind.EQUAL_ENDS
    of = np.repeat(np.arange(len(kind)), np.diff(offsets))
    parents = np.flatnonzero(is_parent)
    head, head_row = np.unique(of[parents], return_index=True)
    one, two = np.full((2, len(kind)), -1)
    one[head] = parents[head_row]
    passing = np.flatnonzero(kind == JunctionKind.PASSING_PARENT)
    two[passing] = parents[np.searchsorted(of[parents], passing) + 1]
    branch = np.flatnonzero(~is_parent & (one[of] >= 0))
    owner = np.concatenate((branch, first))
    order = np.argsort(owner, kind="stable")
    return EndPairs(
        owner=owner[order],
        first=np.concatenate((one[of[branch]], second))[order],
        second=np.concatenate((two[of[branch]], np.full(len(second), -1)))[order],
        is_parent=np.concatenate((np.ones(len(branch), np.bool_), np.zeros(len(first), np.bool_)))[order],
        is_left=np.concatenate((np.ones(len(branch), np.bool_), equal))[order],
    )


def murray(radius: FloatArray, offsets: IntArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Compare the radii r of a junction's ends with that of its largest, R.

    Parameters
    ----------
    radius : (t,) float array
        m.
    offsets : (j + 1,) int array

    Returns
    -------
    exponent : (j,) float array
        x with R^x = Σ r^x; not a number where none fits (a second end as large as the first).
    residual : (j,) float array
        1 − Σ(r/R)³.
    area_ratio : (j,) float array
        Σ(r/R)².

    References
    ----------
    Murray 1926, doi 10.1073/pnas.12.3.207 (exponent 3; from memory).

    Examples
    --------
    >>> exponent, residual, area_ratio = murray(np.array([1.0, 0.5 ** (1 / 3), 0.5 ** (1 / 3)]), np.array([0, 3]))
    >>> print(exponent.round(9), area_ratio.round(6))
    [3.] [1.259921]
    """
    if len(offsets) < 2:
        return np.zeros(0), np.zeros(0), np.zeros(0)
    largest = np.repeat(np.maximum.reduceat(radius, offsets[:-1]), np.diff(offsets))
    log = np.log(radius / largest)

    def total(exponent: FloatArray) -> FloatArray:
        """Σ(r/R)^x without the largest end itself."""
        return np.add.reduceat(np.exp(np.repeat(exponent, np.diff(offsets)) * log), offsets[:-1]) - 1.0

    ones = np.ones(len(offsets) - 1)
    low, high = 0 * ones, 1e3 * ones
    fits = (total(low) >= 1) & (total(high) < 1)
    for _ in range(60):  # 1e3 halved to the last digit
        middle = 0.5 * (low + high)
        above = total(middle) >= 1
        low, high = np.where(above, middle, low), np.where(above, high, middle)
    return np.where(fits, 0.5 * (low + high), np.nan), 1.0 - total(3 * ones), total(2 * ones)


def bends_from_parent(direction: FloatArray, is_parent: BoolArray, offsets: IntArray) -> FloatArray:
    """Return the smallest bend from an end of the parent into each branch.

    Parameters
    ----------
    direction : (t, 3) float array
        Unit vectors away from the junction.
    is_parent : (t,) bool array
    offsets : (j + 1,) int array

    Returns
    -------
    (t,) float array
        rad, 0 straight on; not a number at parents and where there is none.

    Examples
    --------
    >>> away = np.array([[-1.0, 0, 0], [1, 0, 0], [0.5, 0.75**0.5, 0]])
    >>> np.degrees(bends_from_parent(away, np.array([True, True, False]), np.array([0, 3]))).round(9)
    array([nan, nan, 60.])
    """
    angle = np.full(len(direction), np.nan)
    first, second, _ = _pairs(offsets)
    for branch, parent in ((first, second), (second, first)):
        rows = np.flatnonzero(is_parent[parent] & ~is_parent[branch])
        np.fmin.at(angle, branch[rows], _bend(direction[branch[rows]], direction[parent[rows]]))
    return angle
