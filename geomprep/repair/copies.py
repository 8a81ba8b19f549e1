"""Copies of a trunk, each sampled in its own way: fused into one run."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from geomprep.curves import piece_integrals
from geomprep.findings import Finding, Severity
from geomprep.model import FloatArray, IntArray, Repair, anchor_ids, raw_order
from geomprep.repair.classes import VEIN, may_join
from geomprep.repair.draft import LEFT_ALONE, Draft
from geomprep.repair.fused import Absorbed, Fusing, fused_draft, line_anchors, move_to_mean
from geomprep.repair.overlaps import Held, overlapping_runs
from geomprep.repair.runs import Runs, between, nearest_part, places_on
from geomprep.repair.settings import JoinSettings
from geomprep.repair.stretches import Beside, Forest, Limits, Samples, Stretch, copied_stretches
from geomprep.repair.verdicts import Verdicts, settled

__all__ = ["fuse_copies"]

_LISTED = 50
_STEP = 0.25
"""Largest distance between samples, in radii."""
_CANDIDATES = 3
"""Nearest samples whose edges are looked at."""
_REACH = 6.0
"""Radii beyond which nothing is looked for: distances above 3 radii all count the same."""
_PAIR = 2.0
"""Two lines within x of a common middle line are within 2 x of one another."""
_OPTIONS = ("leave", "fuse")
_WEAK = 3.0
"""Single samples may lie this many times further apart than the average."""


def fuse_copies(
    held: Held, settings: JoinSettings, verdicts: Verdicts
) -> tuple[tuple[Repair, ...], tuple[Finding, ...]]:
    """Fuse runs that are copies of one vessel.

    The longest of the runs that lie along one another is kept; a stretch of a
    shorter one that follows it is absorbed, and what is left of it joins where the two
    part. Kept points then move to the mean of all copies, in position and in ln r.
    Veins are fused within the tolerance only: split sinuses and doubled veins are real.

    Parameters
    ----------
    held : Held
        Its draft has the edges laid in runs; it keeps the layout where nothing was fused.
    settings : JoinSettings
    verdicts : Verdicts
        Recorded choices; one on a line holds for all its stretches.

    Returns
    -------
    repairs : tuple of Repair
        One per absorbed stretch, per line that a person left, and per vein that a person is asked about.
    findings : tuple of Finding
        Veins left side by side.
    """
    apart = _PAIR * settings.copies_within
    if apart <= 0:
        return (), ()
    draft, layout = held.take_laid()
    which = overlapping_runs(draft, layout, _WEAK * apart, settings.copies_radius_ratio)
    if len(which) == 0:
        held.put(draft, layout)
        return (), ()
    samples, rows = _sampled(draft, layout.runs, which)
    order = _longest_first(draft, layout.runs, which)
    state, left, findings = _absorbed_in_turn(draft, (samples, rows), order, (settings, verdicts))
    draft = state.draft = _ends_left_alone(draft, state)
    findings = _few(findings)
    if not state.absorbed:
        held.put(draft, layout)
        return left, findings
    del draft, layout
    before = [_both(state, taken) for taken in state.absorbed]
    move_to_mean(state, 1.5 * apart)
    records = settled(_records(state, before), verdicts)
    summary = _summary(state)
    held.put(fused_draft(state))
    return (*records, *left), (*findings, summary)


def _sampled(draft: Draft, laid: Runs, which: IntArray) -> tuple[Samples, IntArray]:
    """Sample some runs; also give the first row of each, and the number of rows."""
    counts = laid.offsets[which + 1] - laid.offsets[which]
    ends = np.cumsum(counts)
    edge = np.arange(ends[-1]) + np.repeat(laid.offsets[which] - (ends - counts), counts)
    step = laid.along[edge + 1] - laid.along[edge]
    pieces = np.maximum(np.ceil(step / _STEP), 2.0).astype(np.int64)  # ends alone may lie on others by chance
    per_run = np.add.reduceat(pieces, ends - counts)
    number = np.arange(pieces.sum()) - np.repeat(np.cumsum(pieces) - pieces, pieces)
    part = np.insert(number / np.repeat(pieces, pieces), np.cumsum(per_run), 1.0)
    edge = np.insert(np.repeat(edge, pieces), np.cumsum(per_run), laid.offsets[which + 1] - 1)
    along = laid.along[edge] + part * (laid.along[edge + 1] - laid.along[edge])
    run = np.repeat(which, per_run + 1)
    chord = places_on(draft, *laid.places(run, along + 1.0)) - places_on(draft, *laid.places(run, along - 1.0))
    chord /= np.maximum(np.linalg.norm(chord, axis=1), np.finfo(float).tiny)[:, None]
    place, radius = places_on(draft, edge, part), between(draft.end_radius, edge, part)
    return Samples(edge, part, place, chord, radius, along), np.concatenate(([0], np.cumsum(per_run + 1)))


def _longest_first(draft: Draft, laid: Runs, which: IntArray) -> list[int]:
    """Order of runs by length, then by the raw coordinates of their points; single steps come last.

    A single step that shares both its points with a finer line would otherwise replace its bends.
    """
    nodes = np.concatenate([draft.edges[laid.offsets[run] : laid.offsets[run + 1]].ravel() for run in which])
    counts = 2 * (laid.offsets[which + 1] - laid.offsets[which])
    source = draft.source_point[nodes]
    rank = np.empty(len(nodes), np.int64)
    rank[raw_order(draft.raw_points, np.maximum(source, 0))] = np.arange(len(nodes))
    first = np.minimum.reduceat(rank, np.cumsum(counts) - counts)
    length = laid.along[laid.offsets[which + 1]] - laid.along[laid.offsets[which]]
    order: list[int] = np.lexsort((first, -length, counts == 2)).tolist()
    return order


def _absorbed_in_turn(
    draft: Draft, sampled: tuple[Samples, IntArray], order: list[int], rules: tuple[JoinSettings, Verdicts]
) -> tuple[Fusing, tuple[Repair, ...], tuple[Finding, ...]]:
    """Take runs into the kept network one by one, without what is a copy of it."""
    (samples, rows), (settings, verdicts) = sampled, rules
    left: list[Repair] = []
    state, forest = Fusing(draft, 4 * len(order) + 8), Forest()
    findings: list[Finding] = []
    for number in order:
        start, end = int(rows[number]), int(rows[number + 1])
        run = samples[start:end]
        stays = np.ones(end - start, np.bool_)
        if len(forest):
            beside = _beside(state, forest, samples, run)
            stretches, aside, asked = _decided(draft, run, beside, state, settings)
            if aside:
                asks, stretches = _asked(draft, run, (stretches, aside, asked), verdicts)
                left.append(asks)
                if asks.choice == "leave":
                    findings += [_veins_finding(run, stretch) for stretch in aside]
                    _leave_alone(state, run, beside, aside)
                    state.left_alone += [int(draft.edges[run.edge[0], 0]), int(draft.edges[run.edge[-1], 1])]
            declined = None if aside else _declined(draft, run, stretches, verdicts)
            if declined is not None:
                left.append(declined)
                _leave_alone(state, run, beside, stretches)
                stretches = []
            after = -1
            for stretch in stretches:
                gone = state.absorb(run, beside, stretch, after)
                if gone is not None:
                    after = gone[1] + 1
                    stays[stretch.first : stretch.last + 1] = False
        stays &= ~state.gone[run.edge]
        state.keep(np.unique(run.edge[~state.gone[run.edge]]))
        forest.add(start + np.flatnonzero(stays), samples.point)
    return state, tuple(left), tuple(findings)


def _asked(
    draft: Draft, run: Samples, found: tuple[list[Stretch], list[Stretch], list[Stretch]], verdicts: Verdicts
) -> tuple[Repair, list[Stretch]]:
    """The question about a vein along another one, and the stretches to absorb by what is decided on it."""
    exact, aside, close = found
    anchors = draft.source_point[line_anchors(draft, run)]
    name = str(anchor_ids("overlapping-veins", draft.raw_points, anchors[None])[0])
    verdict = verdicts.settle(name, _OPTIONS, None)
    x, y, z = run.point[(aside[0].first + aside[0].last) // 2].tolist()
    radii = sum(run.along[stretch.last] - run.along[stretch.first] for stretch in aside)
    reason = (
        f"a vein lies within another for {radii:.3g} radii, {aside[0].mean_distance:.2g} of the radius apart on average: "
        "a copy, or a doubled vein, which is real"
    )
    record = Repair(name, "overlapping veins", reason, (x, y, z), verdict.choice, _OPTIONS, verdict.by)
    return record, close if verdict.choice == "fuse" else exact


def _declined(draft: Draft, run: Samples, stretches: list[Stretch], verdicts: Verdicts) -> Repair | None:
    """The record of a line whose copies a person left as drawn."""
    if not stretches or not verdicts.recorded:
        return None
    anchors = draft.source_point[line_anchors(draft, run)]
    name = str(anchor_ids("fused-copies", draft.raw_points, anchors[None])[0])
    verdict = verdicts.settle(name, _OPTIONS, "fuse")
    if verdict.choice == "fuse":
        return None
    x, y, z = run.point[(stretches[0].first + stretches[0].last) // 2].tolist()
    reason = f"a line runs along another on {len(stretches)} stretch(es); both are kept"
    return Repair(name, "fused copies", reason, (x, y, z), verdict.choice, _OPTIONS, verdict.by)


def _beside(state: Fusing, forest: Forest, samples: Samples, run: Samples) -> Beside:
    """Nearest place on kept edges for each sample of a run."""
    draft = state.draft
    row = forest.nearest(run.point, _CANDIDATES, _REACH * float(run.radius.max()))
    edge = samples.edge[row]
    before = np.maximum(edge - 1, 0)
    follows = state.edges[before, 1] == state.edges[edge, 0]
    edge = np.concatenate((edge, np.where(follows, before, edge)), axis=1)
    row = np.concatenate((row, row), axis=1)
    start = state.points[state.edges[edge, 0]]
    part, distance = nearest_part(run.point[:, None], start, state.points[state.edges[edge, 1]] - start)
    # the edge before a kept one may be of this very run
    allowed = (row >= 0) & state.kept[edge] & may_join(draft.edge_class[edge], draft.edge_class[run.edge][:, None])
    distance = np.where(allowed, distance, np.inf)
    best = np.argmin(distance, axis=1)[:, None]
    edge, row = np.take_along_axis(edge, best, 1)[:, 0], np.take_along_axis(row, best, 1)[:, 0]
    part, distance = np.take_along_axis(part, best, 1)[:, 0], np.take_along_axis(distance, best, 1)[:, 0]
    radius = between(state.end_radius, edge, part)
    first, last = state.points[state.edges[edge, 0]], state.points[state.edges[edge, 1]]
    return Beside(
        edge,
        part,
        first + part[:, None] * (last - first),
        distance / np.minimum(radius, run.radius),
        np.abs(np.einsum("ij,ij->i", run.tangent, samples.tangent[row])),
        np.maximum(radius, run.radius) / np.minimum(radius, run.radius),
    )


def _decided(
    draft: Draft, run: Samples, beside: Beside, state: Fusing, settings: JoinSettings
) -> tuple[list[Stretch], list[Stretch], list[Stretch]]:
    """Stretches to absorb, those of veins that are asked about, and all that are close enough."""
    ends = draft.edges[run.edge[0], 0], draft.edges[run.edge[-1], 1]
    open_ends = bool(state.degree[ends[0]] == 1), bool(state.degree[ends[1]] == 1)
    apart = _PAIR * settings.copies_within
    close = Limits(apart, settings.copies_overlap, settings.copies_radius_ratio)
    stretches = copied_stretches(run, beside, close, open_ends)
    if not stretches or not _in_veins(draft, run, beside, stretches):
        return stretches, [], stretches
    exact = Limits(settings.tolerance, settings.copies_overlap, settings.copies_radius_ratio)
    same = copied_stretches(run, beside, exact, open_ends) if settings.tolerance > 0 else []
    covered = np.zeros(len(run.edge), np.bool_)
    for stretch in same:
        covered[stretch.first : stretch.last + 1] = True
    aside = [
        stretch
        for stretch in stretches
        if not covered[(stretch.first + stretch.last) // 2]
        and run.along[stretch.last] - run.along[stretch.first] >= settings.copies_overlap
    ]
    return same, aside, stretches


def _leave_alone(state: Fusing, run: Samples, beside: Beside, stretches: list[Stretch]) -> None:
    """Remember the points of both lines, so that no later step joins their open ends (in place)."""
    for stretch in stretches:
        rows = np.arange(stretch.first, stretch.last + 1)
        edges = np.concatenate((run.edge[rows], beside.edge[rows]))
        state.left_alone += np.unique(state.draft.edges[edges]).tolist()


def _few(findings: tuple[Finding, ...]) -> tuple[Finding, ...]:
    """The first findings, and one for the rest."""
    rest = len(findings) - _LISTED
    if rest <= 0:
        return findings
    more = Finding("overlapping veins", Severity.WARNING, f"{rest} pairs of overlapping veins more", value=float(rest))
    return (*findings[:_LISTED], more)


def _ends_left_alone(draft: Draft, state: Fusing) -> Draft:
    """Mark open ends of doubled veins, so that no later step joins them."""
    if not state.left_alone:
        return draft
    end_state = draft.end_state.copy()
    nodes = np.array(state.left_alone)
    end_state[nodes[state.degree[nodes] == 1]] = LEFT_ALONE
    return replace(draft, end_state=end_state)


def _in_veins(draft: Draft, run: Samples, beside: Beside, stretches: list[Stretch]) -> bool:
    """Whether a vein takes part in any of the stretches."""
    rows = np.concatenate([np.arange(stretch.first, stretch.last + 1) for stretch in stretches])
    classes = draft.edge_class[np.concatenate((run.edge[rows], beside.edge[rows]))]
    return bool((classes == VEIN).any())


def _veins_finding(run: Samples, stretch: Stretch) -> Finding:
    """Two veins that lie in one another and are left so."""
    x, y, z = run.point[(stretch.first + stretch.last) // 2].tolist()
    return Finding(
        "overlapping veins",
        Severity.WARNING,
        f"two veins lie within one another for {run.along[stretch.last] - run.along[stretch.first]:.3g} radii, "
        f"{stretch.mean_distance:.2g} of the radius apart on average; left as drawn, with open ends "
        "not joined, since doubled veins are real",
        position=(x, y, z),
        value=stretch.mean_distance,
    )


def _records(state: Fusing, before: list[float]) -> tuple[Repair, ...]:
    """One repair per absorbed stretch, in the order of raw coordinates; `before` is the conductance of both copies.

    Ids hang on the ends and the middle of the whole line, which no limit moves.
    """
    draft = state.draft
    groups = [taken.nodes if len(taken.nodes) else taken.line for taken in state.absorbed]
    first = np.array([min(draft.raw_points[draft.source_point[group]].tolist()) for group in groups])
    order = raw_order(first, np.arange(len(groups)))
    of_node = np.full(len(draft.points), -1, np.int64)
    for number, row in enumerate(order.tolist()):
        of_node[state.absorbed[row].nodes] = number
    merged_into = draft.merged_into
    raw = np.flatnonzero((merged_into >= 0) & (of_node[np.maximum(merged_into, 0)] >= 0))
    of_raw = of_node[merged_into[raw]]
    raw = raw[np.argsort(of_raw, kind="stable")]
    bounds = np.cumsum(np.bincount(of_raw, minlength=len(order)))[:-1]
    lines = draft.source_point[np.stack([state.absorbed[row].line for row in order.tolist()])]
    ids = anchor_ids("fused-copies", draft.raw_points, lines)
    return tuple(
        _record(state, state.absorbed[row], str(name), tuple(group.tolist()), before[row])
        for row, name, group in zip(order.tolist(), ids, np.split(raw, bounds), strict=True)
    )


def _both(state: Fusing, taken: Absorbed) -> float:
    """Conductance of a stretch and of what it lies beside."""
    own = _resistance(taken.samples.point, taken.samples.radius)
    beside = _resistance(*_on_edges(state, taken))
    return float(np.pi / 8.0 * (1.0 / own + 1.0 / beside))


def _record(state: Fusing, taken: Absorbed, name: str, raw: tuple[int, ...], before: float) -> Repair:
    """Repair of one absorbed stretch, with the conductance of both copies before and of the one after."""
    fused = _resistance(*_on_edges(state, taken))
    length = float(np.linalg.norm(np.diff(taken.samples.point, axis=0), axis=1).sum())
    x, y, z = taken.samples.point[len(taken.samples.edge) // 2].tolist()
    return Repair(
        id=name,
        kind="fused copies",
        reason=(
            f"a line runs along another for {1e3 * length:.3g} mm "
            f"({taken.samples.along[-1] - taken.samples.along[0]:.3g} radii), "
            f"{taken.stretch.mean_distance:.2g} of the radius apart on average, "
            f"{taken.stretch.largest_distance:.2g} at most"
        ),
        position=(x, y, z),
        choice="fuse",
        options=_OPTIONS,
        conductance_before=before,
        conductance_after=np.pi / 8.0 / fused,
        raw_points=raw,
    )


def _on_edges(state: Fusing, taken: Absorbed) -> tuple[FloatArray, FloatArray]:
    """Positions and radii on the kept edges beside the samples of a stretch."""
    start, end = (state.points[state.edges[taken.edge, side]] for side in (0, 1))
    return start + taken.part[:, None] * (end - start), between(state.end_radius, taken.edge, taken.part)


def _resistance(points: FloatArray, radius: FloatArray) -> float:
    """Integral of ds / r⁴ along a line."""
    step = np.linalg.norm(np.diff(points, axis=0), axis=1)
    return float(piece_integrals(step, radius[:-1], radius[1:])[:, 3].sum())


def _summary(state: Fusing) -> Finding:
    """Say how many stretches were fused."""
    draft = state.draft
    mixed = sum(
        bool(draft.edge_class[taken.samples.edge[0]] != draft.edge_class[taken.edge[0]]) for taken in state.absorbed
    )
    x, y, z = state.absorbed[0].samples.point[0].tolist()
    return Finding(
        "fused copies",
        Severity.NOTE,
        f"{len(state.absorbed)} stretches of lines are copies of others and were fused with them"
        + (f"; {mixed} of them between a line without class and one with" if mixed else ""),
        position=(x, y, z),
        value=float(len(state.absorbed)),
    )
