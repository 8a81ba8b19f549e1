"""Take the stretch inside its parent off every vessel."""

from __future__ import annotations

import dataclasses

import numpy as np

from geomprep.curves import interpolate
from geomprep.measure.junction_zones import JunctionZones
from geomprep.model import Cuts, FloatArray, Network, Stations

__all__ = ["trimmed"]

_APART = 1e-6
"""A station closer to a cut than this part of the segment gives way to it."""


def trimmed(network: Network, zones: JunctionZones) -> Network:
    """Start and end every segment where its vessel leaves its parents; nodes stay where they are.

    Parameters
    ----------
    network : Network
        Nodes, segments and stations.
    zones : JunctionZones
        Of this network.

    Returns
    -------
    Network
        With `cuts` filled; segments that lose nothing keep their stations to the bit.

    Examples
    --------
    See ``tests/measure/test_trim.py``.
    """
    count = len(network.segments)
    cut = np.zeros((count, 2))
    cut[zones.segment, zones.end] = zones.cut
    cuts = Cuts(
        zones.convention.name.lower().replace("_", " "),
        cut[:, 0],
        cut[:, 1],
        zones.share_inside,
        zones.lumped_link.astype(np.uint8),
    )
    if not cut.any():
        return dataclasses.replace(network, cuts=cuts)
    return dataclasses.replace(network, stations=_without_ends(network.stations, cut), cuts=cuts)


def _without_ends(stations: Stations, cut: FloatArray) -> Stations:
    """Stations between the cuts, with one at each cut."""
    offsets, distance = stations.offsets, stations.distance
    segment, length = stations.segment, distance[offsets[1:] - 1]
    start, stop = cut[:, 0], length - cut[:, 1]
    close = _APART * length
    first, last = offsets[:-1], offsets[1:] - 1
    inner = (distance > (start + close)[segment]) & (distance < (stop - close)[segment])
    inner[first] = inner[last] = False
    counts = np.bincount(segment[inner], minlength=len(cut)) + 2
    ends = np.cumsum(counts)
    row = np.insert(
        np.flatnonzero(inner), np.cumsum(counts - 2), last
    )  # the last station of each behind its inner ones
    row = np.insert(row, ends - counts - np.arange(len(cut)), first)
    kept = Stations(
        np.concatenate(([0], ends)), distance[row], stations.position[row], stations.radius[row], stations.basis[row]
    )
    return _with_cut_ends(stations, kept, (start, stop), cut)


def _with_cut_ends(
    stations: Stations, kept: Stations, where: tuple[FloatArray, FloatArray], cut: FloatArray
) -> Stations:
    """Move the first and last station of cut segments to their cuts, and count distances from the first."""
    fields = {name: getattr(kept, name).copy() for name in ("distance", "position", "radius")}
    for side, row in ((0, kept.offsets[:-1]), (1, kept.offsets[1:] - 1)):
        which = np.flatnonzero(cut[:, side] > 0)
        place = which, where[side][which]
        fields["distance"][row[which]] = where[side][which]
        for name in ("position", "radius"):
            values = getattr(stations, name)
            fields[name][row[which]] = interpolate(stations.distance, values, stations.offsets, *place)
    fields["distance"] -= np.repeat(cut[:, 0], np.diff(kept.offsets))
    return Stations(kept.offsets, basis=kept.basis, **fields)
