"""Radii that cannot be: zero, negative, missing, single spikes, and the decay of a distance map at open ends."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from geomprep.curves import piece_integrals
from geomprep.errors import InputError
from geomprep.model import (
    Basis,
    BoolArray,
    Centrelines,
    FloatArray,
    IntArray,
    Repair,
    anchor_ids,
)
from geomprep.repair.coincident import same_place
from geomprep.repair.radius_profile import Profile, is_good, log_radii, place_edges, profile_of, used_points
from geomprep.repair.verdicts import Verdicts

__all__ = ["RadiusResult", "RadiusSettings", "mend_radii"]

_LEAVE, _MEND = "leave", "interpolate"
_HALF_WINDOW = 3
_LONGEST_SPIKE = 2
_SPIKE_RADII = 1.1
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
        A point, or a few side by side within a radius, whose radius differs by this factor from the median
        around is a spike.
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


def mend_radii(centrelines: Centrelines, settings: RadiusSettings, verdicts: Verdicts) -> RadiusResult:
    """Replace impossible radii by a local fit, before lines are joined.

    Zero, negative and missing radii, spikes and the decay at open ends take the value that ln r has between the
    good points beside them on the same vessel (at an end: the nearest good value). A narrowing or widening longer
    than a radius is left as it is. A chain without any good radius stays as it is, and joining refuses it.

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
    used = used_points(centrelines)
    label, first = same_place(centrelines.points[used])
    value = log_radii(centrelines.radius[used], label, len(first))
    edges = place_edges(centrelines, used, label)
    if not (np.isnan(value).any() or _has_steps(value, edges, settings)):
        return RadiusResult(centrelines, ())
    profile = profile_of(centrelines.points, used[first], value, edges)
    kinds = _kinds(profile, settings)
    if not kinds.any() and is_good(centrelines.radius[used]).all():
        return RadiusResult(centrelines, ())
    fitted = _fitted(profile, kinds > 0)
    repairs, mended = _records(centrelines, profile, (kinds, fitted), used[first], verdicts)
    return RadiusResult(_with_radii(centrelines, profile, (fitted, mended), (used, label)), repairs)


def _has_steps(value: FloatArray, edges: IntArray, settings: RadiusSettings) -> bool:
    """Whether any step is steep enough to be looked at."""
    step = np.abs(value[edges[:, 0]] - value[edges[:, 1]])
    return bool((step > min(np.log(settings.spike_ratio), -np.log(max(settings.end_ratio, 1e-6)))).any())


_NOTHING, _IMPOSSIBLE, _SPIKE, _DECAY = range(4)
_WORDS = {_IMPOSSIBLE: "impossible radius", _SPIKE: "radius spike", _DECAY: "decayed end"}


def _kinds(profile: Profile, settings: RadiusSettings) -> IntArray:
    """What is wrong at each row, 0 where nothing is."""
    kinds = np.where(np.isnan(profile.log_radius), _IMPOSSIBLE, _NOTHING)
    if settings.end_ratio > 0:
        kinds[_decays(profile, -np.log(settings.end_ratio)) & (kinds == _NOTHING)] = _DECAY
    kinds[_spikes(profile, np.log(settings.spike_ratio)) & (kinds == _NOTHING)] = _SPIKE
    return kinds


def _spikes(profile: Profile, limit: float) -> BoolArray:
    """Rows whose ln r lies far from the median around them, no more than a radius of them side by side."""
    log_radius = profile.log_radius
    steep = np.zeros(len(log_radius), np.bool_)
    with np.errstate(invalid="ignore"):
        step = np.abs(np.diff(log_radius)) > 0.5 * limit
    steep[1:] |= step
    steep[:-1] |= step
    steep[1:-1] |= steep[2:] & steep[:-2]  # between two steps lies the middle of a run of three
    own = ~profile.at_junction
    rows = np.flatnonzero(steep & own & ~np.isnan(log_radius))
    # near the ends of a vessel the window is moved, not cut, so that a spike there is seen against as many points
    first = profile.offsets[:-1] + profile.at_junction[profile.offsets[:-1]]
    last = profile.offsets[1:] - 1 - profile.at_junction[profile.offsets[1:] - 1]
    chain = profile.chain[rows]
    start = np.clip(rows - _HALF_WINDOW, first[chain], np.maximum(last[chain] - 2 * _HALF_WINDOW, first[chain]))
    inside = start[:, None] + np.arange(2 * _HALF_WINDOW + 1)
    usable = inside <= last[chain, None]
    inside = np.minimum(inside, len(log_radius) - 1)
    window = np.where(usable, log_radius[inside], np.nan)
    enough = np.count_nonzero(~np.isnan(window), axis=1) >= 4
    rows, window = rows[enough], window[enough]
    middle = _row_medians(window)
    spread = _row_medians(np.abs(window - middle[:, None]))
    far = np.abs(log_radius[rows] - middle) > np.maximum(limit, 5 * 1.4826 * spread)
    found = np.zeros(len(log_radius), np.bool_)
    found[rows[far]] = True
    return _short_runs(found, profile)


def _short_runs(found: BoolArray, profile: Profile) -> BoolArray:
    """Drop what stands longer side by side than a spike: it may be a vessel."""
    chain = profile.chain
    starts = found & ~np.concatenate(([False], found[:-1] & (chain[1:] == chain[:-1])))
    number = np.cumsum(starts) - 1
    ends = found & ~np.concatenate((found[1:] & (chain[1:] == chain[:-1]), [False]))
    first, last = np.flatnonzero(starts), np.flatnonzero(ends)
    before, after = np.maximum(first - 1, 0), np.minimum(last + 1, len(found) - 1)
    around = np.exp(np.fmax(profile.log_radius[before], profile.log_radius[after]))
    short = (last - first < _LONGEST_SPIKE) | (profile.along[last] - profile.along[first] <= _SPIKE_RADII * around)
    kept = found.copy()
    kept[found] = short[number[found]]
    return kept


def _decays(profile: Profile, limit: float) -> BoolArray:
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
        tip = near[:, :_LONGEST_DECAY]
        low = np.isnan(tip) | (tip < (level - limit)[:, None])  # a radius of zero at the tip is a part of the decay
        found[row[:, :_LONGEST_DECAY][np.logical_and.accumulate(low, axis=1)]] = True
    return found


def _row_medians(values: FloatArray) -> FloatArray:
    """Median of the numbers in each row; NaN where a row has none."""
    ordered = np.sort(values, axis=1)  # NaN last
    count = np.count_nonzero(~np.isnan(values), axis=1)
    row = np.arange(len(values))
    middle: FloatArray = (ordered[row, np.maximum(count - 1, 0) // 2] + ordered[row, count // 2]) / 2.0
    return middle


def _fitted(profile: Profile, wrong: BoolArray) -> FloatArray:
    """Ln r at wrong rows from the good rows of their chain, linear in arc length; NaN elsewhere and where there is none."""
    rows, good = np.flatnonzero(wrong), np.flatnonzero(~wrong & ~profile.at_junction)
    value = np.full(len(wrong), np.nan)
    bare = np.ones(profile.chain[-1] + 1 if len(wrong) else 0, np.bool_)  # chains with good radii at junctions alone
    bare[profile.chain[good]] = False
    good = np.flatnonzero(~wrong & (~profile.at_junction | bare[profile.chain]))
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
    profile: Profile,
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
    profile: Profile,
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
    centrelines: Centrelines, profile: Profile, found: tuple[FloatArray, BoolArray], places: tuple[IntArray, IntArray]
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
    # copies of a place that state none take the radius of the next point of their line, or that of the other copies
    stated = radius[used]
    value = log_radii(stated, label, count)[label]
    lost = ~is_good(stated) & ~changed & ~np.isnan(value)
    beside = radius[_next_on_line(centrelines)[used[lost]]]
    radius[used[lost]] = np.where(is_good(beside), beside, np.exp(value[lost]))
    basis[used[lost]] = Basis.INTERPOLATED
    return replace(centrelines, radius=radius, radius_basis=basis)


def _next_on_line(centrelines: Centrelines) -> IntArray:
    """For each raw point at the end of a line the point beside it; itself elsewhere."""
    beside = np.arange(centrelines.n_points)
    first, last = centrelines.offsets[:-1], centrelines.offsets[1:] - 1
    beside[centrelines.connectivity[first]] = centrelines.connectivity[first + 1]
    beside[centrelines.connectivity[last]] = centrelines.connectivity[last - 1]
    return beside
