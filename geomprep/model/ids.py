"""Stable ids: a kind and a hash of raw file coordinates, never of repaired positions."""

from __future__ import annotations

import hashlib
from collections import Counter
from typing import Any

import numpy as np
import numpy.typing as npt

from geomprep.model.arrays import IntArray, TextArray, texts

__all__ = ["anchor_ids", "raw_order"]

_DIGEST_BYTES = 6


def anchor_ids(kind: str, raw_points: npt.NDArray[Any], anchors: IntArray) -> TextArray:
    """Return one id per row of anchors, unchanged by the order of points in the file.

    Parameters
    ----------
    kind : str
        Prefix, such as ``node`` or ``segment``.
    raw_points : (n_raw, 3) array
        Coordinates with the exact bytes of the file.
    anchors : (m, a) int array
        Raw points that identify each thing; −1 entries are left out.

    Returns
    -------
    (m,) object array of str
        ``kind-`` and 12 hexadecimal digits of BLAKE2b over the coordinate bytes, points in the
        order of their coordinates; equal anchors get ``-2``, ``-3`` … in row order.

    Examples
    --------
    >>> points = np.array([[0.0, 0.0, 0.0], [1.0, 0.0, 0.0]])
    >>> first, second = anchor_ids("segment", points, np.array([[0, 1], [1, 0]]))
    >>> second == first + "-2"
    True
    """
    anchors = _in_raw_order(raw_points, anchors)
    rows = np.ascontiguousarray(raw_points[anchors] + 0.0)  # −0.0 and 0.0 are the same place
    data = memoryview(rows.astype(rows.dtype.newbyteorder("<"), copy=False).tobytes())
    width = rows.dtype.itemsize * 3
    starts = range(0, len(data), width * anchors.shape[1])
    ends = (np.arange(len(anchors)) * width * anchors.shape[1] + width * (anchors >= 0).sum(axis=1)).tolist()
    found = [
        f"{kind}-{hashlib.blake2b(data[start:end], digest_size=_DIGEST_BYTES).hexdigest()}"
        for start, end in zip(starts, ends, strict=True)
    ]
    return texts("id", _told_apart(found))


def _in_raw_order(raw_points: npt.NDArray[Any], anchors: IntArray) -> IntArray:
    """Sort the anchors of each row by their raw coordinates, entries of −1 last."""
    if anchors.shape[1] < 2:
        return anchors
    used, place = np.unique(anchors, return_inverse=True)
    rank = np.empty(len(used), np.int64)
    rank[raw_order(raw_points, used)] = np.arange(len(used))
    rank[used < 0] = len(used)
    order = np.argsort(rank[place.reshape(anchors.shape)], axis=1, kind="stable")
    return np.take_along_axis(anchors, order, axis=1)


def _told_apart(ids: list[str]) -> list[str]:
    """Number the second, third … of equal ids."""
    if len(set(ids)) == len(ids):
        return ids
    seen: Counter[str] = Counter()
    numbered = []
    for name in ids:
        seen[name] += 1
        numbered.append(name if seen[name] == 1 else f"{name}-{seen[name]}")
    return numbered


def raw_order(raw_points: npt.NDArray[Any], which: IntArray) -> IntArray:
    """Return the order that sorts points by their raw coordinates (x, then y, then z).

    Canonical orders of nodes and segments come from here, so that the order of points
    and cells in a file leaves no trace in the result.
    """
    rows = raw_points[which]
    return np.lexsort((rows[:, 2], rows[:, 1], rows[:, 0])).astype(np.int64)
