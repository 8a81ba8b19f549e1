"""VTK legacy, ``.vtk``."""

from __future__ import annotations

from geomprep.files.layout import Layout

__all__ = ["layout"]


def layout(name: str, data: bytes) -> Layout:
    """Return what the header declares."""
    grid = b"UNSTRUCTURED_GRID" in data[:1000].upper()
    return Layout("VTK legacy", "vtkUnstructuredGridReader" if grid else "vtkPolyDataReader")
