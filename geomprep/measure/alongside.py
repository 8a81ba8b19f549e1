"""Which stretches of one network run along which segments of another."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.spatial import KDTree

from geomprep.curves import interpolate, line_sums, piece_integrals, pieces
from geomprep.model import BoolArray, FloatArray, IntArray, Stations, TextArray, Uint8Array

__all__ = ["Cells", "Nearest", "Reach", "cells", "nearest", "nearest_of_pairs", "shared_pairs"]

_FEWEST, _MOST = 4, 5000  # cells of a segment
_LOOKED_AT = (6, 24)
"""Cells of the other network that are tried for each cell, by the distance of their middles: more where none fits."""
_BLOCK = 50_000  # cells at once: 50,000 · 24 · 3 numbers are 29 MB

Kinds = tuple[tuple[TextArray, Uint8Array], tuple[TextArray, Uint8Array]]
"""Name and class of the segments of two networks."""


@dataclass(frozen=True)
class Reach:
    """How near two axes must run to count as one vessel.

    Attributes
    ----------
    within : float
        Distance in parts of the mean of both radii.
    named_within : float
        The same where both vessels bear the same name.
    floor : float
        Distance that always counts, m: the scatter of positions.
    cosine : float
        Least cosine of the angle between the axes, without sign.
    """

    within: float
    named_within: float
    floor: float
    cosine: float


@dataclass(frozen=True, eq=False)
class Cells:
    """Segments in short cells of equal length, c of them.

    Attributes
    ----------
    segment : (c,) int array
    length : (c,) float array
        m.
    start, middle, end : (c, 3) float array
        m.
    radius_start, radius, radius_end : (c,) float array
        m, at those three.
    inverse_fourth_power : (c,) float array
        The cell's part of ∫ds/r⁴, 1/m³; the cells of a segment add up to its own.
    first : (s + 1,) int array
        Segment i owns cells ``first[i]:first[i + 1]``.
    """

    segment: IntArray
    length: FloatArray
    start: FloatArray
    middle: FloatArray
    end: FloatArray
    radius_start: FloatArray
    radius: FloatArray
    radius_end: FloatArray
    inverse_fourth_power: FloatArray
    first: IntArray


@dataclass(frozen=True, eq=False)
class Nearest:
    """For each cell the segment of the other network that it runs along.

    Attributes
    ----------
    segment : (c,) int array
        −1 for none.
    radius : (c,) float array
        Radius of that segment at the foot, m; NaN for none.
    """

    segment: IntArray
    radius: FloatArray


def cells(stations: Stations, size: float) -> Cells:
    """Cut segments into cells.

    Parameters
    ----------
    stations : Stations
    size : float
        Length of a cell in mean radii of its segment; a segment has four at least.

    Returns
    -------
    Cells

    Examples
    --------
    A cylinder of radius 1 mm, 10 mm long:

    >>> line = Stations([0, 2], [0.0, 0.01], [[0.0, 0, 0], [0.01, 0, 0]], [1e-3, 1e-3], [0, 0])
    >>> cut = cells(line, 0.5)
    >>> len(cut.length), f"{cut.inverse_fourth_power.sum():.6g}"
    (20, '1e+10')
    """
    offsets, distance = stations.offsets, stations.distance
    piece = pieces(offsets)
    near, far = stations.radius[piece.first], stations.radius[piece.first + 1]
    step = distance[piece.first + 1] - distance[piece.first]
    length = line_sums(step, piece.starts)
    mean_radius = line_sums(step * (near + far) / 2, piece.starts) / length
    count = np.clip(np.ceil(length / (size * mean_radius) - 1e-9), _FEWEST, _MOST).astype(np.int64)
    first = np.concatenate(([0], np.cumsum(count)))
    segment = np.repeat(np.arange(len(count)), count)
    at = np.arange(len(segment)) - first[segment]
    columns = np.column_stack((stations.position, stations.radius))
    start, middle, end = (
        interpolate(distance, columns, offsets, segment, (at + part) * (length / count)[segment])
        for part in (0.0, 0.5, 1.0)
    )
    width = (length / count)[segment]
    part = piece_integrals(width / 2, start[:, 3], middle[:, 3]) + piece_integrals(width / 2, middle[:, 3], end[:, 3])
    exact = line_sums(piece_integrals(step, near, far)[:, 3], piece.starts)
    scale = exact / line_sums(part[:, 3], first[:-1])
    return Cells(
        segment=segment,
        length=width,
        start=start[:, :3],
        middle=middle[:, :3],
        end=end[:, :3],
        radius_start=start[:, 3],
        radius=middle[:, 3],
        radius_end=end[:, 3],
        inverse_fourth_power=part[:, 3] * scale[segment],
        first=first,
    )


def nearest(of: Cells, among: Cells, kinds: Kinds, reach: Reach) -> Nearest:
    """Find the segment along which each cell runs.

    Vessels of different known classes never answer to one another; names only widen the reach.

    Parameters
    ----------
    of, among : Cells
        Of one network, and of the other.
    kinds : tuple
        Name and class of the segments of both: ((s,) str, (s,) uint8) each.
    reach : Reach

    Returns
    -------
    Nearest

    Examples
    --------
    >>> line = Stations([0, 2], [0.0, 0.01], [[0.0, 0, 0], [0.01, 0, 0]], [1e-3, 1e-3], [0, 0])
    >>> beside = Stations([0, 2], [0.0, 0.01], [[0.0, 4e-4, 0], [0.01, 4e-4, 0]], [1e-3, 1e-3], [0, 0])
    >>> kind = np.array([""], object), np.array([1], np.uint8)
    >>> reach = Reach(within=0.5, named_within=1.0, floor=0.0, cosine=0.5)
    >>> set(nearest(cells(line, 0.5), cells(beside, 0.5), (kind, kind), reach).segment.tolist())
    {0}
    """
    segment, radius = np.full(len(of.length), -1), np.full(len(of.length), np.nan)
    _fill(segment, radius, (of, among), kinds, reach, None)
    return Nearest(segment, radius)


def nearest_of_pairs(of: Cells, among: Cells, kinds: Kinds, reach: Reach, pairs: IntArray, before: Nearest) -> Nearest:
    """Find the segment along which each cell runs where only some pairs of segments may answer to one another.

    Parameters
    ----------
    of, among, kinds, reach
        As for :func:`nearest`.
    pairs : (p, 2) int array
        Segment of the one, segment of the other.
    before : Nearest
        Answer of :func:`nearest`: a cell whose nearest segment is one of its pairs keeps it.

    Returns
    -------
    Nearest

    Examples
    --------
    >>> line = Stations([0, 2], [0.0, 0.01], [[0.0, 0, 0], [0.01, 0, 0]], [1e-3, 1e-3], [0, 0])
    >>> cut, kind = cells(line, 0.5), (np.array([""], object), np.array([1], np.uint8))
    >>> reach = Reach(within=0.5, named_within=1.0, floor=0.0, cosine=0.5)
    >>> first = nearest(cut, cut, (kind, kind), reach)
    >>> set(nearest_of_pairs(cut, cut, (kind, kind), reach, np.empty((0, 2), np.int64), first).segment.tolist())
    {-1}
    """
    known = np.sort(pairs[:, 0] * len(among.first) + pairs[:, 1])
    kept = (before.segment >= 0) & _is_one_of(of.segment * len(among.first) + before.segment, known)
    segment, radius = np.where(kept, before.segment, -1), np.where(kept, before.radius, np.nan)
    _fill(segment, radius, (of, among), kinds, reach, known)
    return Nearest(segment, radius)


def _fill(
    segment: IntArray,
    radius: FloatArray,
    both: tuple[Cells, Cells],
    kinds: Kinds,
    reach: Reach,
    known: IntArray | None,
) -> None:
    """Answer cells that have none, trying few neighbours first and more where none of these fits."""
    of, among = both
    if not (len(of.length) and len(among.length)):
        return
    tree = KDTree(among.middle)
    words = np.unique(np.concatenate((kinds[0][0], kinds[1][0])).astype(str), return_inverse=True)[1]
    traits = _Traits(words[: len(kinds[0][0])], words[len(kinds[0][0]) :], kinds)
    for count in _LOOKED_AT:
        left = np.flatnonzero(segment < 0)
        for begin in range(0, len(left), _BLOCK):
            rows = left[begin : begin + _BLOCK]
            near = tree.query(of.middle[rows], k=min(count, len(among.length)))[1].reshape(len(rows), -1)
            segment[rows], radius[rows] = _best((of, rows), (among, near), traits, reach, known)


@dataclass(frozen=True, eq=False)
class _Traits:
    """Number of the name of each segment of both networks, and their names and classes."""

    own_word: IntArray
    other_word: IntArray
    kinds: Kinds


def _best(
    one: tuple[Cells, IntArray],
    other: tuple[Cells, IntArray],
    traits: _Traits,
    reach: Reach,
    known: IntArray | None,
) -> tuple[IntArray, FloatArray]:
    """Segment of the nearest candidate that fits, and its radius at the foot."""
    of, rows = one
    among, near = other
    distance, radius = _foot(of.middle[rows], among, near)
    own, theirs = of.segment[rows][:, None], among.segment[near]
    limit = _limits(0.5 * (of.radius[rows][:, None] + radius), (own, theirs), traits, reach)
    fits = (distance <= limit) & _one_class(own, theirs, traits.kinds)
    fits &= _cosine(of.end[rows] - of.start[rows], among, near) >= reach.cosine
    if known is not None:
        fits &= _is_one_of(own * len(among.first) + theirs, known)
    best = np.argmin(np.where(fits, distance, np.inf), axis=1)[:, None]
    found = np.take_along_axis(fits, best, axis=1)[:, 0]
    segment = np.where(found, np.take_along_axis(theirs, best, axis=1)[:, 0], -1)
    return segment, np.where(found, np.take_along_axis(radius, best, axis=1)[:, 0], np.nan)


def _is_one_of(number: IntArray, known: IntArray) -> BoolArray:
    """Whether numbers stand in a sorted list."""
    if not len(known):
        return np.zeros(number.shape, np.bool_)
    found: BoolArray = known[np.minimum(np.searchsorted(known, number), len(known) - 1)] == number
    return found


def _foot(point: FloatArray, among: Cells, near: IntArray) -> tuple[FloatArray, FloatArray]:
    """Distance from points to the axis of their candidates, and the radius there."""
    start, way = among.start[near], among.end[near] - among.start[near]
    to = point[:, None] - start
    square = np.maximum(np.einsum("ijk,ijk->ij", way, way), np.finfo(float).tiny)
    part = np.clip(np.einsum("ijk,ijk->ij", to, way) / square, 0.0, 1.0)
    aside = to - part[..., None] * way
    distance = np.sqrt(np.einsum("ijk,ijk->ij", aside, aside))
    return distance, among.radius_start[near] * (1 - part) + among.radius_end[near] * part


def _cosine(way: FloatArray, among: Cells, near: IntArray) -> FloatArray:
    """Cosine of the angle between ways and the candidates, without sign."""
    other = _unit(among.end - among.start)
    cosine: FloatArray = np.abs(np.einsum("ik,ijk->ij", _unit(way), other[near]))
    return cosine


def _unit(way: FloatArray) -> FloatArray:
    """Unit vectors; zero where there is no way."""
    unit: FloatArray = way / np.maximum(np.linalg.norm(way, axis=1), np.finfo(float).tiny)[:, None]
    return unit


def _limits(radius: FloatArray, rows: tuple[IntArray, IntArray], traits: _Traits, reach: Reach) -> FloatArray:
    """Distance up to which cells and candidates run along one another."""
    own, other = rows
    named = (traits.own_word[own] == traits.other_word[other]) & (traits.kinds[0][0][own] != "")
    return np.maximum(np.where(named, reach.named_within, reach.within) * radius, reach.floor)


def _one_class(own: IntArray, other: IntArray, kinds: Kinds) -> BoolArray:
    """Whether vessels are of one class, or one of them of none."""
    one, two = kinds[0][1][own], kinds[1][1][other]
    same: BoolArray = (one == two) | (one == 0) | (two == 0)
    return same


def shared_pairs(one: tuple[Cells, Nearest], other: tuple[Cells, Nearest], share: float) -> IntArray:
    """Return the segments that answer to one another.

    Parameters
    ----------
    one, other : tuple of Cells and Nearest
        Each network's cells, and along which segment of the other network they run.
    share : float
        Part of the shorter segment that must run along the other, seen from both.

    Returns
    -------
    (p, 2) int array
        Segment of the one, segment of the other.

    Examples
    --------
    >>> line = Stations([0, 2], [0.0, 0.01], [[0.0, 0, 0], [0.01, 0, 0]], [1e-3, 1e-3], [0, 0])
    >>> cut = cells(line, 0.5)
    >>> along = Nearest(np.zeros(20, np.int64), np.full(20, 1e-3))
    >>> shared_pairs((cut, along), (cut, along), 0.5).tolist()
    [[0, 0]]
    """
    columns = len(other[0].first)
    forth, forth_length = _run_along(*one, columns, turned=False)
    back, back_length = _run_along(*other, columns, turned=True)
    keys, here, there = np.intersect1d(forth, back, assume_unique=True, return_indices=True)
    rows, others = np.divmod(keys, columns)
    lengths = [line_sums(cut.length, cut.first[:-1]) for cut in (one[0], other[0])]
    shorter = np.minimum(lengths[0][rows], lengths[1][others])
    kept = np.minimum(forth_length[here], back_length[there]) >= share * shorter * (1 - 1e-9)
    return np.column_stack((rows[kept], others[kept]))


def _run_along(cut: Cells, found: Nearest, columns: int, turned: bool) -> tuple[IntArray, FloatArray]:
    """Number of each pair of segments that meets, and the length along which it does."""
    met = found.segment >= 0
    own, other = cut.segment[met], found.segment[met]
    number = other * columns + own if turned else own * columns + other
    keys, place = np.unique(number, return_inverse=True)
    return keys, np.bincount(place, cut.length[met], len(keys)).astype(np.float64)
