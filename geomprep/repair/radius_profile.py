"""Radii along chains of places, before lines are joined."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.curves import arc_length
from geomprep.model import BoolArray, Centrelines, Chains, FloatArray, IntArray, chains, degrees

__all__ = ["Profile", "is_good", "log_radii", "place_edges", "profile_of", "used_points"]


@dataclass(frozen=True, eq=False)
class Profile:
    """ln r along all chains; NaN where the radius is none."""

    place: IntArray
    offsets: IntArray
    points: FloatArray
    log_radius: FloatArray
    along: FloatArray
    chain: IntArray
    at_junction: BoolArray
    open_start: BoolArray
    open_end: BoolArray


def used_points(centrelines: Centrelines) -> IntArray:
    """Raw points on any line, rising."""
    used = np.zeros(centrelines.n_points, np.bool_)
    used[centrelines.connectivity] = True
    return np.flatnonzero(used)


def log_radii(radius: FloatArray, label: IntArray, count: int) -> FloatArray:
    """Mean ln r of the good radii stated at each place; NaN where none is good."""
    good = is_good(radius)
    total = np.bincount(label[good], np.log(radius[good]), count)
    number = np.bincount(label[good], minlength=count)
    value: FloatArray = np.divide(total, number, out=np.full(count, np.nan), where=number > 0)
    return value


def is_good(radius: FloatArray) -> BoolArray:
    """Whether a radius can be."""
    good: BoolArray = (radius > 0) & (radius < np.inf)
    return good


def place_edges(centrelines: Centrelines, used: IntArray, label: IntArray) -> IntArray:
    """Places at both ends of every step as drawn, each pair once."""
    number = np.zeros(centrelines.n_points, np.int64)
    number[used] = label
    place = number[centrelines.connectivity]
    inner = np.ones(len(place), np.bool_)
    inner[centrelines.offsets[1:] - 1] = False
    start = np.flatnonzero(inner[:-1] & (place[1:] != place[:-1]))
    pairs = np.stack((place[start], place[start + 1]), axis=1)
    keys = _keys(pairs, len(label))
    ordered = np.sort(keys)
    if (ordered[1:] != ordered[:-1]).all():
        return pairs
    return pairs[np.sort(np.unique(keys, return_index=True)[1])]


def _keys(pairs: IntArray, count: int) -> IntArray:
    """One number per pair of places, the same for both directions."""
    low, high = np.minimum(pairs[:, 0], pairs[:, 1]), np.maximum(pairs[:, 0], pairs[:, 1])
    key: IntArray = low * np.int64(count + 1) + high
    return key


def profile_of(raw_points: FloatArray, raw_of_place: IntArray, value: FloatArray, edges: IntArray) -> Profile:
    """Chains of places with ln r and arc length along them."""
    place, offsets = _in_order(chains(len(value), edges), _keys(edges, len(value)))
    first, last = offsets[:-1], offsets[1:] - 1
    degree = degrees(len(value), edges)
    is_open = degree == 1
    open_start, open_end = is_open[place[first]], is_open[place[last]]
    chain = np.repeat(np.arange(len(first)), np.diff(offsets))
    points = raw_points.take(raw_of_place[place], axis=0)
    along = arc_length(points, offsets)
    return Profile(place, offsets, points, value[place], along, chain, degree[place] > 2, open_start, open_end)


def _in_order(cut: Chains, key: IntArray) -> tuple[IntArray, IntArray]:
    """Places along chains, and offsets, in an order and direction that the order of the lines leaves no trace in."""
    first, last = cut.offsets[:-1], cut.offsets[1:] - 1
    start, end = key[cut.edge[cut.edge_offsets[:-1]]], key[cut.edge[cut.edge_offsets[1:] - 1]]
    turned = (start > end) | ((last == first + 1) & (cut.point[first] > cut.point[last]))
    order = np.argsort(np.minimum(start, end))
    count = np.diff(cut.offsets)[order]
    offsets = np.concatenate(([0], np.cumsum(count)))
    way = np.where(turned[order], -1, 1)
    row = np.where(turned, last, first)[order] - way * offsets[:-1]
    return cut.point[np.repeat(row, count) + np.repeat(way, count) * np.arange(offsets[-1])], offsets
