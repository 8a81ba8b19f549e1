"""Kernels on sampled curves: many lines at once, as points and offsets.

Line i owns rows ``offsets[i]:offsets[i + 1]`` of every array. A *piece* lies between two
consecutive rows of one line. The radius is linear between rows, and all profile
integrals are exact for that.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

__all__ = [
    "Pieces",
    "arc_length",
    "interpolate",
    "line_sums",
    "piece_integrals",
    "pieces",
    "resistance_share",
    "weighted_median",
]

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class Pieces:
    """Rows at both ends of every piece, and where each line's pieces begin.

    Attributes
    ----------
    first : (p,) int array
        Row at the start of each piece; ``first + 1`` is the row at its end.
    starts : (m,) int array
        First piece of each line.
    """

    first: IntArray
    starts: IntArray


def pieces(offsets: IntArray) -> Pieces:
    """List the pieces of lines of at least two rows.

    Examples
    --------
    >>> pieces(np.array([0, 3, 5])).first
    array([0, 1, 3])
    """
    inner = np.ones(int(offsets[-1]), np.bool_)
    inner[offsets[1:] - 1] = False
    return Pieces(np.flatnonzero(inner), offsets[:-1] - np.arange(len(offsets) - 1))


def line_sums(values: FloatArray, starts: IntArray) -> FloatArray:
    """Sum piece values over each line.

    Parameters
    ----------
    values : (p, ...) float array
        One value (or row) per piece.
    starts : (m,) int array
        First piece of each line; every line has at least one piece.

    Examples
    --------
    >>> line_sums(np.array([1.0, 2.0, 4.0]), np.array([0, 2]))
    array([3., 4.])
    >>> line_sums(np.empty(0), np.empty(0, dtype=np.int64)).size
    0
    """
    if len(starts) == 0:
        return np.zeros((0, *values.shape[1:]))
    return np.add.reduceat(values, starts)


def arc_length(points: FloatArray, offsets: IntArray) -> FloatArray:
    """Return the distance along each line from its first point.

    Parameters
    ----------
    points : (n, 3) float array
    offsets : (m + 1,) int array

    Returns
    -------
    (n,) float array

    Examples
    --------
    >>> arc_length(np.array([[0.0, 0, 0], [3, 4, 0], [0, 0, 0], [0, 0, 1]]), np.array([0, 2, 4]))
    array([0., 5., 0., 1.])
    """
    step = np.zeros(len(points))
    step[1:] = np.sqrt(np.einsum("ij,ij->i", np.diff(points, axis=0), np.diff(points, axis=0)))
    step[offsets[:-1]] = 0.0
    total = np.cumsum(step)
    # summing from each line's own start keeps short lines exact at the end of long files
    along = total - np.repeat(total[offsets[:-1]], np.diff(offsets))
    return _resummed(along, step, offsets)


def _resummed(along: FloatArray, step: FloatArray, offsets: IntArray) -> FloatArray:
    """Replace the end of each line by the direct sum of its steps, to full precision."""
    ends = offsets[1:] - 1
    along[ends] = np.add.reduceat(step, offsets[:-1]) if len(ends) else 0.0
    return along


def piece_integrals(step: FloatArray, near: FloatArray, far: FloatArray) -> FloatArray:
    """Integrate powers of a linear radius over pieces, exactly.

    Parameters
    ----------
    step : (p,) float array
        Length of each piece, m.
    near, far : (p,) float array
        Radius at its two ends, m.

    Returns
    -------
    (p, 5) float array
        Columns: ∫πr² ds (volume), lateral area of the cone frustum, ∫ds/(πr²), ∫ds/r⁴, ∫r³ ds.

    Notes
    -----
    With r linear, ∫r² = h(a² + ab + b²)/3, ∫r⁻² = h/(ab), ∫r⁻⁴ = h(a² + ab + b²)/(3a³b³),
    ∫r³ = h(a + b)(a² + b²)/4; the frustum's side is π(a + b)√(h² + (a − b)²).

    Examples
    --------
    >>> volume, side, *_ = piece_integrals(np.array([2.0]), np.array([1.0]), np.array([1.0]))[0]
    >>> print(f"{volume / np.pi:.9f} {side / np.pi:.9f}")
    2.000000000 4.000000000
    """
    square = near * near + near * far + far * far
    product = near * far
    return np.stack(
        (
            np.pi * step * square / 3.0,
            np.pi * (near + far) * np.sqrt(step * step + (near - far) ** 2),
            step / (np.pi * product),
            step * square / (3.0 * product**3),
            step * (near + far) * (near * near + far * far) / 4.0,
        ),
        axis=1,
    )


def resistance_share(distance: FloatArray, radius: FloatArray, offsets: IntArray) -> FloatArray:
    """Return the part of each line's ∫ds/r⁴ that lies before each row, from 0 to 1.

    Parameters
    ----------
    distance, radius : (n,) float array
    offsets : (m + 1,) int array

    Examples
    --------
    >>> resistance_share(np.array([0.0, 1.0, 4.0]), np.array([1.0, 1.0, 1.0]), np.array([0, 3]))
    array([0.  , 0.25, 1.  ])
    """
    piece = pieces(offsets)
    share = piece_integrals(
        distance[piece.first + 1] - distance[piece.first], radius[piece.first], radius[piece.first + 1]
    )
    along = np.zeros(len(distance))
    counts = np.diff(offsets)
    along[piece.first + 1] = share[:, 3] / np.repeat(line_sums(share[:, 3], piece.starts), counts - 1)
    along = np.cumsum(along)
    result: FloatArray = along - np.repeat(along[offsets[:-1]], counts)
    return result


def weighted_median(values: FloatArray, weights: FloatArray, starts: IntArray) -> FloatArray:
    """Return the value at which half of each line's weight is reached.

    Parameters
    ----------
    values, weights : (p,) float array
        One value and one weight ≥ 0 per piece.
    starts : (m,) int array
        First piece of each line.

    Examples
    --------
    >>> weighted_median(np.array([3.0, 1.0, 2.0]), np.array([1.0, 1.0, 1.0]), np.array([0]))
    array([2.])
    """
    if len(starts) == 0:
        return np.zeros(0)
    line = np.repeat(np.arange(len(starts)), np.diff(np.append(starts, len(values))))
    order = np.lexsort((values, line))
    share = weights[order] / np.maximum(np.add.reduceat(weights, starts), np.finfo(float).tiny)[line]
    running = np.cumsum(share)
    running -= np.concatenate(([0.0], running[starts[1:] - 1]))[line]
    before_half = np.add.reduceat((running < 0.5 * (1 - 1e-12)).astype(np.int64), starts)
    last = np.diff(np.append(starts, len(values))) - 1
    median: FloatArray = values[order][starts + np.minimum(before_half, last)]
    return median


def interpolate(
    distance: FloatArray, values: FloatArray, offsets: IntArray, line: IntArray, at: FloatArray
) -> FloatArray:
    """Interpolate values linearly along lines.

    Parameters
    ----------
    distance : (n,) float array
        Distance along each line, rising.
    values : (n,) or (n, c) float array
    offsets : (m + 1,) int array
    line : (q,) int array
        Line of each wanted place.
    at : (q,) float array
        Distance along that line; clipped to its ends.

    Returns
    -------
    (q,) or (q, c) float array

    Examples
    --------
    >>> interpolate(np.array([0.0, 2.0]), np.array([1.0, 3.0]), np.array([0, 2]), np.array([0]), np.array([0.5]))
    array([1.5])
    """
    length = distance[offsets[1:] - 1]
    shift = np.concatenate(([0.0], np.cumsum(length + 1.0)))  # lines laid one after the other, apart
    along = distance + np.repeat(shift[:-1], np.diff(offsets))
    wanted = np.clip(at, 0.0, length[line]) + shift[line]
    upper = np.clip(np.searchsorted(along, wanted, side="left"), offsets[line] + 1, offsets[line + 1] - 1)
    lower = upper - 1
    gap = distance[upper] - distance[lower]
    weight = np.where(gap > 0, (np.clip(at, 0.0, length[line]) - distance[lower]) / np.where(gap > 0, gap, 1.0), 0.0)
    weight = np.clip(weight, 0.0, 1.0)
    if values.ndim > 1:
        weight = weight[:, None]
    result: FloatArray = values[lower] * (1.0 - weight) + values[upper] * weight
    return result
