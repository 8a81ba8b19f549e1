"""Open ends a small part of the radius away from other ends or junctions."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from geomprep.curves import piece_integrals
from geomprep.model import BoolArray, FloatArray, IntArray, Repair, anchor_ids, raw_order
from geomprep.repair.classes import may_join
from geomprep.repair.coincident import group_pairs, near_pairs
from geomprep.repair.draft import JOINED_ENDS, LEFT_ALONE, Draft, degree, merged, point_radius
from geomprep.repair.overlaps import Held
from geomprep.repair.runs import Runs
from geomprep.repair.verdicts import Verdicts, settled

__all__ = ["join_near_open_ends", "run_conductance", "runs_at_ends"]

_INSIDE = 2.0
"""A run shorter than this many radii is not closed to a ring."""


def join_near_open_ends(held: Held, within: float, verdicts: Verdicts) -> tuple[Repair, ...]:
    """Merge open ends with ends and junctions that lie within a part of the radius.

    Parameters
    ----------
    held : Held
        Its draft has the edges laid in runs; it keeps the layout where nothing was joined.
    within : float
        Largest distance as a part of the smaller radius.
    verdicts : Verdicts
        Recorded choices on the groups.

    Returns
    -------
    tuple of Repair
        One per group of points that became one, or that a person left apart.
    """
    draft, layout = held.take_laid()
    laid = layout.runs
    ends = degree(draft)
    node = np.flatnonzero((ends != 2) & (ends > 0) & (draft.end_state != LEFT_ALONE))
    radius = point_radius(draft)
    pairs = near_pairs(draft.points[node], radius[node], within)
    one, other = node[pairs[:, 0]], node[pairs[:, 1]]
    allowed = may_join(draft.vessel_class[one], draft.vessel_class[other])
    allowed &= ((ends[one] == 1) | (ends[other] == 1)) & ~_short_run_between(draft, laid, one, other)
    if not allowed.any():
        held.put(draft, layout)
        return ()
    group, _ = group_pairs(draft.points[node], radius[node], pairs[allowed], within)
    leader = np.full(int(group.max()) + 1, len(draft.points))
    np.minimum.at(leader, group, node)
    label = np.arange(len(draft.points))
    label[node] = leader[group]
    joined = np.flatnonzero(np.bincount(label, minlength=len(label))[label] > 1)
    joined = joined[np.argsort(label[joined], kind="stable")]
    groups = np.split(joined, np.flatnonzero(np.diff(label[joined])) + 1)
    first = np.array([min(draft.raw_points[np.maximum(draft.source_point[group], 0)].tolist()) for group in groups])
    groups = [groups[row] for row in raw_order(first, np.arange(len(groups)))]
    repairs = settled(_records(draft, groups, radius, _branch_conductance(draft, laid)), verdicts)
    apart = [group for repair, group in zip(repairs, groups, strict=True) if repair.choice != "join"]
    if apart:
        left = np.concatenate(apart)
        label[left] = left
        joined = np.setdiff1d(joined, left)
        end_state = draft.end_state.copy()
        end_state[left] = LEFT_ALONE
        draft = replace(draft, end_state=end_state)
    if len(joined) == 0:
        held.put(draft, layout)
        return repairs
    del layout, laid
    junctions = np.bincount(label[ends > 2], minlength=len(label))
    keeps = (ends > 2) | (junctions[label] == 0)  # a junction stays in its place
    _, label = np.unique(label, return_inverse=True)
    end_state = draft.end_state.copy()
    end_state[joined] = JOINED_ENDS
    held.put(merged(replace(draft, end_state=end_state), label, keeps))
    return repairs


def _short_run_between(draft: Draft, laid: Runs, one: IntArray, other: IntArray) -> BoolArray:
    """Whether two points are the ends of one run of less than two radii."""
    first, last = draft.edges[laid.offsets[:-1], 0], draft.edges[laid.offsets[1:] - 1, 1]
    short = laid.along[laid.offsets[1:]] - laid.along[laid.offsets[:-1]] < _INSIDE
    n = np.int64(len(draft.points))
    keys = np.minimum(first, last)[short] * n + np.maximum(first, last)[short]
    found: BoolArray = np.isin(np.minimum(one, other) * n + np.maximum(one, other), keys)
    return found


def run_conductance(draft: Draft, laid: Runs, which: IntArray) -> FloatArray:
    """Conductance of some runs at unit viscosity, π / (8 ∫ds/r⁴)."""
    if len(which) == 0:
        return np.empty(0)
    count = laid.offsets[which + 1] - laid.offsets[which]
    starts = np.cumsum(count) - count
    edge = np.arange(count.sum()) + np.repeat(laid.offsets[which] - starts, count)
    step = draft.points.take(draft.edges[edge, 1], axis=0) - draft.points.take(draft.edges[edge, 0], axis=0)
    length = np.sqrt(np.einsum("ij,ij->i", step, step))
    resistance = piece_integrals(length, draft.end_radius[edge, 0], draft.end_radius[edge, 1])[:, 3]
    conductance: FloatArray = np.pi / 8.0 / np.add.reduceat(resistance, starts)
    return conductance


def runs_at_ends(draft: Draft, laid: Runs) -> tuple[IntArray, FloatArray]:
    """Run that begins or ends at each point, or passes where ends were joined; and the distance along all runs there.

    The run is −1 at other points.
    """
    run = np.full(len(draft.points), -1, np.int64)
    along = np.zeros(len(draft.points))
    joined = draft.end_state == JOINED_ENDS
    if joined.any():
        edge = np.flatnonzero(joined[draft.edges[:, 0]])
        run[draft.edges[edge, 0]], along[draft.edges[edge, 0]] = laid.of_edge[edge], laid.along[edge]
    numbers = np.arange(len(laid.offsets) - 1)
    first, last = draft.edges[laid.offsets[:-1], 0], draft.edges[laid.offsets[1:] - 1, 1]
    run[last], along[last] = numbers, laid.along[laid.offsets[1:]]
    run[first], along[first] = numbers, laid.along[laid.offsets[:-1]]
    return run, along


def _branch_conductance(draft: Draft, laid: Runs) -> FloatArray:
    """Conductance of the run at each open end; infinite elsewhere."""
    run, _ = runs_at_ends(draft, laid)
    value = np.full(len(run), np.inf)
    tips = np.flatnonzero(degree(draft) == 1)
    value[tips] = run_conductance(draft, laid, run[tips])
    return value


def _records(draft: Draft, groups: list[IntArray], radius: FloatArray, conductance: FloatArray) -> tuple[Repair, ...]:
    """One repair per group of joined points."""
    anchors = np.full((len(groups), max(len(group) for group in groups)), -1, np.int64)
    for row, group in zip(anchors, groups, strict=True):
        row[: len(group)] = draft.source_point[group]
    records = []
    for name, group in zip(anchor_ids("joined-ends", draft.raw_points, anchors).tolist(), groups, strict=True):
        place = draft.points[group]
        apart = float(np.linalg.norm(place[:, None] - place[None], axis=2).max())
        x, y, z = place.mean(axis=0).tolist()
        records.append(
            Repair(
                id=name,
                kind="joined ends",
                reason=(
                    f"{len(group)} ends lie up to {1e3 * apart:.3g} mm apart, "
                    f"{apart / radius[group].min():.2g} of the smaller radius"
                ),
                position=(x, y, z),
                choice="join",
                options=("join", "leave"),
                conductance_before=0.0,
                conductance_after=float(conductance[group].min()),
                raw_points=tuple(point for point in draft.source_point[group].tolist() if point >= 0),
            )
        )
    return tuple(records)
