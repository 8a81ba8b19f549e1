"""Parts of the graph that hang together with nothing else."""

from __future__ import annotations

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from geomprep.curves import piece_integrals
from geomprep.findings import Finding, Severity
from geomprep.model import VESSEL_CLASSES, FloatArray, IntArray
from geomprep.repair.draft import Draft, lengths

__all__ = ["components", "isolated_parts"]

_LISTED = 100


def components(n_points: int, edges: IntArray) -> tuple[int, IntArray]:
    """Number of connected components and the component of each point."""
    matrix = coo_array((np.ones(len(edges), np.int8), (edges[:, 0], edges[:, 1])), shape=(n_points, n_points))
    count, label = connected_components(matrix, directed=False)
    return int(count), label.astype(np.int64)


def isolated_parts(draft: Draft, radius: FloatArray) -> tuple[Finding, ...]:
    """Report every component but the longest of each vessel class.

    Parameters
    ----------
    draft : Draft
    radius : (n,) float array

    Returns
    -------
    tuple of Finding
        Longest first; beyond 100 the rest is summed up in one.
    """
    count, label = components(len(draft.points), draft.edges)
    if count < 2:
        return ()
    part = label[draft.edges[:, 0]]
    step = lengths(draft)
    length = np.bincount(part, step, minlength=count).astype(np.float64)
    size = piece_integrals(step, radius[draft.edges[:, 0]], radius[draft.edges[:, 1]])[:, 0]
    volume = np.bincount(part, size, minlength=count).astype(np.float64)
    code = np.zeros(count, np.uint8)
    np.maximum.at(code, part, draft.edge_class)
    order = np.lexsort((np.arange(count), -length, code))
    main = np.ones(count, np.bool_)
    main[1:] = np.diff(code[order].astype(np.int64)) != 0
    rest = order[~main]
    rest = rest[np.argsort(-length[rest], kind="stable")]
    place = np.empty(count, np.int64)
    place[part[::-1]] = draft.edges[::-1, 0]
    found = [
        _part_finding(draft.points[place[number]], float(length[number]), float(volume[number]), int(code[number]))
        for number in rest[:_LISTED].tolist()
    ]
    return (*found, *_rest_finding(length[rest[_LISTED:]], volume[rest[_LISTED:]]))


def _part_finding(place: FloatArray, length: float, volume: float, code: int) -> Finding:
    """One part that is not connected with the largest of its class."""
    x, y, z = place.tolist()
    of = "" if code == 0 else f" of {VESSEL_CLASSES[code]} lines"
    return Finding(
        "isolated part",
        Severity.WARNING,
        f"a part{of} is not connected with the largest one: "
        f"length {1e3 * length:.4g} mm, volume {1e9 * volume:.4g} mm³",
        position=(x, y, z),
        value=length,
        unit="m",
    )


def _rest_finding(length: FloatArray, volume: FloatArray) -> tuple[Finding, ...]:
    """All smaller parts in one sentence."""
    if len(length) == 0:
        return ()
    return (
        Finding(
            "isolated part",
            Severity.WARNING,
            f"{len(length)} smaller parts more: length {1e3 * length.sum():.4g} mm, "
            f"volume {1e9 * volume.sum():.4g} mm³ together",
            value=float(length.sum()),
            unit="m",
        ),
    )
