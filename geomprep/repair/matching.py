"""The best set of bridges: every open end in one at most, the highest total score."""

from __future__ import annotations

import numpy as np

from geomprep.model import FloatArray, IntArray
from geomprep.repair.open_ends import Links
from geomprep.repair.parts import components

__all__ = ["best_matching"]


def best_matching(links: Links, weight: FloatArray) -> IntArray:
    """Return the rows of the links in the matching of the largest total weight.

    Parameters
    ----------
    links : Links
        To other ends, or to sides (`other` −1), which any number of ends may meet.
    weight : (q,) float array
        Above zero.

    Returns
    -------
    (m,) int array
        Rows in rising order.

    Notes
    -----
    Maximum-weight matching of general graphs (Edmonds' blossom method, by networkx), for each set of ends that
    have candidates in common; a side counts as a partner of its own for each end.
    """
    count = len(weight)
    if count == 0:
        return np.empty(0, np.int64)
    n_tips = int(max(links.tip.max(), links.other.max())) + 1
    partner = np.where(links.other >= 0, links.other, n_tips + np.arange(count))
    pairs = np.stack((links.tip, partner), axis=1)
    _, label = components(n_tips + count, pairs)
    group = label[links.tip]
    order = np.argsort(group, kind="stable")
    taken = [_matched(pairs, weight, rows) for rows in np.split(order, np.flatnonzero(np.diff(group[order])) + 1)]
    return np.sort(np.concatenate(taken))


def _matched(pairs: IntArray, weight: FloatArray, rows: IntArray) -> IntArray:
    """The matching within one set."""
    if len(rows) == 1:
        return rows
    import networkx as nx

    graph = nx.Graph()
    for row in rows.tolist():
        a, b = pairs[row].tolist()
        graph.add_edge(a, b, weight=float(weight[row]), row=row)
    found = nx.max_weight_matching(graph)
    return np.array(sorted(graph.edges[pair]["row"] for pair in found), np.int64)
