"""Where a number comes from."""

from __future__ import annotations

from enum import IntEnum

__all__ = ["BASIS_NAMES", "VESSEL_CLASSES", "Basis"]


class Basis(IntEnum):
    """Origin of a number, stored as uint8 in arrays and as its name in files."""

    MEASURED = 0
    INTERPOLATED = 1
    DERIVED = 2
    PUBLISHED = 3
    POPULATION = 4
    USER = 5


BASIS_NAMES = tuple(basis.name.lower() for basis in Basis)
"""Name in files of each value of :class:`Basis`, in order."""

VESSEL_CLASSES = ("unknown", "artery", "vein")
"""Name in files of each vessel class code; classes never join but through ``unknown``."""
