"""Large random vessel nets for benchmarks: trees with loops, rings and joints, as lines in files.

Not anatomy: lengths, radii and angles are drawn at random; what matters is the shape of the data.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.spatial import cKDTree


@dataclass(frozen=True)
class Lines:
    """Points, radius and lines in millimetres, as a file would hold them."""

    points: np.ndarray
    radius: np.ndarray
    connectivity: np.ndarray
    offsets: np.ndarray


def tree(n_points: int, per_line: int = 20, seed: int = 1) -> Lines:
    """Binary tree whose lines each hold a copy of their end points, with 3 % extra lines that close loops.

    Radii fall by 0.79 per fork (Murray's law for equal daughters), a line is 14 radii long and its points lie 0.7 radii
    apart: the proportions of vessels drawn from an image, in which tubes seldom touch.
    """
    random = np.random.default_rng(seed)
    n_lines = max(1, n_points // per_line)
    n_extra = int(0.03 * n_lines)
    n_tree = n_lines - n_extra
    parent = (np.arange(n_tree) - 1) // 2
    depth = np.floor(np.log2(np.arange(n_tree) + 1)).astype(int)
    size = 2.5 * 0.79**depth
    heading = random.normal(size=(n_tree, 3))
    heading /= np.linalg.norm(heading, axis=1, keepdims=True)
    end = np.zeros((n_tree, 3))
    for level in range(depth.max() + 1):
        rows = np.flatnonzero(depth == level)
        if level:
            aside = np.cross(heading[parent[rows]], heading[rows - (rows + 1) % 2])  # sisters leave to opposite sides
            aside *= np.where(rows % 2, 1.0, -1.0)[:, None] / np.linalg.norm(aside, axis=1, keepdims=True)
            heading[rows] = heading[parent[rows]] + aside
            heading[rows] /= np.linalg.norm(heading[rows], axis=1, keepdims=True)
        start = end[np.maximum(parent[rows], 0)] if level else np.zeros((len(rows), 3))
        end[rows] = start + heading[rows] * 14.0 * size[rows, None]
    start = np.where((parent >= 0)[:, None], end[np.maximum(parent, 0)], 0.0)
    a = random.integers(1, n_tree, n_extra)
    b = cKDTree(end).query(end[a], k=min(6, n_tree))[1][:, -1] if n_extra else a
    start, end = np.concatenate((start, end[a])), np.concatenate((end, end[b]))
    size = np.concatenate((size, 0.8 * np.minimum(size[a], size[b])))
    keep = np.linalg.norm(end - start, axis=1) > 1e-3
    return _lines(start[keep], end[keep], size[keep], per_line, random)


def _lines(start: np.ndarray, end: np.ndarray, size: np.ndarray, per_line: int, random: np.random.Generator) -> Lines:
    """Bent lines from start to end."""
    n = len(start)
    t = np.linspace(0, 1, per_line)
    chord = end - start
    side = np.cross(chord, random.normal(size=(n, 3)))
    side *= (0.1 * np.linalg.norm(chord, axis=1) / np.maximum(np.linalg.norm(side, axis=1), 1e-9))[:, None]
    bend = np.sin(np.pi * t)
    points = start[:, None] + chord[:, None] * t[:, None] + side[:, None] * bend[:, None]
    points[:, 0], points[:, -1] = start, end
    radius = np.repeat(size, per_line) * (1 + 0.02 * random.normal(size=n * per_line)).clip(0.9, 1.1)
    # ends of lines that meet share a radius, as a joined file would have it
    return Lines(
        points.reshape(-1, 3).astype(np.float32),
        radius,
        np.arange(n * per_line),
        np.arange(0, n * per_line + 1, per_line),
    )


def soup(net: Lines, seed: int = 2) -> Lines:
    """The same net as two-point lines in random order and direction, every end with a copy of its own."""
    random = np.random.default_rng(seed)
    inner = np.ones(len(net.connectivity), bool)
    inner[net.offsets[1:] - 1] = False
    first = np.flatnonzero(inner)
    pairs = np.stack((net.connectivity[first], net.connectivity[first + 1]), axis=1)
    pairs = pairs[random.permutation(len(pairs))]
    flip = random.random(len(pairs)) < 0.5
    pairs[flip] = pairs[flip][:, ::-1]
    flat = pairs.ravel()
    return Lines(net.points[flat], net.radius[flat], np.arange(len(flat)), np.arange(0, len(flat) + 1, 2))


def with_rings_and_joints(net: Lines, per_line: int = 20, seed: int = 3) -> Lines:
    """Add closed rings apart from the net, and lines that start on another line's interior."""
    random = np.random.default_rng(seed)
    n = max(1, len(net.offsets) // 100)
    centre = np.array([0.0, 0, 600.0]) + 5.0 * np.stack((np.arange(n), np.zeros(n), np.zeros(n)), axis=1)
    angle = np.linspace(0, 2 * np.pi, per_line)
    ring = centre[:, None] + np.stack((np.cos(angle), np.sin(angle), 0 * angle), axis=1)
    ring[:, -1] = ring[:, 0]
    host = random.choice(len(net.offsets) - 1, n, replace=False)
    low = net.offsets[host] + per_line // 2
    foot = 0.5 * (net.points[low].astype(float) + net.points[low + 1])
    side = random.normal(size=(n, 3))
    side *= 8.0 / np.linalg.norm(side, axis=1, keepdims=True)
    branch = foot[:, None] + side[:, None] * np.linspace(0, 1, per_line)[:, None]
    extra = np.concatenate((ring, branch)).reshape(-1, 3)
    radius = np.concatenate((np.full(n * per_line, 0.3), np.repeat(0.5 * net.radius[low], per_line)))
    shift = len(net.points)
    return Lines(
        np.concatenate((net.points, extra.astype(np.float32))),
        np.concatenate((net.radius, radius)),
        np.concatenate((net.connectivity, shift + np.arange(len(extra)))),
        np.concatenate((net.offsets, net.offsets[-1] + per_line * np.arange(1, 2 * n + 1))),
    )
