"""Insert points into edges."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from geomprep.model import Basis, FloatArray, IntArray
from geomprep.repair.draft import Draft

__all__ = ["with_new_points", "with_split_edges"]


def with_new_points(draft: Draft, points: FloatArray, edge: IntArray) -> Draft:
    """Append points that lie on the given edges; they belong to no raw point yet.

    Parameters
    ----------
    draft : Draft
    points : (k, 3) float array
    edge : (k,) int array
        Edge whose class and input each point takes.
    """
    near = draft.edges[edge, 0]
    return replace(
        draft,
        points=np.concatenate((draft.points, points)),
        vessel_class=np.concatenate((draft.vessel_class, draft.edge_class[edge])),
        input_id=np.concatenate((draft.input_id, draft.input_id[near])),
        radius_basis=np.concatenate((draft.radius_basis, np.full(len(edge), Basis.INTERPOLATED, np.uint8))),
        end_state=np.concatenate((draft.end_state, np.zeros(len(edge), np.uint8))),
        source_point=np.concatenate((draft.source_point, np.full(len(edge), -1, np.int64))),
    )


def with_split_edges(draft: Draft, edge: IntArray, part: FloatArray, point: IntArray) -> Draft:
    """Split edges at points that lie on them.

    The radius there is linear between the ends of the edge, as stations are read, so that no
    profile integral changes.

    Parameters
    ----------
    draft : Draft
    edge : (k,) int array
        Edge to split; may be named several times.
    part : (k,) float array
        Fraction of the edge.
    point : (k,) int array
        Point that stands there.
    """
    order = np.lexsort((part, edge))
    edge, part, point = edge[order], part[order], point[order]
    pieces = np.ones(len(draft.edges), np.int64)
    np.add.at(pieces, edge, 1)
    of = np.repeat(np.arange(len(pieces)), pieces)
    first_piece = np.cumsum(pieces) - pieces
    number = np.arange(len(edge)) - np.searchsorted(edge, edge)  # count of splits before it on the same edge
    before = first_piece[edge] + number  # the piece that ends at this split
    edges, radius = draft.edges[of], draft.end_radius[of]
    there = draft.end_radius[edge, 0] + part * (draft.end_radius[edge, 1] - draft.end_radius[edge, 0])
    edges[before, 1] = edges[before + 1, 0] = point
    radius[before, 1] = radius[before + 1, 0] = there
    return replace(draft, edges=edges, end_radius=radius, edge_class=draft.edge_class[of])
