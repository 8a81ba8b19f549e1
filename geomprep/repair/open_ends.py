"""Open ends that may once have been joined: candidates from end to end and from end to side, with what speaks for each."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.spatial import KDTree

from geomprep.model import BoolArray, FloatArray, IntArray, PointGraph
from geomprep.repair.branches import Branches
from geomprep.repair.classes import may_join
from geomprep.repair.parts import components

__all__ = ["Links", "Tips", "end_links", "side_links", "tips"]

_BEHIND = 3.0
"""Radii behind an open end that are no side: what points there points at the end."""
_SPAN = 4.0
"""Radii over which the direction of an end is fitted."""


@dataclass(frozen=True, eq=False)
class Tips:
    """Open ends of a graph.

    Attributes
    ----------
    point, chain, side : (t,) int array
        Point, its chain, and the end of the chain at which it lies.
    radius : (t,) float array
        Median radius over the last radii of the vessel, m.
    way : (t, 3) float array
        Unit vector out of the vessel.
    below_widest : (t,) float array
        ln of the radius of the widest open end of the same part over that of this one.
    part : (n,) int array
        Connected part of each graph point.
    """

    point: IntArray
    chain: IntArray
    side: IntArray
    radius: FloatArray
    way: FloatArray
    below_widest: FloatArray
    part: IntArray


@dataclass(frozen=True, eq=False)
class Links:
    """Candidates, one a row.

    Attributes
    ----------
    tip : (q,) int array
        Open end.
    other : (q,) int array
        The other open end, or −1 where it meets a side.
    point : (q,) int array
        Graph point at the far side.
    distance : (q,) float array
        From point to point, m.
    in_radii : (q,) float array
        Length of the gap in mean radii; to a side, what lies outside its tube in radii of the end.
    angle, far_angle : (q,) float array
        Between the way out of each end and the link, rad; at a side zero.
    ratio : (q,) float array
        ln of the radius at the end over that at the far side.
    not_root : (q,) float array
        At a side, how far the end is from being the widest open end of its part, as ln of the ratio: what
        branches off a vessel does so with its root. Zero between ends.
    same_part : (q,) bool array
        Whether both hang together already, so that the link closes a loop.
    """

    tip: IntArray
    other: IntArray
    point: IntArray
    distance: FloatArray
    in_radii: FloatArray
    angle: FloatArray
    far_angle: FloatArray
    ratio: FloatArray
    not_root: FloatArray
    same_part: BoolArray

    def rows(self, which: IntArray | BoolArray) -> Links:
        """Some of the candidates."""
        return Links(*(getattr(self, name)[which] for name in self.__dataclass_fields__))


def tips(branches: Branches) -> Tips:
    """List the open ends of a graph; lines protected at both ends, such as undecided copies, have none."""
    graph = branches.graph
    held = graph.protected[branches.ends]
    undecided = (held[:, 0] & held[:, 1])[:, None]
    chain, side = np.nonzero((branches.degree[branches.ends] == 1) & ~undecided)
    point = branches.ends[chain, side]
    radius = _end_radius(branches, chain, side, graph.radius[point])
    way = branches.way_out(chain, side, _SPAN * radius)
    count, part = components(graph.n_points, graph.edges)
    widest = np.zeros(count)
    np.maximum.at(widest, part[point], radius)
    return Tips(point, chain, side, radius, way, np.log(widest[part[point]] / radius), part)


def _end_radius(branches: Branches, chain: IntArray, side: IntArray, size: FloatArray) -> FloatArray:
    """Median radius over the last three radii of a vessel."""
    part = np.linspace(0.0, 3.0, 7)
    every = np.repeat(np.arange(len(chain)), len(part))
    along = np.minimum((size[:, None] * part).ravel(), branches.length[chain[every]])
    found = branches.at(chain[every], side[every], along, branches.graph.radius)
    median: FloatArray = np.median(found.reshape(len(chain), len(part)), axis=1)
    return median


def end_links(graph: PointGraph, found: Tips, longest: float) -> Links:
    """Candidates between two open ends of one class.

    Parameters
    ----------
    graph : PointGraph
    found : Tips
    longest : float
        Longest gap in mean radii.
    """
    # the mean of two radii may be larger than that of the end looked from, by half of the other at most
    pairs = _near(
        graph.points[found.point], 0.5 * found.radius, graph.points[found.point], 0.5 * longest * found.radius, longest
    )
    a, b = pairs[:, 0], pairs[:, 1]
    first = graph.points[found.point]
    size = 0.5 * (found.radius[a] + found.radius[b])
    apart = first[b] - first[a]
    distance = np.linalg.norm(apart, axis=1)
    kept = (a < b) & (distance <= longest * size) & (distance > 0) & (found.point[a] != found.point[b])
    kept &= may_join(graph.vessel_class[found.point[a]], graph.vessel_class[found.point[b]])
    a, b, apart, distance, size = a[kept], b[kept], apart[kept], distance[kept], size[kept]
    along = apart / np.maximum(distance, np.finfo(float).tiny)[:, None]
    return Links(
        a,
        b,
        found.point[b],
        distance,
        distance / size,
        _angle(found.way[a], along),
        _angle(found.way[b], -along),
        np.log(found.radius[a] / found.radius[b]),
        np.zeros(len(a)),
        found.part[found.point[a]] == found.part[found.point[b]],
    )


def side_links(branches: Branches, found: Tips, longest: float) -> Links:
    """Candidates between an open end and points on the side of vessels of its class.

    The own vessel takes part only beyond the reach along it.

    Parameters
    ----------
    branches : Branches
    found : Tips
    longest : float
        Longest gap outside the other's tube, in radii of the end.
    """
    graph = branches.graph
    body = np.flatnonzero(_is_side(branches))
    largest = graph.radius[body]
    pairs = _near(graph.points[found.point], found.radius, graph.points[body], largest, longest)
    tip, point = pairs[:, 0], body[pairs[:, 1]]
    apart = graph.points[point] - graph.points[found.point[tip]]
    distance = np.linalg.norm(apart, axis=1)
    outside = (distance - graph.radius[point]) / found.radius[tip]
    angle = _angle(found.way[tip], apart / np.maximum(distance, np.finfo(float).tiny)[:, None])
    kept = (outside <= longest) & (distance > 0) & (angle <= np.radians(60.0))
    kept &= may_join(graph.vessel_class[found.point[tip]], graph.vessel_class[point])
    kept &= ~_own_stretch(branches, found, tip, point, 1.5 * distance)
    tip, point, distance = tip[kept], point[kept], distance[kept]
    return Links(
        tip,
        np.full(len(tip), -1),
        point,
        distance,
        np.maximum(outside[kept], 0.0),
        angle[kept],
        np.zeros(len(tip)),
        np.log(found.radius[tip] / graph.radius[point]),
        found.below_widest[tip],
        found.part[found.point[tip]] == found.part[point],
    )


def _is_side(branches: Branches) -> BoolArray:
    """Points of degree two and more that do not lie just behind an open end."""
    graph = branches.graph
    is_open = branches.degree[branches.ends] == 1
    to_start = np.where(is_open[branches.chain, 0], branches.along, np.inf)
    to_end = np.where(is_open[branches.chain, 1], branches.length[branches.chain] - branches.along, np.inf)
    point = branches.cut.point
    side = np.zeros(graph.n_points, np.bool_)
    side[point] = np.minimum(to_start, to_end) > _BEHIND * graph.radius[point]
    return side


def _own_stretch(branches: Branches, found: Tips, tip: IntArray, point: IntArray, reach: FloatArray) -> BoolArray:
    """Whether a point lies on the own chain of an end, no farther along it than some reach."""
    row = np.full(branches.graph.n_points, -1, np.int64)
    row[branches.cut.point] = np.arange(len(branches.cut.point))
    at = row[point]
    chain = found.chain[tip]
    inside = (branches.cut.offsets[chain] <= at) & (at < branches.cut.offsets[chain + 1])
    along = branches.along[np.maximum(at, 0)]
    way = np.where(found.side[tip] == 0, along, branches.length[chain] - along)
    own: BoolArray = inside & (way <= reach)
    return own


def _near(places: FloatArray, size: FloatArray, others: FloatArray, other_size: FloatArray, longest: float) -> IntArray:
    """Pairs (place, other) no farther apart than `longest` sizes and the other's size, searched by octaves of both."""
    found = [np.empty((0, 2), np.int64)]
    trees = [(there, KDTree(others[there])) for there in _octaves(other_size)]
    for which in _octaves(size):
        here = KDTree(places[which])
        for there, tree in trees:
            reach = longest * float(size[which].max()) + float(other_size[there].max())
            pairs = here.sparse_distance_matrix(tree, reach, output_type="ndarray")
            i, j = which[pairs["i"]], there[pairs["j"]]
            close = pairs["v"] <= (1.0 + 1e-9) * (longest * size[i] + other_size[j])
            found.append(np.stack((i[close], j[close]), axis=1))
    return np.concatenate(found)


def _octaves(size: FloatArray) -> list[IntArray]:
    """Rows of similar size, from small to large."""
    if len(size) == 0:
        return []
    octave = np.floor(np.log2(size / size.min())).astype(np.int64)
    return [np.flatnonzero(octave == number) for number in np.unique(octave)]


def _angle(one: FloatArray, other: FloatArray) -> FloatArray:
    """Angle between unit vectors, rad."""
    angle: FloatArray = np.arccos(np.clip(np.einsum("ij,ij->i", one, other), -1.0, 1.0))
    return angle
