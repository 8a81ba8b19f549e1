"""From lines to a graph whose points at identical coordinates are one."""

from __future__ import annotations

import numpy as np

from geomprep.findings import Finding, Severity
from geomprep.model import Centrelines, FloatArray, IntArray, PointGraph, Uint8Array
from geomprep.repair.classes import told_apart, uses
from geomprep.repair.coincident import same_place
from geomprep.repair.draft import Draft

__all__ = ["started"]


def started(centrelines: Centrelines) -> tuple[Draft, tuple[Finding, ...]]:
    """Make the draft graph of all lines; points at identical coordinates are one point.

    Arteries and veins at identical coordinates stay two points, even where a file
    gives them the same point number.

    Parameters
    ----------
    centrelines : Centrelines
        Accepted by :func:`geomprep.repair.accept.refuse_unusable`.

    Returns
    -------
    Draft
        With every edge of the lines, zero-length ones and doubled ones too.
    findings : tuple of Finding
        How many points an artery and a vein share.
    """
    edges, line = _edges(centrelines)
    edge_class = centrelines.vessel_class[line]
    used = uses(centrelines, edges, edge_class)
    label, first = same_place(centrelines.points[used.raw])
    n_places = len(first)
    label, group_class = told_apart(used.vessel_class, label)
    keep = used.raw[_first_members(label, first)]
    merged_into = np.full(centrelines.n_points, PointGraph.UNUSED, np.int64)
    merged_into[used.raw[::-1]] = label[::-1]
    input_of = np.zeros(centrelines.n_points, np.uint8)
    input_of[edges] = centrelines.input_id[line][:, None]
    draft = Draft(
        points=centrelines.points.take(keep, axis=0),
        vessel_class=group_class,
        input_id=input_of[keep],
        radius_basis=_worst_basis(centrelines, used.raw, label, keep),
        source_point=keep,
        end_state=np.zeros(len(keep), np.uint8),
        edges=label.take(used.edges),
        end_radius=_stated_radius(centrelines, edges, line),
        edge_class=edge_class,
        merged_into=merged_into,
        raw_points=centrelines.raw_points,
    )
    return draft, _shared_finding(draft, n_places)


def _edges(centrelines: Centrelines) -> tuple[IntArray, IntArray]:
    """Raw points at both ends of every edge, and the line of each."""
    inner = np.ones(len(centrelines.connectivity), np.bool_)
    inner[centrelines.offsets[1:] - 1] = False
    start = np.flatnonzero(inner)
    edges = np.stack((centrelines.connectivity[start], centrelines.connectivity[start + 1]), axis=1)
    return edges, np.repeat(np.arange(centrelines.n_lines), np.diff(centrelines.offsets) - 1)


def _first_members(label: IntArray, first: IntArray) -> IntArray:
    """One member of each group, also of those told apart."""
    count = int(label.max(initial=-1)) + 1
    if count == len(first):
        return first
    member = np.empty(count, np.int64)
    member[label[::-1]] = np.arange(len(label) - 1, -1, -1)
    return member


def _stated_radius(centrelines: Centrelines, edges: IntArray, line: IntArray) -> FloatArray:
    """Radius that each line states at both ends of each of its edges."""
    stated = centrelines.radius[edges]
    if centrelines.line_radius is None:
        return stated
    of_line = centrelines.line_radius[line][:, None]
    return np.where(np.isnan(of_line), stated, of_line)


def _worst_basis(centrelines: Centrelines, raw: IntArray, label: IntArray, keep: IntArray) -> Uint8Array:
    """Basis of each group: the least direct of its members."""
    basis = centrelines.radius_basis[keep]
    if (centrelines.radius_basis[raw] != basis[0]).any():
        np.maximum.at(basis, label, centrelines.radius_basis[raw])
    return basis


def _shared_finding(draft: Draft, n_places: int) -> tuple[Finding, ...]:
    """Say where arteries and veins use one place."""
    shared = len(draft.points) - n_places
    if shared == 0:
        return ()
    x, y, z = draft.points[n_places].tolist()
    return (
        Finding(
            "classes kept apart",
            Severity.WARNING,
            f"at {shared} places a line of arteries and a line of veins have the same point; they are not joined",
            position=(x, y, z),
            value=float(shared),
        ),
    )
