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
        ``kind-`` and 12 hexadecimal digits of BLAKE2b over the sorted coordinate bytes;
        equal anchors get ``-2``, ``-3`` … in row order.

    Examples
    --------
    >>> points = np.array([[0.0, 0.0, 0.0], [1.0, 0.0, 0.0]])
    >>> first, second = anchor_ids("segment", points, np.array([[0, 1], [1, 0]]))
    >>> second == first + "-2"
    True
    """
    raw = raw_points[anchors.ravel()] + 0.0  # −0.0 and 0.0 are the same place
    width = raw.dtype.itemsize * 3
    data = raw.astype(raw.dtype.newbyteorder("<")).tobytes()
    places = range(0, len(data), width)
    rows = zip(*[iter([data[place : place + width] for place in places])] * anchors.shape[1], strict=True)
    known = (anchors >= 0).tolist()
    found: list[str] = []
    for row, used in zip(rows, known, strict=True):
        anchor = b"".join(sorted(part for part, use in zip(row, used, strict=True) if use))
        found.append(f"{kind}-{hashlib.blake2b(anchor, digest_size=_DIGEST_BYTES).hexdigest()}")
    return texts("id", _told_apart(found))


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
