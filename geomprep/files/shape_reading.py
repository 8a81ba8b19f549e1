"""How surfaces and masks are read: like centrelines, in a contained process, by readers of their own."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

from geomprep.errors import FileError
from geomprep.files.contained import Child, Parsed, ReadLimits
from geomprep.files.layout import Layout
from geomprep.files.reading import _bytes, _shown, _stamp

__all__ = ["ImageLayout", "ShapeFormat", "parsed_shape"]


@dataclass(frozen=True)
class ShapeFormat:
    """One format of surfaces or masks.

    Attributes
    ----------
    suffix : str
        Ending of the file name, lower case, with its dot.
    library : str
        Library that the child process loads: ``vtk xml``, ``stl`` or ``image``.
    layout : callable
        ``(name, data)`` to what the header declares, checked against the bytes.
    """

    suffix: str
    library: str
    layout: Callable[[str, bytes], Layout]


@dataclass(frozen=True)
class ImageLayout(Layout):
    """What the header of an image declares.

    Attributes
    ----------
    shape : (int, int, int)
        Points along each axis; cells are one fewer.
    length_unit : str
        Unit of coordinates, empty where the file states none.
    frame : str
        Anatomical frame, such as ``RAS``, empty where the file states none.
    """

    shape: tuple[int, int, int] = (0, 0, 0)
    length_unit: str = ""
    frame: str = ""


def parsed_shape(
    path: str | Path, formats: Sequence[ShapeFormat], limits: ReadLimits
) -> tuple[str, str, Layout, Parsed]:
    """Read a file with one of several formats.

    Parameters
    ----------
    path : str or Path
    formats : sequence of ShapeFormat
        The first whose suffix ends the file's name is taken.
    limits : ReadLimits
        What reading may cost.

    Returns
    -------
    name, sha256 : str
        Name for messages, hash of the bytes that were read.
    layout : Layout
    parsed : Parsed
        What came back, not yet compared with the layout.

    Raises
    ------
    FileError
        The file is missing, empty, of another suffix, damaged, or was changed while it was read.

    Examples
    --------
    >>> parsed_shape("mask.png", [ShapeFormat(".nii", "image", lambda name, data: Layout("", ""))], ReadLimits())
    Traceback (most recent call last):
    geomprep.errors.FileError: mask.png: suffix '.png' is not read here; one of .nii is needed
    """
    name, place = _shown(str(path)), Path(path)
    row = next((row for row in formats if place.name.lower().endswith(row.suffix)), None)
    if row is None:
        said = f"suffix '{place.suffix}' is not read here" if place.suffix else "has no suffix"
        raise FileError(name, f"{said}; one of {', '.join(row.suffix for row in formats)} is needed")
    stamp = _stamp(place, name)
    child = Child(row.library, name, limits, "shape_child.py")
    try:
        data = _bytes(place, name)
        layout = row.layout(name, data)
        child.order(place, layout.reader)
        digest = hashlib.sha256(data).hexdigest()
        for check in layout.later:
            check()
        del data
        parsed = child.result()
    finally:
        child.close()
    if _stamp(place, name) != stamp:
        raise FileError(name, "was changed while it was read; read it again")
    return name, digest, layout, parsed
