"""Curvature, torsion and tortuosity of centrelines; robust lines and scatter of values along them.

A coarse step cuts corners and lowers every measure of tortuosity: values are comparable only at
like steps, so the step stands beside them.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from geomprep.curves import arc_length, line_sums, pieces, weighted_median
from geomprep.errors import InputError
from geomprep.model import BoolArray, FloatArray, IntArray

__all__ = ["Curvature", "Tortuosity", "check_lines", "curvature", "masked_median", "repeated_medians"]
__all__ += ["station_scatter", "tortuosity"]

_CHUNK = 256  # lines fitted at once: 256 · 65² numbers are 9 MB


@dataclass(frozen=True, eq=False)
class Curvature:
    """Bending of lines at their stations.

    Attributes
    ----------
    curvature : (n,) float array
        1/m; not a number on a line of two points.
    torsion : (n,) float array
        1/m, positive for a right-handed helix; not a number where the line is straight or has fewer
        than four points.
    step, longest_step : (m,) float array
        Mean and longest distance between points of each line, m.
    """

    curvature: FloatArray
    torsion: FloatArray
    step: FloatArray
    longest_step: FloatArray


@dataclass(frozen=True, eq=False)
class Tortuosity:
    """Tortuosity of whole lines.

    Attributes
    ----------
    distance_metric : (m,) float array
        Length over the straight distance of the ends; not a number for a closed line.
    inflections : (m,) int array
        Places where the principal normal turns about.
    inflection_count_metric : (m,) float array
        (inflections + 1) · distance metric.
    sum_of_angles_metric : (m,) float array
        Sum of √(in-plane angle² + torsional angle²) between successive pieces, over the length, rad/m.
    total_curvature : (m,) float array
        Sum of the angles between successive pieces, rad.
    step, longest_step : (m,) float array
        As in :class:`Curvature`.
    """

    distance_metric: FloatArray
    inflections: IntArray
    inflection_count_metric: FloatArray
    sum_of_angles_metric: FloatArray
    total_curvature: FloatArray
    step: FloatArray
    longest_step: FloatArray


@dataclass(frozen=True, eq=False)
class _Turns:
    """Turns at the inner points of all lines, in order.

    `middle`: row of the point; `step`: length of the piece after it; `binormal`: unit vector about which the
    line turns, zero where it is straight; `angle`: the turn; `follows`: for all but the last, the next turn
    is at the next point of the same line; `twist`: angle to its binormal.
    """

    middle: IntArray
    step: FloatArray
    binormal: FloatArray
    angle: FloatArray
    follows: BoolArray
    twist: FloatArray


def check_lines(distance: FloatArray, offsets: IntArray, **columns: npt.NDArray[np.generic]) -> None:
    """Raise unless the lines have two stations or more, rising from distance 0, and columns as long.

    Parameters
    ----------
    distance : (n,) float array
        Distance along each line from its first station, m.
    offsets : (m + 1,) int array
    **columns : (n, ...) array
        Further values per station, by name.

    Raises
    ------
    InputError
        The arrays do not describe such lines.

    Examples
    --------
    >>> check_lines(np.array([0.0, 1.0]), np.array([0, 2]))
    >>> check_lines(np.array([0.0, 1.0, 1.0]), np.array([0, 3]))
    Traceback (most recent call last):
    geomprep.errors.InputError: distance = 1 at station 2: it must rise along a segment; drop the repeated station
    """
    for name, values in columns.items():
        if len(values) != len(distance):
            raise InputError(f"{name}: {len(values)} values for {len(distance)} stations; give one per station")
    _check_offsets(len(distance), offsets)
    if np.any(distance[offsets[:-1]] != 0):
        raise InputError("distance does not start at 0: measure it from each segment's first station")
    first = pieces(offsets).first
    falling = first[~(distance[first + 1] > distance[first])] + 1
    if len(falling):
        raise InputError(
            f"distance = {distance[falling[0]]:g} at station {falling[0]}: it must rise along a segment; "
            "drop the repeated station"
        )


def curvature(points: FloatArray, offsets: IntArray, straight_below: float = 1e-4) -> Curvature:
    r"""Return curvature and torsion at every point.

    Curvature is that of the circle through a point and its neighbours, 2|a × b|/(|a| |b| |a + b|) with
    the pieces a and b; torsion is the angle from one binormal to the next over the piece between, the
    mean of both sides of a point. Both tend to |r' × r''|/|r'|³ and (r' × r'')·r'''/|r' × r''|² at second
    order. Ends take the value next to them. A binormal that turns by more than 90° over one piece
    marks an inflection, not torsion: 180° is taken off.

    Parameters
    ----------
    points : (n, 3) float array
        Points of all lines, m.
    offsets : (m + 1,) int array
        Line i owns points ``offsets[i]:offsets[i + 1]``, at least two, none repeated.
    straight_below : float
        Turn between pieces, rad, below which the line counts as straight (rounded coordinates turn, too).

    Returns
    -------
    Curvature

    Raises
    ------
    InputError
        The arrays do not describe such lines.

    Examples
    --------
    >>> t = np.linspace(0.0, 4 * np.pi, 97)
    >>> bent = curvature(np.stack((np.cos(t), np.sin(t), 0.5 * t), axis=1), np.array([0, 97]))
    >>> print(bent.curvature[48].round(2), bent.torsion[48].round(2))  # a/(a² + b²), b/(a² + b²)
    0.8 0.4
    """
    along = _checked(points, offsets)
    turns = _turns(points, offsets, straight_below)
    bend = np.full(len(points), np.nan)
    chord = np.linalg.norm(points[turns.middle + 1] - points[turns.middle - 1], axis=1)
    bend[turns.middle] = 2 * np.sin(turns.angle) / np.where(chord > 0, chord, np.nan)
    mean, longest = _steps(along, offsets)
    return Curvature(
        curvature=_ends_as_neighbours(bend, offsets),
        torsion=_ends_as_neighbours(_torsion(turns, len(points)), offsets),
        step=mean,
        longest_step=longest,
    )


def tortuosity(points: FloatArray, offsets: IntArray, straight_below: float = 1e-4) -> Tortuosity:
    """Return the tortuosity of every line.

    The distance metric is length over chord, the inflection count metric is that times one more than
    the inflections, and the sum of angles metric is Σ√(p² + q²) over the length, with the angle p
    between successive pieces and the angle q between successive binormals. A planar inflection turns
    the binormal by 180°; that is not torsion, and is taken off. The sum skips the last turn of
    a line, which has no next binormal, so that it converges at first order in the step. A noisy
    line has an inflection at every other point: smooth it first.

    Parameters
    ----------
    points : (n, 3) float array
        Points of all lines, m.
    offsets : (m + 1,) int array
        Line i owns points ``offsets[i]:offsets[i + 1]``, at least two, none repeated.
    straight_below : float
        As for :func:`curvature`.

    Returns
    -------
    Tortuosity

    Raises
    ------
    InputError
        The arrays do not describe such lines.

    References
    ----------
    Bullitt et al. 2003, doi 10.1109/TMI.2003.816964 (idea seen; the form of the sum and the +1 from memory).

    Examples
    --------
    >>> t = np.linspace(0.0, 2 * np.pi, 1001)
    >>> wave = tortuosity(np.stack((t, np.sin(t), 0 * t), axis=1), np.array([0, 1001]))
    >>> int(wave.inflections[0]), float(wave.distance_metric[0].round(4))
    (1, 1.216)
    """
    along = _checked(points, offsets)
    turns = _turns(points, offsets, straight_below)
    n_lines = len(offsets) - 1
    line = np.searchsorted(offsets, turns.middle, side="right") - 1
    length = along[offsets[1:] - 1]
    chord = np.linalg.norm(points[offsets[1:] - 1] - points[offsets[:-1]], axis=1)
    ratio = np.where(chord > 1e-9 * length, length / np.where(chord > 0, chord, 1.0), np.nan)
    both = np.hypot(turns.angle[:-1], turns.twist)[turns.follows]
    inflections = _inflections(turns, line, n_lines)
    mean, longest = _steps(along, offsets)
    return Tortuosity(
        distance_metric=ratio,
        inflections=inflections,
        inflection_count_metric=np.asarray((inflections + 1) * ratio, dtype=np.float64),
        sum_of_angles_metric=np.bincount(line[:-1][turns.follows], both, n_lines) / length,
        total_curvature=np.asarray(np.bincount(line, turns.angle, n_lines), dtype=np.float64),
        step=mean,
        longest_step=longest,
    )


def repeated_medians(x: FloatArray, y: FloatArray, known: BoolArray) -> FloatArray:
    """Fit straight lines that up to half of the values cannot mislead.

    The slope is the median over points of the median slope from that point to all others.

    Parameters
    ----------
    x : (c,) float array
        Places, all different, the same for all lines.
    y : (m, c) float array
    known : (m, c) bool array
        Values that count.

    Returns
    -------
    (m, 2) float array
        Value at x = 0 and slope.

    References
    ----------
    Siegel 1982, doi 10.1093/biomet/69.1.242 (from memory).

    Examples
    --------
    >>> y = np.array([[1.0, 3.0, 5.0, -9.0, 40.0, 11.0, 13.0]])
    >>> repeated_medians(np.arange(7.0), y, np.ones((1, 7), bool))
    array([[1., 2.]])
    """
    run = x[None, :] - x[:, None]
    apart = run != 0
    run[~apart] = 1.0
    slope = np.zeros(len(y))
    for start in range(0, len(y), _CHUNK):
        rows = slice(start, start + _CHUNK)
        each = (y[rows, None, :] - y[rows, :, None]) / run
        slope[rows] = masked_median(masked_median(each, known[rows, None, :] & apart), known[rows])
    return np.stack((masked_median(y - slope[:, None] * x, known), slope), axis=1)


def masked_median(values: FloatArray, known: BoolArray) -> FloatArray:
    """Return the median of the known values along the last axis; 0 where there is none.

    Examples
    --------
    >>> masked_median(np.array([[1.0, 2.0, 9.0], [1.0, 2.0, 9.0]]), np.array([[True, False, True], [False] * 3]))
    array([5., 0.])
    """
    known = np.broadcast_to(known, values.shape)
    count = known.sum(axis=-1, keepdims=True)
    ordered = np.sort(np.where(known, values, np.inf), axis=-1)
    ends = (np.maximum(count - 1, 0) // 2, np.minimum(count // 2, values.shape[-1] - 1))
    low, high = (np.take_along_axis(ordered, end, axis=-1)[..., 0] for end in ends)
    return np.where(count[..., 0] > 0, 0.5 * (low + high), 0.0)


def station_scatter(distance: FloatArray, radius: FloatArray, usable: BoolArray, offsets: IntArray) -> FloatArray:
    """Return the robust standard deviation of ln r from station to station, for each line.

    It is the median distance of ln r from the chord of its neighbours, scaled so that independent
    normal scatter σ gives σ (1/Φ⁻¹(¾) = 1.4826); scatter smooth over stations gives less.

    Examples
    --------
    >>> radius = np.exp(0.02 * np.random.default_rng(1).standard_normal(4000))
    >>> station_scatter(np.arange(4000.0), radius, np.ones(4000, bool), np.array([0, 4000])).round(3)
    array([0.02])
    """
    row = np.setdiff1d(np.arange(len(distance)), np.concatenate((offsets[:-1], offsets[1:] - 1)))
    row = row[usable[row - 1] & usable[row] & usable[row + 1]]
    part = (distance[row] - distance[row - 1]) / (distance[row + 1] - distance[row - 1])
    log = np.log(radius)
    off = np.abs(log[row] - (1 - part) * log[row - 1] - part * log[row + 1])
    owner, starts = np.unique(np.searchsorted(offsets, row, side="right") - 1, return_index=True)
    noise = np.zeros(len(offsets) - 1)
    size = 1.4826 * off / np.sqrt(1 + (1 - part) ** 2 + part**2)
    noise[owner] = weighted_median(size, np.ones(len(row)), starts)
    return noise


def _checked(points: FloatArray, offsets: IntArray) -> FloatArray:
    """Distance along lines of points that can be used."""
    if points.ndim != 2 or points.shape[1] != 3 or not np.isfinite(points).all():
        raise InputError(f"points of shape {points.shape}: (n, 3) finite coordinates are needed")
    _check_offsets(len(points), offsets)
    along = arc_length(points, offsets)
    check_lines(along, offsets)
    return along


def _check_offsets(n: int, offsets: IntArray) -> None:
    """Raise unless the offsets part n stations into lines of two or more."""
    if len(offsets) == 0 or offsets[0] != 0 or offsets[-1] != n or (np.diff(offsets) < 2).any():
        raise InputError(f"offsets of {n} stations: they must run from 0 to {n} in steps of at least 2")


def _steps(along: FloatArray, offsets: IntArray) -> tuple[FloatArray, FloatArray]:
    """Mean and longest step of every line."""
    piece = pieces(offsets)
    step = along[piece.first + 1] - along[piece.first]
    longest = np.maximum.reduceat(step, piece.starts) if len(piece.starts) else np.zeros(0)
    return line_sums(step, piece.starts) / (np.diff(offsets) - 1), longest


def _turns(points: FloatArray, offsets: IntArray, straight_below: float) -> _Turns:
    """Angles between successive pieces and between successive binormals."""
    first = pieces(offsets).first
    piece = points[first + 1] - points[first]
    step = np.linalg.norm(piece, axis=1)
    direction = piece / step[:, None]
    turn = np.flatnonzero(first[1:] == first[:-1] + 1)
    before, after = direction[turn], direction[turn + 1]
    cross = np.cross(before, after)
    sine = np.linalg.norm(cross, axis=1)
    angle = np.arctan2(sine, np.einsum("ij,ij->i", before, after))
    bent = (angle >= straight_below) & (sine > 0)
    binormal = np.where(bent[:, None], cross / np.where(sine > 0, sine, 1.0)[:, None], 0.0)
    middle = first[turn] + 1
    twist = _twist(binormal, after)
    follows = middle[1:] == middle[:-1] + 1
    return _Turns(middle, step[turn + 1], binormal, angle, follows, twist)


def _twist(binormal: FloatArray, axis: FloatArray) -> FloatArray:
    """Signed angle from each binormal to the next about the piece between, folded into ±90°; 0 where one is missing."""
    here, there = binormal[:-1], binormal[1:]
    across = np.einsum("ij,ij->i", np.cross(here, there), axis[:-1])
    alike = np.einsum("ij,ij->i", here, there)
    # an inflection reverses the binormal: both signs change, and the angle is that of the lines
    twist: FloatArray = np.arctan2(across * np.where(alike < 0, -1.0, 1.0), np.abs(alike))
    return twist


def _torsion(turns: _Turns, n_points: int) -> FloatArray:
    """Mean torsion of the pieces on both sides of a point, where both their ends have a binormal."""
    bent = np.any(turns.binormal != 0, axis=1)
    known = np.flatnonzero(turns.follows & bent[:-1] & bent[1:])
    value = turns.twist[known] / turns.step[known]
    sides = [turns.middle[known], turns.middle[known] + 1]
    rows, both = np.concatenate(sides), np.tile(value, 2)
    count = np.bincount(rows, minlength=n_points)
    total = np.bincount(rows, both, n_points)
    return np.where(count > 0, total / np.maximum(count, 1), np.nan)


def _ends_as_neighbours(values: FloatArray, offsets: IntArray) -> FloatArray:
    """Give both ends of lines of three points or more the value beside them."""
    long = np.diff(offsets) > 2
    first, last = offsets[:-1][long], offsets[1:][long] - 1
    values[first], values[last] = values[first + 1], values[last - 1]
    return values


def _inflections(turns: _Turns, line: IntArray, n_lines: int) -> IntArray:
    """Count the reversals of the binormal along each line, straight points passed over."""
    bent = np.flatnonzero(np.any(turns.binormal != 0, axis=1))
    here, there = turns.binormal[bent[:-1]], turns.binormal[bent[1:]]
    turned = (np.einsum("ij,ij->i", here, there) < 0) & (line[bent[:-1]] == line[bent[1:]])
    return np.bincount(line[bent[:-1]][turned], minlength=n_lines)
