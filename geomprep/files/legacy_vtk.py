"""VTK legacy, ``.vtk``: poly data and unstructured grids, text and binary, versions 1 to 5.1."""

from __future__ import annotations

import re

from geomprep.errors import FileError
from geomprep.files.layout import Layout, unique
from geomprep.files.legacy_walk import Walk

__all__ = ["layout"]

_FIRST_LINE = re.compile(rb"# vtk DataFile Version (\d+)\.(\d+)\s*$")
_READERS = {b"POLYDATA": "vtkPolyDataReader", b"UNSTRUCTURED_GRID": "vtkUnstructuredGridReader"}
_CELLS = {
    b"VERTICES": "verts",
    b"LINES": "lines",
    b"POLYGONS": "polys",
    b"TRIANGLE_STRIPS": "strips",
    b"CELLS": "cells",
}
_COLUMNS = {b"VECTORS": 3, b"NORMALS": 3, b"TENSORS": 9, b"TENSORS6": 6, b"GLOBAL_IDS": 1, b"PEDIGREE_IDS": 1,
            b"EDGE_FLAGS": 1}  # fmt: skip


def layout(name: str, data: bytes) -> Layout:
    """Return what the header declares, every section held against the bytes.

    Raises
    ------
    FileError
        The header is none of this format, a section is unknown, cut short, or holds what is
        no number.
    """
    walk, kind = _opened(name, data)
    cells: dict[str, tuple[int, int | None]] = dict.fromkeys(_expected(kind), (0, 0))
    while (words := walk.words()) is not None:
        key = words[0].upper()
        if key == b"POINTS":
            walk.n_points = walk.whole(words, 1, "POINTS")
            walk.block(3 * walk.n_points, walk.type_of(words, 2), "points")
        elif key in _CELLS and _CELLS[key] in cells:
            cells[_CELLS[key]] = _cell_section(walk, words)
        elif key == b"CELL_TYPES":
            walk.block(walk.whole(words, 1, "CELL_TYPES"), b"int", "cell types")
        elif key in (b"POINT_DATA", b"CELL_DATA"):
            walk.enter(key, walk.whole(words, 1, key.decode()), sum(count for count, _ in cells.values()))
        elif not _attribute(walk, key, words):
            shown = words[0][:30].decode("ascii", "backslashreplace")
            raise FileError(name, f"unknown section '{shown}'; the file is damaged, write it anew")
    for place, arrays in (("point", walk.point_arrays), ("cell", walk.cell_arrays)):
        unique(name, place, [array.name for array in arrays])
    return Layout(
        "VTK legacy",
        _READERS[kind],
        n_points=walk.n_points,
        cells=cells,
        point_arrays=tuple(walk.point_arrays),
        cell_arrays=tuple(walk.cell_arrays),
        n_bytes=walk.n_bytes,
    )


def _expected(kind: bytes) -> tuple[str, ...]:
    """Sections of cells that a kind of data set may have."""
    return ("cells",) if kind == b"UNSTRUCTURED_GRID" else ("verts", "lines", "polys", "strips")


def _opened(name: str, data: bytes) -> tuple[Walk, bytes]:
    """The four lines of the header; the walk stands behind them."""
    lines = data[:1000].split(b"\n", 3)
    first = _FIRST_LINE.match(lines[0])
    if first is None or len(lines) < 4:
        raise FileError(name, "no VTK legacy file: its first line must be '# vtk DataFile Version x.y'")
    form = lines[2].strip().upper()
    if form not in (b"ASCII", b"BINARY"):
        shown = lines[2][:30].decode("ascii", "backslashreplace")
        raise FileError(name, f"the third line must say ASCII or BINARY; it says '{shown}'")
    start = sum(len(line) + 1 for line in lines[:3])
    walk = Walk(name, data, start, form == b"BINARY", (int(first[1]), int(first[2])))
    words = walk.words() or [b""]
    kind = words[1].upper() if len(words) == 2 and words[0].upper() == b"DATASET" else b""
    if kind not in _READERS:
        raise FileError(name, "the line after ASCII or BINARY must be DATASET POLYDATA or DATASET UNSTRUCTURED_GRID")
    return walk, kind


def _cell_section(walk: Walk, words: list[bytes]) -> tuple[int, int]:
    """Number of cells of a section, and of the point numbers in them; the walk goes on behind it."""
    what = words[0].decode().lower()
    first, second = walk.whole(words, 1, what), walk.whole(words, 2, what)
    if walk.version < (5, 0):
        walk.block(second, b"int", what)
        return first, second - first
    for key, count in ((b"OFFSETS", first), (b"CONNECTIVITY", second)):
        inner = walk.words() or [b""]
        if inner[0].upper() != key:
            raise FileError(walk.name, f"{what} needs the part {key.decode()}; the file is damaged, write it anew")
        walk.block(count, walk.type_of(inner, 1), what)
    return max(first - 1, 0), second


def _attribute(walk: Walk, key: bytes, words: list[bytes]) -> bool:
    """One section of arrays; False where the word is none."""
    if key == b"SCALARS":
        columns = walk.whole(words, 3, "SCALARS") if len(words) > 3 else 1
        table = walk.words() or [b""]
        if table[0].upper() != b"LOOKUP_TABLE":
            raise FileError(walk.name, "SCALARS must be followed by LOOKUP_TABLE; the file is damaged, write it anew")
        walk.array(words, columns, walk.type_of(words, 2))
    elif key in _COLUMNS:
        walk.array(words, _COLUMNS[key], walk.type_of(words, 2))
    elif key == b"TEXTURE_COORDINATES":
        walk.array(words, walk.whole(words, 2, "TEXTURE_COORDINATES"), walk.type_of(words, 3))
    elif key == b"COLOR_SCALARS":
        walk.array(words, walk.whole(words, 2, "COLOR_SCALARS"), b"unsigned_char" if walk.binary else b"float")
    elif key == b"LOOKUP_TABLE":
        walk.block(4 * walk.whole(words, 2, "LOOKUP_TABLE"), b"unsigned_char" if walk.binary else b"float", "colours")
    elif key == b"FIELD":
        _field(walk, walk.whole(words, 2, "FIELD"))
    elif key == b"METADATA":
        walk.skip_metadata()
    else:
        return False
    return True


def _field(walk: Walk, count: int) -> None:
    """The arrays of one FIELD section."""
    for _ in range(count):
        words = walk.words()
        while words is not None and words[0].upper() == b"METADATA":
            walk.skip_metadata()
            words = walk.words()
        if words is None or len(words) != 4:
            raise FileError(walk.name, f"FIELD declares {count} arrays, fewer are there; write the file anew")
        columns, rows = walk.whole(words, 1, "FIELD"), walk.whole(words, 2, "FIELD")
        walk.array([b"FIELD", words[0]], columns, walk.type_of(words, 3), rows)
