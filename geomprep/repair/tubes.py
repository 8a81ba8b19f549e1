"""Tubes near points: distance to the axis, radius and direction of the vessels around."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.spatial import KDTree

from geomprep.model import FloatArray, IntArray
from geomprep.repair.branches import Branches

__all__ = ["NearTubes", "near_tubes"]


@dataclass(frozen=True, eq=False)
class NearTubes:
    """The pieces of vessels nearest to some points, own vessels left out.

    Attributes
    ----------
    distance : (p, k) float array
        From the point to the axis, m; infinite for pieces of its own chain.
    radius : (p, k) float array
        Of the tube at the nearest place, m.
    way : (p, k, 3) float array
        Unit vector along the piece.
    row : (p, k) int array
        Row of the piece's first point in the chains.
    """

    distance: FloatArray
    radius: FloatArray
    way: FloatArray
    row: IntArray


def near_tubes(branches: Branches, rows: IntArray, point: IntArray, own: IntArray, count: int) -> NearTubes:
    """Find the pieces nearest to points.

    Parameters
    ----------
    branches : Branches
    rows : (m,) int array
        Pieces to look at: rows of the chains whose next row is of the same chain.
    point, own : (p,) int array
        Graph points, and the chain of each.
    count : int
        How many pieces are looked at for each point, by the distance to their middle.
    """
    graph, cut = branches.graph, branches.cut
    a, b = cut.point[rows], cut.point[rows + 1]
    tree = KDTree(0.5 * (graph.points[a] + graph.points[b]))
    near = tree.query(graph.points[point], k=min(count, len(rows)))[1].reshape(len(point), -1)
    start, way = graph.points[a[near]], graph.points[b[near]] - graph.points[a[near]]
    to = graph.points[point][:, None] - start
    square = np.maximum((way * way).sum(axis=2), np.finfo(float).tiny)
    part = np.clip((to * way).sum(axis=2) / square, 0.0, 1.0)
    distance = np.linalg.norm(to - part[..., None] * way, axis=2)
    distance[branches.chain[rows[near]] == own[:, None]] = np.inf
    radius = graph.radius[a[near]] * (1 - part) + graph.radius[b[near]] * part
    return NearTubes(distance, radius, way / np.sqrt(square)[..., None], rows[near])
