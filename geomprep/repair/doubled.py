"""Edges of no length, and edges drawn more than once."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from geomprep.findings import Finding, Severity
from geomprep.model import FloatArray, IntArray
from geomprep.repair.draft import Draft, without_edges

__all__ = ["single_edges"]


def single_edges(draft: Draft, radii_agree_within: float) -> tuple[Draft, tuple[Finding, ...]]:
    """Leave out edges of no length and draw every edge once.

    Edges between the same two points are one edge, whichever lines they come from. Where
    the copies state different radii, those within `radii_agree_within` of the largest are
    averaged in ln r; smaller ones belong to a side branch that was drawn over its parent.

    Parameters
    ----------
    draft : Draft
    radii_agree_within : float
        Part of the largest radius.

    Returns
    -------
    Draft
    findings : tuple of Finding
        Numbers of edges left out.
    """
    no_length = draft.edges[:, 0] == draft.edges[:, 1]
    findings = _no_length_finding(draft, no_length)
    draft = without_edges(draft, no_length)
    low = np.minimum(draft.edges[:, 0], draft.edges[:, 1])
    high = np.maximum(draft.edges[:, 0], draft.edges[:, 1])
    key = low * np.int64(len(draft.points)) + high
    ordered = np.sort(key)
    if not (ordered[1:] == ordered[:-1]).any():
        return draft, findings
    return _once(draft, key, radii_agree_within, findings)


def _once(
    draft: Draft, key: IntArray, agree: float, findings: tuple[Finding, ...]
) -> tuple[Draft, tuple[Finding, ...]]:
    """Keep the first of the edges that share a key, with the radius they agree on."""
    order = np.argsort(key, kind="stable")
    starts = np.flatnonzero(np.diff(key[order], prepend=-1))
    copies = np.diff(np.append(starts, len(order)))
    kept = order[starts]
    turned = draft.edges[:, 0] > draft.edges[:, 1]
    radius = np.where(turned[:, None], draft.end_radius[:, ::-1], draft.end_radius)
    agreed = np.stack([_agreed(radius[order, end], starts, copies, agree) for end in (0, 1)], axis=1)
    end_radius = draft.end_radius.copy()
    end_radius[kept] = np.where(turned[kept, None], agreed[:, ::-1], agreed)
    dropped = np.ones(len(key), np.bool_)
    dropped[kept] = False
    new = without_edges(replace(draft, end_radius=end_radius), dropped)
    return new, (*findings, _doubled_finding(draft, kept[copies > 1], copies[copies > 1]))


def _agreed(radius: FloatArray, starts: IntArray, copies: IntArray, agree: float) -> FloatArray:
    """Radius of each group of copies: geometric mean of those close to the largest."""
    largest = np.maximum.reduceat(radius, starts)
    smallest = np.minimum.reduceat(radius, starts)
    close = radius >= (1.0 - agree) * np.repeat(largest, copies)
    total = np.add.reduceat(np.where(close, np.log(radius), 0.0), starts)
    mean = np.exp(total / np.add.reduceat(close.astype(np.int64), starts))
    agreed: FloatArray = np.where(smallest == largest, largest, mean)  # equal radii stay as they are, to the bit
    return agreed


def _no_length_finding(draft: Draft, no_length: np.ndarray) -> tuple[Finding, ...]:
    """Say how many repeats of a point were left out."""
    count = int(np.count_nonzero(no_length))
    if count == 0:
        return ()
    x, y, z = draft.points[draft.edges[no_length][0, 0]].tolist()
    return (
        Finding(
            "repeated points",
            Severity.NOTE,
            f"{count} steps between points at one place have no length and were left out",
            position=(x, y, z),
            value=float(count),
        ),
    )


def _doubled_finding(draft: Draft, doubled: IntArray, copies: IntArray) -> Finding:
    """Say how many edges were drawn more than once."""
    x, y, z = draft.points[draft.edges[doubled[0], 0]].tolist()
    return Finding(
        "doubled edges",
        Severity.NOTE,
        f"{len(doubled)} edges are drawn more than once, up to {copies.max()} times ({copies.sum()} drawings in all); "
        "each counts once",
        position=(x, y, z),
        value=float(len(doubled)),
    )
