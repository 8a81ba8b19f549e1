"""What one file holds, exactly as it says it, before unit, size and frame have a meaning."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
import numpy.typing as npt

from geomprep.findings import Finding
from geomprep.model import IntArray

__all__ = ["AnyArray", "FileContents"]

AnyArray = npt.NDArray[Any]


@dataclass(frozen=True, eq=False)
class FileContents:
    """Lines of one file with the arrays on its points and on its lines.

    Every value is the file's own, in the file's own precision and unit; only the byte
    order is the machine's. All arrays are read-only.

    Attributes
    ----------
    name : str
        Name of the file as it was given.
    sha256 : str
        SHA-256 of the bytes that were read, in hexadecimal.
    format : str
        What the file is, such as ``VTK XML PolyData``.
    points : (n, 3) float32 or float64 array
        All points of the file, those on no line included.
    connectivity : (k,) int array
        Point numbers along all lines, one line after the other.
    offsets : (m + 1,) int array
        Line i is ``connectivity[offsets[i]:offsets[i + 1]]``; each has two points or more.
    point_arrays : dict of str to array
        Numeric arrays on points, (n,) or (n, components), in the order of the file.
    cell_arrays : dict of str to array
        Numeric arrays on cells, only the rows of the lines: (m,) or (m, components).
    n_vertices_ignored : int
        Points drawn as vertices; centrelines are lines only.
    n_other_cells_ignored : int
        Polygons, strips and volume cells that are not used.
    companions : tuple of (str, str)
        Name and SHA-256 of further files that belong to this one (heavy data of ``.xdmf``).
    findings : tuple of Finding
        What was left out on reading.
    """

    name: str
    sha256: str
    format: str
    points: AnyArray
    connectivity: IntArray
    offsets: IntArray
    point_arrays: dict[str, AnyArray] = field(default_factory=dict)
    cell_arrays: dict[str, AnyArray] = field(default_factory=dict)
    n_vertices_ignored: int = 0
    n_other_cells_ignored: int = 0
    companions: tuple[tuple[str, str], ...] = ()
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        """Make every array read-only."""
        put = object.__setattr__
        for name in ("points", "connectivity", "offsets"):
            put(self, name, _read_only(getattr(self, name)))
        for name in ("point_arrays", "cell_arrays"):
            put(self, name, {key: _read_only(array) for key, array in getattr(self, name).items()})

    @property
    def n_points(self) -> int:
        """Number of points."""
        return len(self.points)

    @property
    def n_lines(self) -> int:
        """Number of lines."""
        return len(self.offsets) - 1


def _read_only(array: AnyArray) -> AnyArray:
    """A view of the array that cannot be written."""
    view = np.asarray(array).view()
    view.flags.writeable = False
    return view
