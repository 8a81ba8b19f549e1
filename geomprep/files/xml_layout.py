"""What the header of a VTK XML file declares, checked against its bytes."""

from __future__ import annotations

from geomprep.errors import FileError
from geomprep.files.layout import Declared, Layout, unique
from geomprep.files.xml_blocks import Blocks
from geomprep.files.xml_tags import ArrayTag, Piece, find_tags, number_of

__all__ = ["xml_layout"]

_CELLS = {
    "PolyData": {"Verts": "verts", "Lines": "lines", "Strips": "strips", "Polys": "polys"},
    "UnstructuredGrid": {"Cells": "cells"},
}
_SUFFIX = {"PolyData": ".vtp", "UnstructuredGrid": ".vtu"}


def xml_layout(name: str, data: bytes, kind: str) -> Layout:
    """Return what a VTK XML file declares.

    Parameters
    ----------
    name : str
        Name of the file, for messages.
    data : bytes
        All bytes of the file.
    kind : str
        ``PolyData`` or ``UnstructuredGrid``, as the suffix says.

    Raises
    ------
    FileError
        Another kind of file, broken XML, counts that the bytes cannot hold.
    """
    tags = find_tags(name, data)
    said = tags.root.get("type", "")
    if said != kind or tags.kind != kind:
        way = f"rename it to {_SUFFIX[said]}" if said in _SUFFIX else "write the lines as PolyData"
        raise FileError(name, f"holds '{said or tags.kind}', not {kind}; {way}")
    if not tags.pieces:
        raise FileError(name, "has no piece of data; it is cut short or damaged, write it anew")
    blocks = Blocks(name, data, tags)
    cells: dict[str, tuple[int, int | None]] = {}
    for piece in tags.pieces:
        for section, (n_cells, numbers) in _piece(blocks, piece, kind).items():
            before = cells.get(section, (0, 0))
            cells[section] = (before[0] + n_cells, (before[1] or 0) + numbers)
    for tag in tags.loose:
        blocks.values(tag, None)
    blocks.check_appended()
    _same_arrays(name, tags.pieces)
    return Layout(
        words=f"VTK XML {kind}",
        reader=f"vtkXML{kind}Reader",
        n_points=sum(number_of(name, piece.attributes, "NumberOfPoints", None) for piece in tags.pieces),
        cells=cells,
        point_arrays=_declared(name, "point", tags.pieces[0].sections.get("PointData", [])),
        cell_arrays=_declared(name, "cell", tags.pieces[0].sections.get("CellData", [])),
        later=tuple(blocks.later),
        n_bytes=blocks.n_bytes,
    )


def _piece(blocks: Blocks, piece: Piece, kind: str) -> dict[str, tuple[int, int]]:
    """Cells and point numbers per section of one piece; all its arrays looked at."""
    name = blocks.name
    n_points = number_of(name, piece.attributes, "NumberOfPoints", None)
    points = piece.sections.get("Points", [])
    if len(points) != 1 and (n_points or points):
        raise FileError(name, f"a piece of {n_points} points has {len(points)} arrays of coordinates; one is needed")
    for tag in points:
        if _components(name, tag) != 3:
            raise FileError(name, f"points have {_components(name, tag)} coordinates; 3 are needed")
        blocks.values(tag, 3 * n_points)
    cells = {}
    for section, key in _CELLS[kind].items():
        count = number_of(name, piece.attributes, f"NumberOf{section}", None if kind == "UnstructuredGrid" else 0)
        cells[key] = (count, _cells(blocks, piece.sections.get(section, []), section, count))
    n_cells = sum(count for count, _ in cells.values())
    for section, n_rows in (("PointData", n_points), ("CellData", n_cells)):
        for tag in piece.sections.get(section, []):
            blocks.values(tag, n_rows * _components(name, tag) if tag.attributes.get("type") != "String" else None)
    return cells


def _cells(blocks: Blocks, tags: list[ArrayTag], section: str, count: int) -> int:
    """Point numbers in a section of so many cells."""
    arrays = {tag.name: tag for tag in tags}
    if len(arrays) != len(tags):
        raise FileError(blocks.name, f"{section} has two arrays of one name; the file is damaged, write it anew")
    needed = ("connectivity", "offsets", *(("types",) if section == "Cells" else ()))
    missing = [key for key in needed if key not in arrays]
    if missing and count:
        raise FileError(
            blocks.name, f"{section} declares {count} cells, but has no array '{missing[0]}'; write it anew"
        )
    numbers = 0
    for key, tag in arrays.items():
        if key not in needed and section != "Cells":
            raise FileError(blocks.name, f"{section} has an unknown array '{key}'; the file is damaged, write it anew")
        if key == "connectivity":
            numbers = blocks.values(tag, None if count else 0)
        else:
            blocks.values(tag, count if key in needed else None)
    return numbers


def _components(name: str, tag: ArrayTag) -> int:
    """Values per row of an array."""
    return number_of(name, tag.attributes, "NumberOfComponents", 1)


def _shape(tag: ArrayTag) -> tuple[str, str, str]:
    """What must agree between pieces: the reader takes type and columns from the first."""
    return tag.name, tag.attributes.get("type", ""), tag.attributes.get("NumberOfComponents", "1")


def _same_arrays(name: str, pieces: list[Piece]) -> None:
    """Raise where a piece has other arrays than the first one."""
    for section in ("Points", "PointData", "CellData"):
        first = [_shape(tag) for tag in pieces[0].sections.get(section, [])]
        for number, piece in enumerate(pieces):
            if [_shape(tag) for tag in piece.sections.get(section, [])] != first:
                raise FileError(
                    name, f"piece {number} has other arrays in {section} than piece 0; write all as one piece"
                )


def _declared(name: str, kind: str, tags: list[ArrayTag]) -> tuple[Declared, ...]:
    """Numeric arrays that must come back."""
    unique(name, kind, [tag.name for tag in tags])
    return tuple(Declared(tag.name, _components(name, tag)) for tag in tags if tag.attributes.get("type") != "String")
