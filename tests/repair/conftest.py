"""Lines made by hand, known trees and the tracks that a path-by-path extraction makes of them."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from types import SimpleNamespace
from typing import Any

import networkx as nx
import numpy as np
import pytest
import scipy.sparse
import scipy.sparse.linalg

from geomprep.model import Centrelines, PointGraph

Maker = Callable[..., Centrelines]


def make_lines(
    lines: Sequence[Any], radius: Any = 1.0, classes: Sequence[int] | None = None, **more: Any
) -> Centrelines:
    """Poly-lines with private copies of all points; radius per line or per point of each line."""
    places = [np.asarray(line, float).reshape(-1, 3) for line in lines]
    sizes = [radius] * len(places) if np.isscalar(radius) else list(radius)
    flat = np.concatenate(places)
    values = np.concatenate(
        [np.broadcast_to(np.asarray(size, float), len(place)) for size, place in zip(sizes, places, strict=True)]
    )
    counts = [len(place) for place in places]
    return Centrelines(
        points=flat,
        radius=values,
        raw_points=flat,
        connectivity=np.arange(len(flat)),
        offsets=np.concatenate(([0], np.cumsum(counts))),
        vessel_class=classes if classes is not None else np.ones(len(places)),
        input_id=np.zeros(len(places)),
        radius_basis=np.zeros(len(flat)),
        **more,
    )


def as_multigraph(graph: PointGraph) -> nx.MultiGraph:
    """The point graph as networkx sees it."""
    whole = nx.MultiGraph()
    whole.add_nodes_from(range(graph.n_points))
    whole.add_edges_from(graph.edges.tolist())
    return whole


@dataclass(frozen=True, eq=False)
class Tree:
    """A binary tree of straight branches of constant radius, in metres.

    ``parent[i]`` is the branch that branch i continues, −1 for the trunk.
    """

    start: np.ndarray
    end: np.ndarray
    radius: np.ndarray
    parent: np.ndarray

    @property
    def length(self) -> np.ndarray:
        return np.linalg.norm(self.end - self.start, axis=1)

    @property
    def leaves(self) -> list[int]:
        return sorted(set(range(len(self.parent))) - set(self.parent.tolist()))

    def path(self, leaf: int) -> list[int]:
        """Branches from the trunk to a leaf."""
        way = [leaf]
        while self.parent[way[-1]] >= 0:
            way.append(int(self.parent[way[-1]]))
        return way[::-1]

    def input_resistance(self) -> float:
        """Poiseuille resistance from the inlet to all outlets held at one pressure, viscosity 1 Pa·s.

        Hagen and Poiseuille: R = 8 µ L / (π r⁴); series add, parallel conductances add.
        """
        own = 8.0 * self.length / (np.pi * self.radius**4)

        def below(branch: int) -> float:
            children = np.flatnonzero(self.parent == branch)
            return float(own[branch]) + (1.0 / sum(1.0 / below(child) for child in children) if len(children) else 0.0)

        return below(0)


def binary_tree(levels: int, seed: int, length: float = 14.0) -> Tree:
    """Random binary tree; branches are 14 radii long and part at about 35° to either side."""
    rng = np.random.default_rng(seed)
    start, end, radius, parent = [np.zeros(3)], [np.array([0, 0, length * 4e-3])], [4e-3], [-1]
    across = [np.array([1.0, 0, 0])]
    front = [0]
    for _ in range(levels):
        following = []
        for branch in front:
            ahead = (end[branch] - start[branch]) / np.linalg.norm(end[branch] - start[branch])
            side = across[branch]
            for sign in (-1.0, 1.0):
                angle = np.radians(rng.uniform(30, 42)) * sign
                direction = np.cos(angle) * ahead + np.sin(angle) * side
                size = radius[branch] * rng.uniform(0.74, 0.84)
                following.append(len(start))
                start.append(end[branch])
                end.append(end[branch] + length * size * direction)
                radius.append(size)
                parent.append(branch)
                normal = np.cross(direction, side)
                across.append(normal / np.linalg.norm(normal))
        front = following
    return Tree(np.array(start), np.array(end), np.array(radius), np.array(parent))


Tracks = tuple[list[np.ndarray], list[np.ndarray]]


def exact_tracks(tree: Tree, per_branch: int = 15) -> Tracks:
    """One track per outlet through the same points; the parent's radius holds up to its end."""
    lines, radii = [], []
    for leaf in tree.leaves:
        points, sizes = [tree.start[0]], [tree.radius[0]]
        for branch in tree.path(leaf):
            along = np.linspace(0, 1, per_branch)[1:, None]
            points += list(tree.start[branch] + along * (tree.end[branch] - tree.start[branch]))
            sizes += [tree.radius[branch]] * (per_branch - 1)
        lines.append(np.array(points))
        radii.append(np.array(sizes))
    return lines, radii


def sampled_tracks(tree: Tree, jitter: float, seed: int, spacing: float = 0.8, times: int = 1) -> Tracks:
    """Tracks to every outlet, each with samples of its own, moved by up to `jitter` radii in any direction."""
    rng = np.random.default_rng(seed)
    lines, radii = [], []
    for leaf in tree.leaves * times:
        way = np.array(tree.path(leaf))
        corners = np.concatenate(([0.0], np.cumsum(tree.length[way])))
        at, branches = [0.0], [way[0]]
        while at[-1] < corners[-1]:
            at.append(min(at[-1] + spacing * rng.uniform(0.7, 1.3) * tree.radius[branches[-1]], corners[-1]))
            branches.append(way[min(int(np.searchsorted(corners, at[-1], "right")) - 1, len(way) - 1)])
        corner = np.concatenate((tree.start[:1], tree.end[way]))
        place = np.stack([np.interp(at, corners, corner[:, axis]) for axis in range(3)], axis=1)
        shift = rng.normal(size=place.shape)
        shift *= (rng.random(len(at)) ** (1 / 3) / np.linalg.norm(shift, axis=1))[:, None]  # uniform in a ball
        size = tree.radius[branches]
        lines.append(place + jitter * size[:, None] * shift)
        radii.append(size)
    return lines, radii


def input_resistance(graph: PointGraph) -> float:
    """Resistance from the open end next to the origin to all other open ends, by a linear solve.

    Each edge is a cone frustum of linear radius: R = 8 µ L (a² + ab + b²) / (3 π a³ b³), from
    integrating 8 µ / (π r⁴) along it; viscosity 1 Pa·s.
    """
    length = np.linalg.norm(graph.points[graph.edges[:, 0]] - graph.points[graph.edges[:, 1]], axis=1)
    ends = graph.radius[graph.edges]
    ends[graph.own_radius_edge, graph.own_radius_end] = graph.own_radius
    a, b = ends.T
    conductance = np.pi * 3 * a**3 * b**3 / (8 * length * (a * a + a * b + b * b))
    start, end = graph.edges.T
    rows, columns = np.concatenate((start, end, start, end)), np.concatenate((start, end, end, start))
    values = np.concatenate((conductance, conductance, -conductance, -conductance))
    matrix = scipy.sparse.coo_array((values, (rows, columns)), shape=(graph.n_points,) * 2).tocsr()
    tips = np.flatnonzero(np.bincount(graph.edges.ravel()) == 1)
    inlet = tips[np.argmin(np.linalg.norm(graph.points[tips], axis=1))]
    free = np.setdiff1d(np.arange(graph.n_points), tips[tips != inlet])
    pressure = scipy.sparse.linalg.spsolve(matrix[free][:, free].tocsc(), (free == inlet).astype(float))
    return float(pressure[np.searchsorted(free, inlet)])


@pytest.fixture
def lines() -> Maker:
    """Make centrelines from lists of places."""
    return make_lines


@pytest.fixture
def multigraph() -> Callable[[PointGraph], nx.MultiGraph]:
    """Turn a point graph into a networkx multigraph."""
    return as_multigraph


@pytest.fixture
def trees() -> SimpleNamespace:
    """Known trees, their tracks and the resistance of a graph."""
    return SimpleNamespace(
        Tree=Tree,
        binary=binary_tree,
        exact_tracks=exact_tracks,
        sampled_tracks=sampled_tracks,
        input_resistance=input_resistance,
    )
