"""Where vessels leave one another at junctions, and what that does to length, resistance and volume.

A centreline starts on the axis of its parent. Its first stretch runs inside the parent's lumen, where
it has neither a length nor a resistance of its own.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from enum import IntEnum

import numpy as np

from geomprep.curves import interpolate, line_sums, piece_integrals, pieces
from geomprep.errors import InputError
from geomprep.findings import Finding, Severity
from geomprep.measure.junction_parents import (
    JunctionKind,
    ParentRule,
    bends_from_parent,
    calibre,
    end_pairs,
    forks,
    murray,
    parents,
)
from geomprep.measure.profiles import ProfileSettings, radius_profiles
from geomprep.measure.tube_overlap import Axes, Ends, exit_distances, overlap_volumes
from geomprep.model import BoolArray, FloatArray, IntArray, Network, Stations, Uint8Array

__all__ = ["Convention", "JunctionKind", "JunctionZones", "ZoneSettings", "junction_zones", "zone_findings"]

_LISTED = 100
_LEAST_SHARE = 0.2  # of a segment inside its parents, above which it is flagged
_WINDOW = 10.0  # radii of the junction that are searched for a change point
_PLACES = 49  # samples in that window


class Convention(IntEnum):
    """Where a vessel is said to start."""

    NODE = 0
    LUMEN_EXIT = 1
    CHANGE_POINT = 2


@dataclass(frozen=True)
class ZoneSettings:
    """How junction zones are found.

    Attributes
    ----------
    convention : Convention
        The one by which vessels are cut.
    parent : ParentRule
    group_within : float
        Forks joined by a segment not longer than this many radii are one junction.
    steepest_taper : float
        Fall of ln r over one radius that marks a transition, for the change point (a judgement).
    change_points : bool
        Whether change points are looked for when vessels are cut by another convention.
    volumes : bool
        Whether overlaps are measured: by far the slowest part of large networks.
    """

    convention: Convention = Convention.LUMEN_EXIT
    parent: ParentRule = field(default_factory=ParentRule)
    group_within: float = 1.0
    steepest_taper: float = 0.05
    change_points: bool = True
    volumes: bool = True

    def __post_init__(self) -> None:
        if not 0 <= self.group_within < np.inf:
            raise InputError(f"group_within = {self.group_within}: a finite number of radii from 0 is needed")
        if not 0 < self.steepest_taper < np.inf:
            raise InputError(f"steepest_taper = {self.steepest_taper}: a finite fall of ln r above 0 is needed")


@dataclass(frozen=True, eq=False)
class JunctionZones:
    """Junctions (j rows), the segment ends that meet there (t rows) and the segments (s rows).

    Attributes
    ----------
    convention : Convention
        The one by which vessels were cut.
    node : (v,) int array
        Forks, junction by junction; several where forks within one radius make one junction.
    node_offsets, offsets : (j + 1,) int array
        Junction i owns nodes ``node_offsets[i]:node_offsets[i + 1]`` and ends ``offsets[i]:offsets[i + 1]``.
    kind : (j,) uint8 array
        :class:`JunctionKind`.
    murray_exponent : (j,) float array
        x in R^x = Σ r^x, with the largest end R; not a number where none fits.
    murray_residual : (j,) float array
        1 − Σ(r/R)³.
    area_ratio : (j,) float array
        Area of the other ends over that of the largest.
    held_volume : (j,) float array
        Volume of the stretches cut off that lies in no other tube, m³: what the junction itself holds;
        below zero where cuts were shortened.
    segment : (t,) int array
    end : (t,) uint8 array
        0 where the segment starts here, 1 where it ends here.
    is_parent : (t,) bool array
        Ends that are not cut.
    direction : (t, 3) float array
        Unit vector into the segment, from one to three radii of the junction away from the node.
    angle : (t,) float array
        Bend from the trunk, or from the nearer arm of a passing parent, rad; 0 runs straight on, not a number at
        parents and among equal ends.
    area : (t,) float array
        Lumen area beyond the junction, m².
    distance : (t, 3) float array
        Distance from the node at which the vessel starts, m, by each :class:`Convention`; not a number by change
        point where none was looked for.
    cut : (t,) float array
        Distance cut off, m: that of the convention, shortened where a segment would lose more than half.
    overlap : (t,) float array
        Volume of this end's tube that lies in the parent, and its share of what it has in common with the
        other branches, m³. Volumes of all segments less all overlaps are the volume of the union. Not a number,
        like `held_volume`, where volumes were not asked for.
    inverse_fourth_power_cut : (t,) float array
        ∫ds/r⁴ of the stretch cut off, 1/m³.
    share_inside : (s,) float array
        Length within the lumen of the parents at both ends over the length, by lumen exit.
    mostly_inside : (s,) bool array
        `share_inside` above 20 %.
    lumped_link : (s,) bool array
        Too short for its cuts, or between forks of one junction: what is left is a resistance, no vessel.
    length_left : (s,) float array
        Length after the cuts, m.
    inverse_fourth_power_before, inverse_fourth_power_after : (s,) float array
        ∫ds/r⁴ of the whole segment and of what is left, 1/m³.
    """

    convention: Convention
    node: IntArray
    node_offsets: IntArray
    offsets: IntArray
    kind: Uint8Array
    murray_exponent: FloatArray
    murray_residual: FloatArray
    area_ratio: FloatArray
    held_volume: FloatArray
    segment: IntArray
    end: Uint8Array
    is_parent: BoolArray
    direction: FloatArray
    angle: FloatArray
    area: FloatArray
    distance: FloatArray
    cut: FloatArray
    overlap: FloatArray
    inverse_fourth_power_cut: FloatArray
    share_inside: FloatArray
    mostly_inside: BoolArray
    lumped_link: BoolArray
    length_left: FloatArray
    inverse_fourth_power_before: FloatArray
    inverse_fourth_power_after: FloatArray


def junction_zones(network: Network, settings: ZoneSettings | None = None) -> JunctionZones:
    r"""Find parents at junctions, and where the other ends leave them.

    The parent is the pair of ends that continue one another best in direction and radius, one of them
    within 10 % of the largest radius. Without a clear pair, the one end that all good pairs share is a
    trunk that parts (a symmetric confluence); without such an end, every end leaves all the others.

    By `LUMEN_EXIT`, a vessel starts at the first place whose distance to the parent's axis is at least
    the parent's radius there; by `CHANGE_POINT`, at the end of the transition of ln r from the
    junction's calibre to its own, where that earns its penalty, else at the node.

    Parameters
    ----------
    network : Network
        Nodes, segments and stations.
    settings : ZoneSettings, optional

    Returns
    -------
    JunctionZones

    Notes
    -----
    Volumes take tubes as flat at their nodes; exits take a trunk that parts as ending in a half sphere.
    Parallel vessels inside one another never exit: their distance is the
    whole length, and half is cut.

    References
    ----------
    Change points of the radius: Bartolo et al. 2024, doi 10.48550/arXiv.2309.08779 (idea seen; the rule
    here is our own). Exponent 3: Murray 1926, doi 10.1073/pnas.12.3.207 (from memory).

    Examples
    --------
    A trunk of radius 2 mm along x, with a branch of 1 mm at a right angle:

    >>> from geomprep.model import Nodes, Segments
    >>> at = np.array([[0, 0, 0], [0.04, 0, 0], [0.08, 0, 0], [0.04, 0.04, 0]])
    >>> ends, zero = np.array([[0, 1], [1, 2], [1, 3]]), np.zeros(3, int)
    >>> named = ["a", "b", "c"]
    >>> segments = Segments(named, named, ends[:, 0], ends[:, 1], zero, zero, zero, zero, zero)
    >>> distance, radius = np.tile([0, 0.04], 3), np.repeat([2e-3, 1e-3], [4, 2])
    >>> stations = Stations(np.arange(0, 7, 2), distance, at[ends.ravel()], radius, np.zeros(6))
    >>> nodes = Nodes(["i", "j", "k", "l"], at, np.zeros(4), np.zeros(4), np.arange(4))
    >>> zones = junction_zones(Network(nodes, segments, stations))
    >>> JunctionKind(zones.kind[0]).name, zones.cut.round(9).tolist()
    ('PASSING_PARENT', [0.0, 0.0, 0.002])
    """
    settings = settings or ZoneSettings()
    stations, found = network.stations, forks(network, settings.group_within)
    axes, ends, offsets = Axes.of(stations), found.ends, found.offsets
    length, n_junctions = axes.length, len(offsets) - 1
    radius, direction = calibre(axes, ends)
    kind, is_parent = parents(offsets, radius, direction, settings.parent)
    pairs = end_pairs(offsets, kind, is_parent)
    exits = exit_distances(axes, ends, pairs)
    changes = np.where(is_parent, 0.0, np.nan)
    if settings.change_points or settings.convention is Convention.CHANGE_POINT:
        changes[~is_parent] = _change_points(axes, ends.rows(~is_parent), settings)
    distance = np.stack((0 * exits, exits, changes), axis=1)
    cut, scale = _cuts(ends, distance[:, settings.convention], length)
    shares, totals = _integrals_to(stations, ends, cut)
    overlap = overlap_volumes(axes, ends, pairs, exits) if settings.volumes else np.full(len(ends), np.nan)
    inside = _summed(exits, ends.segment, len(length)) / length
    gone = _summed(shares[:, 1], ends.segment, len(length))
    return JunctionZones(
        settings.convention,
        found.node,
        found.node_offsets,
        offsets,
        kind,
        *murray(radius, offsets),
        held_volume=_summed(shares[:, 0] * totals[ends.segment, 0] - overlap, found.junction, n_junctions),
        segment=ends.segment,
        end=ends.end.astype(np.uint8),
        is_parent=is_parent,
        direction=direction,
        angle=bends_from_parent(direction, is_parent, offsets),
        area=np.pi * radius**2,
        distance=distance,
        cut=cut,
        overlap=overlap,
        inverse_fourth_power_cut=shares[:, 1] * totals[ends.segment, 1],
        share_inside=np.minimum(inside, 1.0),
        mostly_inside=inside > _LEAST_SHARE,
        lumped_link=found.inner | (scale < 1),
        length_left=length - _summed(cut, ends.segment, len(length)),
        inverse_fourth_power_before=totals[:, 1],
        inverse_fourth_power_after=totals[:, 1] * (1.0 - gone),
    )


def zone_findings(zones: JunctionZones, ids: Sequence[str]) -> tuple[Finding, ...]:
    """Report segments that lie within their parents for more than a fifth, and those left as a link.

    Parameters
    ----------
    zones : JunctionZones
    ids : (s,) sequence of str
        Of segments.

    Returns
    -------
    tuple of Finding
        ``inside its parent`` (warning) and ``lumped link`` (note) by segment, a hundred of each at most,
        then ``junction volume`` (note).

    Examples
    --------
    >>> from types import SimpleNamespace
    >>> found = SimpleNamespace(mostly_inside=np.array([True]), lumped_link=np.array([False]))
    >>> found.share_inside, found.held_volume = np.array([0.43]), np.zeros(0)
    >>> print(zone_findings(found, ["s1"])[0].message)
    43 % of the length lies within the lumen of its parents (limit 20 %): its resistance depends on the convention
    """
    inside, links = np.flatnonzero(zones.mostly_inside), np.flatnonzero(zones.lumped_link)
    found = [_inside_finding(zones, ids, row) for row in inside[:_LISTED].tolist()]
    if len(inside) > _LISTED:
        text = f"{len(inside) - _LISTED} segments more lie within their parents for more than 20 % of their length"
        found.append(Finding("inside its parent", Severity.WARNING, text, value=float(len(inside) - _LISTED)))
    found += [_link_finding(zones, ids, row) for row in links[:_LISTED].tolist()]
    if len(links) > _LISTED:
        text = f"{len(links) - _LISTED} segments more are links with a resistance, no vessels"
        found.append(Finding("lumped link", Severity.NOTE, text, value=float(len(links) - _LISTED)))
    return (*found, *_volume_finding(zones))


def _inside_finding(zones: JunctionZones, ids: Sequence[str], row: int) -> Finding:
    """One segment that lies within its parents for more than a fifth."""
    share = float(zones.share_inside[row])
    text = f"{100 * share:.0f} % of the length lies within the lumen of its parents (limit 20 %): "
    text += "its resistance depends on the convention"
    return Finding("inside its parent", Severity.WARNING, text, ids[row], None, share, _LEAST_SHARE)


def _link_finding(zones: JunctionZones, ids: Sequence[str], row: int) -> Finding:
    """One segment of which only a link is left."""
    left = float(zones.length_left[row])
    text = f"{1e3 * left:.3g} mm are left between junctions: a link with a resistance, no vessel"
    return Finding("lumped link", Severity.NOTE, text, ids[row], value=left, unit="m")


def _volume_finding(zones: JunctionZones) -> tuple[Finding, ...]:
    """What the junctions hold beside the segments, where that was measured."""
    if len(zones.held_volume) == 0 or np.isnan(zones.held_volume).any():
        return ()
    held = float(zones.held_volume.sum())
    text = f"junctions hold {1e9 * held:.4g} mm³ that no segment holds; they belong to the volume of the lumen"
    return (Finding("junction volume", Severity.NOTE, text, value=held, unit="m3"),)


def _summed(values: FloatArray, owner: IntArray, count: int) -> FloatArray:
    """Sum of the values of each owner."""
    return np.asarray(np.bincount(owner, values, count), dtype=np.float64)


def _change_points(axes: Axes, ends: Ends, settings: ZoneSettings) -> FloatArray:
    """End of the steep pieces of ln r that lead away from the node; 0 where the first piece is not steep."""
    window = np.minimum(0.5 * ends.length, _WINDOW * ends.widest)
    at = window[:, None] * np.linspace(0.0, 1.0, _PLACES)
    if len(at) == 0:
        return np.zeros(0)
    radius = axes.sampled(ends.segment[:, None], ends.end[:, None], at)[:, :, 3]
    lines = np.arange(len(at) + 1) * _PLACES
    profile = radius_profiles(at.ravel(), radius.ravel(), lines, ProfileSettings(most_change_points=3))
    first = pieces(profile.knot_offsets).first
    step = profile.knot_distance[first + 1] - profile.knot_distance[first]
    fall = np.log(profile.knot_radius[first] / profile.knot_radius[first + 1])
    steep = fall * profile.knot_radius[first + 1] > settings.steepest_taper * step
    starts = profile.knot_offsets[:-1] - np.arange(len(at))
    row = np.arange(len(steep))
    steep[np.append(starts[1:], len(steep)) - 1] = False  # the last piece is the vessel itself
    settled = np.minimum.reduceat(np.where(steep, len(steep), row), starts)
    return profile.knot_distance[first[settled]]


def _cuts(ends: Ends, wanted: FloatArray, length: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Distance cut at each end, and the factor that keeps half of each segment."""
    total = np.bincount(ends.segment, wanted, len(length))
    scale = np.where(total > 0.5 * length, 0.5 * length / np.where(total > 0, total, 1.0), 1.0)
    return wanted * scale[ends.segment], scale


def _integrals_to(stations: Stations, ends: Ends, cut: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Share of volume and ∫ds/r⁴ between each end and its cut (t, 2), and both of whole segments (s, 2)."""
    piece = pieces(stations.offsets)
    step = stations.distance[piece.first + 1] - stations.distance[piece.first]
    each = piece_integrals(step, stations.radius[piece.first], stations.radius[piece.first + 1])[:, [0, 3]]
    totals = line_sums(each, piece.starts)
    count = np.diff(stations.offsets)
    along = np.zeros((len(stations), 2))
    along[piece.first + 1] = each / np.repeat(totals, count - 1, axis=0)  # shares keep the digits of wide vessels
    along = np.cumsum(along, axis=0)
    at = np.where(ends.end == 0, cut, ends.length - cut)
    values = np.column_stack((stations.radius, np.arange(float(len(stations)))))
    radius, row = interpolate(stations.distance, values, stations.offsets, ends.segment, at).T
    row = np.minimum(np.floor(row).astype(np.int64), stations.offsets[ends.segment + 1] - 1)
    rest = piece_integrals(np.maximum(at - stations.distance[row], 0.0), stations.radius[row], radius)[:, [0, 3]]
    share = along[row] - along[stations.offsets[ends.segment]] + rest / totals[ends.segment]
    share = np.where(ends.end[:, None] == 0, share, 1.0 - share)
    return np.where(cut[:, None] > 0, share, 0.0), totals
