"""Origins of a field whose rows do not all come from the same place."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np

from geomprep.model import Basis, BoolArray, Origin

__all__ = ["origins_by_rows"]


def origins_by_rows(field: str, parts: Iterable[tuple[Basis, str, BoolArray]]) -> tuple[Origin, ...]:
    """Make the origins of a field from masks of its rows.

    Parameters
    ----------
    field : str
        ``table.field`` of the fields table.
    parts : iterable of (Basis, str, (n,) bool array)
        Basis, detail and the rows that have it; equal pairs are put together, parts without rows
        are left out. The masks must not overlap.

    Returns
    -------
    tuple of Origin
        The one with most rows first and without row numbers: it is the default of the field.

    Examples
    --------
    >>> masks = np.array([True, True, False]), np.array([False, False, True])
    >>> for origin in origins_by_rows("t.f", [(Basis.USER, "a", masks[1]), (Basis.DERIVED, "b", masks[0])]):
    ...     print(origin.basis.name, origin.detail, origin.rows)
    DERIVED b ()
    USER a (2,)
    >>> origins_by_rows("t.f", [])
    ()
    """
    masks: dict[tuple[Basis, str], BoolArray] = {}
    for basis, detail, mask in parts:
        if mask.any():
            masks[basis, detail] = masks.get((basis, detail), np.zeros_like(mask)) | mask
    ranked = sorted(masks.items(), key=lambda item: -int(item[1].sum()))
    return tuple(
        Origin(field, basis, detail, () if first == 0 else tuple(np.flatnonzero(mask).tolist()))
        for first, ((basis, detail), mask) in enumerate(ranked)
    )
