"""What a phantom is: segments as densely sampled smooth curves with a radius, and the nodes between them."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

__all__ = ["ARTERY", "VEIN", "Truth", "arc", "piece_resistance"]

ARTERY, VEIN = 1, 2
MM = 1e-3


@dataclass(frozen=True, eq=False)
class Truth:
    """A phantom before anything goes wrong with it, in metres.

    Attributes
    ----------
    kind : str
    seed : int
    points : (n, 3) array
        All segments one after another, each with both its ends, every 0.1 mm or closer.
    radius : (n,) array
        Of the segment itself; a daughter has its own radius at the node it starts from.
    offsets : (s + 1,) array
        Segment i owns rows ``offsets[i]:offsets[i + 1]``.
    segments : (s, 2) array
        Node at the start and at the end, drawn away from the root of its part.
    nodes : (k, 3) array
    names : tuple of str
        What each segment is, such as ``trunk``, ``daughter``, ``twig`` or ``fenestration``.
    vessel_class : (s,) array
        1 artery, 2 vein.
    roots : tuple of int
        One open end of each connected part, from which resistances are taken.
    """

    kind: str
    seed: int
    points: np.ndarray
    radius: np.ndarray
    offsets: np.ndarray
    segments: np.ndarray
    nodes: np.ndarray
    names: tuple[str, ...]
    vessel_class: np.ndarray
    roots: tuple[int, ...]

    @property
    def n_segments(self) -> int:
        return len(self.segments)

    def rows(self, segment: int) -> slice:
        """Rows of one segment."""
        return slice(int(self.offsets[segment]), int(self.offsets[segment + 1]))

    @property
    def degree(self) -> np.ndarray:
        """(k,) number of segment ends at each node."""
        return np.bincount(self.segments.ravel(), minlength=len(self.nodes))

    @property
    def junctions(self) -> np.ndarray:
        """Nodes where three or more segments meet."""
        return np.flatnonzero(self.degree >= 3)

    @property
    def open_ends(self) -> np.ndarray:
        """Nodes of one segment, roots among them."""
        return np.flatnonzero(self.degree == 1)

    @property
    def part(self) -> np.ndarray:
        """(k,) number of the connected part of each node."""
        part = np.arange(len(self.nodes))
        for _ in range(len(self.nodes)):
            least = part.copy()
            np.minimum.at(least, self.segments[:, 0], part[self.segments[:, 1]])
            np.minimum.at(least, self.segments[:, 1], part[self.segments[:, 0]])
            if np.array_equal(least, part):
                break
            part = least
        return np.unique(part, return_inverse=True)[1]

    @property
    def loops(self) -> int:
        """Independent loops: segments − nodes + parts."""
        return len(self.segments) - len(self.nodes) + int(self.part.max()) + 1

    @property
    def lengths(self) -> np.ndarray:
        """(s,) length of each segment."""
        return np.array([arc(self.points[self.rows(i)])[-1] for i in range(self.n_segments)])

    @property
    def resistance(self) -> np.ndarray:
        """(s,) Poiseuille resistance of each segment at a viscosity of 1 Pa·s."""
        return np.array(
            [
                piece_resistance(self.points[self.rows(i)], self.radius[self.rows(i)]).sum()
                for i in range(self.n_segments)
            ]
        )

    @property
    def node_radius(self) -> np.ndarray:
        """(k,) largest radius of the segments at each node."""
        largest = np.zeros(len(self.nodes))
        np.maximum.at(largest, self.segments[:, 0], self.radius[self.offsets[:-1]])
        np.maximum.at(largest, self.segments[:, 1], self.radius[self.offsets[1:] - 1])
        return largest

    def with_radius(self, radius: np.ndarray) -> Truth:
        """Return the same curves with another radius."""
        return replace(self, radius=np.asarray(radius, dtype=float))


def arc(points: np.ndarray) -> np.ndarray:
    """(n,) distance along a poly-line from its first point."""
    return np.concatenate(([0.0], np.cumsum(np.linalg.norm(np.diff(points, axis=0), axis=1))))


def piece_resistance(points: np.ndarray, radius: np.ndarray) -> np.ndarray:
    """(n − 1,) resistance of each piece at a viscosity of 1 Pa·s, exact for a cone.

    ∫ 8 ds / (π r⁴) = 8 L (a² + a b + b²) / (3 π a³ b³) for a radius linear from a to b.
    """
    a, b = radius[:-1], radius[1:]
    length = np.linalg.norm(np.diff(points, axis=0), axis=1)
    return 8 * length * (a * a + a * b + b * b) / (3 * np.pi * (a * b) ** 3)
