"""Changes of a point graph: edges left out or added, points merged, added or doubled; every raw point accounted for."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from geomprep.model import Basis, BoolArray, FloatArray, IntArray, PointGraph, degrees, raw_order

__all__ = ["renumbered", "with_doubled_points", "with_edges", "with_merged_points", "with_points", "without_edges"]

_POINT_FIELDS = ("points", "radius", "radius_basis", "vessel_class", "input_id", "protected", "source_point")


def without_edges(graph: PointGraph, dropped_by: IntArray) -> PointGraph:
    """Leave out edges, and points that have none left.

    Parameters
    ----------
    graph : PointGraph
    dropped_by : (e,) int array
        Number of the repair that drops each edge; −1 keeps it.

    Returns
    -------
    PointGraph
        `merged_into` names for raw points of lost points the repair that took their last edge.
    """
    kept = dropped_by < 0
    if kept.all():
        return graph
    fate = np.full(graph.n_points, -1, np.int64)
    np.maximum.at(fate, graph.edges[~kept].ravel(), np.repeat(dropped_by[~kept], 2))
    return _compacted(_with_kept_edges(graph, kept), fate)


def _with_kept_edges(graph: PointGraph, kept: BoolArray) -> PointGraph:
    """The graph with some of its edges; own radii follow theirs."""
    number = np.cumsum(kept) - 1
    own = kept[graph.own_radius_edge]
    return replace(
        graph,
        edges=graph.edges[kept],
        edge_basis=graph.edge_basis[kept],
        own_radius_edge=number[graph.own_radius_edge[own]],
        own_radius_end=graph.own_radius_end[own],
        own_radius=graph.own_radius[own],
    )


def _compacted(graph: PointGraph, fate: IntArray) -> PointGraph:
    """Leave out points without edges; their raw points get −1 − the repair that is their fate."""
    used = degrees(graph.n_points, graph.edges) > 0
    if used.all():
        return graph
    number = np.where(used, np.cumsum(used) - 1, -1 - fate)
    fields = {name: getattr(graph, name)[used] for name in _POINT_FIELDS}
    return replace(graph, **fields, edges=number[graph.edges], merged_into=_followed(graph, number))


def _followed(graph: PointGraph, number: IntArray) -> IntArray:
    """`merged_into` with graph points replaced by what `number` says of each."""
    into = graph.merged_into
    return np.where(into >= 0, number[np.maximum(into, 0)], into)


def renumbered(merged_into: IntArray, before: IntArray, first: int) -> IntArray:
    """Shift the repair numbers of points that a step has dropped, from its own count to that of the whole run.

    Parameters
    ----------
    merged_into, before : (n_raw,) int array
        After the step and before it.
    first : int
        Number of repairs of all steps before.
    """
    return np.where((merged_into < 0) & (before >= 0), merged_into - first, merged_into)


def with_points(graph: PointGraph, points: FloatArray, radius: FloatArray, like: IntArray) -> PointGraph:
    """Append inserted points, their radius interpolated.

    Parameters
    ----------
    graph : PointGraph
    points : (k, 3) float array
    radius : (k,) float array
    like : (k,) int array
        Graph point whose class and input each takes.
    """
    count = len(points)
    added: dict[str, Any] = {
        "points": points,
        "radius": radius,
        "radius_basis": np.full(count, Basis.INTERPOLATED, np.uint8),
        "vessel_class": graph.vessel_class[like],
        "input_id": graph.input_id[like],
        "protected": np.zeros(count, np.bool_),
        "source_point": np.full(count, -1, np.int64),
    }
    return replace(graph, **{name: np.concatenate((getattr(graph, name), added[name])) for name in _POINT_FIELDS})


def with_edges(graph: PointGraph, edges: IntArray, own: tuple[IntArray, IntArray, FloatArray]) -> PointGraph:
    """Append interpolated edges.

    Parameters
    ----------
    graph : PointGraph
    edges : (k, 2) int array
    own : (edge, end, radius)
        Rows of `edges` and ends at which the radius is another than that of the point.
    """
    edge, end, radius = own
    return replace(
        graph,
        edges=np.concatenate((graph.edges, edges)),
        edge_basis=np.concatenate((graph.edge_basis, np.full(len(edges), Basis.INTERPOLATED, np.uint8))),
        own_radius_edge=np.concatenate((graph.own_radius_edge, graph.n_edges + edge)),
        own_radius_end=np.concatenate((graph.own_radius_end, end)),
        own_radius=np.concatenate((graph.own_radius, radius)),
    )


def with_doubled_points(graph: PointGraph, point: IntArray, edges: IntArray, radius: FloatArray) -> PointGraph:
    """Give some of the edges at each of several points a point of their own at the same place.

    Parameters
    ----------
    graph : PointGraph
    point : (k,) int array
        Raw points stay with these.
    edges : (k, m) int array
        Edges that get the new point.
    radius : (k, 2) float array
        Interpolated radius of each old and each new point.
    """
    new = graph.n_points + np.arange(len(point))
    fields = {name: np.concatenate((getattr(graph, name), getattr(graph, name)[point])) for name in _POINT_FIELDS}
    fields["radius"][point], fields["radius"][new] = radius.T
    fields["radius_basis"][point] = fields["radius_basis"][new] = Basis.INTERPOLATED
    moved = graph.edges.copy()
    for old, added, rows in zip(point.tolist(), new.tolist(), edges, strict=True):
        moved[rows] = np.where(moved[rows] == old, added, moved[rows])
    return replace(graph, **fields, edges=moved)


def with_merged_points(graph: PointGraph, group: IntArray) -> PointGraph:
    """Merge points of one group into one, at their mean place and with their largest radius.

    Edges within a group vanish; of edges that come to join the same two points, one is kept.

    Parameters
    ----------
    graph : PointGraph
    group : (n,) int array
        Number of the group of each point, −1 for those that stay alone.
    """
    members = np.flatnonzero(group >= 0)
    if len(members) == 0:
        return graph
    members = members[_raw_rank(graph, members)]
    members = members[np.argsort(group[members], kind="stable")]
    starts = np.flatnonzero(np.diff(group[members], prepend=-1))
    leader = np.repeat(members[starts], np.diff(np.append(starts, len(members))))
    target = np.arange(graph.n_points)
    target[members] = leader
    merged = replace(graph, **_merged_fields(graph, members, starts), merged_into=_followed(graph, target))
    return _joined_edges(merged, target)


def _raw_rank(graph: PointGraph, members: IntArray) -> IntArray:
    """Order of points by the raw coordinates they stand for, inserted ones last."""
    source = graph.source_point[members]
    order = raw_order(graph.raw_points, np.maximum(source, 0))
    return order[np.argsort(source[order] < 0, kind="stable")]


def _merged_fields(graph: PointGraph, members: IntArray, starts: IntArray) -> dict[str, Any]:
    """Point arrays with what the first member of each group becomes."""
    fields = {name: getattr(graph, name).copy() for name in _POINT_FIELDS}
    first = members[starts]
    count = np.diff(np.append(starts, len(members)))
    fields["points"][first] = np.add.reduceat(graph.points[members], starts) / count[:, None]
    for name in ("radius", "radius_basis", "vessel_class"):
        fields[name][first] = np.maximum.reduceat(fields[name][members], starts)
    fields["protected"][first] = np.logical_or.reduceat(graph.protected[members], starts)
    return fields


def _joined_edges(graph: PointGraph, target: IntArray) -> PointGraph:
    """Let edges end in merged points; drop those within one, and all but one of those that have become alike."""
    edges = target[graph.edges]
    changed = (edges != graph.edges).any(axis=1)
    kept = edges[:, 0] != edges[:, 1]
    key = edges.min(axis=1) * np.int64(graph.n_points) + edges.max(axis=1)
    touched = np.flatnonzero(kept & np.isin(key, key[changed]))
    _, first = np.unique(key[touched], return_index=True)
    kept[touched] = False
    kept[touched[first]] = True
    whole = replace(graph, edges=edges)
    return _compacted(_with_kept_edges(whole, kept), np.zeros(graph.n_points, np.int64))
