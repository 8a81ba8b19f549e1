"""Triangles as ``.stl``, text and binary."""

from __future__ import annotations

import re

from geomprep.errors import FileError
from geomprep.files.layout import Layout

__all__ = ["layout"]

_HEAD, _RECORD = 84, 50


def layout(name: str, data: bytes) -> Layout:
    """Return how many triangles the file holds; raise FileError where its bytes do not fit them.

    Examples
    --------
    >>> layout("a.stl", bytes(80) + (1).to_bytes(4, "little") + bytes(50)).n_points
    3
    """
    count = int.from_bytes(data[80:_HEAD], "little")
    if len(data) == _HEAD + _RECORD * count and len(data) >= _HEAD:
        words = "STL, binary"
    elif data[:256].lstrip().lower().startswith(b"solid"):
        words, count = "STL, text", _text(name, data)
    elif len(data) < _HEAD:
        raise FileError(name, f"{len(data)} bytes are too few for an STL file; write it anew")
    else:
        raise FileError(
            name,
            f"declares {count} triangles, which take {_HEAD + _RECORD * count} bytes, but has {len(data)}; "
            "the file is cut short or damaged, write it anew",
        )
    if count == 0:
        raise FileError(name, "holds no triangles; write the surface anew")
    return Layout(words, "vtkSTLReader", n_points=3 * count, cells={"polys": (count, 3 * count)})


def _text(name: str, data: bytes) -> int:
    """Triangles of a text, every one of them whole."""
    lower = data.lower()
    counts = {word: len(re.findall(rb"\b" + word + rb"\b", lower)) for word in (b"vertex", b"endloop", b"endfacet")}
    corners = len(re.findall(rb"\bvertex(?:\s+[-+]?(?:\d+\.?\d*|\.\d+)(?:e[-+]?\d+)?){3}\s", lower))
    if not re.search(rb"endsolid[^\n]*\s*$", lower) or not (
        counts[b"vertex"] == corners == 3 * counts[b"endloop"] == 3 * counts[b"endfacet"]
    ):
        raise FileError(
            name,
            f"has {counts[b'vertex']} corners, {corners} of them with three numbers, for {counts[b'endfacet']} "
            "closed triangles; the file is cut short or damaged, write it anew",
        )
    return counts[b"endfacet"]
