"""Which lines may join: arteries with arteries, veins with veins, unknown ones with any."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.findings import Finding, Severity
from geomprep.model import VESSEL_CLASSES, BoolArray, Centrelines, FloatArray, IntArray, Uint8Array

__all__ = ["ARTERY", "UNKNOWN", "VEIN", "Uses", "class_findings", "may_join", "told_apart", "uses"]

UNKNOWN, ARTERY, VEIN = (VESSEL_CLASSES.index(name) for name in ("unknown", "artery", "vein"))


def may_join(one: Uint8Array, other: Uint8Array) -> BoolArray:
    """Whether things of two classes may join.

    Examples
    --------
    >>> may_join(np.array([1, 1, 0]), np.array([1, 2, 2]))
    array([ True, False,  True])
    """
    allowed: BoolArray = (one == other) | (one == UNKNOWN) | (other == UNKNOWN)
    return allowed


@dataclass(frozen=True, eq=False)
class Uses:
    """Points as the lines of each class use them.

    A point number that both arteries and veins use counts twice, so that they stay apart.

    Attributes
    ----------
    raw : (u,) int array
        Raw point of each use.
    vessel_class : (u,) uint8 array
    edges : (e, 2) int array
        Uses at both ends of each edge.
    """

    raw: IntArray
    vessel_class: Uint8Array
    edges: IntArray


def uses(centrelines: Centrelines, edges: IntArray, edge_class: Uint8Array) -> Uses:
    """List the used points once per class that must not mix.

    Parameters
    ----------
    centrelines : Centrelines
    edges : (e, 2) int array
        Raw points at both ends of each edge of the lines.
    edge_class : (e,) uint8 array
    """
    if len(edge_class) and (edge_class == edge_class[0]).all():
        return _of_one_class(centrelines, edges, edge_class[0])
    by = np.zeros((len(VESSEL_CLASSES), centrelines.n_points), np.bool_)
    for code in np.unique(edge_class):
        by[code, edges[edge_class == code]] = True
    code_of = np.where(by[VEIN], VEIN, np.where(by[ARTERY], ARTERY, UNKNOWN)).astype(np.uint8)
    through_unknown = by[ARTERY] & by[VEIN] & by[UNKNOWN]
    code_of[through_unknown] = UNKNOWN
    both = by[ARTERY] & by[VEIN] & ~by[UNKNOWN]
    code_of[both] = ARTERY
    first = np.flatnonzero(by.any(axis=0))
    second = np.flatnonzero(both)
    number = np.full((2, centrelines.n_points), -1, np.int64)
    number[:, first] = np.arange(len(first))
    number[1, second] = len(first) + np.arange(len(second))
    raw = np.concatenate((first, second))
    code = np.concatenate((code_of[first], np.full(len(second), VEIN, np.uint8)))
    row = (edge_class == VEIN).astype(np.int64)[:, None]
    return Uses(raw, code, number[row, edges] if len(second) else number[0][edges])


def _of_one_class(centrelines: Centrelines, edges: IntArray, code: np.uint8) -> Uses:
    """The used points where all lines are of one class."""
    used = np.zeros(centrelines.n_points, np.bool_)
    used[edges] = True
    raw = np.flatnonzero(used)
    number = np.cumsum(used) - 1
    return Uses(raw, np.full(len(raw), code, np.uint8), number.take(edges))


def told_apart(code: Uint8Array, label: IntArray) -> tuple[IntArray, Uint8Array]:
    """Split groups in which arteries and veins meet without an unknown line.

    Parameters
    ----------
    code : (u,) uint8 array
        Class of each member.
    label : (u,) int array
        Group of each member, 0 … g − 1.

    Returns
    -------
    label : (u,) int array
        With the veins of such groups in new groups at the end.
    group_class : (h,) uint8 array
        Class of each group: known ones before unknown, unknown where both meet through one.

    Examples
    --------
    >>> told_apart(np.array([1, 2, 0], np.uint8), np.array([0, 0, 1]))
    (array([0, 2, 1]), array([1, 0, 2], dtype=uint8))
    """
    count = int(label.max(initial=-1)) + 1
    if len(code) == 0 or (code == code[0]).all():
        return label, np.full(count, code[0] if len(code) else UNKNOWN, np.uint8)
    has = np.zeros((len(VESSEL_CLASSES), count), np.bool_)
    has[code, label] = True
    group_class = np.where(has[VEIN], VEIN, np.where(has[ARTERY], ARTERY, UNKNOWN)).astype(np.uint8)
    meet = has[ARTERY] & has[VEIN]
    group_class[meet & has[UNKNOWN]] = UNKNOWN
    split = np.flatnonzero(meet & ~has[UNKNOWN])
    group_class[split] = ARTERY
    moved = np.flatnonzero(np.isin(label, split) & (code == VEIN)) if len(split) else split
    label = label.copy()
    label[moved] = count + np.searchsorted(split, label[moved])
    return label, np.concatenate((group_class, np.full(len(split), VEIN, np.uint8)))


def class_findings(
    line_class: Uint8Array, edge_class: Uint8Array, edges: IntArray, points: FloatArray
) -> tuple[Finding, ...]:
    """Say how many lines have no class, and where they join lines that have one.

    Parameters
    ----------
    line_class : (m,) uint8 array
    edge_class : (e,) uint8 array
    edges : (e, 2) int array
        Points of the joined graph at both ends of each edge.
    points : (n, 3) float array
    """
    unknown = int(np.count_nonzero(line_class == UNKNOWN))
    if unknown == 0:
        return ()
    found = [
        Finding(
            "unknown class",
            Severity.NOTE,
            f"{unknown} of {len(line_class)} lines have no vessel class: they may join arteries, veins and one another",
            value=float(unknown),
        )
    ]
    has = np.zeros((len(VESSEL_CLASSES), len(points)), np.bool_)
    for code in np.unique(edge_class):
        has[code, edges[edge_class == code]] = True
    known = has[ARTERY] | has[VEIN]
    for kind, severity, met, words in (
        ("unknown class joined", Severity.NOTE, has[UNKNOWN] & known, "a line without class joins an artery or a vein"),
        (
            "classes joined",
            Severity.WARNING,
            has[UNKNOWN] & has[ARTERY] & has[VEIN],
            "an artery and a vein meet through a line without class",
        ),
    ):
        where = np.flatnonzero(met)
        if len(where):
            x, y, z = points[where[0]].tolist()
            found.append(
                Finding(kind, severity, f"at {len(where)} places {words}", position=(x, y, z), value=float(len(where)))
            )
    return tuple(found)
