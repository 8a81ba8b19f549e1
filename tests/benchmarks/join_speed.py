"""Time joining on clean inputs of growing size: ``python tests/benchmarks/join_speed.py [points …]``.

Data: binary trees of lines with 20 points each on one trunk (poly-lines with private copies of
their end points, no two of which touch), the same as shuffled and randomly flipped two-point lines with private
copies of both points, and the poly-lines with 3 % T-joints added.
"""

from __future__ import annotations

import sys
import time

import numpy as np

from geomprep.model import Centrelines
from geomprep.repair import join

PER_LINE = 20
LINES = 63


def tree(n_points: int, seed: int = 0) -> tuple[np.ndarray, np.ndarray]:
    """Positions (lines, 20, 3) and radius (lines,): binary trees of 63 lines that hang on one long trunk."""
    rng = np.random.default_rng(seed)
    n_trees = max(1, n_points // PER_LINE // (LINES + 1))
    start = np.zeros((n_trees, LINES, 3))
    ahead, across = np.zeros_like(start), np.zeros_like(start)
    radius = np.full((n_trees, LINES), 4e-3)
    ahead[:, 0, 2], across[:, 0, 0] = 1.0, 1.0
    for line in range(1, LINES):
        parent = (line - 1) // 2
        angle = np.radians(rng.uniform(30, 42, n_trees))[:, None] * (1 if line % 2 else -1)
        radius[:, line] = radius[:, parent] * rng.uniform(0.74, 0.84, n_trees)
        start[:, line] = start[:, parent] + 14 * radius[:, parent, None] * ahead[:, parent]
        ahead[:, line] = np.cos(angle) * ahead[:, parent] + np.sin(angle) * across[:, parent]
        across[:, line] = np.cross(ahead[:, line], across[:, parent])
        across[:, line] /= np.linalg.norm(across[:, line], axis=1)[:, None]
    end = start + 14 * radius[:, :, None] * ahead
    shift = np.arange(n_trees + 1)[:, None] * [0.6, 0, 0]
    start, end = start + shift[:-1, None], end + shift[:-1, None]
    # the end of a parent and the start of a branch are the same numbers
    start[:, 1:] = end[:, (np.arange(1, LINES) - 1) // 2]
    trunk = shift[:-1], shift[1:], np.full(n_trees, 5e-3)
    start, end = np.concatenate((start.reshape(-1, 3), trunk[0])), np.concatenate((end.reshape(-1, 3), trunk[1]))
    along = np.linspace(0, 1, PER_LINE)[None, :, None]
    points = start[:, None] + along * (end - start)[:, None]
    points[:, -1] = end
    return points, np.concatenate((radius.ravel(), trunk[2]))


def as_lines(points: np.ndarray, radius: np.ndarray) -> Centrelines:
    """Poly-lines with private end points."""
    n_lines, per_line, _ = points.shape
    flat = points.reshape(-1, 3)
    return Centrelines(
        points=flat,
        radius=np.repeat(radius, per_line),
        raw_points=flat,
        connectivity=np.arange(len(flat)),
        offsets=np.arange(n_lines + 1) * per_line,
        vessel_class=np.ones(n_lines),
        input_id=np.zeros(n_lines),
        radius_basis=np.zeros(len(flat)),
    )


def as_soup(points: np.ndarray, radius: np.ndarray, seed: int = 1) -> Centrelines:
    """Shuffled two-point lines, each with private copies of both points."""
    rng = np.random.default_rng(seed)
    pairs = np.stack((points[:, :-1], points[:, 1:]), axis=2).reshape(-1, 2, 3)
    size = np.repeat(radius, points.shape[1] - 1)
    order = rng.permutation(len(pairs))
    pairs, size = pairs[order], size[order]
    flip = rng.random(len(pairs)) < 0.5
    pairs[flip] = pairs[flip, ::-1]
    return as_lines(pairs, size)


def with_t_joints(points: np.ndarray, radius: np.ndarray, seed: int = 2) -> Centrelines:
    """The tree with one short line in 33 more that starts between two points of another."""
    rng = np.random.default_rng(seed)
    parent = rng.choice(len(points), len(points) // 33, replace=False)
    place = 0.37 * points[parent, 6] + 0.63 * points[parent, 7]
    out = rng.normal(size=(len(parent), 3))
    out /= np.linalg.norm(out, axis=1)[:, None]
    twig = place[:, None] + np.linspace(0, 4, PER_LINE)[None, :, None] * (radius[parent, None] * out)[:, None]
    return as_lines(np.concatenate((points, twig)), np.concatenate((radius, 0.5 * radius[parent])))


def main() -> None:
    """Print one row per kind and size: best of three, seconds."""
    sizes = [int(float(text)) for text in sys.argv[1:]] or [10_000, 100_000, 1_000_000]
    print("kind      points    edges     s      repairs findings")
    for size in sizes:
        points, radius = tree(size)
        for kind, make in (("lines", as_lines), ("soup", as_soup), ("T-joints", with_t_joints)):
            centrelines = make(points, radius)
            taken = []
            for _ in range(3):
                begin = time.perf_counter()
                result = join(centrelines)
                taken.append(time.perf_counter() - begin)
            print(
                f"{kind:9s} {centrelines.n_points:8d} {result.graph.n_edges:8d} {min(taken):8.3f} "
                f"{len(result.repairs):6d} {len(result.findings):6d}"
            )


if __name__ == "__main__":
    main()
