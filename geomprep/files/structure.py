"""Checks of what a parser gave back, before anyone uses it."""

from __future__ import annotations

import numpy as np

from geomprep.errors import FileError
from geomprep.files.contents import AnyArray
from geomprep.model import IntArray

__all__ = ["checked_arrays", "checked_lines", "checked_points"]

MOST_POINTS = 1 << 40


def checked_points(name: str, points: AnyArray | None) -> AnyArray:
    """Return coordinates as float32 or float64, or raise where some are missing or not finite."""
    if points is None or len(points) == 0:
        raise FileError(name, "holds no points; centrelines are lines through points")
    if points.ndim != 2 or points.shape[1] != 3:
        raise FileError(name, f"points have shape {points.shape}; (n, 3) is needed")
    if points.dtype not in (np.float32, np.float64):
        points = _as_float(name, points)
    finite = np.isfinite(points).all(axis=1)
    if not finite.all():
        first = int(np.argmin(finite))
        raise FileError(
            name,
            f"{np.count_nonzero(~finite)} points have a coordinate that is not finite, the first is point {first} "
            f"({', '.join(map(str, points[first].tolist()))}); remove them or write the file anew",
        )
    return points


def _as_float(name: str, points: AnyArray) -> AnyArray:
    """Whole-number coordinates as float64, only where no digit is lost."""
    if points.dtype.kind not in "iu" or (points.size and int(np.abs(points.astype(object)).max()) > 2**53):
        raise FileError(name, f"coordinates are of type {points.dtype}; float32 or float64 is needed")
    return points.astype(np.float64)


def checked_lines(name: str, connectivity: AnyArray, offsets: AnyArray, n_points: int) -> tuple[IntArray, IntArray]:
    """Return connectivity and offsets as int64, or raise where they cut no lines out of the points."""
    connectivity, offsets = _whole(name, connectivity), _whole(name, offsets)
    if len(offsets) < 2:
        raise FileError(name, f"holds {n_points} points but no lines; centrelines are poly-lines or two-point lines")
    lengths = np.diff(offsets)
    if offsets[0] != 0 or offsets[-1] != len(connectivity) or (lengths < 0).any():
        raise FileError(
            name,
            f"offsets of the lines must rise from 0 to {len(connectivity)}, they run from {offsets[0]} to {offsets[-1]}"
            f"{' and fall on the way' if (lengths < 0).any() else ''}; the file is damaged, write it anew",
        )
    if (lengths < 2).any():
        first = int(np.argmax(lengths < 2))
        raise FileError(
            name, f"line {first} has {lengths[first]} point(s); a line needs two or more, remove it or draw it whole"
        )
    wrong = (connectivity < 0) | (connectivity >= n_points)
    if wrong.any():
        raise FileError(
            name,
            f"a line names point {connectivity[int(np.argmax(wrong))]}, but there are {n_points} points, "
            "numbered from 0; the file is damaged, write it anew",
        )
    return connectivity, offsets


def _whole(name: str, array: AnyArray) -> IntArray:
    """Whole numbers as int64."""
    if array.dtype.kind not in "iu":
        raise FileError(name, f"point numbers of lines are of type {array.dtype}; whole numbers are needed")
    return array.astype(np.int64, copy=False).reshape(-1)


def checked_arrays(name: str, kind: str, arrays: list[tuple[str, AnyArray]], n_rows: int) -> dict[str, AnyArray]:
    """Return named arrays, or raise where a name comes twice or a length does not fit."""
    found: dict[str, AnyArray] = {}
    for key, array in arrays:
        if len(array) != n_rows:
            raise FileError(
                name, f"{kind} array '{key}' has {len(array)} rows, but there are {n_rows}; the file is damaged"
            )
        if key in found:
            raise FileError(name, f"two {kind} arrays are named '{key}'; rename one of them")
        found[key] = array
    return found
