"""A phantom while it grows: nodes and curves in millimetres, and whether tubes run into one another."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from phantoms.truth import ARTERY, MM, Truth, arc

__all__ = ["STEP", "Draft", "Row", "bent", "even", "turned", "unit"]

STEP = 0.1
"""Distance between the points of a true curve in mm."""
_NEAR = 8.0  # largest radii along the network within which neighbours may touch: the branching zone


@dataclass(frozen=True, eq=False)
class Row:
    """One segment: its nodes, curve, radius, name and class."""

    start: int
    end: int
    points: np.ndarray
    radius: np.ndarray
    name: str
    vessel_class: int


@dataclass
class Draft:
    """Nodes and segments in millimetres, added to while a phantom is drawn."""

    nodes: list[np.ndarray] = field(default_factory=list)
    rows: list[Row] = field(default_factory=list)

    def node(self, place: np.ndarray) -> int:
        """Add a node and return its number."""
        self.nodes.append(np.asarray(place, dtype=float))
        return len(self.nodes) - 1

    def add(self, ends: tuple[int, int], points: np.ndarray, radius: np.ndarray, name: str, kind: int = ARTERY) -> int:
        """Add a segment between two nodes and return its number."""
        points = np.array(points, dtype=float)
        points[0], points[-1] = self.nodes[ends[0]], self.nodes[ends[1]]
        self.rows.append(Row(*ends, points, np.broadcast_to(np.asarray(radius, float), len(points)).copy(), name, kind))
        return len(self.rows) - 1

    def collisions(self, first: int = 0, gap: float = 0.8) -> int:
        """Count pairs of places whose tubes come closer than `gap` outside branching zones.

        Only pairs with a segment from number `first` on are looked at.
        """
        sample = _samples(self.rows)
        new = sample.row >= first
        if not new.any():
            return 0
        apart = np.linalg.norm(sample.points[new][:, None] - sample.points[None], axis=2)
        tubes = sample.radius[new][:, None] + sample.radius[None]
        close = np.argwhere(apart < tubes + gap)
        left, right = np.flatnonzero(new)[close[:, 0]], close[:, 1]
        way = _way(self, sample, left, right)
        largest = np.maximum(sample.radius[left], sample.radius[right])
        return int(np.count_nonzero(way > _NEAR * largest + 2 * max(gap, 0.0)))

    def truth(self, kind: str, seed: int, roots: tuple[int, ...]) -> Truth:
        """Freeze it, in metres."""
        counts = [len(row.points) for row in self.rows]
        return Truth(
            kind=kind,
            seed=seed,
            points=MM * np.concatenate([row.points for row in self.rows]),
            radius=MM * np.concatenate([row.radius for row in self.rows]),
            offsets=np.concatenate(([0], np.cumsum(counts))),
            segments=np.array([(row.start, row.end) for row in self.rows]),
            nodes=MM * np.array(self.nodes),
            names=tuple(row.name for row in self.rows),
            vessel_class=np.array([row.vessel_class for row in self.rows], np.uint8),
            roots=roots,
        )


@dataclass(frozen=True)
class _Samples:
    """Coarse samples of all rows, for looking at distances."""

    points: np.ndarray
    radius: np.ndarray
    row: np.ndarray
    at: np.ndarray
    length: np.ndarray


def _samples(rows: list[Row]) -> _Samples:
    """About two samples per radius."""
    points, radius, number, at, length = [], [], [], [], []
    for index, row in enumerate(rows):
        along = arc(row.points)
        count = max(3, int(2 * along[-1] / row.radius.mean()) + 1)
        take = np.unique(np.linspace(0, len(along) - 1, min(count, len(along))).round().astype(int))
        points.append(row.points[take])
        radius.append(row.radius[take])
        number.append(np.full(len(take), index))
        at.append(along[take])
        length.append(along[-1])
    return _Samples(*(np.concatenate(part) for part in (points, radius, number, at)), np.array(length))


def _way(draft: Draft, sample: _Samples, left: np.ndarray, right: np.ndarray) -> np.ndarray:
    """Shortest way along the network between pairs of samples."""
    between = node_distances(len(draft.nodes), [(row.start, row.end) for row in draft.rows], sample.length)
    ends = np.array([(row.start, row.end) for row in draft.rows])
    i, j = sample.row[left], sample.row[right]
    from_start, to_start = (sample.at[left], sample.length[i] - sample.at[left]), None
    to_start = (sample.at[right], sample.length[j] - sample.at[right])
    way = np.where(i == j, np.abs(sample.at[left] - sample.at[right]), np.inf)
    for a in (0, 1):
        for b in (0, 1):
            way = np.minimum(way, from_start[a] + between[ends[i, a], ends[j, b]] + to_start[b])
    return way


def node_distances(n_nodes: int, ends: list[tuple[int, int]] | np.ndarray, length: np.ndarray) -> np.ndarray:
    """(k, k) shortest way along the network between nodes, inf between parts."""
    from scipy.sparse.csgraph import shortest_path

    matrix = np.full((n_nodes, n_nodes), np.inf)
    for (a, b), value in zip(ends, length, strict=True):
        matrix[a, b] = matrix[b, a] = min(matrix[a, b], value)
    np.fill_diagonal(matrix, 0.0)
    return shortest_path(matrix, directed=False)


def unit(vector: np.ndarray) -> np.ndarray:
    """Vectors of length one."""
    vector = np.asarray(vector, dtype=float)
    return vector / np.linalg.norm(vector, axis=-1, keepdims=True)


def turned(direction: np.ndarray, angle: float, azimuth: float) -> np.ndarray:
    """A direction at an angle to another, on the side given by the azimuth about it."""
    direction = unit(direction)
    side = unit(np.cross(direction, np.eye(3)[np.argmin(np.abs(direction))]))
    up = np.cross(direction, side)
    return np.cos(angle) * direction + np.sin(angle) * (np.cos(azimuth) * side + np.sin(azimuth) * up)


def even(points: np.ndarray, step: float = STEP) -> np.ndarray:
    """Points of a finely sampled curve at even distances along it, by a cubic spline."""
    from scipy.interpolate import CubicSpline

    along = arc(points)
    count = max(4, round(along[-1] / step))
    return CubicSpline(along, points)(np.linspace(0.0, along[-1], count + 1))


def bent(start: np.ndarray, along: np.ndarray, leaving: np.ndarray, length: float) -> np.ndarray:
    """A smooth curve of about a length that starts along one direction and ends along another."""
    end = start + length * unit(unit(along) + unit(leaving))
    a, b = start + along * length / 3, end - leaving * length / 3
    t = np.linspace(0.0, 1.0, 60)[:, None]
    return even((1 - t) ** 3 * start + 3 * t * (1 - t) ** 2 * a + 3 * t**2 * (1 - t) * b + t**3 * end)
