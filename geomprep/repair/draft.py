"""The graph while it is being joined: every stated radius kept at the edge that stated it."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import numpy.typing as npt

from geomprep.model import FloatArray, IntArray, Uint8Array, degrees

__all__ = [
    "JOINED_ENDS",
    "LEFT_ALONE",
    "Draft",
    "compacted",
    "degree",
    "lengths",
    "merged",
    "point_radius",
    "with_edge_rows",
    "without_edges",
]


JOINED_ENDS, LEFT_ALONE = 1, 2


@dataclass(frozen=True, eq=False)
class Draft:
    """Points and edges between two steps of joining.

    Attributes
    ----------
    points : (n, 3) float array
    vessel_class, input_id, radius_basis : (n,) uint8 array
    source_point : (n,) int array
        Raw point with the smallest raw coordinates of those merged here; −1 inserted.
    edges : (e, 2) int array
        In the order of the lines.
    end_radius : (e, 2) float array
        Radius that the line stated at both ends of each edge.
    edge_class : (e,) uint8 array
        Vessel class of the line.
    end_state : (n,) uint8 array
        :data:`JOINED_ENDS` where open ends were joined, which may still lie on the side of a
        line; :data:`LEFT_ALONE` for ends that no step may join before a person decides.
    merged_into : (n_raw,) int array
        Point that each raw point ended in, :data:`PointGraph.UNUSED` where no line uses it.
    raw_points : (n_raw, 3) array
    """

    points: FloatArray
    vessel_class: Uint8Array
    input_id: Uint8Array
    radius_basis: Uint8Array
    source_point: IntArray
    edges: IntArray
    end_radius: FloatArray
    edge_class: Uint8Array
    end_state: Uint8Array
    merged_into: IntArray
    raw_points: npt.NDArray[Any]


def degree(draft: Draft) -> IntArray:
    """Number of edge ends at each point."""
    return degrees(len(draft.points), draft.edges)


def point_radius(draft: Draft) -> FloatArray:
    """Largest radius stated at each point."""
    radius = np.zeros(len(draft.points))
    np.maximum.at(radius, draft.edges.ravel(), draft.end_radius.ravel())
    return radius


def lengths(draft: Draft) -> FloatArray:
    """Length of each edge."""
    step = draft.points.take(draft.edges[:, 1], axis=0)
    step -= draft.points.take(draft.edges[:, 0], axis=0)
    length: FloatArray = np.sqrt(np.einsum("ij,ij->i", step, step))
    return length


def without_edges(draft: Draft, dropped: npt.NDArray[np.bool_]) -> Draft:
    """The draft without the edges marked."""
    if not dropped.any():
        return draft
    return with_edge_rows(draft, np.flatnonzero(~dropped))


def with_edge_rows(draft: Draft, rows: IntArray) -> Draft:
    """The draft with some of its edges, in the order given."""
    return replace(
        draft,
        edges=draft.edges.take(rows, axis=0),
        end_radius=draft.end_radius.take(rows, axis=0),
        edge_class=draft.edge_class[rows],
    )


def merged(draft: Draft, label: IntArray, keeps_place: npt.NDArray[np.bool_] | None = None) -> Draft:
    """Merge points of one label; a merged point lies at the mean of its members.

    Parameters
    ----------
    draft : Draft
    label : (n,) int array
        New number of each point, 0 … k − 1, none left out.
    keeps_place : (n,) bool array, optional
        Members whose mean is taken, at least one of each label; all of them by default.
    """
    count = int(label.max(initial=-1)) + 1
    members = np.bincount(label, minlength=count)
    first = np.empty(count, np.int64)
    first[label[::-1]] = np.arange(len(label) - 1, -1, -1)
    new = _renumbered(draft, first, label)
    several = np.flatnonzero(members[label] > 1)
    if len(several):
        _settle(draft, new, several, label)
        _place(draft, new, several if keeps_place is None else several[keeps_place[several]], label)
    return new


def _grouped(draft: Draft, members: IntArray, label: IntArray) -> tuple[IntArray, IntArray]:
    """Members label by label, each label in the order of raw coordinates, and where each label starts."""
    ordered = members[_source_order(draft, members)]
    ordered = ordered[np.argsort(label[ordered], kind="stable")]
    return ordered, np.flatnonzero(np.diff(label[ordered], prepend=-1))


def _place(draft: Draft, new: Draft, members: IntArray, label: IntArray) -> None:
    """Put merged points at the mean of members (in place, on fresh arrays)."""
    ordered, starts = _grouped(draft, members, label)
    count = np.diff(np.append(starts, len(ordered)))
    several = np.flatnonzero(count > 1)
    new.points[label[ordered[starts]]] = draft.points[ordered[starts]]
    if len(several):
        mean = np.add.reduceat(draft.points[ordered], starts) / count[:, None]
        new.points[label[ordered[starts[several]]]] = mean[several]


def _settle(draft: Draft, new: Draft, several: IntArray, label: IntArray) -> None:
    """Give merged points the class and source of all their members (in place, on fresh arrays)."""
    ordered, starts = _grouped(draft, several, label)
    target = label[ordered[starts]]
    leader = ordered[starts]  # the member whose raw coordinates come first
    new.source_point[target] = draft.source_point[leader]
    new.input_id[target] = draft.input_id[leader]
    new.vessel_class[target] = np.maximum.reduceat(draft.vessel_class[ordered], starts)
    new.end_state[target] = np.maximum.reduceat(draft.end_state[ordered], starts)
    new.radius_basis[target] = np.maximum.reduceat(draft.radius_basis[ordered], starts)


def _source_order(draft: Draft, which: IntArray) -> IntArray:
    """Order of points by the raw coordinates they stand for; inserted points by place, last."""
    source = draft.source_point[which]
    rows = np.where((source >= 0)[:, None], draft.raw_points[source], draft.points[which])
    return np.lexsort((rows[:, 2], rows[:, 1], rows[:, 0], source < 0)).astype(np.int64)


def _relabelled(merged_into: IntArray, label: IntArray) -> IntArray:
    """Follow raw points into new numbers; negative entries stay."""
    if len(label) == 0:
        return merged_into
    if len(merged_into) and merged_into.min() >= 0:
        return label[merged_into]
    return np.where(merged_into >= 0, label[np.maximum(merged_into, 0)], merged_into)


def compacted(draft: Draft) -> tuple[Draft, IntArray]:
    """Leave out points without edges and number the rest along the edges.

    Returns
    -------
    Draft
        Raw points that ended in a point without edges have −1 in `merged_into`.
    lost : (k,) int array
        Those raw points.
    """
    flat = draft.edges.ravel()
    first = np.full(len(draft.points), -1, np.int64)
    first[flat[::-1]] = np.arange(len(flat) - 1, -1, -1)  # place of the first mention
    used = np.flatnonzero(first >= 0)
    mentioned = np.zeros(len(flat), np.bool_)
    mentioned[first[used]] = True
    order = flat[mentioned]
    number = np.full(len(draft.points), -1, np.int64)
    number[order] = np.arange(len(order))
    new = _renumbered(draft, order, number)
    lost = np.flatnonzero((draft.merged_into >= 0) & (new.merged_into == -1)) if len(order) < len(number) else _NONE
    return new, lost


def _renumbered(draft: Draft, kept: IntArray, number: IntArray) -> Draft:
    """The draft with the points kept, in their order, where every point gets a new number."""
    return replace(
        draft,
        points=draft.points.take(kept, axis=0),
        vessel_class=draft.vessel_class[kept],
        input_id=draft.input_id[kept],
        radius_basis=draft.radius_basis[kept],
        source_point=draft.source_point[kept],
        end_state=draft.end_state[kept],
        edges=number.take(draft.edges),
        merged_into=_relabelled(draft.merged_into, number),
    )


_NONE = np.empty(0, np.int64)
