"""Hold a graph or a network against the truth: junctions, open ends, loops, resistances."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from geomprep.model import Centrelines, Network, PointGraph
from phantoms.truth import Truth, piece_resistance

__all__ = [
    "Comparison",
    "Match",
    "Shape",
    "comparable",
    "compare",
    "matched",
    "outlet_resistances",
    "resistance_errors",
    "shape_of",
]


@dataclass(frozen=True, eq=False)
class Shape:
    """A graph as plain arrays, whatever it came from; metres.

    Attributes
    ----------
    points : (n, 3) array
    radius : (n,) array
        Largest radius at each point.
    edges : (e, 2) array
    resistance : (e,) array
        At a viscosity of 1 Pa·s.
    """

    points: np.ndarray
    radius: np.ndarray
    edges: np.ndarray
    resistance: np.ndarray

    @property
    def degree(self) -> np.ndarray:
        """(n,) number of edges at each point."""
        return np.bincount(self.edges.ravel(), minlength=len(self.points))

    @property
    def parts(self) -> np.ndarray:
        """(n,) number of the connected part of each point."""
        from scipy.sparse import coo_array
        from scipy.sparse.csgraph import connected_components

        n = len(self.points)
        matrix = coo_array((np.ones(len(self.edges)), self.edges.T), shape=(n, n))
        return connected_components(matrix, directed=False)[1]

    @property
    def loops(self) -> int:
        """Independent loops: edges − points + parts."""
        return len(self.edges) - len(self.points) + int(self.parts.max()) + 1

    @property
    def length(self) -> float:
        """Length of all edges."""
        return float(np.linalg.norm(self.points[self.edges[:, 0]] - self.points[self.edges[:, 1]], axis=1).sum())

    @property
    def open_ends(self) -> np.ndarray:
        """(k, 3) places of points of one edge."""
        return self.points[self.degree == 1]

    def junctions(self, within: float = 1.0) -> np.ndarray:
        """(k, 3) places where three or more branches leave, near ones taken as one.

        Parameters
        ----------
        within : float
            Junctions joined by a way shorter than this many local radii are one: the chain between
            lies in the branching zone. What is one that way and has only two branches is none.
        """
        return self._clusters(within)[0]

    def _clusters(self, within: float) -> tuple[np.ndarray, np.ndarray]:
        """Places of clusters of junctions, and the number of branches that leave each."""
        import networkx as nx

        whole = nx.Graph()
        for (a, b), length in zip(self.edges.tolist(), self._lengths(), strict=True):
            if not whole.has_edge(a, b) or whole.edges[a, b]["length"] > length:
                whole.add_edge(a, b, length=length)
        near = nx.Graph()
        branch = [int(point) for point in np.flatnonzero(self.degree >= 3)]
        near.add_nodes_from(branch)
        known = set(branch)
        for point in branch:
            reach = nx.single_source_dijkstra_path_length(
                whole, point, cutoff=within * float(self.radius[point]), weight="length"
            )
            near.add_edges_from((point, other) for other in reach if other in known and other != point)
        places, branches = [], []
        for group in nx.connected_components(near):
            count = _branches(whole, group, self.degree)
            if count >= 3:
                members = sorted(group)
                places.append(self.points[members].mean(axis=0))
                branches.append(count)
        return np.array(places).reshape(-1, 3), np.array(branches, int)

    def _lengths(self) -> list[float]:
        """Length of each edge."""
        ends = self.points[self.edges]
        return np.linalg.norm(ends[:, 0] - ends[:, 1], axis=1).tolist()


def _branches(whole: Any, group: set[int], degree: np.ndarray) -> int:
    """Number of ways that leave a cluster and do not end in it again within itself."""
    import networkx as nx

    if len(group) == 1:
        return int(degree[next(iter(group))])
    inside = set(group)
    for a in group:  # chains between members belong to the cluster
        for b in whole[a]:
            run, last = [], a
            while b not in group and degree[b] == 2:
                run.append(b)
                last, b = b, next(iter(set(whole[b]) - {last}))  # noqa: PLW2901
            if b in group and len(run) < _LONGEST_CHAIN:
                inside.update(run)
    return nx.cut_size(whole, inside) if len(inside) < len(whole) else 0


_LONGEST_CHAIN = 8  # points; a longer way from a cluster back to itself is a loop of its own


def shape_of(thing: Truth | PointGraph | Network | Centrelines) -> Shape:
    """Return the plain arrays of a truth, a graph, a network or raw lines (points at one place are one)."""
    if isinstance(thing, Truth):
        rows = [thing.rows(i) for i in range(thing.n_segments)]
        return _from_lines([thing.points[row] for row in rows], [thing.radius[row] for row in rows])
    if isinstance(thing, PointGraph):
        return _from_graph(thing)
    if isinstance(thing, Network):
        cuts = thing.stations.offsets[1:-1]
        return _from_lines(np.split(thing.stations.position, cuts), np.split(thing.stations.radius, cuts))
    numbers = np.split(thing.connectivity, thing.offsets[1:-1])
    return _from_lines([thing.points[n] for n in numbers], [thing.radius[n] for n in numbers])


def _from_lines(points: list[np.ndarray], radius: list[np.ndarray]) -> Shape:
    """Lines that meet where points have the same coordinates."""
    places, number = np.unique(np.concatenate(points), axis=0, return_inverse=True)
    number = number.ravel()
    largest = np.zeros(len(places))
    np.fmax.at(largest, number, np.concatenate(radius))
    edges, resistance, start = [], [], 0
    for line, sizes in zip(points, radius, strict=True):
        own = number[start : start + len(line)]
        edges.append(np.column_stack((own[:-1], own[1:])))
        resistance.append(piece_resistance(line, sizes))
        start += len(line)
    return Shape(places, largest, np.concatenate(edges), np.concatenate(resistance))


def _from_graph(graph: PointGraph) -> Shape:
    """A point graph; ends with a radius of their own use it."""
    sizes = graph.radius[graph.edges].copy()
    sizes[graph.own_radius_edge, graph.own_radius_end] = graph.own_radius
    ends = graph.points[graph.edges]
    a, b = sizes.T
    length = np.linalg.norm(ends[:, 1] - ends[:, 0], axis=1)
    resistance = 8 * length * (a * a + a * b + b * b) / (3 * np.pi * (a * b) ** 3)
    used = np.bincount(graph.edges.ravel(), minlength=graph.n_points) > 0
    number = np.cumsum(used) - 1
    return Shape(graph.points[used], graph.radius[used], number[graph.edges], resistance)


@dataclass(frozen=True, eq=False)
class Match:
    """One-to-one matching of true and found places.

    Attributes
    ----------
    pairs : (m, 2) int array
        True and found numbers of each pair.
    missed : int array
        True places without a found one.
    false : int array
        Found places without a true one.
    """

    pairs: np.ndarray
    missed: np.ndarray
    false: np.ndarray

    @property
    def exact(self) -> bool:
        """Whether every place has its partner."""
        return len(self.missed) == len(self.false) == 0


def matched(true: np.ndarray, found: np.ndarray, within: np.ndarray | float) -> Match:
    """Match places one to one at the least sum of distances, none farther than allowed.

    Parameters
    ----------
    true : (n, 3) array
    found : (m, 3) array
    within : (n,) array or float
        Largest distance allowed to each true place.
    """
    from scipy.optimize import linear_sum_assignment

    true, found = np.reshape(true, (-1, 3)), np.reshape(found, (-1, 3))
    limit = np.broadcast_to(within, len(true))[:, None]
    apart = np.linalg.norm(true[:, None] - found[None], axis=2)
    allowed = apart <= limit
    cost = np.where(allowed, apart / np.maximum(limit, 1e-12), 1e3)
    rows, columns = linear_sum_assignment(cost)
    good = allowed[rows, columns]
    pairs = np.column_stack((rows[good], columns[good]))
    missed, false = np.setdiff1d(np.arange(len(true)), pairs[:, 0]), np.setdiff1d(np.arange(len(found)), pairs[:, 1])
    return Match(pairs, missed, false)


@dataclass(frozen=True, eq=False)
class Comparison:
    """What of the truth was found.

    Attributes
    ----------
    junctions, open_ends : Match
    true_loops, found_loops : int
    true_parts, found_parts : int
    """

    junctions: Match
    open_ends: Match
    true_loops: int
    found_loops: int
    true_parts: int
    found_parts: int

    @property
    def exact(self) -> bool:
        """Whether junctions, open ends, loops and parts are all right."""
        counts = self.true_loops == self.found_loops and self.true_parts == self.found_parts
        return self.junctions.exact and self.open_ends.exact and counts

    def __str__(self) -> str:
        """One line with all counts."""
        return (
            ", ".join(
                f"{name} {len(match.pairs)} right {len(match.missed)} missed {len(match.false)} false"
                for name, match in (("junctions", self.junctions), ("open ends", self.open_ends))
            )
            + f", loops {self.found_loops}/{self.true_loops}, parts {self.found_parts}/{self.true_parts}"
        )


def compare(truth: Truth, thing: Any, within: float = 2.0, slack: float = 0.0) -> Comparison:
    """Hold a graph, a network or raw lines against the truth.

    Parameters
    ----------
    truth : Truth
    thing : PointGraph, Network, Centrelines or Shape
    within : float
        Places match within this many radii of the truth at that node …
    slack : float
        … and so many metres more (a voxel or two).
    """
    shape = thing if isinstance(thing, Shape) else shape_of(thing)
    limit = within * truth.node_radius + slack
    junctions, ends = _true_junctions(truth), truth.open_ends
    return Comparison(
        junctions=matched(truth.nodes[junctions], shape.junctions(), limit[junctions]),
        open_ends=matched(truth.nodes[ends], shape.open_ends, limit[ends]),
        true_loops=truth.loops,
        found_loops=shape.loops,
        true_parts=int(truth.part.max()) + 1,
        found_parts=int(shape.parts.max()) + 1,
    )


def comparable(truth: Truth) -> bool:
    """Whether no two junctions of a truth lie within a radius of one another."""
    return not _within_zones(truth).any()


def _within_zones(truth: Truth) -> np.ndarray:
    """(s,) segments between two junctions that are shorter than a radius."""
    short = truth.lengths < truth.node_radius[truth.segments].max(axis=1)
    return short & (truth.degree[truth.segments] >= 3).all(axis=1)


def _true_junctions(truth: Truth) -> np.ndarray:
    """Junctions of the truth; none lie within a radius of one another."""
    both = _within_zones(truth)
    if both.any():
        raise ValueError(f"segments {np.flatnonzero(both).tolist()} lie within the branching zone: no truth to match")
    return truth.junctions


def outlet_resistances(thing: Any, roots: np.ndarray, outlets: np.ndarray) -> np.ndarray:
    """(k,) resistance between pairs of places on a graph, all other ends closed; inf where not joined.

    Parameters
    ----------
    thing : Truth, PointGraph, Network, Centrelines or Shape
    roots, outlets : (k, 3) arrays
        Places; the nearest open end stands for each.

    Notes
    -----
    The pseudo-inverse of the dense Laplacian of the junctions and ends after chains are taken
    as single resistors; nothing of the package is used.
    """
    shape = thing if isinstance(thing, Shape) else shape_of(thing)
    ends = np.flatnonzero(shape.degree == 1)
    nearest = [
        ends[np.linalg.norm(shape.points[ends][None] - np.reshape(places, (-1, 3))[:, None], axis=2).argmin(axis=1)]
        for places in (roots, outlets)
    ]
    nodes, tail, head, resistance = _contracted(shape)
    number = {int(point): i for i, point in enumerate(nodes)}
    laplacian = np.zeros((len(nodes), len(nodes)))
    scale = np.median(resistance)
    for a, b, value in zip(tail, head, resistance / scale, strict=True):
        laplacian[[a, b], [a, b]] += 1 / value if a != b else 0
        laplacian[[a, b], [b, a]] -= 1 / value if a != b else 0
    return np.array([_between(shape, laplacian, number, int(a), int(b)) for a, b in zip(*nearest, strict=True)]) * scale


def _between(shape: Shape, laplacian: np.ndarray, number: dict[int, int], a: int, b: int) -> float:
    """Head difference for unit flow from a to b, with b and all other parts at rest."""
    if shape.parts[a] != shape.parts[b]:
        return float("inf")
    nodes = np.array(list(number))
    keep = np.flatnonzero((shape.parts[nodes] == shape.parts[a]) & (nodes != b))
    flow = (nodes[keep] == a).astype(float)
    return float(np.linalg.solve(laplacian[np.ix_(keep, keep)], flow)[np.argmax(flow)]) if a != b else 0.0


def _contracted(shape: Shape) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Nodes (points whose degree is not 2, one per closed ring), chains between them and their resistances."""
    degree = shape.degree
    around: list[list[tuple[int, int]]] = [[] for _ in degree]
    for edge, (a, b) in enumerate(shape.edges.tolist()):
        around[a].append((b, edge))
        around[b].append((a, edge))
    nodes = np.flatnonzero((degree != 2) & (degree > 0))
    number = {int(point): i for i, point in enumerate(nodes)}
    done = np.zeros(len(shape.edges), np.bool_)
    tail, head, resistance = [], [], []
    for start in nodes.tolist():
        for point, edge in around[start]:
            if done[edge]:
                continue
            total, here, via = shape.resistance[edge], point, edge
            done[edge] = True
            while here not in number:
                here, via = next((p, e) for p, e in around[here] if e != via)
                done[via] = True
                total += shape.resistance[via]
            tail.append(number[start])
            head.append(number[here])
            resistance.append(total)
    return nodes, np.array(tail, int), np.array(head, int), np.array(resistance)


def resistance_errors(truth: Truth, thing: Any) -> np.ndarray:
    """(k,) relative error of the resistance from each root to each other open end of its part; inf where cut off."""
    ends = [int(end) for end in truth.open_ends if end not in truth.roots]
    roots = [next(root for root in truth.roots if truth.part[root] == truth.part[end]) for end in ends]
    pairs = truth.nodes[roots], truth.nodes[ends]
    return outlet_resistances(thing, *pairs) / outlet_resistances(truth, *pairs) - 1
