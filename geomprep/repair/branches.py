"""Branches of a point graph: chains with their lengths, ends and the directions in which they leave."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geomprep.curves import arc_length, interpolate, line_sums, piece_integrals, pieces
from geomprep.model import BoolArray, Chains, FloatArray, IntArray, PointGraph, chains, degrees

__all__ = ["Branches", "conductance", "ranges"]

_SAMPLES = 9


@dataclass(frozen=True, eq=False)
class Branches:
    """Chains of a graph between its junctions and open ends.

    Attributes
    ----------
    graph : PointGraph
    cut : Chains
    degree : (n,) int array
        Edge ends at each point.
    along : (k,) float array
        Distance from the start of its chain at each row.
    chain : (k,) int array
        Chain of each row.
    length : (c,) float array
    ends : (c, 2) int array
        Points at the start and the end of each chain.
    """

    graph: PointGraph
    cut: Chains
    degree: IntArray
    along: FloatArray
    chain: IntArray
    length: FloatArray
    ends: IntArray

    @classmethod
    def of(cls, graph: PointGraph) -> Branches:
        """Cut a graph and measure its chains."""
        cut = chains(graph.n_points, graph.edges)
        along = arc_length(graph.points.take(cut.point, axis=0), cut.offsets)
        first, last = cut.offsets[:-1], cut.offsets[1:] - 1
        chain = np.repeat(np.arange(cut.n_chains), np.diff(cut.offsets))
        ends = np.stack((cut.point[first], cut.point[last]), axis=1)
        return cls(graph, cut, degrees(graph.n_points, graph.edges), along, chain, along[last], ends)

    def at(self, chain: IntArray, side: IntArray, distance: FloatArray, values: FloatArray) -> FloatArray:
        """Values of points at distances from an end of chains.

        Parameters
        ----------
        chain, side : (q,) int array
            Side 0 counts from the start, 1 from the end.
        distance : (q,) float array
        values : (n,) or (n, d) float array
            One per graph point.
        """
        there = np.where(side == 0, distance, self.length[chain] - distance)
        return interpolate(self.along, values[self.cut.point], self.cut.offsets, chain, there)

    def way_out(self, chain: IntArray, side: IntArray, span: FloatArray) -> FloatArray:
        """Unit vectors in which chains leave through an end, fitted over a span, (q, 3).

        The slope of a straight line fitted to places at even distances, so that one jagged step turns it little.
        """
        reach = np.minimum(span, self.length[chain])
        part = np.linspace(0.0, 1.0, _SAMPLES)
        every = np.repeat(np.arange(len(chain)), _SAMPLES)
        distance = (reach[:, None] * part).ravel()
        place = self.at(chain[every], side[every], distance, self.graph.points).reshape(len(chain), _SAMPLES, 3)
        slope = np.einsum("s,qsd->qd", 0.5 - part, place)
        way: FloatArray = slope / np.maximum(np.linalg.norm(slope, axis=1), np.finfo(float).tiny)[:, None]
        return way

    def rows(self, chain: IntArray) -> tuple[IntArray, IntArray]:
        """All rows of some chains, and which of the chains given each belongs to."""
        return ranges(self.cut.offsets[chain], self.cut.offsets[chain + 1])

    def chain_edges(self, chain: IntArray) -> tuple[IntArray, IntArray]:
        """All edges of some chains, and which of the chains given each belongs to."""
        offsets = self.cut.edge_offsets
        row, owner = ranges(offsets[chain], offsets[chain + 1])
        return self.cut.edge[row], owner

    def protected(self, chain: IntArray) -> BoolArray:
        """Whether a point of each chain is protected, junctions left out: they belong to others, too."""
        row, owner = self.rows(chain)
        point = self.cut.point[row]
        held = self.graph.protected[point] & (self.degree[point] < 3)
        return np.bincount(owner[held], minlength=len(chain)) > 0

    def chain_conductance(self, chain: IntArray) -> FloatArray:
        """Conductance of chains from end to end at a viscosity of 1 Pa·s, m³/(Pa·s)."""
        row, _ = self.rows(chain)
        counts = np.diff(self.cut.offsets)[chain]
        offsets = np.concatenate(([0], np.cumsum(counts)))
        point = self.cut.point[row]
        return conductance(self.graph.points[point], self.graph.radius[point], offsets)


def ranges(start: IntArray, stop: IntArray) -> tuple[IntArray, IntArray]:
    """All whole numbers of several ranges, one after another, and the range of each.

    Examples
    --------
    >>> ranges(np.array([3, 10]), np.array([5, 11]))
    (array([ 3,  4, 10]), array([0, 0, 1]))
    """
    counts = stop - start
    owner = np.repeat(np.arange(len(counts)), counts)
    before = np.cumsum(counts) - counts
    return np.arange(len(owner)) - before[owner] + start[owner], owner


def conductance(points: FloatArray, radius: FloatArray, offsets: IntArray) -> FloatArray:
    """Return π / (8 ∫ ds/r⁴) of each line: Poiseuille at a viscosity of 1 Pa·s, m³/(Pa·s).

    Examples
    --------
    >>> conductance(np.array([[0.0, 0, 0], [1, 0, 0]]), np.array([1.0, 1.0]), np.array([0, 2])) * 8 / np.pi
    array([1.])
    """
    piece = pieces(offsets)
    step = np.linalg.norm(points[piece.first + 1] - points[piece.first], axis=1)
    shares = piece_integrals(step, radius[piece.first], radius[piece.first + 1])[:, 3]
    total = line_sums(shares, piece.starts)
    found: FloatArray = np.pi / (8.0 * np.maximum(total, np.finfo(float).tiny))
    return found
