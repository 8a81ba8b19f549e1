"""VTK XML PolyData, ``.vtp``."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from geomprep.atomic import replacing
from geomprep.files.contents import AnyArray
from geomprep.files.layout import Layout
from geomprep.files.xml_layout import xml_layout
from geomprep.model import IntArray

__all__ = ["layout", "write"]


def layout(name: str, data: bytes) -> Layout:
    """Return what the header declares, checked against the bytes; raise FileError where they differ."""
    return xml_layout(name, data, "PolyData")


def write(
    path: Path,
    points: AnyArray,
    lines: tuple[IntArray, IntArray],
    point_arrays: dict[str, AnyArray],
    cell_arrays: dict[str, AnyArray],
) -> None:
    """Write lines by VTK's own writer: appended raw, little-endian, not compressed, 64-bit headers.

    Parameters
    ----------
    path : Path
        File to make or to replace.
    points : (n, 3) float32 or float64 array
    lines : connectivity (k,), offsets (m + 1,)
    point_arrays, cell_arrays : dict of str to array
        Numeric arrays with n and m rows.

    Raises
    ------
    InputError
        The folder is missing or not writable, or the disk is full.
    """
    from vtkmodules.vtkIOXML import vtkXMLPolyDataWriter

    faults: list[str] = []
    writer: Any = vtkXMLPolyDataWriter()
    writer.AddObserver("ErrorEvent", lambda *_: faults.append("VTK could not write it"))
    writer.SetInputData(_data_set(points, lines, point_arrays, cell_arrays))
    writer.SetDataModeToAppended()
    writer.EncodeAppendedDataOff()
    writer.SetCompressorTypeToNone()
    writer.SetByteOrderToLittleEndian()
    writer.SetHeaderTypeToUInt64()
    with replacing(path) as new:
        writer.SetFileName(str(new))
        if writer.Write() != 1 or writer.GetErrorCode() or faults:
            raise OSError("the disk is full or not writable")


def _data_set(
    points: AnyArray,
    lines: tuple[IntArray, IntArray],
    point_arrays: dict[str, AnyArray],
    cell_arrays: dict[str, AnyArray],
) -> Any:
    """The same as a VTK data set that looks at the arrays' own memory."""
    import numpy as np
    from vtkmodules.util import numpy_support
    from vtkmodules.vtkCommonCore import vtkPoints
    from vtkmodules.vtkCommonDataModel import vtkCellArray, vtkPolyData

    convert: Any = numpy_support  # it carries no types
    place, cells, data = vtkPoints(), vtkCellArray(), vtkPolyData()
    place.SetData(convert.numpy_to_vtk(np.ascontiguousarray(points)))
    cells.SetData(*(convert.numpy_to_vtkIdTypeArray(np.ascontiguousarray(each)) for each in lines[::-1]))
    data.SetPoints(place)
    data.SetLines(cells)
    for attributes, arrays in ((data.GetPointData(), point_arrays), (data.GetCellData(), cell_arrays)):
        for key, values in arrays.items():
            array = convert.numpy_to_vtk(np.ascontiguousarray(values))
            array.SetName(key)
            attributes.AddArray(array)
    return data
