"""Open ends of a file by exactly equal coordinates: a first look, before anything is joined."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from geomprep.files import FileContents
from geomprep.model import FloatArray, IntArray

__all__ = ["OpenEnds", "find_open_ends"]


@dataclass(frozen=True, eq=False)
class OpenEnds:
    """How the lines of a file hang together where coordinates are exactly equal.

    Attributes
    ----------
    points : (e,) int array
        A point of the file at every place where one line ends and no other goes on.
    n_parts : int
        Parts that share no place.
    n_loops : int
        Independent loops.
    smallest_part : int
        Places in the smallest part.
    n_zero_steps : int
        Steps of lines without length.
    total_length : float
        Length of all lines in the unit of the file.
    """

    points: IntArray
    n_parts: int
    n_loops: int
    smallest_part: int
    n_zero_steps: int
    total_length: float


def find_open_ends(contents: FileContents) -> OpenEnds:
    """Return open ends, parts and loops of the lines of a file.

    Points of exactly equal coordinates count as one place; steps drawn twice count once.

    Parameters
    ----------
    contents : FileContents

    Returns
    -------
    OpenEnds
    """
    points = np.asarray(contents.points)
    first, second = _steps(contents)
    lengths: FloatArray = np.linalg.norm(points[second].astype(float) - points[first], axis=1)
    place, representative = _places(points)
    low, high = np.minimum(place[first], place[second]), np.maximum(place[first], place[second])
    once = np.sort((low * len(points) + high)[low != high])
    once = once[np.diff(once, prepend=-1) > 0]
    pairs = np.stack((once // len(points), once % len(points)), axis=1)
    degree = np.bincount(pairs.ravel(), minlength=len(representative))
    used = np.flatnonzero(np.bincount(place[contents.connectivity], minlength=len(representative)))
    parts, label = connected_components(
        coo_array((np.ones(len(pairs)), (pairs[:, 0], pairs[:, 1])), shape=(len(degree),) * 2), directed=False
    )
    sizes = np.bincount(label[used], minlength=parts)
    n_parts = int((sizes > 0).sum())
    return OpenEnds(
        points=representative[np.flatnonzero(degree == 1)].astype(np.int64),
        n_parts=n_parts,
        n_loops=len(pairs) - len(used) + n_parts,
        smallest_part=int(sizes[sizes > 0].min()),
        n_zero_steps=int((lengths == 0).sum()),
        total_length=float(lengths.sum()),
    )


def _places(points: npt.NDArray[Any]) -> tuple[IntArray, IntArray]:
    """Number of the place of every point, and the first point at every place."""
    order = np.lexsort((points[:, 2], points[:, 1], points[:, 0]))
    ordered = points[order]
    fresh = np.ones(len(points), dtype=bool)
    fresh[1:] = (ordered[1:] != ordered[:-1]).any(axis=1)
    place = np.empty(len(points), dtype=np.int64)
    place[order] = np.cumsum(fresh) - 1
    return place, order[fresh].astype(np.int64)


def _steps(contents: FileContents) -> tuple[IntArray, IntArray]:
    """Both points of every step along the lines."""
    inside = np.ones(len(contents.connectivity) - 1, dtype=bool)
    inside[contents.offsets[1:-1] - 1] = False
    return contents.connectivity[:-1][inside], contents.connectivity[1:][inside]
