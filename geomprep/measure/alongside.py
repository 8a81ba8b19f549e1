"""Which stretches of one network run along which segments of another."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.spatial import KDTree

from geomprep.curves import interpolate, line_sums, piece_integrals, pieces
from geomprep.model import BoolArray, FloatArray, IntArray, Stations, TextArray, Uint8Array

__all__ = ["Cells", "Nearest", "Reach", "cells", "nearest", "shared_pairs"]

_FEWEST, _MOST = 4, 5000  # cells of a segment
_LOOKED_AT = 24
"""Cells of the other network that are tried for each cell, by the distance of their middles."""


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


def nearest(
    of: Cells,
    among: Cells,
    kinds: tuple[tuple[TextArray, Uint8Array], tuple[TextArray, Uint8Array]],
    reach: Reach,
    pairs: IntArray | None = None,
) -> Nearest:
    """Find the segment along which each cell runs.

    Vessels of different known classes never answer to one another; names only widen the reach.

    Parameters
    ----------
    of, among : Cells
        Of one network, and of the other.
    kinds : tuple
        Name and class of the segments of both: ((s,) str, (s,) uint8) each.
    reach : Reach
    pairs : (p, 2) int array, optional
        The only segments that may answer to one another; all where not given.

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
    if not (len(of.length) and len(among.length)):
        return Nearest(np.full(len(of.length), -1), np.full(len(of.length), np.nan))
    near = KDTree(among.middle).query(of.middle, k=min(_LOOKED_AT, len(among.length)))[1].reshape(len(of.length), -1)
    distance, radius = _foot(of, among, near)
    own, other = of.segment[:, None], among.segment[near]
    limit = _limits(0.5 * (of.radius[:, None] + radius), (own, other), kinds, reach)
    fits = (distance <= limit) & (_cosine(of, among, near) >= reach.cosine) & _one_class(own, other, kinds)
    if pairs is not None:
        known = np.sort(pairs[:, 0] * len(among.first) + pairs[:, 1])
        fits &= np.isin(own * len(among.first) + other, known)
    best = np.argmin(np.where(fits, distance, np.inf), axis=1)[:, None]
    found = np.take_along_axis(fits, best, axis=1)[:, 0]
    segment = np.where(found, np.take_along_axis(other, best, axis=1)[:, 0], -1)
    return Nearest(segment, np.where(found, np.take_along_axis(radius, best, axis=1)[:, 0], np.nan))


def _foot(of: Cells, among: Cells, near: IntArray) -> tuple[FloatArray, FloatArray]:
    """Distance from the middle of each cell to the axis of its candidates, and their radius there."""
    start, way = among.start[near], among.end[near] - among.start[near]
    to = of.middle[:, None] - start
    square = np.maximum((way * way).sum(axis=2), np.finfo(float).tiny)
    part = np.clip((to * way).sum(axis=2) / square, 0.0, 1.0)
    distance = np.linalg.norm(to - part[..., None] * way, axis=2)
    return distance, among.radius_start[near] * (1 - part) + among.radius_end[near] * part


def _cosine(of: Cells, among: Cells, near: IntArray) -> FloatArray:
    """Cosine of the angle between each cell and its candidates, without sign."""
    one, other = (_unit(each.end - each.start) for each in (of, among))
    cosine: FloatArray = np.abs((one[:, None] * other[near]).sum(axis=2))
    return cosine


def _unit(way: FloatArray) -> FloatArray:
    """Unit vectors; zero where there is no way."""
    unit: FloatArray = way / np.maximum(np.linalg.norm(way, axis=1), np.finfo(float).tiny)[:, None]
    return unit


def _limits(
    radius: FloatArray,
    rows: tuple[IntArray, IntArray],
    kinds: tuple[tuple[TextArray, Uint8Array], tuple[TextArray, Uint8Array]],
    reach: Reach,
) -> FloatArray:
    """Distance up to which cells and candidates run along one another."""
    words = np.concatenate((kinds[0][0], kinds[1][0])).astype(str)
    number = np.unique(words, return_inverse=True)[1]
    one, other = number[: len(kinds[0][0])][rows[0]], number[len(kinds[0][0]) :][rows[1]]
    named = (one == other) & (kinds[0][0][rows[0]] != "")
    return np.maximum(np.where(named, reach.named_within, reach.within) * radius, reach.floor)


def _one_class(
    own: IntArray, other: IntArray, kinds: tuple[tuple[TextArray, Uint8Array], tuple[TextArray, Uint8Array]]
) -> BoolArray:
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
