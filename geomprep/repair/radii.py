"""One radius per point from what the lines state, exceptions kept at the edges."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.findings import Finding, Severity
from geomprep.model import Basis, FloatArray, IntArray, Uint8Array
from geomprep.repair.draft import Draft, degree

__all__ = ["Radii", "settled_radii"]

_STEP = 1.05


@dataclass(frozen=True, eq=False)
class Radii:
    """Radius of each point, and the ends of edges at which a line states another.

    Attributes
    ----------
    radius : (n,) float array
    basis : (n,) uint8 array
    own_edge, own_end : (k,) int array
    own_radius : (k,) float array
    findings : tuple of Finding
    """

    radius: FloatArray
    basis: Uint8Array
    own_edge: IntArray
    own_end: IntArray
    own_radius: FloatArray
    findings: tuple[Finding, ...]


def settled_radii(draft: Draft) -> Radii:
    """Choose the radius of each point among those that its edges state.

    Where all agree, it is that one. At a point of degree 2 it is the geometric mean of
    both; at a junction the one that most edge ends state (the largest of these), and
    the other ends keep their own.

    Parameters
    ----------
    draft : Draft
        Every point has an edge.
    """
    ends, stated = draft.edges.ravel(), draft.end_radius.ravel()
    radius = np.zeros(len(draft.points))
    radius[ends] = stated
    disagree = np.zeros(len(radius), np.bool_)
    disagree[ends[radius[ends] != stated]] = True
    basis = draft.radius_basis.copy()
    none = np.empty(0, np.int64)
    if not disagree.any():
        return Radii(radius, basis, none, none, np.empty(0), ())
    which = np.flatnonzero(disagree[ends])
    order = which[np.lexsort((stated[which], ends[which]))]
    through = degree(draft) == 2
    at_through = order[through[ends[order]]]
    low, high = at_through[0::2], at_through[1::2]
    radius[ends[low]] = np.sqrt(stated[low]) * np.sqrt(stated[high])
    basis[ends[low]] = np.maximum(basis[ends[low]], Basis.INTERPOLATED)
    at_junction = order[~through[ends[order]]]
    point, chosen = _most_stated(ends[at_junction], stated[at_junction])
    radius[point] = chosen
    own = np.sort(at_junction[stated[at_junction] != radius[ends[at_junction]]])
    return Radii(radius, basis, own // 2, own % 2, stated[own], _step_findings(draft, ends, stated, low, high))


def _most_stated(point: IntArray, value: FloatArray) -> tuple[IntArray, FloatArray]:
    """For each point the value stated most often, the largest of these; rows sorted by point and value."""
    if len(point) == 0:
        return point, value
    new = np.ones(len(point), np.bool_)
    new[1:] = (point[1:] != point[:-1]) | (value[1:] != value[:-1])
    starts = np.flatnonzero(new)
    votes = np.diff(np.append(starts, len(point)))
    order = np.lexsort((value[starts], votes, point[starts]))
    last = np.ones(len(order), np.bool_)
    last[:-1] = np.diff(point[starts][order]) != 0
    best = starts[order[last]]
    return point[best], value[best]


def _step_findings(
    draft: Draft, ends: IntArray, stated: FloatArray, low: IntArray, high: IntArray
) -> tuple[Finding, ...]:
    """Say where two lines that continue each other state clearly different radii."""
    ratio = stated[high] / stated[low]
    steps = int(np.count_nonzero(ratio > _STEP))
    if steps == 0:
        return ()
    worst = int(np.argmax(ratio))
    x, y, z = draft.points[ends[low[worst]]].tolist()
    return (
        Finding(
            "radius step",
            Severity.NOTE,
            f"at {steps} points two lines continue each other with radii that differ by more than 5 %, "
            f"by a factor of {ratio[worst]:.3g} at most; the point has their geometric mean",
            position=(x, y, z),
            value=float(ratio[worst]),
            limit=_STEP,
        ),
    )
