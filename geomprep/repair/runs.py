"""Runs of edges laid head to tail, and marks spread evenly along them."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from geomprep.model import FloatArray, IntArray, chains
from geomprep.repair.draft import Draft, degree, lengths

__all__ = [
    "Marks",
    "Runs",
    "between",
    "foot",
    "laid_in_runs",
    "marked",
    "nearest_on",
    "nearest_part",
    "places_on",
    "runs",
]

_SPACING = 2.0
"""Largest distance between marks in radii: every overlap of two radii holds a mark."""


@dataclass(frozen=True, eq=False)
class Runs:
    """Consecutive edges that follow one another through points of degree 2.

    Attributes
    ----------
    offsets : (m + 1,) int array
        Run i holds the edges ``offsets[i]`` to ``offsets[i + 1] - 1``.
    of_edge : (e,) int array
        Run of each edge.
    along : (e + 1,) float array
        Distance in local radii from the start of the first edge, through all runs.
    """

    offsets: IntArray
    of_edge: IntArray
    along: FloatArray

    def places(self, run: IntArray, along: FloatArray) -> tuple[IntArray, FloatArray]:
        """Edge and fraction of it at a distance along a run."""
        edge = np.searchsorted(self.along, along, side="right") - 1
        edge = np.clip(edge, self.offsets[run], self.offsets[run + 1] - 1)
        step = self.along[edge + 1] - self.along[edge]
        return edge, np.clip((along - self.along[edge]) / step, 0.0, 1.0)


def laid_in_runs(draft: Draft) -> Draft:
    """Put edges head to tail where most of them do not yet follow one another."""
    through = degree(draft) == 2
    follows = (draft.edges[:-1, 1] == draft.edges[1:, 0]) & through[draft.edges[:-1, 1]]
    if 2 * np.count_nonzero(follows) >= np.count_nonzero(through):
        return draft
    cut = chains(len(draft.points), draft.edges)
    inner = np.ones(len(cut.point), np.bool_)
    inner[cut.offsets[1:] - 1] = False
    turned = (draft.edges[cut.edge, 0] != cut.point[inner])[:, None]
    edges, radius = draft.edges.take(cut.edge, axis=0), draft.end_radius.take(cut.edge, axis=0)
    return replace(
        draft,
        edges=np.where(turned, edges[:, ::-1], edges),
        end_radius=np.where(turned, radius[:, ::-1], radius),
        edge_class=draft.edge_class[cut.edge],
    )


def runs(draft: Draft) -> Runs:
    """Find the runs of a draft in which edges lie head to tail."""
    through = degree(draft) == 2
    start = np.ones(len(draft.edges), np.bool_)
    start[1:] = (draft.edges[:-1, 1] != draft.edges[1:, 0]) | ~through[draft.edges[1:, 0]]
    first = np.flatnonzero(start)
    step = lengths(draft)
    step /= (draft.end_radius[:, 0] + draft.end_radius[:, 1]) / 2.0
    return Runs(
        offsets=np.append(first, len(start)),
        of_edge=np.cumsum(start) - 1,
        along=np.concatenate(([0.0], np.cumsum(step))),
    )


@dataclass(frozen=True, eq=False)
class Marks:
    """Places at most two radii apart, each in the middle of its piece of a run.

    Attributes
    ----------
    run, edge : (k,) int array
        Run and edge of each mark.
    point : (k, 3) float array
    radius : (k,) float array
        Local radius.
    along : (k,) float array
        Distance in radii as in :class:`Runs`.
    half : (k,) float array
        Half the length of the piece, in radii.
    size : (k,) float array
        The larger of the local radius and the half length in metres: how far the
        piece reaches.
    """

    run: IntArray
    edge: IntArray
    point: FloatArray
    radius: FloatArray
    along: FloatArray
    half: FloatArray
    size: FloatArray


def marked(draft: Draft, laid: Runs) -> Marks:
    """Spread marks along all runs, at least one on each."""
    start, end = laid.along[laid.offsets[:-1]], laid.along[laid.offsets[1:]]
    count = np.maximum(np.ceil((end - start) / _SPACING), 1.0).astype(np.int64)
    run = np.repeat(np.arange(len(count)), count)
    half = 0.5 * (end - start) / count
    number = np.arange(len(run)) - np.repeat(np.cumsum(count) - count, count)
    along = start[run] + (2 * number + 1) * half[run]
    edge, part = laid.places(run, along)
    radius = between(draft.end_radius, edge, part)
    # where the radius grows along the piece, so does its length in metres
    ahead, behind = (between(draft.end_radius, *laid.places(run, along + sign * half[run])) for sign in (1.0, -1.0))
    size = np.maximum(radius, np.maximum(ahead, behind)) * np.maximum(half[run], 1.0)
    return Marks(run, edge, places_on(draft, edge, part), radius, along, half[run], size)


def between(values: FloatArray, edge: IntArray, part: FloatArray) -> FloatArray:
    """Linear value at a fraction of edges, from the values at their ends."""
    value: FloatArray = values[edge, 0] + part * (values[edge, 1] - values[edge, 0])
    return value


def places_on(draft: Draft, edge: IntArray, part: FloatArray) -> FloatArray:
    """Positions at a fraction of edges."""
    start = draft.points.take(draft.edges[edge, 0], axis=0)
    place: FloatArray = draft.points.take(draft.edges[edge, 1], axis=0)
    place -= start
    place *= part[:, None]
    place += start
    return place


def nearest_on(
    draft: Draft, places: FloatArray, first: IntArray, last: IntArray
) -> tuple[IntArray, FloatArray, FloatArray]:
    """Nearest place on a range of edges.

    Parameters
    ----------
    draft : Draft
    places : (q, 3) float array
    first, last : (q,) int array
        The edges ``first`` to ``last`` (included) are tried for each place.

    Returns
    -------
    edge : (q,) int array
    part : (q,) float array
        Fraction of that edge.
    distance : (q,) float array
    """
    count = last - first + 1
    starts = np.cumsum(count) - count
    query = np.repeat(np.arange(len(count)), count)
    edge = np.arange(len(query)) - np.repeat(starts - first, count)
    part, distance = foot(draft, places.take(query, axis=0), edge)
    least = np.minimum.reduceat(distance, starts) if len(starts) else distance
    # the first edge of each range that is as near as the nearest
    hit = np.flatnonzero(distance == least[query])
    hit = hit[np.diff(query[hit], prepend=-1) != 0]
    return edge[hit], part[hit], least


def foot(draft: Draft, places: FloatArray, edge: IntArray) -> tuple[FloatArray, FloatArray]:
    """Fraction of an edge nearest to each place, and the distance to it."""
    start = draft.points.take(draft.edges[edge, 0], axis=0)
    return nearest_part(places, start, draft.points.take(draft.edges[edge, 1], axis=0) - start)


def nearest_part(places: FloatArray, start: FloatArray, step: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Fraction of straight steps nearest to places, and the distance to it; arrays of (…, 3)."""
    away = places - start
    square = np.maximum(np.einsum("...i,...i", step, step), np.finfo(float).tiny)
    part = np.clip(np.einsum("...i,...i", away, step) / square, 0.0, 1.0)
    away = away - part[..., None] * step
    return part, np.sqrt(np.einsum("...i,...i", away, away))
