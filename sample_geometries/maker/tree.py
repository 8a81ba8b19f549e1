"""Tracks with named nodes on them, cut into the segments of a sample."""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from maker.curves import Floats, SplineCurve

__all__ = ["Phantom", "Segment", "Track", "WayPoint", "cut", "mirrored"]

WayPoint = tuple[float, float, float, float] | tuple[float, float, float, float, str]
"""x, y, z, radius and, where segments end, the name of the node."""


@dataclass(frozen=True)
class Track:
    """A smooth vessel drawn in one stroke; its first and last way points must be nodes.

    Attributes
    ----------
    segments : tuple of str
        Names of the pieces between consecutive nodes of the track.
    way_points : tuple of WayPoint
    """

    segments: tuple[str, ...]
    way_points: tuple[WayPoint, ...]


@dataclass(frozen=True, eq=False)
class Segment:
    """A vessel piece between two nodes as it is written: sampled points and the truth about it.

    Attributes
    ----------
    name, start, end : str
        Its own name and the names of its nodes.
    points : (n, 3) array
        Places, rounded as in the file.
    radius : (n,) array
        Its own radius at each point, rounded as in the file.
    length : float
        Arc length of the smooth curve before sampling.
    """

    name: str
    start: str
    end: str
    points: Floats
    radius: Floats
    length: float


@dataclass(frozen=True)
class Phantom:
    """A whole sample before it is written.

    Attributes
    ----------
    name : str
        Folder name of the sample.
    unit : str
        Unit of all lengths in it.
    segments : tuple of Segment
    """

    name: str
    unit: str
    segments: tuple[Segment, ...]

    @property
    def nodes(self) -> dict[str, Floats]:
        """Place of each node by name, in order of first appearance."""
        found: dict[str, Floats] = {}
        for segment in self.segments:
            found.setdefault(segment.start, segment.points[0])
            found.setdefault(segment.end, segment.points[-1])
        return found


def cut(tracks: tuple[Track, ...], spacing: float, decimals: int) -> tuple[Segment, ...]:
    """Sample tracks evenly between their nodes.

    Parameters
    ----------
    tracks : tuple of Track
    spacing : float
        Wanted distance between points; each segment is cut into whole steps close to it.
    decimals : int
        Digits kept after the point, in positions and radii.

    Raises
    ------
    ValueError
        A track does not start and end at a node, or has not one name per piece.
    """
    return tuple(segment for track in tracks for segment in _cut_track(track, spacing, decimals))


def _cut_track(track: Track, spacing: float, decimals: int) -> list[Segment]:
    """Segments of one track."""
    curve = SplineCurve([way[:3] for way in track.way_points], [way[3] for way in track.way_points])
    stops = [number for number, way in enumerate(track.way_points) if len(way) == 5]
    if stops[:1] != [0] or stops[-1:] != [len(track.way_points) - 1] or len(stops) != len(track.segments) + 1:
        raise ValueError(f"track {track.segments}: {len(track.segments)} names do not fit its nodes at {stops}")
    segments = []
    for name, (first, last) in zip(track.segments, pairwise(stops), strict=True):
        begin, end = curve.way_distance[first], curve.way_distance[last]
        steps = max(2, round(float(end - begin) / spacing))
        distance = np.linspace(begin, end, steps + 1)
        points = np.round(curve.position(distance), decimals) + 0.0  # no negative zero in the files
        points[[0, -1]] = [track.way_points[first][:3], track.way_points[last][:3]]
        radius = np.round(curve.radius(distance), decimals)
        ends = str(track.way_points[first][-1]), str(track.way_points[last][-1])
        segments.append(Segment(name, *ends, points, radius, float(end - begin)))
    return segments


def mirrored(
    track: Track, size: float, sway: tuple[float, float, float], lacking: str = "", segments: tuple[str, ...] = ()
) -> Track:
    """Return the right-hand counterpart of a left-hand track.

    Parameters
    ----------
    track : Track
    size : float
        Factor on its radii.
    sway : (float, float, float)
        Largest shift of the course against the exact mirror, in the middle between two nodes
        (nodes stay exact mirrors).
    lacking : str
        Node of the left track that the right side lacks.
    segments : tuple of str
        Names on the right; those of the left with the side exchanged where none are given.
    """
    nodes = [number for number, way in enumerate(track.way_points) if len(way) == 5]
    way_points: list[WayPoint] = []
    for number, way in enumerate(track.way_points):
        before, after = max(n for n in nodes if n <= number), min(n for n in nodes if n >= number)
        lean = math.sin(math.pi * (number - before) / (after - before)) if after > before else 0.0
        x, y, z = (value + lean * shift for value, shift in zip((-way[0], *way[1:3]), sway, strict=True))
        radius = round(way[3] * size, 3)
        if len(way) == 5 and way[4] != lacking:
            way_points.append((x, y, z, radius, way[4].replace("left", "right")))
        else:
            way_points.append((x, y, z, radius))
    names = segments or tuple(name.replace("left", "right") for name in track.segments)
    return Track(names, tuple(way_points))
