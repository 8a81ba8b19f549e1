"""Further open mesh formats that hold two-point lines, read by meshio: ``.msh``, ``.xdmf``, ``.mesh``.

The header check is lighter than for VTK's formats: sections must be closed and the number of
points agree; the rest rests on meshio's own checks and on those made of every format after reading.
"""

from __future__ import annotations

import re

from geomprep.errors import FileError
from geomprep.files.layout import Layout

__all__ = ["medit_layout", "msh_layout", "xdmf_layout"]


def msh_layout(name: str, data: bytes) -> Layout:
    """Return what a ``.msh`` file (version 2 or 4) declares; raise FileError where a section is missing or open."""
    for section in (b"MeshFormat", b"Nodes", b"Elements"):
        if data.count(b"$" + section) != 1 or data.count(b"$End" + section) != 1:
            raise FileError(name, f"section ${section.decode()} is missing, doubled or not closed; write the file anew")
    first, second = _first_numbers(data, b"$Nodes", 2)
    old = data.split(b"$MeshFormat", 1)[1].split()[0].startswith(b"2")
    binary = data.split(b"$MeshFormat", 1)[1].split()[1] == b"1"
    points = None if binary and not old else first if old else second
    return Layout("mesh (.msh)", "gmsh", n_points=points)


def _first_numbers(data: bytes, after: bytes, count: int) -> tuple[int | None, ...]:
    """Whole numbers that follow a word, None where they are no text."""
    words = data.split(after, 1)[1][:100].split()[:count]
    found = [int(word) if word.isdigit() else None for word in words]
    return (*found, *[None] * (count - len(found)))


def xdmf_layout(name: str, data: bytes) -> Layout:
    """Return what an ``.xdmf`` file declares; raise FileError where it is no closed XML of that kind."""
    if b"<Xdmf" not in data or b"</Xdmf>" not in data:
        raise FileError(name, "no whole XDMF document; write the file anew")
    if b"<!ENTITY" in data or b"<!DOCTYPE" in data:
        raise FileError(name, "declares entities; they are refused, write the file without them")
    return Layout("mesh (.xdmf)", "xdmf")


def medit_layout(name: str, data: bytes) -> Layout:
    """Return what a ``.mesh`` file declares; raise FileError where it does not end or has no vertices."""
    if b"MeshVersionFormatted" not in data or not re.search(rb"\bEnd\s*$", data):
        raise FileError(name, "no whole .mesh text (MeshVersionFormatted … End); write the file anew")
    found = re.search(rb"\bVertices\s+(\d+)", data)
    if found is None:
        raise FileError(name, "has no section Vertices; write the file anew")
    return Layout("mesh (.mesh)", "medit", n_points=int(found[1]))
