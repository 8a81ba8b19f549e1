"""The formats that can be read: one row each."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from geomprep.errors import FileError
from geomprep.files import legacy_vtk, mesh, vtp, vtu
from geomprep.files.contents import AnyArray
from geomprep.files.layout import Layout
from geomprep.model import IntArray

__all__ = ["FORMATS", "Format", "format_of"]


@dataclass(frozen=True)
class Format:
    """One format of files.

    Attributes
    ----------
    suffix : str
        Ending of the file name, lower case, with its dot.
    words : str
        What the format is, for people.
    library : str
        Library that the child process loads: ``vtk xml``, ``vtk legacy`` or ``meshio``.
    layout : callable
        ``(name, data)`` to what the header declares, checked against the bytes.
    write : callable or None
        Writer of lines, where there is one.
    """

    suffix: str
    words: str
    library: str
    layout: Callable[[str, bytes], Layout]
    write: (
        Callable[[Path, AnyArray, tuple[IntArray, IntArray], dict[str, AnyArray], dict[str, AnyArray]], None] | None
    ) = None


FORMATS = {
    row.suffix: row
    for row in (
        Format(".vtp", "VTK XML PolyData", "vtk xml", vtp.layout, vtp.write),
        Format(".vtk", "VTK legacy", "vtk legacy", legacy_vtk.layout),
        Format(".vtu", "VTK XML UnstructuredGrid", "vtk xml", vtu.layout),
        Format(".msh", "mesh (.msh)", "meshio", mesh.msh_layout),
        Format(".xdmf", "mesh (.xdmf)", "meshio", mesh.xdmf_layout),
        Format(".mesh", "mesh (.mesh)", "meshio", mesh.medit_layout),
    )
}
"""Every format by the suffix of its files."""


def format_of(path: Path, name: str) -> Format:
    """Return the format of a file by its suffix.

    Raises
    ------
    FileError
        The suffix is unknown; the known ones are listed.

    Examples
    --------
    >>> format_of(Path("head.VTP"), "head.VTP").words
    'VTK XML PolyData'
    >>> format_of(Path("head"), "head")
    Traceback (most recent call last):
    geomprep.errors.FileError: head: has no suffix; one of .vtp, ... is needed
    """
    suffix = path.suffix.lower()
    if suffix not in FORMATS:
        said = f"suffix '{path.suffix}' is unknown" if suffix else "has no suffix"
        raise FileError(name, f"{said}; one of {', '.join(sorted(FORMATS))} is needed")
    return FORMATS[suffix]
