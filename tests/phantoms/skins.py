"""Lumen surfaces for the tests: swept outlines, and the skin of united tubes."""

import numpy as np
from scipy.spatial import cKDTree
from skimage.measure import marching_cubes

Mesh = tuple[np.ndarray, np.ndarray]


def swept(axis: np.ndarray, across: np.ndarray, up: np.ndarray, outline: np.ndarray) -> Mesh:
    """An outline (k, 2), or one per place (n, k, 2), carried along an axis (n, 3) in the frame (across, up)."""
    outlines = np.broadcast_to(outline, (len(axis), *outline.shape[-2:]))
    points = axis[:, None] + outlines[..., :1] * across[:, None] + outlines[..., 1:] * up[:, None]
    n, k = points.shape[:2]
    row, i = np.arange(n - 1)[:, None] * k, np.arange(k)[None]
    j = (i + 1) % k
    corners = np.broadcast_arrays(row + i, row + j, row + k + j, row + k + i)
    halves = [np.stack([corners[c] for c in three], axis=-1).reshape(-1, 3) for three in ((0, 1, 2), (0, 2, 3))]
    return points.reshape(-1, 3), np.concatenate(halves)


def straight(outline: np.ndarray, n: int, length: float = 20.0) -> Mesh:
    """A tube along z."""
    z, zero, one = np.linspace(0, length, n), np.zeros(n), np.ones(n)
    axis, across, up = (np.stack(each, axis=1) for each in ((zero, zero, z), (one, zero, zero), (zero, one, zero)))
    return swept(axis, across, up, outline)


def bent(outline: np.ndarray, n: int, bend: float, angle: float = np.pi) -> Mesh:
    """A tube along a circle of radius `bend` about z; the outline's first axis points outwards."""
    turn = np.linspace(0, angle, n)
    out = np.stack((np.cos(turn), np.sin(turn), 0 * turn), axis=1)
    return swept(bend * out, out, np.tile([0.0, 0, 1], (n, 1)), outline)


def ellipse(n: int, a: float = 1.0, b: float = 1.0) -> np.ndarray:
    """n points on an ellipse."""
    t = np.linspace(0, 2 * np.pi, n, endpoint=False)
    return np.stack((a * np.cos(t), b * np.sin(t)), axis=1)


def rounded_triangle(n: int, side: float, rounding: float) -> np.ndarray:
    """An equilateral triangle grown by a disc; n steps on each of its three arcs."""
    corners = side / np.sqrt(3) * np.exp(2j * np.pi * np.arange(3) / 3)
    arc = np.exp(1j * np.linspace(-np.pi / 3, np.pi / 3, n + 1))
    curve = (corners[:, None] + rounding * np.exp(2j * np.pi * np.arange(3) / 3)[:, None] * arc).ravel()
    return np.stack((curve.real, curve.imag), axis=1)


def united(curves: list[np.ndarray], radii: list[float], step: float, margin: float = 0.5) -> Mesh:
    """The skin of the union of tubes round densely sampled curves."""
    wide = max(radii) + margin
    low = np.min([curve.min(axis=0) for curve in curves], axis=0) - wide
    high = np.max([curve.max(axis=0) for curve in curves], axis=0) + wide
    sides = [np.arange(first, last, step) for first, last in zip(low, high, strict=True)]
    grid = np.stack(np.meshgrid(*sides, indexing="ij"), axis=-1)
    flat = grid.reshape(-1, 3)
    field = np.min([cKDTree(c).query(flat)[0] - r for c, r in zip(curves, radii, strict=True)], axis=0)
    corners, triangles, _, _ = marching_cubes(field.reshape(grid.shape[:3]), 0.0, spacing=(step,) * 3)
    return corners + low, triangles.astype(np.int64)


def joined(*meshes: Mesh) -> Mesh:
    """Several meshes as one, not merged."""
    shift = np.cumsum([0, *(len(points) for points, _ in meshes)])
    triangles = [each + first for (_, each), first in zip(meshes, shift, strict=False)]
    return np.concatenate([points for points, _ in meshes]), np.concatenate(triangles)
