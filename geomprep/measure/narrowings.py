"""Narrowings and widenings along segments, against a reference radius from both sides.

A straight line through the whole segment, robust against lesions, tells where the radius leaves
it. A line through the stations beside each such place then gives its reference, taper included.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import NamedTuple

import numpy as np

from geomprep.curves import interpolate
from geomprep.errors import InputError
from geomprep.laws.arrays import positive
from geomprep.measure.curves import check_lines, masked_median, repeated_medians, station_scatter
from geomprep.model import BoolArray, FloatArray, IntArray

__all__ = ["NarrowingSettings", "Narrowings", "narrowings"]

_SAMPLES = 65  # places at which the line through a whole segment looks at it
_PASSES = 2  # of reference and extent in turn; a third changes nothing
_COLUMNS = ("start", "end", "place", "radius", "reference_radius", "scatter")
_MARGIN = 0.25  # of the length of the lesion: its faint feet, kept out of the reference


@dataclass(frozen=True)
class NarrowingSettings:
    """What counts as a narrowing or widening. All values are judgements that a user may move.

    Attributes
    ----------
    least_narrowing, least_widening : float
        Smallest loss and gain of diameter, as a part of the reference, that are listed.
    edge : float
        A lesion ends where the radius is off by this part of the reference, or twice the scatter if more.
    scatter_multiple : float
        The logarithm of the ratio must exceed so many times the scatter of the reference stations.
    reach, gap, focal_length : float
        In reference radii: how far to each side the reference is taken; how near two lesions are one;
        the length above which a lesion is a long small (or wide) stretch.
    """

    least_narrowing: float = 0.2
    least_widening: float = 0.3
    edge: float = 0.05
    scatter_multiple: float = 5.0
    reach: float = 10.0
    gap: float = 1.0
    focal_length: float = 10.0

    def __post_init__(self) -> None:
        for field in fields(self):
            if not 0 < getattr(self, field.name) < np.inf:
                raise InputError(f"{field.name} = {getattr(self, field.name)}: a finite number above 0 is needed")
        if not self.edge < self.least_narrowing < 1 or not self.edge < self.least_widening:
            raise InputError(
                f"edge = {self.edge:g}: it must lie below least_narrowing = {self.least_narrowing:g} (itself below 1) "
                f"and least_widening = {self.least_widening:g}"
            )


@dataclass(frozen=True, eq=False)
class Narrowings:
    """One row per narrowing or widening, by segment and place.

    Attributes
    ----------
    segment : (k,) int array
    widening : (k,) bool array
        False for a narrowing.
    station : (k,) int array
        Row of the station with the smallest (largest) radius against the reference.
    start, end, place : (k,) float array
        Distance along the segment of both edges and of the extreme radius, m.
    radius, area : (k,) float array
        Extreme radius, m, and π times its square, m²: of one station, or of a parabola through the
        stations about it where these agree within their scatter.
    reference_radius : (k,) float array
        Radius expected at `place` from the vessel beside the lesion, m.
    degree_by_diameter, degree_by_area : (k,) float array
        |1 − r/reference| and |1 − (r/reference)²|.
    length : (k,) float array
        ``end − start``, m.
    focal : (k,) bool array
        Short, with a reference on both sides. False: a long small (wide) stretch, or one at the end of
        its segment, where a narrow vessel cannot be told from a narrowed one.
    sides : (k,) int array
        Sides with a reference, 1 or 2. With one, the taper is that of the whole segment.
    scatter : (k,) float array
        Standard deviation of ln r about the reference, in the stations it was made from.
    against_distal, against_original : (k,) float array
        Narrowings of arteries: 1 − d/d of the normal vessel beyond (NASCET; not a number where there is
        none), and of the lumen estimated at the place itself (ECST). Not a number elsewhere.
    """

    segment: IntArray
    widening: BoolArray
    station: IntArray
    start: FloatArray
    end: FloatArray
    place: FloatArray
    radius: FloatArray
    area: FloatArray
    reference_radius: FloatArray
    degree_by_diameter: FloatArray
    degree_by_area: FloatArray
    length: FloatArray
    focal: BoolArray
    sides: IntArray
    scatter: FloatArray
    against_distal: FloatArray
    against_original: FloatArray


class _Segment(NamedTuple):
    """Stations of one segment: `usable` may serve as reference, `line` is the robust line through all."""

    distance: FloatArray
    radius: FloatArray
    usable: BoolArray
    line: FloatArray
    logarithmic: np.bool_
    noise: np.float64
    edge: np.float64


class _Reference(NamedTuple):
    """Reference radius at every station, and what it was made from."""

    radius: FloatArray
    scatter: float
    sides: int
    distal_radius: float


def narrowings(
    distance: FloatArray,
    radius: FloatArray,
    offsets: IntArray,
    settings: NarrowingSettings | None = None,
    usable: BoolArray | None = None,
    arterial: BoolArray | None = None,
) -> Narrowings:
    """Find narrowings and widenings of every segment.

    Parameters
    ----------
    distance, radius : (n,) float array
        Distance along each segment from its first station, in the direction of flow, and radius there, m.
    offsets : (m + 1,) int array
        Segment i owns stations ``offsets[i]:offsets[i + 1]``, at least two.
    settings : NarrowingSettings, optional
    usable : (n,) bool array, optional
        False at stations to pass over, such as those within junctions; all True by default.
    arterial : (m,) bool array, optional
        Segments for which both carotid conventions are filled; none by default.

    Returns
    -------
    Narrowings

    Raises
    ------
    InputError
        A radius is not above zero, or the arrays do not describe segments.

    Notes
    -----
    A segment that is narrow all along is its own reference: this function says nothing of it.
    The convention against the distal vessel is not valid where that vessel has collapsed.

    References
    ----------
    Against the distal vessel: NASCET 1991, doi 10.1056/NEJM199108153250701; against the original lumen:
    ECST 1991, doi 10.1016/0140-6736(91)92916-P (formulas seen in secondary text, citations from memory).

    Examples
    --------
    >>> s = np.linspace(0.0, 60e-3, 121)
    >>> found = narrowings(s, 2e-3 - 1.4e-3 * np.exp(-(((s - 30e-3) / 3e-3) ** 2)), np.array([0, 121]))
    >>> found.place.round(4).tolist(), found.radius.round(6).tolist(), found.degree_by_diameter.round(3).tolist()
    ([0.03], [0.0006], [0.7])
    """
    settings = settings or NarrowingSettings()
    radius = positive("radius", radius)
    usable = np.ones(len(radius), np.bool_) if usable is None else usable
    check_lines(distance, offsets, radius=radius, usable=usable)
    arterial = np.zeros(len(offsets) - 1, np.bool_) if arterial is None else arterial
    if len(arterial) != len(offsets) - 1:
        raise InputError(f"arterial: {len(arterial)} values for {len(offsets) - 1} segments; give one per segment")
    noise = station_scatter(distance, radius, usable, offsets)
    edge = np.maximum(-np.log1p(-settings.edge), 2 * noise)
    level = usable & _level(np.log(radius), usable, 0.5 * _least_depth(settings, False) + 4 * noise, offsets)
    line, logarithmic = _robust_lines(distance, radius, np.stack((level, usable), axis=1), offsets)
    depth = np.where(usable, np.log(line / radius), 0.0)
    label, owner, weak = _candidates(distance, depth, line, edge, offsets, settings)
    found: dict[tuple[float, float], dict[str, float]] = {}
    for number, segment in enumerate(owner.tolist()):
        rows = slice(offsets[segment], offsets[segment + 1])
        own = label[rows] == number
        free = usable[rows] & ((label[rows] < 0) | own | weak[label[rows]])
        here = _Segment(
            distance[rows], radius[rows], free, line[rows], *(of[segment] for of in (logarithmic, noise, edge))
        )
        lesion = _measured(here, own, bool(depth[rows][own].max() <= 0), settings)
        if lesion is not None:  # two candidates may have grown into one
            lesion |= {"segment": segment, "station": lesion["station"] + int(offsets[segment])}
            found[lesion["station"], lesion["widening"]] = lesion
    return _table([found[key] for key in sorted(found)], arterial, settings)


def _level(log: FloatArray, usable: BoolArray, least: FloatArray, offsets: IntArray) -> BoolArray:
    """Tell stations that lie in no hollow or bump: filled up to its lower shoulder, it is deeper than the least."""
    segment = np.repeat(np.arange(len(least)), np.diff(offsets))
    lift = segment * (1.0 + 2 * np.ptp(log)) if len(log) else log  # running maxima start afresh in every segment
    level = np.ones(len(log), np.bool_)
    for y in (log, -log):
        seen = np.where(usable, y, y.min()) if len(y) else y
        before = np.maximum.accumulate(seen + lift) - lift
        after = np.maximum.accumulate((seen - lift)[::-1])[::-1] + lift
        level &= np.minimum(before, after) - y <= least[segment]
    return level


def _robust_lines(
    distance: FloatArray, radius: FloatArray, wanted: BoolArray, offsets: IntArray
) -> tuple[FloatArray, BoolArray]:
    """Line in r or ln r, whichever lies nearer, through the first column of stations or, if too few, the second."""
    m, count = len(offsets) - 1, np.diff(offsets)
    length = distance[offsets[1:] - 1]
    part = np.linspace(0.0, 1.0, _SAMPLES)
    segment, at = np.repeat(np.arange(m), _SAMPLES), (length[:, None] * part).ravel()
    sampled = interpolate(distance, np.column_stack((radius, wanted)), offsets, segment, at).reshape(m, _SAMPLES, 3)
    r, level, usable = sampled[:, :, 0], sampled[:, :, 1] > 1 - 1e-9, sampled[:, :, 2] > 1 - 1e-9
    known = np.where(level.sum(axis=1, keepdims=True) >= _SAMPLES // 4, level, usable)
    plain, logs = repeated_medians(part, r, known), repeated_medians(part, np.log(r), known)
    crossing = ~((plain[:, 0] > 0) & (plain.sum(axis=1) > 0))
    plain[crossing] = [1.0, 0.0]  # never chosen
    off_plain = np.abs(np.log(r / (plain[:, :1] + plain[:, 1:] * part)))
    off_logs = np.abs(np.log(r) - logs[:, :1] - logs[:, 1:] * part)
    logarithmic = crossing | (masked_median(off_logs, known) < masked_median(off_plain, known))
    of = np.repeat(np.arange(m), count)
    along = distance / length[of]
    log_line, plain_line = (fit[of, 0] + fit[of, 1] * along for fit in (logs, plain))
    line = np.where(logarithmic[of], np.exp(np.where(logarithmic[of], log_line, 0.0)), plain_line)
    return np.where(known.sum(axis=1)[of] >= _SAMPLES // 4, line, np.nan), logarithmic


def _candidates(
    distance: FloatArray,
    depth: FloatArray,
    line: FloatArray,
    edge: FloatArray,
    offsets: IntArray,
    settings: NarrowingSettings,
) -> tuple[IntArray, IntArray, BoolArray]:
    """Stretches off the line by half of what is listed: number at each station (−1 none), segment, less than listed."""
    segment = np.repeat(np.arange(len(edge)), np.diff(offsets))
    state = (depth > edge[segment]).astype(np.int64) - (depth < -edge[segment])
    new = np.ones(len(state), np.bool_)
    new[1:] = (state[1:] != state[:-1]) | (segment[1:] != segment[:-1])
    first = np.flatnonzero(new)
    last = np.append(first[1:], len(state)) - 1
    first, last = first[state[first] != 0], last[state[first] != 0]
    joined = (state[first[1:]] == state[last[:-1]]) & (segment[first[1:]] == segment[last[:-1]])
    joined &= distance[first[1:]] - distance[last[:-1]] <= settings.gap * line[last[:-1]]
    first, last = first[np.append(True, ~joined)[: len(first)]], last[np.append(~joined, True)[: len(last)]]
    bounds = np.stack((first, last + 1), axis=1).ravel()
    peak = np.maximum.reduceat(np.append(np.abs(depth), 0.0), bounds)[::2] if len(first) else np.zeros(0)
    part = peak / np.where(state[first] > 0, _least_depth(settings, False), _least_depth(settings, True))
    first, last, weak = first[part >= 0.5], last[part >= 0.5], part[part >= 0.5] < 1
    row = np.arange(len(state))
    number = np.searchsorted(first, row, side="right") - 1  # the stretch that begins here or before, −1 if none
    return np.where(row <= np.append(last, -1)[number], number, -1), segment[first], np.append(weak, False)


def _least_depth(settings: NarrowingSettings, widening: bool) -> float:
    """Size of ln(reference/r) from which a lesion is listed."""
    return float(np.log1p(settings.least_widening) if widening else -np.log1p(-settings.least_narrowing))


def _measured(here: _Segment, own: BoolArray, widening: bool, settings: NarrowingSettings) -> dict[str, float] | None:
    """Reference and extent in turn, then the extreme; None where it is no lesion after all."""
    rows = np.flatnonzero(own)
    first, last = int(rows[0]), int(rows[-1])
    for _ in range(_PASSES):
        reference = _local_reference(here, first, last, settings.reach)
        depth = np.where(here.usable, np.log(here.radius / reference.radius) * (1.0 if widening else -1.0), 0.0)
        level = np.flatnonzero(depth[first : last + 1] >= depth[first : last + 1].max() - 1e-9)
        peak = first + int(level[len(level) // 2])  # the middle of a throat of constant radius
        if reference.sides == 0 or depth[peak] <= here.edge:
            return None
        first, last = _extent(here.distance, depth > here.edge, peak, settings.gap * reference.radius[peak])
    place, height = _extreme(here, depth, (first, peak, last), reference.radius[peak])
    least = max(_least_depth(settings, widening), settings.scatter_multiple * max(reference.scatter, here.noise))
    if height < least * (1 - 1e-12):
        return None
    expected = float(np.interp(place, here.distance, reference.radius))
    return {
        "widening": widening,
        "station": peak,
        "start": _crossing(here.distance, depth, first, first - 1, here.edge),
        "end": _crossing(here.distance, depth, last, last + 1, here.edge),
        "place": place,
        "radius": expected * float(np.exp(height if widening else -height)),
        "reference_radius": expected,
        **{name: getattr(reference, name) for name in ("sides", "scatter", "distal_radius")},
    }


def _local_reference(here: _Segment, first: int, last: int, reach: float) -> _Reference:
    """Line through the stations on both sides of a lesion, or the segment's line moved onto those of one side."""
    s, size = here.distance, float(here.line[first : last + 1].mean())
    margin = max(_MARGIN * (s[last] - s[first]), 0.5 * size)
    beside = []
    for away in (s[first] - s, s - s[last]):
        near = min(margin, 0.25 * away.max()) - 1e-9 * s[-1]  # stations on the border count
        beside.append(here.usable & (away > 0) & (away >= near) & (away <= near + reach * size + 2e-9 * s[-1]))
    sides = [side for side in beside if np.count_nonzero(side) >= 2]
    if not sides:
        return _Reference(here.line, 0.0, 0, np.nan)
    chosen = np.logical_or.reduce(sides)
    weights = np.sqrt(np.gradient(s)[chosen])
    if len(sides) == 2:
        values = np.log(here.radius[chosen]) if here.logarithmic else here.radius[chosen]
        slope, level = np.polyfit(s[chosen] - s[first], values, 1, w=weights)
        fitted = level + slope * (s - s[first])
        fitted = np.exp(fitted) if here.logarithmic else np.maximum(fitted, 1e-3 * size)
    else:
        offset = np.average(np.log(here.radius[chosen] / here.line[chosen]), weights=weights**2)
        fitted = here.line * np.exp(offset)
    off = np.log(here.radius[chosen] / fitted[chosen])
    scatter = np.sqrt(np.average(off**2, weights=weights**2) * len(off) / max(len(off) - len(sides), 1))
    distal = np.average(here.radius[beside[1]], weights=np.gradient(s)[beside[1]]) if beside[1].any() else np.nan
    return _Reference(fitted, float(scatter), len(sides), float(distal))


def _extent(distance: FloatArray, beyond: BoolArray, peak: int, gap: float) -> tuple[int, int]:
    """First and last station of the stretch around a peak, small gaps bridged."""
    rows = np.flatnonzero(beyond)
    new = np.append(True, (np.diff(rows) > 1) & (np.diff(distance[rows]) > gap))
    group = np.cumsum(new)
    mine = rows[group == group[np.searchsorted(rows, peak)]]
    return int(mine[0]), int(mine[-1])


def _crossing(distance: FloatArray, depth: FloatArray, inside: int, outside: int, edge: np.float64) -> float:
    """Place between two stations where the depth falls to the edge; the end of the segment if there is none."""
    if not 0 <= outside < len(distance):
        return float(distance[inside])
    part = np.clip((depth[inside] - edge) / (depth[inside] - depth[outside]), 0.0, 1.0)
    return float(distance[inside] + part * (distance[outside] - distance[inside]))


def _extreme(here: _Segment, depth: FloatArray, stretch: tuple[int, int, int], size: float) -> tuple[float, float]:
    """Place and depth of the extreme: a parabola's where the deepest station agrees with it, else the station's."""
    first, peak, last = stretch
    raw = float(here.distance[peak]), float(depth[peak])
    place, height = raw
    s, d = here.distance[first : last + 1], depth[first : last + 1]
    for _ in range(_PASSES):
        core = (np.abs(s - place) <= size * (1 + 1e-9)) & (d >= 0.5 * raw[1])
        if np.count_nonzero(core) < 6:  # twice the values of a parabola
            return raw
        x = s[core] - place
        bend, slope, level = np.polyfit(x / size, d[core], 2)
        shift = float(np.clip(-0.5 * slope / bend * size, x[0], x[-1])) if bend < 0 else 0.0
        height = float(level + slope * shift / size + bend * (shift / size) ** 2)
        place += shift
        rest = d[core] - np.polyval((bend, slope, level), x / size)
    misfit = np.sqrt(np.sum(rest**2) / (len(rest) - 3))
    return (place, height) if misfit <= 1.5 * here.noise else raw


def _table(found: list[dict[str, float]], arterial: BoolArray, settings: NarrowingSettings) -> Narrowings:
    """Columns of all lesions."""
    column = {name: np.array([row[name] for row in found], np.float64) for name in (*_COLUMNS, "distal_radius")}
    segment, station, sides, widening = (
        np.array([row[name] for row in found], np.int64) for name in ("segment", "station", "sides", "widening")
    )
    expected, length = column["reference_radius"], column["end"] - column["start"]
    ratio = column["radius"] / expected
    graded = arterial[segment] & (widening == 0)
    return Narrowings(
        **{name: column[name] for name in _COLUMNS},
        segment=segment,
        station=station,
        sides=sides,
        widening=widening != 0,
        area=np.pi * column["radius"] ** 2,
        degree_by_diameter=np.abs(1 - ratio),
        degree_by_area=np.abs(1 - ratio**2),
        length=length,
        focal=(sides == 2) & (length <= settings.focal_length * expected),
        against_distal=np.where(graded, 1 - column["radius"] / column["distal_radius"], np.nan),
        against_original=np.where(graded, 1 - ratio, np.nan),
    )
