"""Lines across gaps: a smooth path with a radius interpolated in ln r."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.model import FloatArray, PointGraph
from geomprep.repair.branches import conductance
from geomprep.repair.edits import with_edges, with_points

__all__ = ["Bridge", "bridge_lines", "with_bridges"]

_STEP = 0.5
"""Distance between inserted points in mean radii."""


@dataclass(frozen=True, eq=False)
class Bridge:
    """A line from one graph point to another.

    Attributes
    ----------
    ends : (int, int)
    points : (k, 3) float array
        Both ends included.
    radius : (k,) float array
        At a side that of the branch, not of the vessel it meets.
    conductance : float
        At a viscosity of 1 Pa·s, m³/(Pa·s).
    """

    ends: tuple[int, int]
    points: FloatArray
    radius: FloatArray
    conductance: float


def bridge_lines(
    graph: PointGraph, ends: tuple[int, int], ways: tuple[FloatArray, FloatArray | None], thin: float | None
) -> Bridge:
    """Draw a bridge: a cubic curve that leaves along the way out of each end.

    Parameters
    ----------
    graph : PointGraph
    ends : (int, int)
        Graph points.
    ways : (unit vector, unit vector or None)
        Ways out; None where the far end is the side of a vessel, which is met straight.
    thin : float, optional
        Radius of a thread in metres; interpolated between the ends where not given.

    Notes
    -----
    Cubic Hermite curve with end slopes as long as the chord.
    """
    start, stop = graph.points[list(ends)]
    chord = float(np.linalg.norm(stop - start))
    near = float(graph.radius[ends[0]])
    far = float(graph.radius[ends[1]]) if ways[1] is not None else near
    count = max(1, int(np.ceil(2.0 * chord / (_STEP * (near + far)))))
    t = np.linspace(0.0, 1.0, count + 1)[:, None]
    leaving = chord * ways[0]
    arriving = stop - start if ways[1] is None else -chord * ways[1]
    points = (
        (2 * t**3 - 3 * t**2 + 1) * start
        + (t**3 - 2 * t**2 + t) * leaving
        + (3 * t**2 - 2 * t**3) * stop
        + (t**3 - t**2) * arriving
    )
    radius = near ** (1 - t[:, 0]) * far ** t[:, 0] if thin is None else np.full(count + 1, thin)
    return Bridge(ends, points, radius, float(conductance(points, radius, np.array([0, count + 1]))[0]))


def with_bridges(graph: PointGraph, bridges: list[Bridge]) -> PointGraph:
    """Add bridges to a graph; their points and edges are interpolated, their radius at both ends is their own."""
    if not bridges:
        return graph
    inner = [bridge.points[1:-1] for bridge in bridges]
    count = np.array([len(points) for points in inner])
    first = graph.n_points + np.cumsum(count) - count
    chains = [
        np.concatenate(([bridge.ends[0]], start + np.arange(number), [bridge.ends[1]]))
        for bridge, start, number in zip(bridges, first.tolist(), count.tolist(), strict=True)
    ]
    like = np.repeat([bridge.ends[0] for bridge in bridges], count)
    grown = with_points(graph, np.concatenate(inner), np.concatenate([one.radius[1:-1] for one in bridges]), like)
    edges = np.concatenate([np.stack((chain[:-1], chain[1:]), axis=1) for chain in chains])
    last = np.cumsum(count + 1) - 1
    edge = np.stack((last - count, last), axis=1).ravel()
    end = np.tile([0, 1], len(bridges))
    radius = np.array([(one.radius[0], one.radius[-1]) for one in bridges]).ravel()
    other = radius != graph.radius[edges[edge, end]]
    return with_edges(grown, edges, (edge[other], end[other], radius[other]))
