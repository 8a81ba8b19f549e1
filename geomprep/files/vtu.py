"""VTK XML UnstructuredGrid, ``.vtu``."""

from __future__ import annotations

from geomprep.files.layout import Layout
from geomprep.files.xml_layout import xml_layout

__all__ = ["layout"]


def layout(name: str, data: bytes) -> Layout:
    """Return what the header declares, checked against the bytes; raise FileError where they differ."""
    return xml_layout(name, data, "UnstructuredGrid")
