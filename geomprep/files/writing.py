"""Write lines with result arrays: the one entry for every format that can be written."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import numpy as np
import numpy.typing as npt

from geomprep.errors import InputError
from geomprep.files.formats import FORMATS
from geomprep.files.structure import checked_lines

__all__ = ["write_lines"]


def write_lines(
    path: str | Path,
    points: npt.ArrayLike,
    connectivity: npt.ArrayLike,
    offsets: npt.ArrayLike,
    point_arrays: Mapping[str, npt.ArrayLike] | None = None,
    cell_arrays: Mapping[str, npt.ArrayLike] | None = None,
) -> None:
    """Write lines with arrays on points and lines, whole or not at all.

    The same values give the same bytes. Arrays keep their precision; bool is written as
    uint8.

    Parameters
    ----------
    path : str or Path
        File to make or to replace; its suffix (``.vtp``) says the format.
    points : (n, 3) array_like of float32 or float64
        Coordinates.
    connectivity : (k,) array_like of int
        Point numbers along all lines, one line after the other.
    offsets : (m + 1,) array_like of int
        Line i is ``connectivity[offsets[i]:offsets[i + 1]]``.
    point_arrays : mapping of str to (n,) or (n, c) array_like, optional
        Arrays on points, written in this order.
    cell_arrays : mapping of str to (m,) or (m, c) array_like, optional
        Arrays on lines.

    Raises
    ------
    InputError
        Unknown suffix, folder missing or not writable, disk full, arrays that do not fit.

    Examples
    --------
    >>> import tempfile
    >>> from geomprep.files import read_file
    >>> path = tempfile.mkdtemp() + "/line.vtp"
    >>> write_lines(path, [[0.0, 0, 0], [0, 0, 1]], [0, 1], [0, 2], {"radius": [0.5, 0.25]})
    >>> read_file(path).point_arrays
    {'radius': array([0.5 , 0.25])}
    >>> write_lines("lines.txt", [[0.0, 0, 0]], [], [0])
    Traceback (most recent call last):
    geomprep.errors.InputError: lines.txt: lines are written as .vtp; choose that suffix
    """
    name, row = str(path), FORMATS.get(Path(path).suffix.lower())
    if row is None or row.write is None:
        known = ", ".join(sorted(suffix for suffix, each in FORMATS.items() if each.write))
        raise InputError(f"{name}: lines are written as {known}; choose that suffix")
    place = np.asarray(points)
    if place.dtype not in (np.float32, np.float64):
        place = place.astype(np.float64)
    if place.ndim != 2 or place.shape[1] != 3:
        raise InputError(f"{name}: points of shape {place.shape} given, (n, 3) needed")
    numbers, starts = checked_lines(name, _whole(connectivity), _whole(offsets), len(place))
    on_points = {key: _column(name, key, values, len(place)) for key, values in (point_arrays or {}).items()}
    on_lines = {key: _column(name, key, values, len(starts) - 1) for key, values in (cell_arrays or {}).items()}
    row.write(Path(path), place, (numbers, starts), on_points, on_lines)


def _whole(values: npt.ArrayLike) -> npt.NDArray[np.int64]:
    """Whole numbers; an empty list counts as such."""
    array = np.asarray(values)
    return array.astype(np.int64) if array.size == 0 else array


def _column(name: str, key: str, values: npt.ArrayLike, n_rows: int) -> npt.NDArray[np.generic]:
    """One array with as many rows as needed, of a type that can be written."""
    array = np.asarray(values)
    if array.dtype == np.bool_:
        array = array.astype(np.uint8)
    if array.dtype.kind not in "iuf" or array.dtype.itemsize > 8 or array.dtype == np.float16:
        raise InputError(f"{name}: array '{key}' is of type {array.dtype}; numbers of at most 64 bits are needed")
    if array.ndim not in (1, 2) or len(array) != n_rows:
        raise InputError(f"{name}: array '{key}' has shape {array.shape}, but {n_rows} rows are needed")
    return np.ascontiguousarray(array)
