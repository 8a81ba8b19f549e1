"""Add to a network how well its geometry is known."""

from __future__ import annotations

import dataclasses

import numpy as np

from geomprep.findings import Finding, Severity
from geomprep.measure.curves import tortuosity
from geomprep.measure.narrowings import Narrowings, narrowings
from geomprep.measure.profiles import radius_profiles
from geomprep.measure.resolution import resolution, resolution_findings, unresolved_share
from geomprep.measure.uncertainty import intervals
from geomprep.model import (
    FloatArray,
    Narrowing,
    Network,
    SegmentBending,
    SegmentIntervals,
    SegmentProfiles,
    SegmentResolution,
)

__all__ = ["describe", "unresolved_finding"]

_LARGEST = 50_000
_LISTED = 20
_ONE_RADIUS = 0.05
_ARTERY = 1


def describe(network: Network, voxel: float | None) -> tuple[Network, tuple[Finding, ...]]:
    """Add radius profiles, and where the voxel is known resolution and intervals.

    Parameters
    ----------
    network : Network
        With its stations as they will be written.
    voxel : float, optional
        Longest edge of a voxel, m.

    Returns
    -------
    Network
        With `profiles`, `bending` and `narrowings` filled up to 50,000 stations; above, fitting takes longer than all else.
        `resolution` and, up to the same size, `intervals` are filled where the voxel is known.
    findings : tuple of Finding
    """
    if len(network.segments) == 0:
        return network, ()
    findings: tuple[Finding, ...] = ()
    few = len(network.stations) <= _LARGEST
    if few:
        network, findings = _with_profiles(_with_bending(network))
        network, more = _with_narrowings(network)
        findings += more
    if voxel is not None:
        network, more = _with_resolution(network, voxel, few)
        findings += more
    return network, findings


def _with_profiles(network: Network) -> tuple[Network, tuple[Finding, ...]]:
    """Profiles, and how many segments one radius would misjudge."""
    stations = network.stations
    found = radius_profiles(stations.distance, stations.radius, stations.offsets)
    table = SegmentProfiles(
        found.kind, found.n_pieces, found.scatter, found.noise_bias, found.ratio_for_volume, found.ratio_median
    )
    off = np.abs(found.ratio_for_volume - 1.0)
    wrong = np.flatnonzero(off > _ONE_RADIUS)
    if len(wrong) == 0:
        return dataclasses.replace(network, profiles=table), ()
    worst = int(np.argmax(off))
    message = (
        f"{len(wrong)} of {len(off)} segments have a resistance that one cylinder of equal volume misses by more than 5 %, "
        f"the worst has {1.0 / found.ratio_for_volume[worst]:.3g} times that of the cylinder: use ∫ds/r⁴ or the stations"
    )
    where = str(network.segments.id[worst])
    finding = Finding("one radius", Severity.NOTE, message, where, value=float(len(wrong)), limit=_ONE_RADIUS)
    return dataclasses.replace(network, profiles=table), (finding,)


def _with_bending(network: Network) -> Network:
    """Tortuosity of every segment."""
    found = tortuosity(network.stations.position, network.stations.offsets)
    table = SegmentBending(found.inflections, found.sum_of_angles_metric, found.total_curvature, found.step)
    return dataclasses.replace(network, bending=table)


def _with_narrowings(network: Network) -> tuple[Network, tuple[Finding, ...]]:
    """Narrowings and widenings, and the strongest of those that can be told."""
    stations = network.stations
    arterial = network.segments.vessel_class == _ARTERY
    found = narrowings(stations.distance, stations.radius, stations.offsets, arterial=arterial)
    rows = tuple(_narrowing(found, row) for row in range(len(found.segment)))
    told = [row for row in rows if row.focal == "focal" or row.kind == "narrowing"]
    told.sort(key=lambda row: -row.degree_by_diameter)
    return dataclasses.replace(network, narrowings=rows), tuple(_lesion(network, row) for row in told[:_LISTED])


def _narrowing(found: Narrowings, row: int) -> Narrowing:
    """One row of the kernel's columns."""
    plain = {name: float(getattr(found, name)[row]) for name in _PLAIN}
    distal, original = (float(getattr(found, name)[row]) for name in ("against_distal", "against_original"))
    return Narrowing(
        segment=int(found.segment[row]),
        kind="widening" if found.widening[row] else "narrowing",
        focal="focal" if found.focal[row] else "cannot be told",
        against_distal=_or_none(distal),
        against_original=_or_none(original),
        **plain,
    )


_PLAIN = ("start", "end", "place", "radius", "reference_radius", "degree_by_diameter", "degree_by_area")


def _or_none(value: float) -> float | None:
    """None for what is no number."""
    return None if np.isnan(value) else value


def _lesion(network: Network, row: Narrowing) -> Finding:
    """One narrowing or widening."""
    name = str(network.segments.name[row.segment]) or "a segment without a name"
    degrees = f"{100 * row.degree_by_diameter:.0f} % by diameter ({100 * row.degree_by_area:.0f} % by area)"
    size = f"{2e3 * row.radius:.3g} mm where {2e3 * row.reference_radius:.3g} mm are expected"
    place = f"{1e3 * (row.end - row.start):.3g} mm long, {1e3 * row.place:.4g} mm along"
    doubt = "" if row.focal == "focal" else "; cannot be told from a vessel that is narrow by nature here"
    message = f"{name}: {row.kind} of {degrees}, {size}, {place}{doubt}"
    where = str(network.segments.id[row.segment])
    return Finding(row.kind, Severity.NOTE, message, where, value=row.degree_by_diameter)


def _with_resolution(network: Network, voxel: float, few: bool) -> tuple[Network, tuple[Finding, ...]]:
    """Voxels across vessels, and intervals of what follows from their radii."""
    stations = network.stations
    found = resolution(stations.distance, stations.radius, stations.offsets, voxel)
    table = SegmentResolution(
        found.segment_diameter_in_voxels,
        found.segment_level,
        np.minimum(found.share_not_resolved, 1.0),  # a sum of parts may pass the whole by its rounding
        np.minimum(found.share_biased, 1.0),
    )
    network = dataclasses.replace(network, resolution=table)
    seen = resolution_findings(found, network.segments.id.tolist())
    findings = seen[:_LISTED]
    if len(seen) > _LISTED:
        message = f"{len(seen) - _LISTED} segments more have fewer than 8 voxels across"
        findings += (Finding("resolution", Severity.WARNING, message, value=float(len(seen) - _LISTED)),)
    if few:
        spread = intervals(stations, voxel)
        columns = {
            f"{name}_{side}": getattr(getattr(spread, name), side)
            for name in ("length", "volume", "inverse_fourth_power")
            for side in ("low", "high")
        }
        network = dataclasses.replace(network, intervals=SegmentIntervals(spread.level, **columns))
    return network, findings


def unresolved_finding(network: Network, flow: FloatArray) -> tuple[Finding, ...]:
    """Say how much of the loss between inlets and outlets lies in vessels that the image does not resolve.

    Parameters
    ----------
    network : Network
        With `lumped`, and `resolution` where the voxel is known.
    flow : (s,) float array
        Of the steady state, m³/s.

    Returns
    -------
    tuple of Finding
        None where the voxel is not known, or all is resolved.
    """
    if network.resolution is None or network.lumped is None or not np.any(flow):
        return ()
    share = float(unresolved_share(network.lumped.resistance, flow, network.resolution.share_not_resolved))
    if share <= 0.0:
        return ()
    message = (
        f"{100 * share:.3g} % of the friction between inlets and outlets lies where fewer than 4 voxels lie across: "
        "that part of the resistance is not known from this image"
    )
    return (Finding("unresolved resistance", Severity.WARNING, message, value=share, limit=0.0),)
