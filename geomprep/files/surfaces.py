"""Lumen surfaces: ``.vtp``, ``.stl`` and ``.vtu``, read by VTK's own readers in a contained way."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np

from geomprep.errors import FileError
from geomprep.files import stl, vtp, vtu
from geomprep.files.contained import Parsed, ReadLimits
from geomprep.files.contents import AnyArray
from geomprep.files.layout import compare
from geomprep.files.shape_reading import ShapeFormat, parsed_shape
from geomprep.files.structure import checked_points
from geomprep.findings import Finding, Severity
from geomprep.model import BoolArray, IntArray

__all__ = ["SurfaceContents", "read_surface"]

_FORMATS = (
    ShapeFormat(".vtp", "vtk xml", vtp.layout),
    ShapeFormat(".vtu", "vtk xml", vtu.layout),
    ShapeFormat(".stl", "stl", stl.layout),
)
_DEFAULT_LIMITS = ReadLimits()
_VTK_STRIP, _VTK_POLYGONS = 6, (5, 7, 9)  # VTK_TRIANGLE_STRIP; VTK_TRIANGLE, VTK_POLYGON and VTK_QUAD


@dataclass(frozen=True, eq=False)
class SurfaceContents:
    """Triangles of one file; coordinates are the file's own.

    Attributes
    ----------
    name : str
        Name of the file as it was given.
    sha256 : str
        SHA-256 of the bytes that were read, in hexadecimal.
    format : str
        What the file is.
    points : (n, 3) float32 or float64 array
    triangles : (t, 3) int array
        Rows of `points`; polygons of more corners are cut into fans, strips into their triangles.
    n_other_cells_ignored : int
        Vertices, lines and volume cells.
    findings : tuple of Finding
    """

    name: str
    sha256: str
    format: str
    points: AnyArray
    triangles: IntArray
    n_other_cells_ignored: int = 0
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        """Make the arrays read-only."""
        for name in ("points", "triangles"):
            view = np.asarray(getattr(self, name)).view()
            view.flags.writeable = False
            object.__setattr__(self, name, view)


def read_surface(path: str | Path, *, limits: ReadLimits = _DEFAULT_LIMITS) -> SurfaceContents:
    """Read a triangulated lumen surface, open or closed.

    Parameters
    ----------
    path : str or Path
        ``.vtp``, ``.vtu`` or ``.stl``.
    limits : ReadLimits
        What reading may cost.

    Returns
    -------
    SurfaceContents

    Raises
    ------
    FileError
        One line with the file, its fault and the way out.

    Examples
    --------
    >>> read_surface("no such file.stl")
    Traceback (most recent call last):
    geomprep.errors.FileError: no such file.stl: there is no such file; check name and folder
    """
    name, digest, layout, parsed = parsed_shape(path, _FORMATS, limits)
    compare(name, layout, parsed)
    points = parsed.one("points")
    if points is None or len(points) == 0:
        raise FileError(name, "holds no points; a surface is triangles between points")
    points = checked_points(name, points)
    if "cells" in parsed.answer["counts"]:
        triangles, n_other, n_wide = _of_grid(name, parsed, len(points))
    else:
        triangles, n_other, n_wide = _of_polydata(name, parsed, len(points))
    if len(triangles) == 0:
        raise FileError(
            name, f"holds {n_other} cells but no triangles or polygons; write the surface of the lumen, not its volume"
        )
    return SurfaceContents(
        str(path), digest, layout.words, points, triangles, n_other, _findings(n_other, n_wide)
    )  # fmt: skip


def _of_polydata(name: str, parsed: Parsed, n_points: int) -> tuple[IntArray, int, int]:
    """Triangles of polygons and strips, number of other cells and of polygons of five corners or more."""
    counts = parsed.answer["counts"]
    polygons, wide = _fans(*_section(name, parsed, "polys", n_points))
    strips = _strips(*_section(name, parsed, "strips", n_points))
    return np.concatenate((polygons, strips)), counts["verts"][0] + counts["lines"][0], wide


def _section(name: str, parsed: Parsed, section: str, n_points: int) -> tuple[IntArray, IntArray]:
    """Connectivity and offsets of a section of cells."""
    return _checked(name, parsed.one(f"{section} connectivity"), parsed.one(f"{section} offsets"), n_points)


def _of_grid(name: str, parsed: Parsed, n_points: int) -> tuple[IntArray, int, int]:
    """The same of an unstructured grid."""
    types = parsed.one("types")
    types = np.empty(0, np.uint8) if types is None else types
    connectivity, offsets = _checked(name, parsed.one("connectivity"), parsed.one("offsets"), n_points)
    if len(offsets) != len(types) + 1:
        raise FileError(
            name, f"has {len(types)} types for {len(offsets) - 1} cells; the file is damaged, write it anew"
        )
    flat, strip = np.isin(types, _VTK_POLYGONS), types == _VTK_STRIP
    polygons, wide = _fans(*_some(connectivity, offsets, flat))
    strips = _strips(*_some(connectivity, offsets, strip))
    return np.concatenate((polygons, strips)), int(np.count_nonzero(~flat & ~strip)), wide


def _checked(
    name: str, connectivity: AnyArray | None, offsets: AnyArray | None, n_points: int
) -> tuple[IntArray, IntArray]:
    """Point numbers and offsets as int64, or a complaint where they cut no cells out of the points."""
    if connectivity is None or offsets is None or len(offsets) == 0:
        return np.empty(0, np.int64), np.zeros(1, np.int64)
    connectivity, offsets = connectivity.astype(np.int64).reshape(-1), offsets.astype(np.int64).reshape(-1)
    if offsets[0] != 0 or offsets[-1] != len(connectivity) or (np.diff(offsets) < 0).any():
        raise FileError(
            name, f"offsets of the cells must rise from 0 to {len(connectivity)}; the file is damaged, write it anew"
        )
    wrong = (connectivity < 0) | (connectivity >= n_points)
    if wrong.any():
        raise FileError(
            name,
            f"a cell names point {connectivity[int(np.argmax(wrong))]}, but there are {n_points} points, "
            "numbered from 0; the file is damaged, write it anew",
        )
    return connectivity, offsets


def _some(connectivity: IntArray, offsets: IntArray, keep: BoolArray) -> tuple[IntArray, IntArray]:
    """Only some of the cells."""
    lengths = np.diff(offsets)
    return connectivity[np.repeat(keep, lengths)], np.concatenate(([0], np.cumsum(lengths[keep])))


def _fans(connectivity: IntArray, offsets: IntArray) -> tuple[IntArray, int]:
    """Triangles from the first corner of each polygon to its other sides; number of polygons of five corners up."""
    lengths = np.diff(offsets)
    parts = np.maximum(lengths - 2, 0)
    start = np.repeat(offsets[:-1], parts)
    step = np.arange(parts.sum()) - np.repeat(np.cumsum(parts) - parts, parts)
    corners = (start, start + step + 1, start + step + 2)
    return np.stack([connectivity[each] for each in corners], axis=1), int(np.count_nonzero(lengths > 4))


def _strips(connectivity: IntArray, offsets: IntArray) -> IntArray:
    """Triangles of strips, every second one turned so that all face the same way."""
    parts = np.maximum(np.diff(offsets) - 2, 0)
    step = np.arange(parts.sum()) - np.repeat(np.cumsum(parts) - parts, parts)
    first = np.repeat(offsets[:-1], parts) + step
    odd = step % 2
    return np.stack([connectivity[first], connectivity[first + 1 + odd], connectivity[first + 2 - odd]], axis=1)


def _findings(n_other: int, n_wide: int) -> tuple[Finding, ...]:
    """What was left out or had to be cut."""
    findings = []
    if n_other:
        message = f"{n_other} cells that are no surface (vertices, lines, volumes) are ignored"
        findings.append(Finding("ignored cells", Severity.NOTE, message, value=n_other))
    if n_wide:
        message = f"{n_wide} polygons of more than four corners are cut into triangles from their first corner"
        findings.append(Finding("polygons cut", Severity.NOTE, message, value=n_wide))
    return tuple(findings)
