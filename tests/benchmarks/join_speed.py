"""Time joining on clean inputs of growing size: ``python tests/benchmarks/join_speed.py [points …]``.

Data: random binary trees of segments with 20 points each (poly-lines with private copies of
their end points), the same as shuffled and randomly flipped two-point lines with private
copies of both points, and the poly-lines with 3 % T-joints added.
"""

from __future__ import annotations

import sys
import time

import numpy as np

from geomprep.model import Centrelines
from geomprep.repair import join

PER_LINE = 20


def tree(n_points: int, seed: int = 0) -> tuple[np.ndarray, np.ndarray]:
    """Positions (lines, 20, 3) and radius (lines,) of a random binary tree."""
    rng = np.random.default_rng(seed)
    n_lines = max(1, n_points // PER_LINE)
    start = np.zeros((n_lines, 3))
    direction = np.zeros((n_lines, 3))
    direction[0, 2] = 1.0
    radius = np.full(n_lines, 5e-3)
    level, first = 0, 0
    while first < n_lines:
        last = min(2 * first + 1, n_lines)
        if level:
            parent = (np.arange(first, last) - 1) // 2
            radius[first:last] = radius[parent] * rng.uniform(0.72, 0.86, last - first)
            start[first:last] = start[parent] + direction[parent] * 12 * radius[parent, None]
            turn = rng.normal(size=(last - first, 3))
            turned = direction[parent] + 0.8 * turn / np.linalg.norm(turn, axis=1)[:, None]
            direction[first:last] = turned / np.linalg.norm(turned, axis=1)[:, None]
        first, level = last, level + 1
    along = np.linspace(0, 1, PER_LINE)[None, :, None]
    end = start + direction * 12 * radius[:, None]
    points = start[:, None] + along * (end - start)[:, None]
    points[:, -1] = end
    return points, radius


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
    place = 0.37 * points[parent, 9] + 0.63 * points[parent, 10]
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
