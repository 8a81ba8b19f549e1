"""How the radius runs along each segment: constant, linear or piecewise linear in its logarithm.

The profile never replaces the stations. It says how many pieces a segment deserves, how far its
radii scatter, and what a receiver loses who takes one radius for the whole segment.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum
from typing import NamedTuple

import numpy as np
import numpy.typing as npt
from scipy.linalg import solveh_banded

from geomprep.curves import line_sums, piece_integrals, pieces, weighted_median
from geomprep.errors import InputError
from geomprep.laws.arrays import positive
from geomprep.measure.curves import check_lines
from geomprep.model import BoolArray, FloatArray, IntArray, Uint8Array

__all__ = ["ProfileKind", "ProfileSettings", "RadiusProfiles", "noise_bias", "radius_profiles"]

_BINS = 64  # candidate places of a knot; longer segments are averaged to as many
_CHUNK = 256  # segments searched at once: 256 · 64² numbers are 8 MB
_SWEEPS = 2  # times every knot is moved to its best place while the others stay


class ProfileKind(IntEnum):
    """Form of ln r along a segment."""

    CONSTANT = 0
    LINEAR = 1
    PIECEWISE = 2


@dataclass(frozen=True)
class ProfileSettings:
    """What a change point must earn.

    Attributes
    ----------
    most_change_points, stations_per_piece : int
        Change points per segment, and stations that a piece needs.
    finest_scatter : float
        Misfit of ln r below which no piece is worth adding (a judgement: 0.4 % of the resistance).
    correlation_length : float
        In median radii. Stations closer than this do not count as independent, because a
        segmented wall varies smoothly (a judgement); 0 takes every station as independent.
    """

    most_change_points: int = 4
    stations_per_piece: int = 4
    finest_scatter: float = 1e-3
    correlation_length: float = 1.0

    def __post_init__(self) -> None:
        # four stations leave a free place for every knot, two bins from its neighbours
        limits = {"most_change_points": 0, "stations_per_piece": 4, "finest_scatter": 1e-9, "correlation_length": 0}
        for name, least in limits.items():
            if not least <= getattr(self, name) < np.inf:
                raise InputError(f"{name} = {getattr(self, name)}: a finite number from {least:g} is needed")


@dataclass(frozen=True, eq=False)
class RadiusProfiles:
    """Profile of every segment, and what one radius would do to its resistance.

    Attributes
    ----------
    kind : (m,) uint8 array
        :class:`ProfileKind`.
    n_pieces : (m,) int array
        1, or one more than the change points.
    knot_offsets : (m + 1,) int array
        Segment i owns knots ``knot_offsets[i]:knot_offsets[i + 1]``; its two ends are the first and last.
    knot_distance, knot_radius : (k,) float array
        Place along the segment and radius of the profile there, m; ln r is linear between.
    scatter : (m,) float array
        Residual standard deviation of ln r, with the fitted values counted off.
    ratio_mean, ratio_median, ratio_for_volume, ratio_for_resistance : (m,) float array
        Poiseuille resistance of one cylinder over that of the stations, for the arc-length mean
        radius, the median, the radius of equal volume and the radius of equal resistance (1).
    ratio_profile : (m,) float array
        Resistance of the fitted profile over that of the stations.
    noise_bias : (m,) float array
        :func:`noise_bias` of `scatter`; an upper bound, as part of the scatter may be the vessel's shape.
    """

    kind: Uint8Array
    n_pieces: IntArray
    knot_offsets: IntArray
    knot_distance: FloatArray
    knot_radius: FloatArray
    scatter: FloatArray
    ratio_mean: FloatArray
    ratio_median: FloatArray
    ratio_for_volume: FloatArray
    ratio_for_resistance: FloatArray
    ratio_profile: FloatArray
    noise_bias: FloatArray


@dataclass(frozen=True, eq=False)
class _Lines:
    """ln r at stations with weights that sum to 1 on every line."""

    distance: FloatArray
    values: FloatArray
    weights: FloatArray
    offsets: IntArray


class _Fit(NamedTuple):
    """One form fitted to all lines: knots and ln r there, and the mean squared misfit."""

    knots: FloatArray
    values: FloatArray
    misfit: FloatArray


def noise_bias(scatter: npt.ArrayLike, about_mean: bool = False) -> FloatArray:
    r"""Return E[r⁻⁴] of a noisy radius over r⁻⁴ of the true one, for lognormal scatter.

    Let ln r = ln R + e with e normal, mean 0, standard deviation σ. Then E[exp(k e)] = exp(k²σ²/2),
    so E[r⁻⁴] = R⁻⁴ exp(8σ²): this is the bias where R is the geometric mean, as in a fit of ln r.
    Where the true radius is the arithmetic mean M = E[r] = R exp(σ²/2) (noise that leaves the mean
    alone), R⁻⁴ = M⁻⁴ exp(2σ²) and the bias is exp(10σ²).

    Noise independent from station to station has the variance (t² + (1 − t)²)σ² a part t of the way
    between two of them, on average ⅔σ²: the integral over a radius linear between stations is biased
    less: by −4·½σ² + 10·⅔σ² = 14/3 σ² for small σ. Noise smooth over several stations biases it in full.

    Parameters
    ----------
    scatter : array_like
        Standard deviation σ of ln r, from 0. A coefficient of variation v of r has σ² = ln(1 + v²) ≈ v².
    about_mean : bool
        True where the true radius is the arithmetic mean of the noisy ones.

    Returns
    -------
    ndarray
        A factor ≥ 1.

    Raises
    ------
    InputError
        A scatter is negative or not a number.

    Examples
    --------
    >>> noise_bias([0.0, 0.1, 0.2]).round(4)
    array([1.    , 1.0833, 1.3771])
    """
    sigma = np.asarray(scatter, dtype=np.float64)
    if not (sigma >= 0).all():
        raise InputError(f"scatter = {np.min(sigma):g}: a standard deviation of ln r from 0 is needed")
    return np.asarray(np.exp((10.0 if about_mean else 8.0) * sigma**2))


def radius_profiles(
    distance: FloatArray, radius: FloatArray, offsets: IntArray, settings: ProfileSettings | None = None
) -> RadiusProfiles:
    """Choose the form of ln r along every segment by the Bayesian information criterion.

    Candidates are a constant, a line, and continuous chains of lines with 1, 2, … change points.
    The form with the least n ln(misfit² + finest²) + p ln n is kept, where misfit² is weighted by arc
    length, n counts independent stations and p counts values fitted (two for a change point: its
    place and its radius). Change points enter one after the other where they lower the misfit
    most, and after each every one is moved to its best place while the others stay.

    Parameters
    ----------
    distance, radius : (n,) float array
        Distance along each segment from its first station and radius there, m.
    offsets : (m + 1,) int array
        Segment i owns stations ``offsets[i]:offsets[i + 1]``, at least two.
    settings : ProfileSettings, optional

    Returns
    -------
    RadiusProfiles

    Raises
    ------
    InputError
        A radius is not above zero, or the arrays do not describe segments.

    References
    ----------
    Criterion: Schwarz 1978, doi 10.1214/aos/1176344136 (from memory).

    Examples
    --------
    >>> s = np.linspace(0.0, 40e-3, 81)
    >>> found = radius_profiles(s, 2e-3 * np.exp(-10 * s), np.array([0, 81]))
    >>> ProfileKind(found.kind[0]).name, found.knot_radius.round(6).tolist()
    ('LINEAR', [0.002, 0.001341])
    """
    settings = settings or ProfileSettings()
    radius = positive("radius", radius)
    check_lines(distance, offsets, radius=radius)
    lines = _Lines(distance, np.log(radius), _weights(distance, offsets), offsets)
    inner = _searched_knots(lines, settings)
    candidates = [_constant(lines), *(_chained(lines, inner[:, count, :count]) for count in range(inner.shape[1]))]
    best = _least_criterion(lines, candidates, settings)
    return _described(lines, radius, candidates, best)


def _weights(distance: FloatArray, offsets: IntArray) -> FloatArray:
    """Half of the neighbouring pieces' length, over the length of the line."""
    first = pieces(offsets).first
    half, step = np.zeros(len(distance)), 0.5 * (distance[first + 1] - distance[first])
    half[first] += step
    half[first + 1] += step
    weights: FloatArray = half / np.repeat(distance[offsets[1:] - 1], np.diff(offsets))
    return weights


def _constant(lines: _Lines) -> _Fit:
    """Weighted mean of every line."""
    mean = line_sums(lines.weights * lines.values, lines.offsets[:-1])
    rest = lines.values - np.repeat(mean, np.diff(lines.offsets))
    ends = np.stack((np.zeros(len(mean)), lines.distance[lines.offsets[1:] - 1]), axis=1)
    return _Fit(ends, np.stack((mean, mean), axis=1), line_sums(lines.weights * rest**2, lines.offsets[:-1]))


def _chained(lines: _Lines, inner: FloatArray) -> _Fit:
    """Fit the lines whose inner knots are known; the others have an infinite misfit."""
    known = np.flatnonzero(np.isfinite(inner).all(axis=1))
    knots, values = np.full((2, len(inner), inner.shape[1] + 2), np.nan)
    misfit = np.full(len(inner), np.inf)
    if len(known):
        part = _taken(lines, known)
        length = part.distance[part.offsets[1:] - 1]
        knots[known] = np.column_stack((np.zeros(len(known)), inner[known], length))
        values[known], misfit[known] = _chain(part, knots[known])
    return _Fit(knots, values, misfit)


def _taken(lines: _Lines, rows: IntArray) -> _Lines:
    """Some of the lines."""
    count = np.diff(lines.offsets)
    keep = np.zeros(len(count), np.bool_)
    keep[rows] = True
    mask = np.repeat(keep, count)
    offsets = np.concatenate(([0], np.cumsum(count[keep])))
    return _Lines(lines.distance[mask], lines.values[mask], lines.weights[mask], offsets)


def _chain(lines: _Lines, knots: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Least-squares values at the knots of continuous chains, and their misfit.

    Hat functions make the normal equations tridiagonal, without links between lines: one banded solve.
    """
    n_lines, n_knots = knots.shape
    line = np.repeat(np.arange(n_lines), np.diff(lines.offsets))
    piece = np.zeros(len(line), np.int64)
    for inner in range(1, n_knots - 1):
        piece += lines.distance >= knots[line, inner]
    near = knots[line, piece]
    part = (lines.distance - near) / (knots[line, piece + 1] - near)
    row, size = line * n_knots + piece, n_lines * n_knots
    w = lines.weights
    band = np.zeros((2, size))
    band[1] = np.bincount(row, w * (1 - part) ** 2, size) + np.bincount(row + 1, w * part**2, size)
    band[0, 1:] = np.bincount(row, w * part * (1 - part), size)[:-1]
    right = np.bincount(row, w * (1 - part) * lines.values, size) + np.bincount(row + 1, w * part * lines.values, size)
    found = solveh_banded(band, right)
    rest = lines.values - (1 - part) * found[row] - part * found[row + 1]
    return found.reshape(knots.shape), line_sums(w * rest**2, lines.offsets[:-1])


def _searched_knots(lines: _Lines, settings: ProfileSettings) -> FloatArray:
    """Places of the best 0, 1, … knots of every line, (m, most + 1, most), nan where a line is too short."""
    counts, most = np.diff(lines.offsets), settings.most_change_points
    places = np.full((len(counts), most + 1, most), np.nan)
    room = np.minimum(most, counts // settings.stations_per_piece - 1)
    for allowed in range(1, most + 1):
        rows = np.flatnonzero(room == allowed)
        for start in range(0, len(rows), _CHUNK):
            chosen = rows[start : start + _CHUNK]
            x, y, w = _binned(_taken(lines, chosen))
            for index in _chosen_bins(x, y, w, allowed):
                places[chosen, index.shape[1], : index.shape[1]] = np.take_along_axis(x, index, axis=1)
    return places


def _binned(lines: _Lines) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Distance, ln r and weight of at most 64 bins of each line; unused bins weigh nothing."""
    count = np.diff(lines.offsets)
    line = np.repeat(np.arange(len(count)), count)
    within = np.arange(len(line)) - lines.offsets[line]
    cell: IntArray = line * _BINS + within * np.minimum(count, _BINS)[line] // count[line]
    columns = (lines.distance, lines.values, np.ones(len(line)))
    x, y, w = (np.bincount(cell, lines.weights * c, len(count) * _BINS).reshape(-1, _BINS) for c in columns)
    safe = np.where(w > 0, w, 1.0)
    return x / safe, y / safe, w.astype(np.float64)


def _chosen_bins(x: FloatArray, y: FloatArray, w: FloatArray, most: int) -> list[IntArray]:
    """Bins of the best 1, 2, … knots, each (m, count) in rising order."""
    root = np.sqrt(w)
    scaled = x / x.max(axis=1, keepdims=True)
    hinges = np.maximum(scaled[:, :, None] - scaled[:, None, :], 0.0) * root[:, :, None]
    plain = np.stack((root, scaled * root), axis=2)
    used = np.count_nonzero(w > 0, axis=1)
    index, found = np.zeros((len(x), 0), np.int64), []
    for count in range(1, most + 1):
        index = np.column_stack((index, _best_bin(hinges, plain, y * root, used, index)))
        for moved in [*range(count)] * _SWEEPS if count > 1 else ():
            others = np.delete(index, moved, axis=1)
            index[:, moved] = _best_bin(hinges, plain, y * root, used, others)
        found.append(np.sort(index, axis=1))
    return found


def _best_bin(hinges: FloatArray, plain: FloatArray, y: FloatArray, used: IntArray, others: IntArray) -> IntArray:
    """Bin whose hinge, beside the other knots, lowers the squared misfit most."""
    basis = np.concatenate((plain, np.take_along_axis(hinges, others[:, None, :], axis=2)), axis=2)
    q = np.linalg.qr(basis)[0]
    rest = y - np.einsum("mck,mk->mc", q, np.einsum("mck,mc->mk", q, y))
    shared = np.swapaxes(q, 1, 2) @ hinges
    size = np.einsum("mcj,mcj->mj", hinges, hinges)
    # |hinge|² less its part in the basis; where little is left the gain is rounding
    left = size - np.einsum("mkj,mkj->mj", shared, shared)
    gain = np.einsum("mc,mcj->mj", rest, hinges) ** 2 / np.where(left > 1e-9 * size, left, np.inf)
    picked: IntArray = np.argmax(np.where(_free(used, others, hinges.shape[2]), gain, -1.0), axis=1)
    return picked


def _free(used: IntArray, others: IntArray, n_bins: int) -> BoolArray:
    """Bins at least two away from both ends and from every other knot, so that each piece is determined."""
    place = np.arange(n_bins)
    free = (place >= 2) & (place < used[:, None] - 2)
    for knot in others.T:
        free &= np.abs(place - knot[:, None]) >= 2
    return free


def _least_criterion(lines: _Lines, candidates: list[_Fit], settings: ProfileSettings) -> IntArray:
    """Candidate of least n ln(misfit² + finest²) + p ln n; the simpler one of two equal."""
    counts, starts = np.diff(lines.offsets), lines.offsets[:-1]
    middle = np.exp(weighted_median(lines.values, lines.weights, starts))
    length = lines.distance[lines.offsets[1:] - 1]
    apart = np.maximum(settings.correlation_length * middle, length / (counts - 1))
    n = np.maximum(1 + length / apart, 2.0)[:, None]
    misfit = np.stack([fit.misfit for fit in candidates], axis=1)
    fitted = np.array([1, *(2 * (fit.knots.shape[1] - 1) for fit in candidates[1:])])
    best: IntArray = np.argmin(n * np.log(misfit + settings.finest_scatter**2) + fitted * np.log(n), axis=1)
    return best


def _described(lines: _Lines, radius: FloatArray, candidates: list[_Fit], best: IntArray) -> RadiusProfiles:
    """Gather the chosen fits and compare resistances."""
    knots, values = np.full((2, len(best), candidates[-1].knots.shape[1]), np.nan)
    for number, fit in enumerate(candidates):
        rows = np.flatnonzero(best == number)
        knots[rows, : fit.knots.shape[1]] = fit.knots[rows]
        values[rows, : fit.knots.shape[1]] = fit.values[rows]
    misfit = np.stack([fit.misfit for fit in candidates])[best, np.arange(len(best))]
    counts = np.diff(lines.offsets)
    left = np.maximum(counts - best - 1, 0)  # candidate 0 has one value, candidate i has i + 1
    scatter = np.sqrt(np.where(left > 0, misfit * counts / np.maximum(left, 1), 0.0))
    kept = np.isfinite(knots)
    return RadiusProfiles(
        kind=np.minimum(best, ProfileKind.PIECEWISE).astype(np.uint8),
        n_pieces=kept.sum(axis=1) - 1,
        knot_offsets=np.concatenate(([0], np.cumsum(kept.sum(axis=1)))).astype(np.int64),
        knot_distance=knots[kept],
        knot_radius=np.exp(values[kept]),
        scatter=scatter,
        noise_bias=noise_bias(scatter),
        **_ratios(lines, radius, knots, values),
    )


def _ratios(lines: _Lines, radius: FloatArray, knots: FloatArray, values: FloatArray) -> dict[str, FloatArray]:
    """Resistance of single radii and of the profile over that of the stations."""
    piece = pieces(lines.offsets)
    near, far = radius[piece.first], radius[piece.first + 1]
    step = lines.distance[piece.first + 1] - lines.distance[piece.first]
    length = lines.distance[lines.offsets[1:] - 1]
    volume, _, _, inverse_fourth, _ = line_sums(piece_integrals(step, near, far), piece.starts).T
    single = {
        "ratio_mean": line_sums(step * 0.5 * (near + far), piece.starts) / length,
        "ratio_median": weighted_median(0.5 * (near + far), step, piece.starts),
        "ratio_for_volume": np.sqrt(volume / (np.pi * length)),
        "ratio_for_resistance": (length / inverse_fourth) ** 0.25,
    }
    rise = np.diff(values, axis=1)
    # ∫exp(−4u) over a piece of length h where u rises by d about its middle value: h exp(−4u) sinh(2d)/(2d)
    growth = np.where(np.abs(rise) > 1e-6, np.sinh(2 * rise) / np.where(rise == 0, 1.0, 2 * rise), 1.0)
    fitted = np.nansum(np.diff(knots, axis=1) * np.exp(-2 * (values[:, 1:] + values[:, :-1])) * growth, axis=1)
    return {name: length / (r**4 * inverse_fourth) for name, r in single.items()} | {
        "ratio_profile": fitted / inverse_fourth
    }
