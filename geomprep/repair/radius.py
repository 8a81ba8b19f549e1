"""Radii that cannot be: zero, negative, missing, single spikes, and the decay of a distance map at open ends."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from geomprep.curves import arc_length, piece_integrals
from geomprep.errors import InputError
from geomprep.model import (
    Basis,
    BoolArray,
    Centrelines,
    Chains,
    FloatArray,
    IntArray,
    Repair,
    anchor_ids,
    chains,
    degrees,
)
from geomprep.repair.coincident import same_place
from geomprep.repair.verdicts import Verdicts

__all__ = ["RadiusResult", "RadiusSettings", "mend_radii"]

_LEAVE, _MEND = "leave", "interpolate"
_HALF_WINDOW = 3
_LONGEST_SPIKE = 2
_LONGEST_DECAY = 4
_NEAR_END = 8


@dataclass(frozen=True)
class RadiusSettings:
    """When a radius is mended.

    Attributes
    ----------
    use : bool
        False leaves every radius as it is.
    spike_ratio : float
        A point, or two side by side, whose radius differs by this factor from the median around it is a spike.
    end_ratio : float
        Points at an open end whose radius lies below this part of the radius further in have decayed.

    Raises
    ------
    InputError
        A value lies outside its range.
    """

    use: bool = True
    spike_ratio: float = 1.5
    end_ratio: float = 0.6

    def __post_init__(self) -> None:
        """Refuse values outside their range."""
        if not 1.1 <= self.spike_ratio <= 10.0:
            raise InputError(f"repair.radius.spike_ratio = {self.spike_ratio:g}: must be between 1.1 and 10")
        if not 0.0 <= self.end_ratio < 0.95:
            raise InputError(f"repair.radius.end_ratio = {self.end_ratio:g}: must be at least 0 and below 0.95")


@dataclass(frozen=True)
class RadiusResult:
    """Centrelines with mended radii, and the record of each."""

    centrelines: Centrelines
    repairs: tuple[Repair, ...]


@dataclass(frozen=True, eq=False)
class _Profile:
    """ln r along all chains; NaN where the radius is none."""

    place: IntArray
    offsets: IntArray
    points: FloatArray
    log_radius: FloatArray
    along: FloatArray
    chain: IntArray
    inner: BoolArray
    open_start: BoolArray
    open_end: BoolArray


def mend_radii(centrelines: Centrelines, settings: RadiusSettings, verdicts: Verdicts) -> RadiusResult:
    """Replace impossible radii by a local fit, before lines are joined.

    Zero, negative and missing radii, spikes of one or two points and the decay at open ends take the value that ln r has
    between the good points beside them (at an end: the nearest good value). A narrowing or widening of three
    points or more is left as it is. A chain without any good radius stays as it is, and joining refuses it.

    Parameters
    ----------
    centrelines : Centrelines
    settings : RadiusSettings
    verdicts : Verdicts
        Recorded choices; a spike or a decayed end may be left.

    Returns
    -------
    RadiusResult
        The same centrelines where nothing was mended; the original values stay in the file.
    """
    if not settings.use or centrelines.line_radius is not None:
        return RadiusResult(centrelines, ())
    used = _used_points(centrelines)
    label, first = same_place(centrelines.points[used])
    value = _log_radius(centrelines.radius[used], label, len(first))
    edges = _edges(centrelines, used, label)
    if not (np.isnan(value).any() or _has_steps(value, edges, settings)):
        return RadiusResult(centrelines, ())
    profile = _profile(centrelines.points, used[first], value, edges)
    kinds = _kinds(profile, settings)
    if not kinds.any() and _is_good(centrelines.radius[used]).all():
        return RadiusResult(centrelines, ())
    fitted = _fitted(profile, kinds > 0)
    repairs, mended = _records(centrelines, profile, (kinds, fitted), used[first], verdicts)
    return RadiusResult(_with_radii(centrelines, profile, (fitted, mended), (used, label)), repairs)


def _used_points(centrelines: Centrelines) -> IntArray:
    """Raw points on any line, rising."""
    used = np.zeros(centrelines.n_points, np.bool_)
    used[centrelines.connectivity] = True
    return np.flatnonzero(used)


def _log_radius(radius: FloatArray, label: IntArray, count: int) -> FloatArray:
    """Mean ln r of the good radii stated at each place; NaN where none is good."""
    good = _is_good(radius)
    total = np.bincount(label[good], np.log(radius[good]), count)
    number = np.bincount(label[good], minlength=count)
    value: FloatArray = np.divide(total, number, out=np.full(count, np.nan), where=number > 0)
    return value


def _is_good(radius: FloatArray) -> BoolArray:
    """Whether a radius can be."""
    good: BoolArray = (radius > 0) & (radius < np.inf)
    return good


def _edges(centrelines: Centrelines, used: IntArray, label: IntArray) -> IntArray:
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


def _has_steps(value: FloatArray, edges: IntArray, settings: RadiusSettings) -> bool:
    """Whether any step is steep enough to be looked at."""
    step = np.abs(value[edges[:, 0]] - value[edges[:, 1]])
    return bool((step > min(np.log(settings.spike_ratio), -np.log(max(settings.end_ratio, 1e-6)))).any())


def _profile(raw_points: FloatArray, raw_of_place: IntArray, value: FloatArray, edges: IntArray) -> _Profile:
    """Chains of places with ln r and arc length along them."""
    place, offsets = _in_order(chains(len(value), edges), _keys(edges, len(value)))
    first, last = offsets[:-1], offsets[1:] - 1
    inner = np.ones(len(place), np.bool_)
    inner[first] = inner[last] = False
    is_open = degrees(len(value), edges) == 1
    open_start, open_end = is_open[place[first]], is_open[place[last]]
    chain = np.repeat(np.arange(len(first)), np.diff(offsets))
    points = raw_points.take(raw_of_place[place], axis=0)
    along = arc_length(points, offsets)
    return _Profile(place, offsets, points, value[place], along, chain, inner, open_start, open_end)


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


_NOTHING, _IMPOSSIBLE, _SPIKE, _DECAY = range(4)
_WORDS = {_IMPOSSIBLE: "impossible radius", _SPIKE: "radius spike", _DECAY: "decayed end"}


def _kinds(profile: _Profile, settings: RadiusSettings) -> IntArray:
    """What is wrong at each row, 0 where nothing is."""
    kinds = np.where(np.isnan(profile.log_radius), _IMPOSSIBLE, _NOTHING)
    if settings.end_ratio > 0:
        kinds[_decays(profile, -np.log(settings.end_ratio)) & (kinds == _NOTHING)] = _DECAY
    kinds[_spikes(profile, np.log(settings.spike_ratio)) & (kinds == _NOTHING)] = _SPIKE
    return kinds


def _spikes(profile: _Profile, limit: float) -> BoolArray:
    """Rows whose ln r lies far from the median around them, no more than two side by side."""
    log_radius = profile.log_radius
    steep = np.zeros(len(log_radius), np.bool_)
    with np.errstate(invalid="ignore"):
        step = np.abs(np.diff(log_radius)) > 0.5 * limit
    steep[1:] |= step
    steep[:-1] |= step
    rows = np.flatnonzero(steep & profile.inner & ~np.isnan(log_radius))
    around = rows[:, None] + np.arange(-_HALF_WINDOW, _HALF_WINDOW + 1)
    inside = np.clip(around, 0, len(log_radius) - 1)
    usable = (inside == around) & (profile.chain[inside] == profile.chain[rows][:, None]) & profile.inner[inside]
    window = np.where(usable, log_radius[inside], np.nan)
    enough = np.count_nonzero(~np.isnan(window), axis=1) >= 4
    rows, window = rows[enough], window[enough]
    middle = _row_medians(window)
    spread = _row_medians(np.abs(window - middle[:, None]))
    far = np.abs(log_radius[rows] - middle) > np.maximum(limit, 5 * 1.4826 * spread)
    found = np.zeros(len(log_radius), np.bool_)
    found[rows[far]] = True
    return _short_runs(found, profile.chain)


def _short_runs(found: BoolArray, chain: IntArray) -> BoolArray:
    """Drop what stands longer side by side than a spike: it may be a vessel."""
    starts = found & ~np.concatenate(([False], found[:-1] & (chain[1:] == chain[:-1])))
    number = np.cumsum(starts) - 1
    length = np.bincount(number[found], minlength=max(int(number.max(initial=-1)) + 1, 0))
    kept = found.copy()
    kept[found] = length[number[found]] <= _LONGEST_SPIKE
    return kept


def _decays(profile: _Profile, limit: float) -> BoolArray:
    """Rows at open ends that lie below the radius further in, from the end inwards."""
    found = np.zeros(len(profile.log_radius), np.bool_)
    first, last = profile.offsets[:-1], profile.offsets[1:] - 1
    count = last - first + 1
    for is_open, end, way in ((profile.open_start, first, 1), (profile.open_end, last, -1)):
        chain = np.flatnonzero(is_open & (count >= _NEAR_END))
        step = np.arange(2 * _LONGEST_DECAY + 1)
        row = end[chain, None] + way * np.minimum(step, count[chain, None] - 1)
        near = profile.log_radius[row]
        near[step >= count[chain, None]] = np.nan
        level = _row_medians(near[:, _LONGEST_DECAY:])
        low = near[:, :_LONGEST_DECAY] < (level - limit)[:, None]
        found[row[:, :_LONGEST_DECAY][np.logical_and.accumulate(low, axis=1)]] = True
    return found


def _row_medians(values: FloatArray) -> FloatArray:
    """Median of the numbers in each row; NaN where a row has none."""
    ordered = np.sort(values, axis=1)  # NaN last
    count = np.count_nonzero(~np.isnan(values), axis=1)
    row = np.arange(len(values))
    middle: FloatArray = (ordered[row, np.maximum(count - 1, 0) // 2] + ordered[row, count // 2]) / 2.0
    return middle


def _fitted(profile: _Profile, wrong: BoolArray) -> FloatArray:
    """Ln r at wrong rows from the good rows of their chain, linear in arc length; NaN elsewhere and where there is none."""
    rows, good = np.flatnonzero(wrong), np.flatnonzero(~wrong)
    value = np.full(len(wrong), np.nan)
    if len(rows) == 0 or len(good) == 0:
        return value
    above = np.searchsorted(good, rows)
    before, after = good[np.maximum(above - 1, 0)], good[np.minimum(above, len(good) - 1)]
    has_before = (above > 0) & (profile.chain[before] == profile.chain[rows])
    has_after = (above < len(good)) & (profile.chain[after] == profile.chain[rows])
    low = np.where(has_before, before, np.where(has_after, after, rows))
    high = np.where(has_after, after, low)
    gap = profile.along[high] - profile.along[low]
    part = np.where(gap > 0, (profile.along[rows] - profile.along[low]) / np.where(gap > 0, gap, 1.0), 0.0)
    value[rows] = profile.log_radius[low] * (1 - part) + profile.log_radius[high] * part
    value[rows[~has_before & ~has_after]] = np.nan
    return value


def _records(
    centrelines: Centrelines,
    profile: _Profile,
    found: tuple[IntArray, FloatArray],
    raw_of_place: IntArray,
    verdicts: Verdicts,
) -> tuple[tuple[Repair, ...], BoolArray]:
    """One repair per run of rows with one fault, and the rows that are mended."""
    kinds, fitted = found
    same = (kinds[1:] == kinds[:-1]) & (profile.chain[1:] == profile.chain[:-1])
    starts = np.flatnonzero((kinds > 0) & ~np.concatenate(([False], same)))
    ends = np.flatnonzero((kinds > 0) & ~np.concatenate((same, [False]))) + 1
    mended = np.zeros(len(kinds), np.bool_)
    anchors = raw_of_place[profile.place[np.stack((starts, ends - 1), axis=1)]]
    ids = anchor_ids("radius", centrelines.raw_points, anchors)
    repairs = []
    for name, start, end in zip(ids.tolist(), starts.tolist(), ends.tolist(), strict=True):
        rows = np.arange(start, end)
        if np.isnan(fitted[rows]).any():
            continue  # no good radius on this chain: joining names the points
        repair = _record(profile, (name, int(kinds[start]), rows), fitted, verdicts)
        mended[rows] = repair.choice == _MEND
        repairs.append(repair)
    return tuple(repairs), mended


def _record(
    profile: _Profile,
    what: tuple[str, int, IntArray],
    fitted: FloatArray,
    verdicts: Verdicts,
) -> Repair:
    """The repair of one run of rows."""
    name, kind, rows = what
    options = (_MEND,) if kind == _IMPOSSIBLE else (_LEAVE, _MEND)
    verdict = verdicts.settle(name, options, _MEND)
    span = np.arange(max(int(rows[0]) - 1, 0), min(int(rows[-1]) + 2, len(fitted)))
    span = span[profile.chain[span] == profile.chain[rows[0]]]
    new = np.where(np.isin(span, rows), fitted[span], profile.log_radius[span])
    before = 0.0 if kind == _IMPOSSIBLE else _conductance(profile.along[span], profile.log_radius[span])
    after = _conductance(profile.along[span], new)
    said = "none above zero" if kind == _IMPOSSIBLE else f"{1e3 * np.exp(profile.log_radius[rows]).mean():.3g} mm"
    x, y, z = profile.points[rows[0]].tolist()
    return Repair(
        id=name,
        kind=_WORDS[kind],
        reason=f"{len(rows)} point(s) state a radius of {said}; the good points beside them give "
        f"{1e3 * np.exp(fitted[rows]).mean():.3g} mm",
        position=(x, y, z),
        choice=verdict.choice,
        options=options,
        verdict_by=verdict.by,
        conductance_before=before,
        conductance_after=after if verdict.choice == _MEND else before,
    )


def _conductance(along: FloatArray, log_radius: FloatArray) -> float:
    """Conductance of a stretch at unit viscosity; 0 where a radius is none or the stretch has no length."""
    radius = np.exp(log_radius)
    if np.isnan(radius).any() or along[-1] <= along[0]:
        return 0.0
    resistance = piece_integrals(np.diff(along), radius[:-1], radius[1:])[:, 3].sum()
    return float(np.pi / 8.0 / resistance)


def _with_radii(
    centrelines: Centrelines, profile: _Profile, found: tuple[FloatArray, BoolArray], places: tuple[IntArray, IntArray]
) -> Centrelines:
    """The centrelines with the mended radii in all points of each place; a place on several chains takes their mean."""
    (fitted, mended), (used, label) = found, places
    count = int(label.max()) + 1
    at = profile.place[mended]
    number = np.bincount(at, minlength=count)
    mean = np.bincount(at, fitted[mended], count) / np.maximum(number, 1)
    radius, basis = centrelines.radius.copy(), centrelines.radius_basis.copy()
    changed = number[label] > 0
    radius[used[changed]] = np.exp(mean[label[changed]])
    basis[used[changed]] = Basis.INTERPOLATED
    # a place with one good statement keeps it for those of its points that state none
    stated = radius[used]
    value = _log_radius(stated, label, count)[label]
    lost = ~_is_good(stated) & ~changed & ~np.isnan(value)
    radius[used[lost]] = np.exp(value[lost])
    basis[used[lost]] = Basis.INTERPOLATED
    return replace(centrelines, radius=radius, radius_basis=basis)
