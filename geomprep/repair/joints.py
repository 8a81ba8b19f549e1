"""Ends that lie on the side of another line."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.model import BoolArray, FloatArray, IntArray, Repair, anchor_ids, raw_order
from geomprep.repair.classes import may_join
from geomprep.repair.draft import JOINED_ENDS, LEFT_ALONE, Draft, degree, merged, without_edges
from geomprep.repair.ends import run_conductance, runs_at_ends
from geomprep.repair.insert import with_new_points, with_split_edges
from geomprep.repair.overlaps import Held, Layout
from geomprep.repair.parts import components
from geomprep.repair.runs import between, nearest_on, places_on
from geomprep.repair.settings import JoinSettings
from geomprep.repair.verdicts import Verdicts, settled

__all__ = ["join_sides"]

_OWN_RUN = 3.0
"""A line may join its own side from this many radii along it."""
_INSIDE = 2.0
"""Radii of a line, from its end, that may run inside the vessel it joins."""


@dataclass(frozen=True, eq=False)
class _Contacts:
    """Ends on the side of a line.

    Attributes
    ----------
    node : (c,) int array
        The end.
    edge : (c,) int array
        Edge that it lies on.
    part : (c,) float array
        Fraction of that edge.
    distance : (c,) float array
        In parts of the radius there.
    """

    node: IntArray
    edge: IntArray
    part: FloatArray
    distance: FloatArray

    def __getitem__(self, which: IntArray | BoolArray) -> _Contacts:
        """Some of the contacts."""
        return _Contacts(self.node[which], self.edge[which], self.part[which], self.distance[which])


def join_sides(held: Held, settings: JoinSettings, verdicts: Verdicts) -> tuple[Repair, ...]:
    """Join line ends to the side of the line that they lie on.

    An open end within `joints_within` of the local radius of another line, or a
    junction within the tolerance, becomes a point of that line: the nearest place on its
    nearest edge, or a point that is there already. First steps of a line that run
    inside the other vessel are left out.

    Parameters
    ----------
    held : Held
        Its draft has the edges laid in runs; it keeps the layout where nothing was joined.
    settings : JoinSettings
    verdicts : Verdicts
        Recorded choices on the joints.

    Returns
    -------
    tuple of Repair
        One per joint, declined ones too.
    """
    draft, layout = held.take_laid()
    contacts = _contacts(draft, layout, settings)
    if len(contacts.node) == 0:
        held.put(draft, layout)
        return ()
    contacts, facing = _without_facing(draft, layout, contacts)
    contacts = contacts[raw_order(draft.raw_points, np.maximum(draft.source_point[contacts.node], 0))]
    repairs = settled(_records(draft, layout, contacts), verdicts)
    contacts = contacts[np.flatnonzero([repair.choice == "join" for repair in repairs])]
    if len(contacts.node) == 0:
        held.put(draft, layout)
        return repairs
    contacts, inside = _followed_inside(draft, layout, contacts, settings.joints_within)
    del layout
    gone = np.concatenate((facing.gone, inside.gone))
    target, split = _targets(draft, contacts, settings)
    edge, part = contacts.edge[split], contacts.part[split]
    new = with_new_points(draft, places_on(draft, edge, part), edge)
    target[split] = len(draft.points) + np.arange(len(split))
    to_target = np.stack((contacts.node, target), axis=1)
    pairs = np.concatenate(
        (to_target, facing.pairs, inside.pairs, _same_split(draft, edge, part, target[split], settings))
    )
    kept = np.ones(len(draft.edges), np.bool_)
    kept[gone] = False
    del draft
    new = with_split_edges(without_edges(new, ~kept), (np.cumsum(kept) - 1)[edge], part, target[split])
    stays = np.ones(len(new.points), np.bool_)
    stays[np.concatenate((contacts.node, facing.pairs[:, 1], inside.pairs[:, 1]))] = False
    stays[facing.pairs[:, 0]] = True
    _, label = components(len(new.points), pairs)
    has_place = np.zeros(len(label), np.bool_)
    has_place[label[stays]] = True
    held.put(merged(new, label, stays | ~has_place[label]))
    return repairs


@dataclass(frozen=True, eq=False)
class _LeftOut:
    """Steps of a line inside the vessel it joins.

    Attributes
    ----------
    pairs : (p, 2) int array
        Points that become one: a joined end, and a point that is left out with it.
    gone : (g,) int array
        Edges left out.
    """

    pairs: IntArray
    gone: IntArray


_NO_PAIRS = np.empty((0, 2), np.int64)
_NONE = np.empty(0, np.int64)


def _contacts(draft: Draft, layout: Layout, settings: JoinSettings) -> _Contacts:
    """Ends within reach of the side of a line, each with the nearest place."""
    marks, laid = layout.marks, layout.runs
    ends = degree(draft)
    was_end = draft.end_state == JOINED_ENDS
    node = np.flatnonzero((ends > 0) & ((ends != 2) | was_end) & (draft.end_state != LEFT_ALONE))
    within = np.where((ends[node] == 1) | was_end[node], settings.joints_within, settings.tolerance)
    node, within = node[within > 0], within[within > 0]
    found = [_EMPTY]
    for near_row, near_mark in layout.near(draft.points[node], 1.0 + settings.joints_within):
        other = ~_own_pieces(draft, layout, node[near_row], near_mark)
        other &= may_join(draft.vessel_class[node[near_row]], draft.edge_class[marks.edge[near_mark]])
        row, mark = near_row[other], near_mark[other]
        run = marks.run[mark]
        first, _ = laid.places(run, marks.along[mark] - marks.half[mark])
        last, _ = laid.places(run, marks.along[mark] + marks.half[mark])
        edge, part, distance = nearest_on(draft, draft.points[node[row]], first, last)
        distance = distance / between(draft.end_radius, edge, part)
        close = distance <= within[row]
        found.append(_Contacts(node[row], edge, part, distance)[close])
    return _nearest_each(found)


def _own_pieces(draft: Draft, layout: Layout, node: IntArray, mark: IntArray) -> BoolArray:
    """Whether a piece belongs to a run that begins, ends or passes at a point, and lies near that point."""
    marks, laid = layout.marks, layout.runs
    run, along, half = marks.run[mark], marks.along[mark], marks.half[mark]
    start, end = laid.offsets[run], laid.offsets[run + 1]
    through, there = runs_at_ends(draft, laid)
    own: BoolArray = (draft.edges[start, 0] == node) & (along - laid.along[start] - half <= _OWN_RUN)
    own |= (draft.edges[end - 1, 1] == node) & (laid.along[end] - along - half <= _OWN_RUN)
    own |= (through[node] == run) & (np.abs(along - there[node]) - half <= _OWN_RUN)
    return own


_EMPTY = _Contacts(_NONE, _NONE, np.empty(0), np.empty(0))


def _nearest_each(found: list[_Contacts]) -> _Contacts:
    """Of all contacts of an end the nearest."""
    every = _Contacts(
        np.concatenate([contacts.node for contacts in found]),
        np.concatenate([contacts.edge for contacts in found]),
        np.concatenate([contacts.part for contacts in found]),
        np.concatenate([contacts.distance for contacts in found]),
    )
    order = np.lexsort((every.distance, every.node))
    return every[order[np.diff(every.node[order], prepend=-1) != 0]]


def _without_facing(draft: Draft, layout: Layout, contacts: _Contacts) -> tuple[_Contacts, _LeftOut]:
    """Where the ends of two lines run past one another, join the longer line's; leave out the other's."""
    laid = layout.runs
    own, tip = runs_at_ends(draft, laid)
    row_of = np.full(len(draft.points), -1, np.int64)
    row_of[contacts.node] = np.arange(len(contacts.node))
    row_of[degree(draft) != 1] = -1
    run = laid.of_edge[contacts.edge]
    along = laid.along[contacts.edge] + contacts.part * (laid.along[contacts.edge + 1] - laid.along[contacts.edge])
    length = laid.along[laid.offsets[1:]] - laid.along[laid.offsets[:-1]]
    single, part = np.ones(len(contacts.node), np.bool_), contacts.part.copy()
    pairs, gone = [_NO_PAIRS], [_NONE]
    for side, ends in ((0, draft.edges[laid.offsets[:-1], 0]), (1, draft.edges[laid.offsets[1:] - 1, 1])):
        facing = ends[run]
        back = row_of[facing]
        mutual = (back >= 0) & (row_of[contacts.node] >= 0) & (np.abs(along - tip[facing]) <= _INSIDE)
        mutual &= (run[back] == own[contacts.node]) & (run != own[contacts.node])
        longer = length[own[contacts.node]] - length[run]
        for row in np.flatnonzero(mutual & ((longer > 0) | ((longer == 0) & (own[contacts.node] < run)))).tolist():
            edge, start, end = int(contacts.edge[row]), laid.offsets[run[row]], laid.offsets[run[row] + 1]
            left_out = np.arange(start, edge) if side == 0 else np.arange(edge + 1, end)
            points = np.append(draft.edges[left_out, side], draft.edges[edge, side])
            pairs.append(np.stack((np.full(len(points), contacts.node[row]), points), axis=1))
            gone.append(left_out)
            single[back[row]] = False
            part[row] = side  # the end takes the place of the other line's point next to it
    kept = _Contacts(contacts.node, contacts.edge, part, contacts.distance)[single]
    return kept, _LeftOut(np.concatenate(pairs), np.concatenate(gone))


def _followed_inside(draft: Draft, layout: Layout, contacts: _Contacts, within: float) -> tuple[_Contacts, _LeftOut]:
    """Move contacts of open ends on along their line while its points lie on the same other line."""
    laid = layout.runs
    own, tip = runs_at_ends(draft, laid)
    edge, part, distance = contacts.edge.copy(), contacts.part.copy(), contacts.distance.copy()
    run = own[contacts.node]
    begins = draft.edges[laid.offsets[run], 0] == contacts.node
    inwards = np.where(begins, 1, -1)
    step = np.where(begins, laid.offsets[run], laid.offsets[run + 1] - 1)  # first step of the line
    target = laid.of_edge[contacts.edge]
    active = np.flatnonzero((degree(draft)[contacts.node] == 1) & (target != run) & ~np.isin(step, contacts.edge))
    pairs, gone = [_NO_PAIRS], [_NONE]
    while len(active):
        inner = draft.edges[step[active], np.where(begins[active], 1, 0)]
        along = laid.along[step[active] + begins[active]]
        last = step[active] == np.where(begins, laid.offsets[run + 1] - 1, laid.offsets[run])[active]
        near = laid.along[edge[active]]
        low, _ = laid.places(target[active], near - _INSIDE)
        high, _ = laid.places(target[active], near + 2 * _INSIDE)
        found_edge, found_part, apart = nearest_on(draft, draft.points[inner], low, high)
        apart = apart / between(draft.end_radius, found_edge, found_part)
        inside = ~last & (np.abs(along - tip[contacts.node[active]]) <= _INSIDE) & (apart <= within)
        inside &= ~np.isin(step[active] + inwards[active], contacts.edge)
        active = active[inside]
        edge[active], part[active], distance[active] = found_edge[inside], found_part[inside], apart[inside]
        pairs.append(np.stack((contacts.node[active], inner[inside]), axis=1))
        gone.append(step[active])
        step[active] += inwards[active]
    return _Contacts(contacts.node, edge, part, distance), _LeftOut(np.concatenate(pairs), np.concatenate(gone))


def _targets(draft: Draft, contacts: _Contacts, settings: JoinSettings) -> tuple[IntArray, IntArray]:
    """Point that each end becomes one with, where there is one; and the contacts that split their edge."""
    ends = degree(draft)
    corner = draft.edges[contacts.edge]
    place = places_on(draft, contacts.edge, contacts.part)
    apart = np.linalg.norm(draft.points[corner] - place[:, None], axis=2)
    apart = apart / between(draft.end_radius, contacts.edge, contacts.part)[:, None]
    within = np.where(ends[corner] != 2, max(settings.joints_within, settings.tolerance), settings.tolerance)
    nearer = np.argmin(apart, axis=1)
    row = np.arange(len(nearer))
    there = apart[row, nearer] <= within[row, nearer]
    target = np.where(there, corner[row, nearer], -1)
    return target, np.flatnonzero(~there)


def _same_split(draft: Draft, edge: IntArray, part: FloatArray, point: IntArray, settings: JoinSettings) -> IntArray:
    """Pairs of new points on one edge that are one joint."""
    order = np.lexsort((part, edge))
    one, other = order[:-1], order[1:]
    place = places_on(draft, edge, part)
    radius = between(draft.end_radius, edge, part)
    apart = np.linalg.norm(place[other] - place[one], axis=1)
    same = (edge[one] == edge[other]) & (apart <= settings.joints_within * radius[one])
    return np.stack((point[one[same]], point[other[same]]), axis=1)


def _records(draft: Draft, layout: Layout, contacts: _Contacts) -> tuple[Repair, ...]:
    """One repair per joint."""
    own, _ = runs_at_ends(draft, layout.runs)
    conductance = run_conductance(draft, layout.runs, own[contacts.node]).tolist()
    source = draft.source_point[contacts.node]
    ids = anchor_ids("t-joint", draft.raw_points, source[:, None])
    radius = between(draft.end_radius, contacts.edge, contacts.part)
    rows = zip(
        ids.tolist(),
        draft.points[contacts.node].tolist(),
        contacts.distance.tolist(),
        (contacts.distance * radius).tolist(),
        conductance,
        source.tolist(),
        strict=True,
    )
    return tuple(
        Repair(
            id=name,
            kind="T-joint",
            reason=(
                f"a line ends {1e3 * metres:.3g} mm from the side of another, {distance:.2g} of the radius there; "
                "it is joined to it"
            ),
            position=(x, y, z),
            choice="join",
            options=("join", "leave"),
            conductance_before=0.0,
            conductance_after=branch,
            raw_points=(raw,) if raw >= 0 else (),
        )
        for name, (x, y, z), distance, metres, branch, raw in rows
    )
