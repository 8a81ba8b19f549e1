"""VTK XML UnstructuredGrid, ``.vtu``."""

from __future__ import annotations

from geomprep.files.layout import Layout

__all__ = ["layout"]


def layout(name: str, data: bytes) -> Layout:
    """Return what the header declares."""
    return Layout("VTK XML UnstructuredGrid", "vtkXMLUnstructuredGridReader")
