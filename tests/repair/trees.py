"""Known trees and the tracks that a path-by-path extraction makes of them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np


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

    def input_resistance(self, conductance_at_ends: float = 0.0) -> float:
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


def exact_tracks(tree: Tree, per_branch: int = 15) -> tuple[list[np.ndarray], list[np.ndarray]]:
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


def sampled_tracks(tree: Tree, jitter: float, seed: int, spacing: float = 0.8) -> tuple[list[np.ndarray], list[np.ndarray]]:
    """One track per outlet, each with samples of its own, moved by up to `jitter` radii in any direction."""
    rng = np.random.default_rng(seed)
    lines, radii = [], []
    for leaf in tree.leaves:
        way = tree.path(leaf)
        corners = np.concatenate(([0.0], np.cumsum(tree.length[way])))
        steps = rng.uniform(0.7, 1.3, 4000) * spacing
        at, size = [0.0], []
        for step in steps:
            branch = way[min(int(np.searchsorted(corners, at[-1], "right")) - 1, len(way) - 1)]
            size.append(tree.radius[branch])
            if at[-1] >= corners[-1]:
                break
            at.append(min(at[-1] + step * tree.radius[branch], corners[-1]))
        place = np.stack([np.interp(at, corners, [tree.start[0][k], *tree.end[way][:, k]]) for k in range(3)], axis=1)
        shift = rng.normal(size=place.shape)
        shift *= (rng.random(len(at)) ** (1 / 3) / np.linalg.norm(shift, axis=1))[:, None]  # uniform in a ball
        lines.append(place + jitter * np.array(size)[:, None] * shift)
        radii.append(np.array(size))
    return lines, radii
